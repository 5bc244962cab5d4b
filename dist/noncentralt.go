package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/noncentral"
	"subsume.example/internal/special"
)

// NoncentralT is the noncentral t law with Nu degrees of freedom, any real number
// above 0, and noncentrality Delta, any finite number: the law of (Z + Delta)/sqrt(V/Nu) with
// independent Z, standard normal, and V, ChiSquared{Nu}. Nu = +Inf is the normal law of mean Delta
// and variance 1; Delta = 0 gives StudentT{Nu}, bit for bit.
//
// Tails come from noncentral F on the side of Delta and from a convergent sum of normal tails
// elsewhere, see internal/noncentral; both tails keep their relative accuracy on either side of Delta.
type NoncentralT struct{ Nu, Delta float64 }

var _ Law = NoncentralT{}

// Validate returns a *ParamError unless 0 < Nu <= +Inf and |Delta| <= 1e50.
func (n NoncentralT) Validate() error {
	if !(n.Nu > 0) {
		return &ParamError{"NoncentralT", "Nu", n.Nu, wantPositiveOrInf}
	}
	if !(math.Abs(n.Delta) <= maxDelta) {
		return &ParamError{"NoncentralT", "Delta", n.Delta, "a number within ±1e50"}
	}
	return nil
}

func (n NoncentralT) valid() bool { return n.Nu > 0 && math.Abs(n.Delta) <= maxDelta }

func (n NoncentralT) central() StudentT { return StudentT{n.Nu} }

func (n NoncentralT) tail(t float64) centralTail {
	if math.IsInf(n.Nu, 1) {
		v, upper := noncentral.NormalTail(t, n.Delta)
		return centralTail{v, upper}
	}
	v, upper := noncentral.TTail(n.Nu, t, n.Delta)
	return centralTail{v, upper}
}

func (n NoncentralT) density(t float64) special.Scaled {
	if math.IsInf(n.Nu, 1) {
		return noncentral.NormalDensity(t, n.Delta)
	}
	return noncentral.TDensity(n.Nu, t, n.Delta)
}

// CDF returns P(T <= t); NaN for NaN or a bad parameter.
func (n NoncentralT) CDF(t float64) float64 {
	if n.Delta == 0 {
		return n.central().CDF(t)
	}
	if v, done := realEnds(t, n.valid(), 0, 1); done {
		return v
	}
	return n.tail(t).value(false)
}

// Survival returns P(T > t), computed directly; NaN for NaN or a bad parameter.
func (n NoncentralT) Survival(t float64) float64 {
	if n.Delta == 0 {
		return n.central().Survival(t)
	}
	if v, done := realEnds(t, n.valid(), 1, 0); done {
		return v
	}
	return n.tail(t).value(true)
}

// LogCDF returns log P(T <= t), finite far below the underflow of CDF.
func (n NoncentralT) LogCDF(t float64) float64 {
	if n.Delta == 0 {
		return n.central().LogCDF(t)
	}
	if v, done := realEnds(t, n.valid(), math.Inf(-1), 0); done {
		return v
	}
	return n.tail(t).log(false)
}

// LogSurvival returns log P(T > t), finite far beyond the underflow of Survival.
func (n NoncentralT) LogSurvival(t float64) float64 {
	if n.Delta == 0 {
		return n.central().LogSurvival(t)
	}
	if v, done := realEnds(t, n.valid(), 0, math.Inf(-1)); done {
		return v
	}
	return n.tail(t).log(true)
}

// Prob returns the density at t.
func (n NoncentralT) Prob(t float64) float64 {
	if n.Delta == 0 {
		return n.central().Prob(t)
	}
	if v, done := realEnds(t, n.valid(), 0, 0); done {
		return v
	}
	return n.density(t).Float64()
}

// LogProb returns the logarithm of the density.
func (n NoncentralT) LogProb(t float64) float64 {
	if n.Delta == 0 {
		return n.central().LogProb(t)
	}
	if v, done := realEnds(t, n.valid(), math.Inf(-1), math.Inf(-1)); done {
		return v
	}
	return n.density(t).Log()
}

func (n NoncentralT) tailAt(t float64, upper bool) (tail, logTail, hazard float64) {
	return n.tail(t).eval(upper, n.density(t))
}

func (n NoncentralT) support() (lo, hi float64) { return math.Inf(-1), math.Inf(1) }

// start solves the normal approximation of Z + Delta - ts, whose spread is
// sqrt(1 + t²/(2Nu)) (Jennett and Welch 1939).
func (n NoncentralT) start(p float64, upper bool) float64 {
	if !(p > 0 && p < 1) {
		return math.NaN()
	}
	z := normalStart(p)
	if !upper {
		z = -z
	}
	if math.IsInf(n.Nu, 1) {
		return n.Delta + z
	}
	b := 1 - 1/(4*n.Nu+1)
	v := 1 - b*b
	q := b*b - z*z*v
	r := b*b + v*(n.Delta*n.Delta-z*z)
	if q > 0.1 && r > 0 {
		return (n.Delta*b + z*math.Sqrt(r)) / q
	}
	// a power tail
	if t := (1 + math.Abs(n.Delta)) * studentStart(n.Nu, min(p, 1-p)); z*n.Delta > 0 && !math.IsNaN(t) {
		return math.Copysign(t, z)
	}
	return n.Delta + z
}

// Quantile returns the t with P(T <= t) = p: -Inf for p = 0, +Inf for p = 1, NaN for p outside
// [0, 1] or a bad parameter. For p near 1 use UpperQuantile.
func (n NoncentralT) Quantile(p float64) float64 {
	switch {
	case n.Delta == 0:
		return n.central().Quantile(p)
	case !n.valid():
		return math.NaN()
	}
	return invertTail(n, p, false, n.start(p, false))
}

// UpperQuantile returns the t with P(T > t) = q, q down to the smallest denormal.
func (n NoncentralT) UpperQuantile(q float64) float64 {
	switch {
	case n.Delta == 0:
		return n.central().UpperQuantile(q)
	case !n.valid():
		return math.NaN()
	}
	return invertTail(n, q, true, n.start(q, true))
}

// Mean returns Delta sqrt(Nu/2) Γ((Nu-1)/2)/Γ(Nu/2) for Nu > 1, ±Inf with the sign of Delta
// for smaller Nu, NaN for Delta = 0 there.
func (n NoncentralT) Mean() float64 {
	switch {
	case !n.valid():
		return math.NaN()
	case math.IsInf(n.Nu, 1):
		return n.Delta
	case n.Nu <= 1:
		return n.Delta * math.Inf(1)
	}
	return n.Delta * math.Sqrt(n.meanSquare().Float64())
}

// meanSquare returns (Mean/Delta)² = (Nu/2) (Γ((Nu-1)/2)/Γ(Nu/2))² for Nu > 1.
func (n NoncentralT) meanSquare() dd.DD {
	if n.Nu > 200 {
		return dd.From(n.Nu).Div(dd.Sum(n.Nu, -2)).AddF(-n.meanDefect())
	}
	a := dd.From(n.Nu).MulF(0.5)
	return dd.Exp(special.LogGamma(a.AddF(-0.5)).Sub(special.LogGamma(a)).MulF(2)).Mul(a)
}

// meanDefect returns Nu/(Nu-2) - (Mean/Delta)². For Nu > 200 it is the series of that difference in
// 1/Nu (from Γ's expansion; the first term left out is 1e-15 of the sum), which does not cancel.
func (n NoncentralT) meanDefect() float64 {
	if r := 1 / n.Nu; n.Nu > 200 {
		return r * (0.5 + r*(1.875+r*(5.1875+r*(12.5390625+r*(27.98046875+r*(59.3701171875+r*122.47021484375))))))
	}
	return dd.From(n.Nu).Div(dd.Sum(n.Nu, -2)).Sub(n.meanSquare()).Float64()
}

// Variance returns Nu(1 + Delta²)/(Nu-2) - Mean² for Nu > 2, +Inf for 1 < Nu <= 2, NaN for smaller Nu.
func (n NoncentralT) Variance() float64 {
	switch {
	case !n.valid() || n.Nu <= 1:
		return math.NaN()
	case n.Nu <= 2:
		return math.Inf(1)
	case math.IsInf(n.Nu, 1):
		return 1
	}
	return n.Nu/(n.Nu-2) + n.Delta*n.Delta*n.meanDefect()
}

// Rand draws one value from src.
func (n NoncentralT) Rand(src rand.Source) float64 {
	if !n.valid() {
		return math.NaN()
	}
	if n.Delta == 0 {
		return n.central().Rand(src)
	}
	z := normalVariate(src) + n.Delta
	if math.IsInf(n.Nu, 1) {
		return z
	}
	return z * math.Exp(-0.5*(logGammaVariate(src, n.Nu/2)-math.Log(n.Nu/2)))
}

// String returns "NoncentralT(10, 1.5)".
func (n NoncentralT) String() string { return fmt.Sprintf("NoncentralT(%v, %v)", n.Nu, n.Delta) }
