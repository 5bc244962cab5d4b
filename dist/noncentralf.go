package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/noncentral"
	"subsume.example/internal/special"
)

// NoncentralF is the noncentral F law with D1 and D2 degrees of freedom, real
// numbers above 0, and noncentrality Lambda >= 0 of the numerator: the law of (U/D1)/(V/D2) with
// independent U, NoncentralChiSquared{D1, Lambda}, and V, ChiSquared{D2}. For a comparison
// of normal linear spaces Lambda is ‖(P_B - P_S)μ‖²/σ². D2 = +Inf is the law of
// NoncentralChiSquared{D1, Lambda} over D1; Lambda = 0 gives F{D1, D2}, bit for bit.
//
// Tails and density come from a contour integral through the saddle point, or from the Poisson
// mixture of incomplete beta functions where that has few terms; see
// internal/noncentral for the regions. The work does not grow with the parameters.
type NoncentralF struct{ D1, D2, Lambda float64 }

var _ Law = NoncentralF{}

// Validate returns a *ParamError unless 0 < D1 < +Inf, 0 < D2 <= +Inf and 0 <= Lambda <= 1e100.
func (f NoncentralF) Validate() error {
	if !finitePositive(f.D1) {
		return &ParamError{"NoncentralF", "D1", f.D1, wantPositive}
	}
	if !(f.D2 > 0) {
		return &ParamError{"NoncentralF", "D2", f.D2, wantPositiveOrInf}
	}
	if !noncentrality(f.Lambda) {
		return &ParamError{"NoncentralF", "Lambda", f.Lambda, wantNoncentrality}
	}
	return nil
}

func (f NoncentralF) valid() bool {
	return finitePositive(f.D1) && f.D2 > 0 && noncentrality(f.Lambda)
}

// unlimited reports denominator degrees of freedom at which the law is its limit to
// the last bit, as that of F is.
func (f NoncentralF) unlimited() bool { return f.D2 > 1e100 }

func (f NoncentralF) central() F { return F{f.D1, f.D2} }

func (f NoncentralF) tail(x float64) centralTail {
	if f.unlimited() {
		p, upper, ok := f.limit(x)
		if !ok {
			return centralTail{upper: upper}
		}
		t, upper := p.Tail()
		return centralTail{t, upper}
	}
	p := noncentral.AtF(f.D1, f.D2, f.Lambda, x)
	t, upper := p.Tail()
	return centralTail{t, upper}
}

// tailKernel returns the tail and the density of log X.
func (f NoncentralF) tailKernel(x float64) (centralTail, special.Scaled) {
	if f.unlimited() {
		p, upper, ok := f.limit(x)
		if !ok {
			return centralTail{upper: upper}, special.Scaled{}
		}
		t, upper, kernel, _ := p.All()
		return centralTail{t, upper}, kernel
	}
	p := noncentral.AtF(f.D1, f.D2, f.Lambda, x)
	t, upper, kernel, _ := p.All()
	return centralTail{t, upper}, kernel
}

// kernel returns the density of log X.
func (f NoncentralF) kernel(x float64) special.Scaled {
	if f.unlimited() {
		p, _, ok := f.limit(x)
		if !ok {
			return special.Scaled{}
		}
		return p.Kernel()
	}
	p := noncentral.AtF(f.D1, f.D2, f.Lambda, x)
	return p.Kernel()
}

// limit returns the chi-squared law at D1 x; ok is false where D1 x is +Inf (upper) or
// 0.
func (f NoncentralF) limit(x float64) (p noncentral.ChiSquared, upper, ok bool) {
	y := f.D1 * x
	if !(y > 0 && y <= math.MaxFloat64) {
		return p, y > 0, false
	}
	return noncentral.AtChiSquared(f.D1, f.Lambda, dd.Prod(f.D1, x)), false, true
}

// CDF returns P(F <= x): 0 for x <= 0, 1 at +Inf, NaN for NaN or a bad parameter.
func (f NoncentralF) CDF(x float64) float64 {
	if f.Lambda == 0 {
		return f.central().CDF(x)
	}
	if v, done := positiveEnds(x, f.valid(), 0, 1); done {
		return v
	}
	return f.tail(x).value(false)
}

// Survival returns P(F > x), computed directly: 1 for x <= 0, 0 at +Inf, NaN for
// NaN or a bad parameter.
func (f NoncentralF) Survival(x float64) float64 {
	if f.Lambda == 0 {
		return f.central().Survival(x)
	}
	if v, done := positiveEnds(x, f.valid(), 1, 0); done {
		return v
	}
	return f.tail(x).value(true)
}

// LogCDF returns log P(F <= x), finite far below the underflow of CDF; -Inf for x <= 0.
func (f NoncentralF) LogCDF(x float64) float64 {
	if f.Lambda == 0 {
		return f.central().LogCDF(x)
	}
	if v, done := positiveEnds(x, f.valid(), math.Inf(-1), 0); done {
		return v
	}
	return f.tail(x).log(false)
}

// LogSurvival returns log P(F > x), finite far beyond the underflow of Survival;
// -Inf at +Inf.
func (f NoncentralF) LogSurvival(x float64) float64 {
	if f.Lambda == 0 {
		return f.central().LogSurvival(x)
	}
	if v, done := positiveEnds(x, f.valid(), 0, math.Inf(-1)); done {
		return v
	}
	return f.tail(x).log(true)
}

// Prob returns the density at x: 0 outside [0, +Inf), at 0 its limit, which is +Inf for D1 < 2,
// exp(-Lambda/2) for D1 = 2 and 0 above.
func (f NoncentralF) Prob(x float64) float64 {
	switch {
	case f.Lambda == 0:
		return f.central().Prob(x)
	case !f.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return 0
	case x == 0:
		return densityAtZero(f.D1/2, math.Exp(-f.Lambda/2))
	}
	return perX(f.kernel(x), x).Float64()
}

// LogProb returns the logarithm of the density.
func (f NoncentralF) LogProb(x float64) float64 {
	switch {
	case f.Lambda == 0:
		return f.central().LogProb(x)
	case !f.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return math.Inf(-1)
	case x == 0 && f.D1 == 2:
		return -f.Lambda / 2
	case x == 0:
		return math.Log(densityAtZero(f.D1/2, 1))
	}
	if f.D1 == 2 {
		if l, ok := noncentral.LogDensityTwo(f.D2, f.Lambda, x); ok {
			return l
		}
	}
	k := perX(f.kernel(x), x)
	if l := k.Log(); l < -0.05 || l > 0.05 || f.unlimited() {
		return l
	}
	// near 1 an error of some 1e-16 would be large beside the logarithm
	return perX(noncentral.FKernelFull(f.D1, f.D2, f.Lambda, x), x).Log()
}

func (f NoncentralF) tailAt(x float64, upper bool) (tail, logTail, hazard float64) {
	t, k := f.tailKernel(x)
	return t.eval(upper, perX(k, x))
}

func (f NoncentralF) support() (lo, hi float64) { return 0, math.Inf(1) }

// start is the quantile of the scaled central F whose numerator has the same mean
// and variance (Patnaik 1949).
func (f NoncentralF) start(p float64, upper bool) float64 {
	m, v := f.D1+f.Lambda, f.D1+2*f.Lambda
	return m / f.D1 * F{m / v * m, f.D2}.start(p, upper)
}

// Quantile returns the x with P(F <= x) = p: 0 for p = 0 and where the
// quantile is below the smallest denormal, +Inf for p = 1, NaN for p outside
// [0, 1] or a bad parameter. For p near 1 use UpperQuantile.
func (f NoncentralF) Quantile(p float64) float64 {
	switch {
	case f.Lambda == 0:
		return f.central().Quantile(p)
	case !f.valid():
		return math.NaN()
	}
	return invertTail(f, p, false, f.start(p, false))
}

// UpperQuantile returns the x with P(F > x) = q, q down to the smallest denormal.
func (f NoncentralF) UpperQuantile(q float64) float64 {
	switch {
	case f.Lambda == 0:
		return f.central().UpperQuantile(q)
	case !f.valid():
		return math.NaN()
	}
	return invertTail(f, q, true, f.start(q, true))
}

// Mean returns D2 (D1 + Lambda) / (D1 (D2-2)), +Inf for D2 <= 2.
func (f NoncentralF) Mean() float64 {
	switch {
	case !f.valid():
		return math.NaN()
	case f.D2 <= 2:
		return math.Inf(1)
	}
	m := 1 + f.Lambda/f.D1
	if f.unlimited() {
		return m
	}
	return m * (f.D2 / (f.D2 - 2))
}

// Variance returns 2 (D2/D1)² ((D1+Lambda)² + (D1+2 Lambda)(D2-2)) / ((D2-2)² (D2-4)):
// +Inf for 2 < D2 <= 4, NaN where the mean is infinite.
func (f NoncentralF) Variance() float64 {
	switch {
	case !f.valid() || f.D2 <= 2:
		return math.NaN()
	case f.D2 <= 4:
		return math.Inf(1)
	}
	l := f.Lambda / f.D1
	v := (1 + 2*l) / f.D1
	if f.unlimited() {
		return 2 * v
	}
	m := f.D2 / (f.D2 - 2)
	return 2 * m * m * ((1+l)*(1+l)/f.D2 + v*(1-2/f.D2)) / (1 - 4/f.D2)
}

// Rand draws one value from src: the quotient of a noncentral and a central
// chi-squared variate over their degrees of freedom.
func (f NoncentralF) Rand(src rand.Source) float64 {
	if !f.valid() {
		return math.NaN()
	}
	if f.Lambda == 0 {
		return f.central().Rand(src)
	}
	var num float64
	if f.D1 > 1 {
		num = math.Log(NoncentralChiSquared{f.D1, f.Lambda}.Rand(src) / f.D1)
	} else {
		num = logGammaVariate(src, f.D1/2+poissonVariate(src, f.Lambda/2)) - math.Log(f.D1/2)
	}
	if f.unlimited() {
		return math.Exp(num)
	}
	return math.Exp(num - (logGammaVariate(src, f.D2/2) - math.Log(f.D2/2)))
}

// String returns "NoncentralF(3, 20, 5)".
func (f NoncentralF) String() string {
	return fmt.Sprintf("NoncentralF(%v, %v, %v)", f.D1, f.D2, f.Lambda)
}
