package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// Beta is the beta law on (0, 1) with shape parameters A and B, real numbers above 0 (best from
// 5e-4 to 5e11): P(X <= x) = I_x(A, B), the regularized incomplete beta function (DLMF 8.17). The
// ratio of residual sums of squares of two nested linear models, RSS of the larger over RSS
// of the smaller, is Beta{(n-r)/2, q/2} when the smaller one holds.
//
// Points near 1 are as coarse as float64 is there; to keep the digits of 1 - x use Beta{B, A} at it.
type Beta struct{ A, B float64 }

var _ Law = Beta{}

// Validate returns a *ParamError unless A and B are finite and above 0.
func (b Beta) Validate() error {
	switch {
	case !finitePositive(b.A):
		return &ParamError{"Beta", "A", b.A, wantPositive}
	case !finitePositive(b.B):
		return &ParamError{"Beta", "B", b.B, wantPositive}
	}
	return nil
}

func (b Beta) valid() bool { return finitePositive(b.A) && finitePositive(b.B) }

// tail returns one tail at 0 < x < 1.
func (b Beta) tail(x float64) centralTail {
	if x < 1e-270 {
		t, _ := special.BetaTailTiny(dd.From(b.A), dd.From(b.B), dd.Log(dd.From(x)))
		return centralTail{t, false}
	}
	t, upper := special.BetaTail(dd.From(b.A), dd.From(b.B), dd.From(x), dd.Sum(1, -x))
	return centralTail{t, upper}
}

// density returns the density at 0 < x < 1; quick answers are not fit for logarithms near 0.
func (b Beta) density(x float64, quick bool) special.Scaled {
	X, Y := dd.From(x), dd.Sum(1, -x)
	switch {
	case x < 1e-270:
		_, k := special.BetaTailTiny(dd.From(b.A), dd.From(b.B), dd.Log(X))
		return perX(k, x)
	case quick:
		k := perX(special.BetaKernelQuick(dd.From(b.A), dd.From(b.B), X, Y), x)
		k.M = k.M.Div(Y)
		return k
	}
	k := perX(special.BetaKernel(dd.From(b.A), dd.From(b.B), X, Y), x)
	k.M = k.M.Div(Y)
	return k
}

// ends answers where no computation is needed: NaN and outside (0, 1).
func (b Beta) ends(x, left, right float64) (float64, bool) {
	switch {
	case x > 0 && x < 1 && b.valid():
		return 0, false
	case !b.valid() || math.IsNaN(x):
		return math.NaN(), true
	case x <= 0:
		return left, true
	}
	return right, true
}

// CDF returns I_x(A, B): 0 for x <= 0, 1 for x >= 1, NaN for NaN or a bad parameter.
func (b Beta) CDF(x float64) float64 {
	if v, done := b.ends(x, 0, 1); done {
		return v
	}
	return b.tail(x).value(false)
}

// Survival returns 1 - I_x(A, B), computed directly.
func (b Beta) Survival(x float64) float64 {
	if v, done := b.ends(x, 1, 0); done {
		return v
	}
	return b.tail(x).value(true)
}

// LogCDF returns the logarithm of CDF, finite far below its underflow.
func (b Beta) LogCDF(x float64) float64 {
	if v, done := b.ends(x, math.Inf(-1), 0); done {
		return v
	}
	return b.tail(x).log(false)
}

// LogSurvival returns the logarithm of Survival, finite far below its underflow.
func (b Beta) LogSurvival(x float64) float64 {
	if v, done := b.ends(x, 0, math.Inf(-1)); done {
		return v
	}
	return b.tail(x).log(true)
}

// Prob returns the density: 0 outside [0, 1], at 0 and 1 its limits.
func (b Beta) Prob(x float64) float64 {
	switch {
	case !b.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || x > 1:
		return 0
	case x == 0:
		return densityAtZero(b.A, b.B)
	case x == 1:
		return densityAtZero(b.B, b.A)
	}
	return b.density(x, true).Float64()
}

// LogProb returns the logarithm of the density.
func (b Beta) LogProb(x float64) float64 {
	switch {
	case !b.valid() || math.IsNaN(x):
		return math.NaN()
	case x < 0 || x > 1:
		return math.Inf(-1)
	case x == 0:
		return math.Log(densityAtZero(b.A, b.B))
	case x == 1:
		return math.Log(densityAtZero(b.B, b.A))
	}
	return logDensity(b, x)
}

func (b Beta) tailAt(x float64, upper bool) (tail, logTail, hazard float64) {
	return b.tail(x).eval(upper, b.density(x, true))
}

func (b Beta) support() (lo, hi float64) { return 0, 1 }

// start returns a start for the quantile, by that of the F law.
func (b Beta) start(p float64, upper bool) float64 {
	r := F{2 * b.A, 2 * b.B}.start(p, upper) * (b.A / b.B)
	if r > 1 {
		return 1 / (1 + 1/r)
	}
	return r / (1 + r)
}

// Quantile returns the x with P(X <= x) = p, NaN for p outside [0, 1] or a bad parameter.
func (b Beta) Quantile(p float64) float64 {
	if !b.valid() {
		return math.NaN()
	}
	return invertTail(b, p, false, b.start(p, false))
}

// UpperQuantile returns the x with P(X > x) = q.
func (b Beta) UpperQuantile(q float64) float64 {
	if !b.valid() {
		return math.NaN()
	}
	return invertTail(b, q, true, b.start(q, true))
}

// Mean returns A/(A+B).
func (b Beta) Mean() float64 {
	if !b.valid() {
		return math.NaN()
	}
	return 1 / (1 + b.B/b.A)
}

// Variance returns AB / ((A+B)² (A+B+1)).
func (b Beta) Variance() float64 {
	if !b.valid() {
		return math.NaN()
	}
	return (b.A / (b.A + b.B)) * (b.B / (b.A + b.B)) / (b.A + b.B + 1)
}

// Rand draws one value from src, by two gamma variates.
func (b Beta) Rand(src rand.Source) float64 {
	if !b.valid() {
		return math.NaN()
	}
	g, s := gammaVariate(src, b.A)
	h, t := gammaVariate(src, b.B)
	return 1 / (1 + timesExp(h/g, t-s))
}

// String returns "Beta(2, 3.5)".
func (b Beta) String() string { return fmt.Sprintf("Beta(%v, %v)", b.A, b.B) }
