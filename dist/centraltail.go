package dist

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// centralTail is one directly computed tail of a law at a point: the upper one if
// upper is set. The other is its complement, which loses nothing because the tail is
// kept in double-double and is not near 1.
type centralTail struct {
	special.Scaled
	upper bool
}

// value returns P(X > x) for upper, else P(X <= x).
func (t centralTail) value(upper bool) float64 {
	if upper == t.upper {
		return t.Float64()
	}
	return t.Complement()
}

// log returns the logarithm of value(upper).
func (t centralTail) log(upper bool) float64 {
	if upper == t.upper {
		return t.Log()
	}
	return t.LogComplement()
}

// eval returns the tail, its logarithm (only where the tail is below tinyTail) and the
// hazard density/tail, as invertible wants it.
func (t centralTail) eval(upper bool, density special.Scaled) (tail, logTail, hazard float64) {
	tail = t.value(upper)
	if d := density.Float64(); tail >= tinyTail && d > 1e-290 && d < 1e290 {
		return tail, 0, d / tail
	}
	logTail = t.log(upper)
	return tail, logTail, math.Exp(density.Log() - logTail)
}

// perX divides a density of log X by x, which makes it the density of X.
func perX(k special.Scaled, x float64) special.Scaled {
	if q := k.M.Hi / x; x > 1e-200 && x < 1e200 && q > 1e-270 && q < 1e270 {
		k.M = k.M.DivF(x)
		return k
	}
	k.L = k.L.Sub(dd.Log(dd.From(x)))
	return k
}

// densityAtZero returns the limit at 0 of a density that behaves as c x^(a-1) there.
func densityAtZero(a, c float64) float64 {
	switch {
	case a < 1:
		return math.Inf(1)
	case a > 1:
		return 0
	}
	return c
}

// half returns v/2 as a double-double.
func half(v float64) dd.DD { return dd.DD{Hi: v * 0.5} }

// logDensity returns the logarithm of a density: from the quick answer where that lies in the normal
// range and its logarithm is not near 0, which would show its error.
func logDensity[L interface {
	density(x float64, quick bool) special.Scaled
}](law L, x float64) float64 {
	if d := law.density(x, true); d.L.Hi == 0 && d.M.Hi > 1e-290 {
		if l := d.Log(); math.Abs(l) > 1 {
			return l
		}
	}
	return law.density(x, false).Log()
}
