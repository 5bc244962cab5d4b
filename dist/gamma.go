package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// Gamma is the gamma law with the given shape and scale, real numbers above 0 (the shape best from
// 5e-4 to 5e11): P(X <= x) = P(Shape, x/Scale), the regularized incomplete gamma function (DLMF 8.2).
// ChiSquared{K} is Gamma{K/2, 2}; a sum of n exponential waiting times of mean m is Gamma{n, m}.
type Gamma struct{ Shape, Scale float64 }

var _ Law = Gamma{}

// Validate returns a *ParamError unless Shape and Scale are finite and above 0.
func (g Gamma) Validate() error {
	switch {
	case !finitePositive(g.Shape):
		return &ParamError{"Gamma", "Shape", g.Shape, wantPositive}
	case !finitePositive(g.Scale):
		return &ParamError{"Gamma", "Scale", g.Scale, wantPositive}
	}
	return nil
}

func (g Gamma) valid() bool { return finitePositive(g.Shape) && finitePositive(g.Scale) }

// standard returns x/Scale, in double-double where it is between 1e-270 and the overflow.
func (g Gamma) standard(x float64) (u dd.DD, tiny, huge bool) {
	v := x / g.Scale
	if v < 1e-270 {
		return dd.DD{}, true, false
	}
	if v > math.MaxFloat64 {
		return dd.DD{}, false, true
	}
	m, i := math.Frexp(x)
	n, j := math.Frexp(g.Scale)
	return dd.From(m).DivF(n).Scale(i - j), false, false
}

func (g Gamma) logStandard(x float64) dd.DD { return dd.Log(dd.From(x)).Sub(dd.Log(dd.From(g.Scale))) }

// tail returns one tail at 0 < x < +Inf.
func (g Gamma) tail(x float64) centralTail {
	u, tiny, huge := g.standard(x)
	switch {
	case tiny:
		t, _ := special.GammaTailTiny(dd.From(g.Shape), g.logStandard(x))
		return centralTail{t, false}
	case huge:
		return centralTail{special.Scaled{}, true}
	}
	t, upper := special.GammaTail(dd.From(g.Shape), u)
	return centralTail{t, upper}
}

// density returns the density at 0 < x < +Inf; quick answers are not fit for logarithms near 0.
func (g Gamma) density(x float64, quick bool) special.Scaled {
	u, tiny, huge := g.standard(x)
	switch {
	case tiny:
		_, k := special.GammaTailTiny(dd.From(g.Shape), g.logStandard(x))
		return perX(k, x)
	case huge:
		return special.Scaled{}
	case quick:
		return perX(special.GammaKernelQuick(dd.From(g.Shape), u), x)
	}
	return perX(special.GammaKernel(dd.From(g.Shape), u), x)
}

// CDF returns P(X <= x): 0 for x <= 0, 1 at +Inf, NaN for NaN or a bad parameter.
func (g Gamma) CDF(x float64) float64 {
	if v, done := positiveEnds(x, g.valid(), 0, 1); done {
		return v
	}
	return g.tail(x).value(false)
}

// Survival returns P(X > x), computed directly.
func (g Gamma) Survival(x float64) float64 {
	if v, done := positiveEnds(x, g.valid(), 1, 0); done {
		return v
	}
	return g.tail(x).value(true)
}

// LogCDF returns the logarithm of CDF, finite far below its underflow.
func (g Gamma) LogCDF(x float64) float64 {
	if v, done := positiveEnds(x, g.valid(), math.Inf(-1), 0); done {
		return v
	}
	return g.tail(x).log(false)
}

// LogSurvival returns the logarithm of Survival, finite far beyond its underflow.
func (g Gamma) LogSurvival(x float64) float64 {
	if v, done := positiveEnds(x, g.valid(), 0, math.Inf(-1)); done {
		return v
	}
	return g.tail(x).log(true)
}

// Prob returns the density: 0 outside [0, +Inf), at 0 its limit.
func (g Gamma) Prob(x float64) float64 {
	switch {
	case !g.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return 0
	case x == 0:
		return densityAtZero(g.Shape, 1/g.Scale)
	}
	return g.density(x, true).Float64()
}

// LogProb returns the logarithm of the density.
func (g Gamma) LogProb(x float64) float64 {
	switch {
	case !g.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return math.Inf(-1)
	case x == 0:
		return math.Log(densityAtZero(g.Shape, 1/g.Scale))
	}
	return logDensity(g, x)
}

func (g Gamma) tailAt(x float64, upper bool) (tail, logTail, hazard float64) {
	return g.tail(x).eval(upper, g.density(x, true))
}

func (g Gamma) support() (lo, hi float64) { return 0, math.Inf(1) }

// Quantile returns the x with P(X <= x) = p: 0 where it is below the smallest denormal, +Inf for
// p = 1, NaN for p outside [0, 1] or a bad parameter.
func (g Gamma) Quantile(p float64) float64 {
	if !g.valid() {
		return math.NaN()
	}
	return invertTail(g, p, false, chiStart(2*g.Shape, p, false)/2*g.Scale)
}

// UpperQuantile returns the x with P(X > x) = q.
func (g Gamma) UpperQuantile(q float64) float64 {
	if !g.valid() {
		return math.NaN()
	}
	return invertTail(g, q, true, chiStart(2*g.Shape, q, true)/2*g.Scale)
}

// Mean returns Shape Scale.
func (g Gamma) Mean() float64 {
	if !g.valid() {
		return math.NaN()
	}
	return g.Shape * g.Scale
}

// Variance returns Shape Scale².
func (g Gamma) Variance() float64 {
	if !g.valid() {
		return math.NaN()
	}
	return g.Shape * g.Scale * g.Scale
}

// Rand draws one value from src (Marsaglia and Tsang 2000).
func (g Gamma) Rand(src rand.Source) float64 {
	if !g.valid() {
		return math.NaN()
	}
	v, s := gammaVariate(src, g.Shape)
	return timesExp(g.Scale*v, s)
}

// String returns "Gamma(2, 0.5)".
func (g Gamma) String() string { return fmt.Sprintf("Gamma(%v, %v)", g.Shape, g.Scale) }
