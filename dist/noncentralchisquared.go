package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/noncentral"
)

// NoncentralChiSquared is the noncentral chi-squared law with K degrees of
// freedom, any real number above 0, and noncentrality Lambda >= 0: for whole K the law
// of the sum of squares of K independent normal variables of variance 1 whose
// squared means add up to Lambda. It is the Poisson(Lambda/2) mixture of
// ChiSquared{K + 2j}; its mean is K + Lambda. Lambda = 0 gives ChiSquared{K}, bit for bit.
//
// Tails and density come from a contour integral of the moment generating function through its
// saddle point, or from the mixture where that has few terms; see
// internal/noncentral for the regions. The work does not grow with K or Lambda.
type NoncentralChiSquared struct{ K, Lambda float64 }

var _ Law = NoncentralChiSquared{}

const wantNoncentrality = "a number from 0 to 1e100"

// The noncentralities up to which the squares that the kernels form stay in range.
const (
	maxNoncentrality = 1e100
	maxDelta         = 1e50
)

// noncentrality reports whether v is a noncentrality parameter; NaN is not.
func noncentrality(v float64) bool { return v >= 0 && v <= maxNoncentrality }

// Validate returns a *ParamError unless 0 < K < +Inf and 0 <= Lambda <= 1e100.
func (c NoncentralChiSquared) Validate() error {
	if !finitePositive(c.K) {
		return &ParamError{"NoncentralChiSquared", "K", c.K, wantPositive}
	}
	if !noncentrality(c.Lambda) {
		return &ParamError{"NoncentralChiSquared", "Lambda", c.Lambda, wantNoncentrality}
	}
	return nil
}

func (c NoncentralChiSquared) valid() bool { return finitePositive(c.K) && noncentrality(c.Lambda) }

func (c NoncentralChiSquared) central() ChiSquared { return ChiSquared{c.K} }

func (c NoncentralChiSquared) tail(x float64) centralTail {
	p := noncentral.AtChiSquared(c.K, c.Lambda, dd.From(x))
	t, upper := p.Tail()
	return centralTail{t, upper}
}

// CDF returns P(X <= x): 0 for x <= 0, 1 at +Inf, NaN for NaN or a bad parameter.
func (c NoncentralChiSquared) CDF(x float64) float64 {
	if c.Lambda == 0 {
		return c.central().CDF(x)
	}
	if v, done := positiveEnds(x, c.valid(), 0, 1); done {
		return v
	}
	return c.tail(x).value(false)
}

// Survival returns P(X > x), computed directly: 1 for x <= 0, 0 at +Inf, NaN for
// NaN or a bad parameter.
func (c NoncentralChiSquared) Survival(x float64) float64 {
	if c.Lambda == 0 {
		return c.central().Survival(x)
	}
	if v, done := positiveEnds(x, c.valid(), 1, 0); done {
		return v
	}
	return c.tail(x).value(true)
}

// LogCDF returns log P(X <= x), finite far below the underflow of CDF; -Inf for x <= 0.
func (c NoncentralChiSquared) LogCDF(x float64) float64 {
	if c.Lambda == 0 {
		return c.central().LogCDF(x)
	}
	if v, done := positiveEnds(x, c.valid(), math.Inf(-1), 0); done {
		return v
	}
	return c.tail(x).log(false)
}

// LogSurvival returns log P(X > x), finite far beyond the underflow of Survival;
// -Inf at +Inf.
func (c NoncentralChiSquared) LogSurvival(x float64) float64 {
	if c.Lambda == 0 {
		return c.central().LogSurvival(x)
	}
	if v, done := positiveEnds(x, c.valid(), 0, math.Inf(-1)); done {
		return v
	}
	return c.tail(x).log(true)
}

// Prob returns the density at x: 0 outside [0, +Inf), at 0 its limit, which is +Inf for K < 2,
// exp(-Lambda/2)/2 for K = 2 and 0 above.
func (c NoncentralChiSquared) Prob(x float64) float64 {
	switch {
	case c.Lambda == 0:
		return c.central().Prob(x)
	case !c.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return 0
	case x == 0:
		return densityAtZero(c.K/2, 0.5*math.Exp(-c.Lambda/2))
	}
	p := noncentral.AtChiSquared(c.K, c.Lambda, dd.From(x))
	return perX(p.Kernel(), x).Float64()
}

// LogProb returns the logarithm of the density.
func (c NoncentralChiSquared) LogProb(x float64) float64 {
	switch {
	case c.Lambda == 0:
		return c.central().LogProb(x)
	case !c.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return math.Inf(-1)
	case x == 0 && c.K == 2:
		return -math.Ln2 - c.Lambda/2
	case x == 0:
		return math.Log(densityAtZero(c.K/2, 1))
	}
	p := noncentral.AtChiSquared(c.K, c.Lambda, dd.From(x))
	return perX(p.Kernel(), x).Log()
}

func (c NoncentralChiSquared) tailAt(x float64, upper bool) (tail, logTail, hazard float64) {
	p := noncentral.AtChiSquared(c.K, c.Lambda, dd.From(x))
	t, up, kernel, _ := p.All()
	return centralTail{t, up}.eval(upper, perX(kernel, x))
}

func (c NoncentralChiSquared) support() (lo, hi float64) { return 0, math.Inf(1) }

// start is the quantile of the scaled central law with the same mean and
// variance (Patnaik 1949).
func (c NoncentralChiSquared) start(p float64, upper bool) float64 {
	m, v := c.K+c.Lambda, c.K+2*c.Lambda
	return v / m * chiStart(m/v*m, p, upper)
}

// Quantile returns the x with P(X <= x) = p: 0 for p = 0 and where the
// quantile is below the smallest denormal, +Inf for p = 1, NaN for p outside
// [0, 1] or a bad parameter. For p near 1 use UpperQuantile.
func (c NoncentralChiSquared) Quantile(p float64) float64 {
	switch {
	case c.Lambda == 0:
		return c.central().Quantile(p)
	case !c.valid():
		return math.NaN()
	}
	return invertTail(c, p, false, c.start(p, false))
}

// UpperQuantile returns the x with P(X > x) = q, q down to the smallest denormal.
func (c NoncentralChiSquared) UpperQuantile(q float64) float64 {
	switch {
	case c.Lambda == 0:
		return c.central().UpperQuantile(q)
	case !c.valid():
		return math.NaN()
	}
	return invertTail(c, q, true, c.start(q, true))
}

// Mean returns K + Lambda.
func (c NoncentralChiSquared) Mean() float64 {
	if !c.valid() {
		return math.NaN()
	}
	return c.K + c.Lambda
}

// Variance returns 2(K + 2 Lambda).
func (c NoncentralChiSquared) Variance() float64 {
	if !c.valid() {
		return math.NaN()
	}
	return 2 * (c.K + 2*c.Lambda)
}

// Rand draws one value from src: (Z + sqrt(Lambda))² plus a chi-squared variate of K - 1
// degrees of freedom for K > 1, else a chi-squared variate of K + 2N degrees of freedom with
// N a Poisson variate of mean Lambda/2.
func (c NoncentralChiSquared) Rand(src rand.Source) float64 {
	if !c.valid() {
		return math.NaN()
	}
	if c.Lambda == 0 {
		return c.central().Rand(src)
	}
	if c.K > 1 {
		z := normalVariate(src) + math.Sqrt(c.Lambda)
		return z*z + 2*math.Exp(logGammaVariate(src, (c.K-1)/2))
	}
	return 2 * math.Exp(logGammaVariate(src, c.K/2+poissonVariate(src, c.Lambda/2)))
}

// String returns "NoncentralChiSquared(3, 5)".
func (c NoncentralChiSquared) String() string {
	return fmt.Sprintf("NoncentralChiSquared(%v, %v)", c.K, c.Lambda)
}
