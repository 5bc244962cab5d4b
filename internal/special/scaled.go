package special

import (
	"math"

	"subsume.example/internal/dd"
)

// Scaled is the non-negative number exp(L) M. It reaches far beyond the range
// of a float64 on both sides.
type Scaled struct{ L, M dd.DD }

// Split returns m and k with the value m 2^k.
func (s Scaled) Split() (m dd.DD, k int) {
	if s.L.Hi == 0 {
		return s.M, 0
	}
	m, k = dd.ExpScaled(s.L)
	return m.Mul(s.M), k
}

// Float64 returns the value rounded to a float64: 0 below the smallest
// denormal, +Inf above the range.
func (s Scaled) Float64() float64 {
	if s.L.Hi == 0 {
		return s.M.Hi + s.M.Lo
	}
	m, k := s.Split()
	return math.Ldexp(m.Hi+m.Lo, k)
}

// DD returns the value as a double-double; it is 0 or loses its low part below 1e-290.
func (s Scaled) DD() dd.DD {
	m, k := s.Split()
	if k == 0 {
		return m
	}
	return m.Scale(k)
}

// Complement returns 1 minus the value rounded to a float64, at least 0.
func (s Scaled) Complement() float64 {
	c := s.DD().Neg().AddF(1)
	return max(0, c.Hi+c.Lo)
}

// LogDD returns the natural logarithm of the value.
func (s Scaled) LogDD() dd.DD {
	if s.L.Hi == 0 {
		return dd.Log(s.M)
	}
	return s.L.Add(dd.Log(s.M))
}

// Log returns the natural logarithm of the value as a float64.
func (s Scaled) Log() float64 {
	if s.M.Hi == 0 {
		return math.Inf(-1)
	}
	if s.L.Hi == 0 && s.M.Hi > 0x1p-1000 && s.M.Hi < 0x1p1000 {
		l := dd.LogQuick(s.M)
		return l.Hi + l.Lo
	}
	l := s.LogDD()
	return l.Hi + l.Lo
}

// LogComplement returns log(1 - value), accurate also when the value is tiny.
func (s Scaled) LogComplement() float64 {
	v := s.DD()
	switch {
	case v.Hi < 1e-290:
		return -s.Float64()
	case v.Hi > 1e-12 && v.Hi < 0.999:
		l := dd.LogQuick(v.Neg().AddF(1))
		return l.Hi + l.Lo
	case v.Hi >= 1:
		if v.Hi == 1 && v.Lo < 0 {
			return math.Log(-v.Lo)
		}
		return math.Inf(-1)
	}
	l := dd.Log1p(v.Neg())
	return l.Hi + l.Lo
}

// complement returns 1 - s as a Scaled.
func (s Scaled) complement() Scaled {
	c := s.DD().Neg().AddF(1)
	if c.Hi < 0 {
		c = dd.DD{}
	}
	return Scaled{M: c}
}
