package dist

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// StudentT is Student's t law with Nu degrees of freedom, any real number above 0;
// Nu = +Inf is the standard normal law.
//
// For t >= 0, P(T > t) = I_Y(Nu/2, 1/2)/2 with Y = Nu/(Nu + t²) (DLMF 8.17).
type StudentT struct{ Nu float64 }

var _ Law = StudentT{}

// Validate returns a *ParamError unless 0 < Nu <= +Inf.
func (s StudentT) Validate() error {
	if !s.valid() {
		return &ParamError{"StudentT", "Nu", s.Nu, wantPositiveOrInf}
	}
	return nil
}

func (s StudentT) valid() bool { return s.Nu > 0 }

// invSqrt2Pi = 1/sqrt(2 pi).
var invSqrt2Pi = dd.DD{Hi: 0x1.9884533d43651p-2, Lo: -0x1.cbc0d30ebfd15p-56}

// outer returns the outer tail P(T > |t|) for finite t.
func (s StudentT) outer(t float64) special.Scaled {
	t = math.Abs(t)
	if t < 1e-140 && s.Nu > 1e-100 {
		// P(T > t) = 1/2 - density t to all digits.
		return special.Scaled{M: dd.From(0.5)}
	}
	var u special.Scaled
	var upper bool
	switch {
	case math.IsInf(s.Nu, 1):
		if t > 1e150 {
			return special.Scaled{}
		}
		u, upper = special.GammaTail(dd.From(0.5), dd.Prod(t, t).MulF(0.5))
	case t > 1e140:
		ly := dd.Log(dd.From(s.Nu)).Sub(dd.Log(dd.From(t)).MulF(2))
		u, _ = special.BetaTailTiny(half(s.Nu), dd.From(0.5), ly)
		upper = true
	default:
		q := dd.Prod(t, t)
		d := q.AddF(s.Nu)
		u, upper = special.BetaTail(dd.From(0.5), half(s.Nu), q.DivQuick(d), dd.From(s.Nu).DivQuick(d))
	}
	if !upper {
		u = special.Scaled{M: u.DD().Neg().AddF(1)}
	}
	u.M = u.M.MulF(0.5)
	return u
}

// density returns the density at a finite t; quick answers are not fit for logarithms near 0.
func (s StudentT) density(t float64, quick bool) special.Scaled {
	t = math.Abs(t)
	switch {
	case math.IsInf(s.Nu, 1):
		if t > 1e150 {
			return special.Scaled{}
		}
		return special.Scaled{L: dd.Prod(t, t).MulF(-0.5), M: invSqrt2Pi}
	case t > 1e140:
		ly := dd.Log(dd.From(s.Nu)).Sub(dd.Log(dd.From(t)).MulF(2))
		_, k := special.BetaTailTiny(half(s.Nu), dd.From(0.5), ly)
		return perX(k, t)
	case t < 1e-140:
		t = 1e-140
	}
	// Y^(Nu/2) / (B(1/2, Nu/2) sqrt(Nu + t²)).
	q := dd.Prod(t, t)
	d := q.AddF(s.Nu)
	x := q.DivQuick(d)
	if quick && t > 1e-10 {
		// The density of log T² over t.
		k := special.BetaKernelQuick(dd.From(0.5), half(s.Nu), x, dd.From(s.Nu).DivQuick(d))
		return perX(k, t)
	}
	c := special.InverseBeta(dd.From(0.5), half(s.Nu))
	if x.Hi < 0.25 {
		c.L = c.L.Add(half(s.Nu).Mul(dd.Log1p(x.Neg())))
	} else {
		c.L = c.L.Add(half(s.Nu).Mul(dd.Log(dd.From(s.Nu).Div(d))))
	}
	c.M = c.M.Div(d.Sqrt())
	return c
}

// tail returns the tail on the side of t.
func (s StudentT) tail(t float64) centralTail {
	return centralTail{s.outer(t), t >= 0}
}

// CDF returns P(T <= t); NaN for NaN or a bad parameter.
func (s StudentT) CDF(t float64) float64 {
	if v, done := realEnds(t, s.valid(), 0, 1); done {
		return v
	}
	return s.tail(t).value(false)
}

// Survival returns P(T > t), computed directly; NaN for NaN or a bad parameter.
func (s StudentT) Survival(t float64) float64 {
	if v, done := realEnds(t, s.valid(), 1, 0); done {
		return v
	}
	return s.tail(t).value(true)
}

// LogCDF returns log P(T <= t).
func (s StudentT) LogCDF(t float64) float64 {
	if v, done := realEnds(t, s.valid(), math.Inf(-1), 0); done {
		return v
	}
	return s.tail(t).log(false)
}

// LogSurvival returns log P(T > t).
func (s StudentT) LogSurvival(t float64) float64 {
	if v, done := realEnds(t, s.valid(), 0, math.Inf(-1)); done {
		return v
	}
	return s.tail(t).log(true)
}

// Prob returns the density at t.
func (s StudentT) Prob(t float64) float64 {
	if v, done := realEnds(t, s.valid(), 0, 0); done {
		return v
	}
	return s.density(t, true).Float64()
}

// LogProb returns the logarithm of the density.
func (s StudentT) LogProb(t float64) float64 {
	if v, done := realEnds(t, s.valid(), math.Inf(-1), math.Inf(-1)); done {
		return v
	}
	return logDensity(s, t)
}

func (s StudentT) tailAt(t float64, upper bool) (tail, logTail, hazard float64) {
	return s.tail(t).eval(upper, s.density(t, true))
}

func (s StudentT) support() (lo, hi float64) { return math.Inf(-1), math.Inf(1) }

// Quantile returns the t with P(T <= t) = p: -Inf for 0, +Inf for 1, NaN for p
// outside [0, 1] or a bad parameter. For p near 1 use UpperQuantile.
func (s StudentT) Quantile(p float64) float64 {
	if !s.valid() {
		return math.NaN()
	}
	switch {
	case p > 0.5:
		return s.outerQuantile(1 - p)
	default:
		return -s.outerQuantile(p)
	}
}

// outerQuantile returns the t >= 0 with P(T > t) = q, q <= 1/2. Near the centre the tail
// says little about t; there P(T² <= t²) = 1 - 2q, which is exact for q >= 1/4, is inverted.
func (s StudentT) outerQuantile(q float64) float64 {
	if q >= 0.25 && q <= 0.5 {
		if v := (F{1, s.Nu}).Quantile(1 - 2*q); v < 1e250 {
			return math.Sqrt(v)
		}
	}
	return invertTail(s, q, true, studentStart(s.Nu, q))
}

// UpperQuantile returns the t with P(T > t) = q.
func (s StudentT) UpperQuantile(q float64) float64 { return -s.Quantile(q) }

// Mean returns 0, NaN for Nu <= 1 where it does not exist.
func (s StudentT) Mean() float64 {
	if s.Nu > 1 {
		return 0
	}
	return math.NaN()
}

// Variance returns Nu/(Nu-2): +Inf for 1 < Nu <= 2, NaN where the mean does not exist.
func (s StudentT) Variance() float64 {
	switch {
	case math.IsInf(s.Nu, 1):
		return 1
	case s.Nu > 2:
		return s.Nu / (s.Nu - 2)
	case s.Nu > 1:
		return math.Inf(1)
	}
	return math.NaN()
}

// Rand draws one value from src: a normal variate over the root of a gamma one.
func (s StudentT) Rand(src rand.Source) float64 {
	if !s.valid() {
		return math.NaN()
	}
	z := normalVariate(src)
	if math.IsInf(s.Nu, 1) {
		return z
	}
	g, e := gammaVariate(src, s.Nu/2)
	return timesExp(z/math.Sqrt(g/(s.Nu/2)), -0.5*e)
}

// String returns "StudentT(12)".
func (s StudentT) String() string { return fmt.Sprintf("StudentT(%v)", s.Nu) }
