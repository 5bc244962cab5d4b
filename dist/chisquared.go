package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// ChiSquared is the chi-squared law with K degrees of freedom, any real number above 0:
// P(X <= x) = P(K/2, x/2), the regularized incomplete gamma function (DLMF 8.2).
type ChiSquared struct{ K float64 }

var _ Law = ChiSquared{}

// Validate returns a *ParamError unless 0 < K < +Inf.
func (c ChiSquared) Validate() error {
	if !finitePositive(c.K) {
		return &ParamError{"ChiSquared", "K", c.K, wantPositive}
	}
	return nil
}

func (c ChiSquared) valid() bool { return finitePositive(c.K) }

// chiTail returns one tail of the chi-squared law with k degrees of freedom at x given
// as a double-double; for tiny values x is k (or 1) times near and taken by logarithms.
func chiTail(k float64, x dd.DD, near float64) centralTail {
	if near < 1e-270 {
		t, _ := special.GammaTailTiny(half(k), chiLogHalf(k, x, near))
		return centralTail{t, false}
	}
	if math.IsInf(x.Hi, 1) {
		return centralTail{special.Scaled{}, true}
	}
	t, upper := special.GammaTail(half(k), x.MulF(0.5))
	return centralTail{t, upper}
}

// chiKernel returns the density of log X; quick answers are not fit for logarithms near 0.
func chiKernel(k float64, x dd.DD, near float64, quick bool) special.Scaled {
	if near < 1e-270 {
		_, d := special.GammaTailTiny(half(k), chiLogHalf(k, x, near))
		return d
	}
	if math.IsInf(x.Hi, 1) {
		return special.Scaled{}
	}
	if quick {
		return special.GammaKernelQuick(half(k), x.MulF(0.5))
	}
	return special.GammaKernel(half(k), x.MulF(0.5))
}

// chiLogHalf returns log(x/2) where x is near, or k near when it is not.
func chiLogHalf(k float64, x dd.DD, near float64) dd.DD {
	l := dd.Log(dd.From(near)).Sub(dd.Ln2)
	if x.Hi != near {
		l = l.Add(dd.Log(dd.From(k)))
	}
	return l
}

func (c ChiSquared) tail(x float64) centralTail { return chiTail(c.K, dd.From(x), x) }

func (c ChiSquared) density(x float64, quick bool) special.Scaled {
	return perX(chiKernel(c.K, dd.From(x), x, quick), x)
}

// CDF returns P(X <= x): 0 for x <= 0, 1 at +Inf, NaN for NaN or a bad parameter.
func (c ChiSquared) CDF(x float64) float64 {
	if v, done := positiveEnds(x, c.valid(), 0, 1); done {
		return v
	}
	return c.tail(x).value(false)
}

// Survival returns P(X > x), computed directly: 1 for x <= 0, 0 at +Inf, NaN for
// NaN or a bad parameter.
func (c ChiSquared) Survival(x float64) float64 {
	if v, done := positiveEnds(x, c.valid(), 1, 0); done {
		return v
	}
	return c.tail(x).value(true)
}

// LogCDF returns log P(X <= x), finite far below the underflow of CDF; -Inf for x <= 0.
func (c ChiSquared) LogCDF(x float64) float64 {
	if v, done := positiveEnds(x, c.valid(), math.Inf(-1), 0); done {
		return v
	}
	return c.tail(x).log(false)
}

// LogSurvival returns log P(X > x), finite far beyond the underflow of Survival;
// -Inf at +Inf.
func (c ChiSquared) LogSurvival(x float64) float64 {
	if v, done := positiveEnds(x, c.valid(), 0, math.Inf(-1)); done {
		return v
	}
	return c.tail(x).log(true)
}

// Prob returns the density at x: 0 outside [0, +Inf), at 0 its limit, which is +Inf for K < 2,
// 1/2 for K = 2 and 0 above.
func (c ChiSquared) Prob(x float64) float64 {
	switch {
	case !c.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return 0
	case x == 0:
		return densityAtZero(c.K/2, 0.5)
	}
	return c.density(x, true).Float64()
}

// LogProb returns the logarithm of the density.
func (c ChiSquared) LogProb(x float64) float64 {
	switch {
	case !c.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return math.Inf(-1)
	case x == 0:
		return math.Log(densityAtZero(c.K/2, 0.5))
	}
	return logDensity(c, x)
}

func (c ChiSquared) tailAt(x float64, upper bool) (tail, logTail, hazard float64) {
	return c.tail(x).eval(upper, c.density(x, true))
}

func (c ChiSquared) support() (lo, hi float64) { return 0, math.Inf(1) }

// Quantile returns the x with P(X <= x) = p: 0 for p = 0 and where the
// quantile is below the smallest denormal, +Inf for p = 1, NaN for p outside
// [0, 1] or a bad parameter. For p near 1 use UpperQuantile.
func (c ChiSquared) Quantile(p float64) float64 {
	if !c.valid() {
		return math.NaN()
	}
	return invertTail(c, p, false, chiStart(c.K, p, false))
}

// UpperQuantile returns the x with P(X > x) = q, q down to the smallest denormal.
func (c ChiSquared) UpperQuantile(q float64) float64 {
	if !c.valid() {
		return math.NaN()
	}
	return invertTail(c, q, true, chiStart(c.K, q, true))
}

// Mean returns K.
func (c ChiSquared) Mean() float64 {
	if !c.valid() {
		return math.NaN()
	}
	return c.K
}

// Variance returns 2K.
func (c ChiSquared) Variance() float64 {
	if !c.valid() {
		return math.NaN()
	}
	return 2 * c.K
}

// Rand draws one value from src (gamma variate, Marsaglia and Tsang 2000).
func (c ChiSquared) Rand(src rand.Source) float64 {
	if !c.valid() {
		return math.NaN()
	}
	g, s := gammaVariate(src, c.K/2)
	return timesExp(2*g, s)
}

// String returns "ChiSquared(5)".
func (c ChiSquared) String() string { return fmt.Sprintf("ChiSquared(%v)", c.K) }
