package dist

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
)

// ChiBarSquared is the mixture of chi-squared laws with 0, 1, ..., k degrees of
// freedom that the likelihood ratio statistic follows when the null hypothesis
// lies on the boundary of the alternative (Kudô, Biometrika 50, 1963; Shapiro,
// International Statistical Review 56, 1988): P(X <= x) = Σ Weights[j] P(χ²_j <= x).
//
// χ²_0 is the constant 0, so the law has an atom of size Weights[0] at 0:
// CDF(0) = Weights[0] and Survival(0) = 1 - Weights[0]. A statistic of 0 has
// the p-value P(X >= 0) = 1; Survival, which is P(X > x), is smaller there.
//
// Weights must be finite, not negative and sum to 1 within 1e-8; they are
// divided by their sum. The law never writes to the slice; do not change it
// while the law is in use. NewChiBarSquared takes a copy. BoundaryWeights finds
// the weights from the covariance of the estimates at the boundary.
type ChiBarSquared struct{ Weights []float64 }

var _ Law = ChiBarSquared{}

// NewChiBarSquared returns the law with a copy of the weights of χ²_0, χ²_1, ...
func NewChiBarSquared(weights ...float64) ChiBarSquared {
	return ChiBarSquared{slices.Clone(weights)}
}

// Shift returns the law with r added to all degrees of freedom, as r further
// restrictions inside the parameter space do. A negative r returns a law that
// is not valid.
func (c ChiBarSquared) Shift(r int) ChiBarSquared {
	if r < 0 {
		return ChiBarSquared{}
	}
	return ChiBarSquared{append(make([]float64, r, r+len(c.Weights)), c.Weights...)}
}

// Reverse returns the law with the weights in reverse order: that of the test
// of a cone against no restriction, when the law itself is that of the origin
// against the cone (k = len(Weights)-1 the dimension of the space).
func (c ChiBarSquared) Reverse() ChiBarSquared {
	w := slices.Clone(c.Weights)
	slices.Reverse(w)
	return ChiBarSquared{w}
}

// Validate returns a *ParamError that names the first weight at fault, or the
// sum of the weights; nil when none is.
func (c ChiBarSquared) Validate() error {
	if len(c.Weights) == 0 {
		return &ParamError{"ChiBarSquared", "len(Weights)", 0, "at least the weight of χ²_0"}
	}
	sum := 0.0
	for j, w := range c.Weights {
		if !(w >= 0 && w <= math.MaxFloat64) {
			return &ParamError{"ChiBarSquared", fmt.Sprintf("Weights[%d]", j), w, "a number from 0 to 1"}
		}
		sum += w
	}
	if !(math.Abs(sum-1) <= 1e-8) {
		return &ParamError{"ChiBarSquared", "the sum of Weights", sum, "1"}
	}
	return nil
}

// total returns the sum of the weights and that of all but the first; NaN for
// a law that is not valid.
func (c ChiBarSquared) total() (all, positive float64) {
	for j, w := range c.Weights {
		if !(w >= 0) {
			return math.NaN(), math.NaN()
		}
		if j > 0 {
			positive += w
		}
	}
	if len(c.Weights) > 0 {
		all = positive + c.Weights[0]
	}
	if !(math.Abs(all-1) <= 1e-8) {
		return math.NaN(), math.NaN()
	}
	return all, positive
}

// mix sums weight times f(χ²_j) over j >= 1.
func (c ChiBarSquared) mix(x float64, f func(ChiSquared, float64) float64) float64 {
	s := 0.0
	for j, w := range c.Weights {
		if j > 0 && w > 0 {
			s += w * f(ChiSquared{float64(j)}, x)
		}
	}
	return s
}

// logMix is the log of mix, from the logs of its terms.
func (c ChiBarSquared) logMix(x, first float64, f func(ChiSquared, float64) float64) float64 {
	top := first
	for j, w := range c.Weights {
		if j > 0 && w > 0 {
			top = math.Max(top, f(ChiSquared{float64(j)}, x)+math.Log(w))
		}
	}
	if math.IsInf(top, 0) {
		return top
	}
	s := math.Exp(first - top)
	for j, w := range c.Weights {
		if j > 0 && w > 0 {
			s += math.Exp(f(ChiSquared{float64(j)}, x) + math.Log(w) - top)
		}
	}
	return top + math.Log(s)
}

// CDF returns P(X <= x): 0 for x < 0, the atom Weights[0] at 0.
func (c ChiBarSquared) CDF(x float64) float64 {
	all, _ := c.total()
	switch {
	case math.IsNaN(all) || math.IsNaN(x):
		return math.NaN()
	case x < 0:
		return 0
	case math.IsInf(x, 1):
		return 1
	}
	return math.Min(1, (c.Weights[0]+c.mix(x, ChiSquared.CDF))/all)
}

// Survival returns P(X > x), a sum of upper tails: 1 for x < 0, 1 - Weights[0]
// at 0.
func (c ChiBarSquared) Survival(x float64) float64 {
	all, _ := c.total()
	switch {
	case math.IsNaN(all) || math.IsNaN(x):
		return math.NaN()
	case x < 0:
		return 1
	case math.IsInf(x, 1):
		return 0
	}
	return c.mix(x, ChiSquared.Survival) / all
}

// LogCDF returns log P(X <= x), -Inf for x < 0.
func (c ChiBarSquared) LogCDF(x float64) float64 {
	all, _ := c.total()
	switch {
	case math.IsNaN(all) || math.IsNaN(x):
		return math.NaN()
	case x < 0:
		return math.Inf(-1)
	case math.IsInf(x, 1):
		return 0
	}
	if s := c.mix(x, ChiSquared.Survival) / all; s < 0.5 {
		return math.Log1p(-s)
	}
	return c.logMix(x, math.Log(c.Weights[0]), ChiSquared.LogCDF) - math.Log(all)
}

// LogSurvival returns log P(X > x), finite far beyond the underflow of
// Survival; -Inf everywhere from 0 on when all weight is on χ²_0.
func (c ChiBarSquared) LogSurvival(x float64) float64 {
	all, positive := c.total()
	switch {
	case math.IsNaN(all) || math.IsNaN(x):
		return math.NaN()
	case x < 0:
		return 0
	case math.IsInf(x, 1) || positive == 0:
		return math.Inf(-1)
	}
	if p := (c.Weights[0] + c.mix(x, ChiSquared.CDF)) / all; p < 0.5 {
		return math.Log1p(-p)
	}
	return c.logMix(x, math.Inf(-1), ChiSquared.LogSurvival) - math.Log(all)
}

// Prob returns the density of the part of the law on x > 0, which integrates to
// 1 - Weights[0]; 0 for x < 0. At 0 it is +Inf for a law with an atom there or
// with weight on χ²_1, otherwise the limit from the right.
func (c ChiBarSquared) Prob(x float64) float64 {
	all, _ := c.total()
	switch {
	case math.IsNaN(all) || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return 0
	case x == 0 && c.Weights[0] > 0:
		return math.Inf(1)
	}
	return c.mix(x, ChiSquared.Prob) / all
}

// LogProb returns the log of Prob.
func (c ChiBarSquared) LogProb(x float64) float64 {
	all, positive := c.total()
	switch {
	case math.IsNaN(all) || math.IsNaN(x):
		return math.NaN()
	case x == 0:
		return math.Log(c.Prob(0))
	case x < 0 || math.IsInf(x, 1) || positive == 0:
		return math.Inf(-1)
	}
	return c.logMix(x, math.Inf(-1), ChiSquared.LogProb) - math.Log(all)
}

// chiBarPositive is the law of X given X > 0, which has no atom.
type chiBarPositive struct {
	c        ChiBarSquared
	positive float64
}

func (g chiBarPositive) tailAt(x float64, upper bool) (tail, logTail, hazard float64) {
	f, lf := ChiSquared.CDF, ChiSquared.LogCDF
	if upper {
		f, lf = ChiSquared.Survival, ChiSquared.LogSurvival
	}
	tail = g.c.mix(x, f) / g.positive
	if tail < tinyTail {
		logTail = g.c.logMix(x, math.Inf(-1), lf) - math.Log(g.positive)
		ld := g.c.logMix(x, math.Inf(-1), ChiSquared.LogProb) - math.Log(g.positive)
		return tail, logTail, math.Exp(ld - logTail)
	}
	return tail, 0, g.c.mix(x, ChiSquared.Prob) / g.positive / tail
}

func (g chiBarPositive) support() (lo, hi float64) { return 0, math.Inf(1) }

// Quantile returns the smallest x with P(X <= x) >= p: 0 for every p up to
// the atom Weights[0], +Inf at p = 1 unless all weight is on χ²_0, NaN outside
// [0, 1].
func (c ChiBarSquared) Quantile(p float64) float64 {
	all, positive := c.total()
	switch {
	case math.IsNaN(all) || !(p >= 0 && p <= 1):
		return math.NaN()
	case positive == 0 || p <= c.Weights[0]/all:
		return 0
	}
	r := (p - c.Weights[0]/all) * (all / positive)
	if r > 0.5 {
		return c.positiveQuantile((1-p)*(all/positive), true)
	}
	return c.positiveQuantile(r, false)
}

// UpperQuantile returns the smallest x with P(X > x) <= q, the critical value
// of size q: 0 for every q from 1 - Weights[0] on, +Inf at q = 0 unless all
// weight is on χ²_0, NaN outside [0, 1].
func (c ChiBarSquared) UpperQuantile(q float64) float64 {
	all, positive := c.total()
	switch {
	case math.IsNaN(all) || !(q >= 0 && q <= 1):
		return math.NaN()
	case positive == 0 || q >= positive/all:
		return 0
	}
	return c.positiveQuantile(q*(all/positive), true)
}

func (c ChiBarSquared) positiveQuantile(p float64, upper bool) float64 {
	_, positive := c.total()
	k := 0
	for j, w := range c.Weights {
		if w > 0 && j > 0 && (upper || k == 0) {
			k = j // the law of the tail in question: largest above, smallest below
		}
	}
	start := chiStart(float64(k), p, upper)
	return invertTail(chiBarPositive{c, positive}, math.Min(p, 1), upper, start)
}

// Mean returns Σ j Weights[j].
func (c ChiBarSquared) Mean() float64 {
	all, _ := c.total()
	m := 0.0
	for j, w := range c.Weights {
		m += w * float64(j)
	}
	return m / all
}

// Variance returns Σ (j² + 2j) Weights[j] - Mean².
func (c ChiBarSquared) Variance() float64 {
	all, _ := c.total()
	m := c.Mean()
	v := 0.0
	for j, w := range c.Weights {
		d := float64(j) - m
		v += w * (d*d + 2*float64(j))
	}
	return v / all
}

// Rand draws a value: the degrees of freedom by the weights, then χ².
func (c ChiBarSquared) Rand(src rand.Source) float64 {
	all, _ := c.total()
	if math.IsNaN(all) {
		return math.NaN()
	}
	u := rand.New(src).Float64() * all
	for j, w := range c.Weights {
		if u -= w; u < 0 && w > 0 {
			if j == 0 {
				return 0
			}
			return ChiSquared{float64(j)}.Rand(src)
		}
	}
	// Rounding left u at the end of the weights: the last of them.
	for j := len(c.Weights) - 1; j > 0; j-- {
		if c.Weights[j] > 0 {
			return ChiSquared{float64(j)}.Rand(src)
		}
	}
	return 0
}

// String returns the weights, "ChiBarSquared(0.5, 0.5)".
func (c ChiBarSquared) String() string {
	s := make([]string, len(c.Weights))
	for i, w := range c.Weights {
		s[i] = fmt.Sprint(w)
	}
	return "ChiBarSquared(" + strings.Join(s, ", ") + ")"
}
