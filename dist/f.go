package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// F is the F law with D1 numerator and D2 denominator degrees of freedom: the law of
// the quotient of two independent chi-squared variables, each over its degrees of
// freedom. Both are real numbers above 0; D2 = +Inf is the law of ChiSquared{D1} over D1.
//
// With X = D1 x/(D1 x + D2), P(F <= x) = I_X(D1/2, D2/2) (DLMF 8.17).
type F struct{ D1, D2 float64 }

var _ Law = F{}

// Validate returns a *ParamError unless 0 < D1 < +Inf and 0 < D2 <= +Inf.
func (f F) Validate() error {
	if !finitePositive(f.D1) {
		return &ParamError{"F", "D1", f.D1, wantPositive}
	}
	if !(f.D2 > 0) {
		return &ParamError{"F", "D2", f.D2, wantPositiveOrInf}
	}
	return nil
}

func (f F) valid() bool { return finitePositive(f.D1) && f.D2 > 0 }

// scaleChi returns the chi-squared variable that has the law of D1 F for D2 = +Inf.
func (f F) scaleChi(x float64) dd.DD {
	if p := f.D1 * x; p > math.MaxFloat64 {
		return dd.From(p)
	}
	return dd.Prod(f.D1, x)
}

// logOdds returns log(D1 x / D2).
func (f F) logOdds(x float64) dd.DD {
	return dd.Log(dd.From(f.D1)).Add(dd.Log(dd.From(x))).Sub(dd.Log(dd.From(f.D2)))
}

// beta returns X = D1 x/(D1 x + D2) and Y = 1 - X.
func (f F) beta(x float64) (X, Y dd.DD) {
	d2 := f.D2
	switch {
	case x < 0x1p-700:
		x, d2 = x*0x1p400, d2*0x1p400
	case x > 0x1p700:
		x, d2 = x*0x1p-400, d2*0x1p-400
	}
	p := dd.Prod(f.D1, x)
	s := p.AddF(d2)
	inv := 1 / s.Hi
	return s.Quotient(p, inv), s.Quotient(dd.From(d2), inv)
}

// moderate reports whether all of the law's numbers lie far inside the floats.
func (f F) moderate(x float64) bool {
	return x > 1e-70 && x < 1e70 && f.D1 > 1e-70 && f.D1 < 1e70 && f.D2 > 1e-70 && f.D2 < 1e70
}

// cut limits finite degrees of freedom to 1e150, where the law is its limit to all digits but no
// product leaves the floats.
func (f F) cut() F { return F{min(f.D1, 1e150), min(f.D2, 1e150)} }

// tinyOdds is where X or Y is taken by its logarithm only.
const tinyOdds = 0x1p-800

// tail returns one tail at 0 < x < +Inf.
func (f F) tail(x float64) centralTail {
	if math.IsInf(f.D2, 1) {
		return chiTail(f.D1, f.scaleChi(x), x)
	}
	if f.moderate(x) {
		X, Y := f.beta(x)
		t, upper := special.BetaTail(half(f.D1), half(f.D2), X, Y)
		return centralTail{t, upper}
	}
	f = f.cut()
	a, b := half(f.D1), half(f.D2)
	switch odds := f.D1 / f.D2 * x; {
	case odds < tinyOdds:
		t, _ := special.BetaTailTiny(a, b, f.logOdds(x))
		return centralTail{t, false}
	case odds > 1/tinyOdds:
		t, _ := special.BetaTailTiny(b, a, f.logOdds(x).Neg())
		return centralTail{t, true}
	}
	X, Y := f.beta(x)
	t, upper := special.BetaTail(a, b, X, Y)
	return centralTail{t, upper}
}

// density returns the density at 0 < x < +Inf; quick answers are not fit for logarithms near 0.
func (f F) density(x float64, quick bool) special.Scaled {
	if math.IsInf(f.D2, 1) {
		return perX(chiKernel(f.D1, f.scaleChi(x), x, quick), x)
	}
	f = f.cut()
	a, b := half(f.D1), half(f.D2)
	switch odds := f.D1 / f.D2 * x; {
	case odds < tinyOdds:
		_, k := special.BetaTailTiny(a, b, f.logOdds(x))
		return perX(k, x)
	case odds > 1/tinyOdds:
		_, k := special.BetaTailTiny(b, a, f.logOdds(x).Neg())
		return perX(k, x)
	}
	X, Y := f.beta(x)
	if quick {
		return perX(special.BetaKernelQuick(a, b, X, Y), x)
	}
	return perX(special.BetaKernel(a, b, X, Y), x)
}

// CDF returns P(F <= x): 0 for x <= 0, 1 at +Inf, NaN for NaN or a bad parameter.
func (f F) CDF(x float64) float64 {
	if v, done := positiveEnds(x, f.valid(), 0, 1); done {
		return v
	}
	return f.tail(x).value(false)
}

// Survival returns P(F > x), computed directly: 1 for x <= 0, 0 at +Inf, NaN for
// NaN or a bad parameter.
func (f F) Survival(x float64) float64 {
	if v, done := positiveEnds(x, f.valid(), 1, 0); done {
		return v
	}
	return f.tail(x).value(true)
}

// LogCDF returns log P(F <= x), finite far below the underflow of CDF; -Inf for x <= 0.
func (f F) LogCDF(x float64) float64 {
	if v, done := positiveEnds(x, f.valid(), math.Inf(-1), 0); done {
		return v
	}
	return f.tail(x).log(false)
}

// LogSurvival returns log P(F > x), finite far beyond the underflow of Survival;
// -Inf at +Inf.
func (f F) LogSurvival(x float64) float64 {
	if v, done := positiveEnds(x, f.valid(), 0, math.Inf(-1)); done {
		return v
	}
	return f.tail(x).log(true)
}

// Prob returns the density at x: 0 outside [0, +Inf), at 0 its limit, which is +Inf for D1 < 2,
// 1 for D1 = 2 and 0 above.
func (f F) Prob(x float64) float64 {
	switch {
	case !f.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return 0
	case x == 0:
		return densityAtZero(f.D1/2, 1)
	}
	return f.density(x, true).Float64()
}

// LogProb returns the logarithm of the density.
func (f F) LogProb(x float64) float64 {
	switch {
	case !f.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || math.IsInf(x, 1):
		return math.Inf(-1)
	case x == 0:
		return math.Log(densityAtZero(f.D1/2, 1))
	case f.D1 == 2:
		// Falls from log 1 = 0 at x = 0: -(1 + D2/2) log(1 + 2x/D2).
		if math.IsInf(f.D2, 1) {
			return -x
		}
		u := dd.From(2 * x).DivF(f.D2)
		if u.Hi < 1e-30 || u.Hi > 1e300 {
			return -(1 + f.D2/2) * math.Log1p(2*(x/f.D2))
		}
		l := half(f.D2).AddF(1).Mul(dd.Log1p(u))
		return -(l.Hi + l.Lo)
	}
	return logDensity(f, x)
}

func (f F) tailAt(x float64, upper bool) (tail, logTail, hazard float64) {
	return f.tail(x).eval(upper, f.density(x, true))
}

func (f F) support() (lo, hi float64) { return 0, math.Inf(1) }

// Quantile returns the x with P(F <= x) = p: 0 for p = 0 and where the
// quantile is below the smallest denormal, +Inf for p = 1 and where it is above the largest float64,
// NaN for p outside [0, 1] or a bad parameter. For p near 1 use UpperQuantile.
func (f F) Quantile(p float64) float64 {
	if !f.valid() {
		return math.NaN()
	}
	return invertTail(f, p, false, f.start(p, false))
}

// UpperQuantile returns the x with P(F > x) = q, q down to the smallest denormal.
func (f F) UpperQuantile(q float64) float64 {
	if !f.valid() {
		return math.NaN()
	}
	return invertTail(f, q, true, f.start(q, true))
}

// Mean returns D2/(D2-2), +Inf for D2 <= 2.
func (f F) Mean() float64 {
	switch {
	case !f.valid():
		return math.NaN()
	case f.D2 <= 2:
		return math.Inf(1)
	case math.IsInf(f.D2, 1):
		return 1
	}
	return f.D2 / (f.D2 - 2)
}

// Variance returns 2 D2² (D1+D2-2) / (D1 (D2-2)² (D2-4)): +Inf for 2 < D2 <= 4, NaN where the
// mean is infinite.
func (f F) Variance() float64 {
	switch {
	case !f.valid() || f.D2 <= 2:
		return math.NaN()
	case f.D2 <= 4:
		return math.Inf(1)
	case math.IsInf(f.D2, 1):
		return 2 / f.D1
	}
	m := f.D2 / (f.D2 - 2)
	return 2 * m * m * (1/f.D1 + (1-2/f.D1)/f.D2) / (1 - 4/f.D2)
}

// Rand draws one value from src, by two gamma variates (Marsaglia and Tsang 2000) whose powers for
// small degrees of freedom stay logarithms, so that they neither underflow to 0/0 nor overflow early.
func (f F) Rand(src rand.Source) float64 {
	if !f.valid() {
		return math.NaN()
	}
	g, s := gammaVariate(src, f.D1/2)
	g /= f.D1 / 2
	if math.IsInf(f.D2, 1) {
		return timesExp(g, s)
	}
	h, t := gammaVariate(src, f.D2/2)
	return timesExp(g/(h/(f.D2/2)), s-t)
}

// String returns "F(3, 20)".
func (f F) String() string { return fmt.Sprintf("F(%v, %v)", f.D1, f.D2) }
