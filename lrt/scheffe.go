package lrt

import (
	"context"
	"fmt"
	"math"

	"subsume.example/dist"
)

// Scheffe refers the F of a comparison to the largest that any comparison of
// a family could have: all the linear functions of a mean that vanish on the null,
// a space of Dimension dimensions. With numerator degrees of freedom d1, F·d1/Dimension is
// referred to F(Dimension, d2) (Scheffé 1953), or F·d1 to χ² with known variance.
// The p-value holds for every contrast of the family at once, also for one
// suggested by the data.
type Scheffe struct{ Dimension float64 }

// Refer makes the test. It needs linear spaces, and no more numerator degrees of
// freedom than the family has dimensions; otherwise the error wraps ErrInvalid.
func (r Scheffe) Refer(_ context.Context, _ Comparison, p Pair, _ *Settings) (Test, error) {
	l := p.Linear
	d1, d2 := l.DF()
	switch {
	case l.M == 0:
		return Test{}, fmt.Errorf("%w: Scheffé's reference is for linear spaces", ErrInvalid)
	case !(d1 <= r.Dimension) || math.IsInf(r.Dimension, 0):
		return Test{}, fmt.Errorf("%w: a family of %g dimensions holds no comparison of %g", ErrInvalid, r.Dimension, d1)
	}
	t := Test{Kind: Exact, Name: "Scheffé F", Why: "it holds at once for every contrast of the family"}
	if !l.Certified {
		t.Kind, t.Why = Approximate, "F is not certified exact for this design"
	}
	if l.Known > 0 {
		law := dist.ChiSquared{K: r.Dimension}
		t.Name, t.Law, t.Statistic = "Scheffé χ²", law, l.standardized()
		t.P, t.LogP = tails(law.Survival(t.Statistic), t.Statistic, law.LogSurvival)
		return t, nil
	}
	f, _, _ := l.F()
	law := dist.F{D1: r.Dimension, D2: d2}
	t.Law, t.Statistic = law, f*d1/r.Dimension
	switch {
	case math.IsNaN(f):
		t.P, t.LogP = nan, nan
	case math.IsInf(f, 1):
		t.P, t.LogP = 0, -inf
	default:
		t.P, t.LogP = tails(law.Survival(t.Statistic), t.Statistic, law.LogSurvival)
	}
	return t, nil
}

var _ Reference = Scheffe{}
