package anova

import (
	"math"

	"subsume.example/lrt"
)

// Critical values of intervals. They come from the null law of a plan, so that
// this package inverts no distribution itself.

// studentCritical returns the two-sided critical value of Student's t of a level: the root of
// that of F(1, ν).
func studentCritical(nu, level float64) float64 {
	p, err := lrt.PlanF(1, nu, 0)
	if err != nil {
		return math.NaN()
	}
	return math.Sqrt(p.Critical(1 - level))
}

// scheffeCritical returns by how many standard errors every contrast of a
// family of d dimensions may differ from its estimate, at once, at the level (Scheffé
// 1953): √(d·F). With known variance nu is +Inf.
func scheffeCritical(d, nu, level float64) float64 {
	p, err := lrt.PlanF(d, nu, 0)
	if err != nil {
		return math.NaN()
	}
	return math.Sqrt(d * p.Critical(1-level))
}
