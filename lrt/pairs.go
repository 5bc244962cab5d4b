package lrt

import (
	"context"
	"fmt"
	"math"

	"subsume.example/dist"
)

// Pairs refers the F of a difference of two means to the largest difference among
// all pairs of Groups means: √(2F) is referred to the studentized range (Tukey
// 1953). That is exact where all differences have the same variance, which is for the
// caller to say by Balanced; otherwise it is Kramer's (1956) approximation, which
// errs on the safe side for independent means of any sizes (Hayter 1984). With
// known variance the range of normal values is meant.
type Pairs struct {
	Groups   int
	Balanced bool
}

// Refer makes the test. It needs linear spaces and one numerator degree of
// freedom; otherwise the error wraps ErrInvalid.
func (r Pairs) Refer(_ context.Context, _ Comparison, p Pair, _ *Settings) (Test, error) {
	l := p.Linear
	d1, d2 := l.DF()
	law := dist.StudentizedRange{K: r.Groups, Nu: d2}
	if l.Known > 0 {
		law.Nu = inf
	}
	switch err := law.Validate(); {
	case l.M == 0 || d1 != 1:
		return Test{}, fmt.Errorf("%w: the studentized range is for differences of means, one degree of freedom each", ErrInvalid)
	case err != nil:
		return Test{}, fmt.Errorf("%w: %w", ErrInvalid, err)
	}
	t := Test{Kind: Exact, Name: "q", Law: law, Why: "it holds at once for all pairs of means whose differences have one variance"}
	if !r.Balanced {
		t.Kind, t.Why = Approximate, "the differences have different variances: by Tukey and Kramer, which errs on the safe side for independent means (Hayter 1984)"
	}
	if !l.Certified {
		t.Kind, t.Why = Approximate, "F is not certified exact for this design"
	}
	f, _, _ := l.F() // with known variance the statistic is χ² on one degree of freedom
	t.Statistic = math.Sqrt(2 * f)
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

// Critical returns by how many standard errors every difference may depart from its
// estimate, at once, with probability 1 − alpha: the upper quantile of the
// studentized range over √2. nu is +Inf with known variance. NaN out of range.
func (r Pairs) Critical(nu, alpha float64) float64 {
	if !(alpha > 0 && alpha < 1) {
		return nan
	}
	return dist.StudentizedRange{K: r.Groups, Nu: nu}.UpperQuantile(alpha) / math.Sqrt2
}

var _ Reference = Pairs{}
