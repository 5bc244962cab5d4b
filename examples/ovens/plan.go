package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"subsume.example/lrt"
)

// plan holds what the design could be expected to find, from figures that were
// there before the response: the difference of interest and the spread of earlier work.
type plan struct {
	difference, sd float64
	alpha, wanted  float64
	a, b           string // the pair of groups that is hardest to tell apart
	here           lrt.Plan
	detectable     float64 // difference found with the wanted power by this design
	each           int     // rows a group, equal groups, for the wanted power; 0: out of reach
	powerEach      float64 // reached with them
}

// plan works the planning figures, for the least favourable pattern: two
// groups differ by the difference of interest and all others lie halfway.
func (s *study) plan(ctx context.Context) error {
	if s.difference == 0 {
		return nil
	}
	q := &plan{difference: s.difference, sd: s.sd, alpha: 1 - s.level, wanted: s.power}
	unit := math.Inf(1)
	for a := range s.groups {
		for b := range a {
			if l := spreadOf(s.counts, a, b); l < unit {
				unit, q.a, q.b = l, s.groups[b], s.groups[a]
			}
		}
	}
	var err error
	if q.here, err = s.planFor(s.counts, unit); err != nil {
		return s.explain(err)
	}
	lambda, err := q.here.Detectable(q.alpha, q.wanted)
	if err != nil {
		return err
	}
	q.detectable = q.sd * math.Sqrt(lambda/unit)
	size, err := lrt.SizeSearch{
		Alpha: q.alpha, Power: q.wanted, Step: slices.Repeat([]int{1}, len(s.groups)),
		Plan: func(n []int) (lrt.Plan, error) { return s.planFor(n, spreadOf(n, 0, 1)) },
	}.Solve(ctx)
	switch {
	case err == nil:
		q.each, q.powerEach = size.N[0], size.Power
	case !errors.Is(err, lrt.ErrTooSmall):
		return err
	}
	s.planned = q
	return nil
}

// planFor is the plan of the F test with n rows in the groups, for a pattern
// of the given spread in units of the difference of interest.
func (s *study) planFor(n []int, spread float64) (lrt.Plan, error) {
	total := 0
	for _, v := range n {
		total += v
	}
	ratio := s.difference / s.sd
	return lrt.PlanF(float64(len(n)-1), float64(total-len(n)-len(s.covariates)), spread*ratio*ratio)
}

// spreadOf returns Σ n (μ − μ̄)² for means ½ in group a, −½ in group b and 0 elsewhere.
func spreadOf(counts []int, a, b int) float64 {
	n := 0
	for _, c := range counts {
		n += c
	}
	na, nb := float64(counts[a]), float64(counts[b])
	mean := (na - nb) / 2 / float64(n)
	return (na+nb)/4 - float64(n)*mean*mean
}

// writePlan says what could be expected before the response was looked at.
func (s *study) writePlan(p *page) {
	q := s.planned
	if q == nil {
		return
	}
	p.title("Plan")
	p.text("Stated before the response is looked at: a difference of %s in %s between two groups matters, and %s is the expected standard deviation within groups%s. The pattern hardest to see is two groups that far apart with the others halfway; of these groups, %s and %s.",
		fig(q.difference, 3), s.response, fig(q.sd, 3), s.atEqual(), q.a, q.b)
	p.line("")
	t := p.table("lr")
	t.row("level of the test", percent(q.alpha))
	t.row("noncentrality λ of that pattern in this design", fig(q.here.Noncentrality, 4))
	t.row("power of the exact F test in this design", percent(q.here.Power(q.alpha)))
	t.row(fmt.Sprintf("difference found with power %s in this design", percent(q.wanted)), fig(q.detectable, 4))
	if q.each > 0 {
		t.row(fmt.Sprintf("rows a group for power %s, equal groups (power %s)", percent(q.wanted), percent(q.powerEach)), fmt.Sprint(q.each))
	}
	t.end()
}
