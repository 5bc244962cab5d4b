// Package dd computes in double-double arithmetic: an unevaluated sum Hi + Lo
// of two float64 with |Lo| <= ulp(Hi)/2, which carries about 106 bits.
//
// The error-free transformations are Knuth's two-sum (The Art of Computer
// Programming, volume 2, section 4.2.2, theorem B), Dekker's quick two-sum
// (Numerische Mathematik 18, 1971) and the two-product by fused multiply-add.
// The compound operations and their bounds are those of Joldes, Muller and
// Popescu, "Tight and rigorous error bounds for basic building blocks of
// double-word arithmetic", ACM TOMS 44(2), 2017; u = 2^-53 in the comments.
//
// Products are wrapped in float64 conversions so that no compiler fuses them:
// the same bits come out on every processor.
package dd

import "math"

// DD is the value Hi + Lo. The zero value is 0.
type DD struct{ Hi, Lo float64 }

// From returns x as a double-double.
func From(x float64) DD { return DD{Hi: x} }

// Float64 returns the nearest float64.
func (a DD) Float64() float64 { return a.Hi + a.Lo }

// TwoSum returns s + e = a + b exactly, s the rounded sum.
func TwoSum(a, b float64) (s, e float64) {
	s = a + b
	t := s - a
	return s, (a - (s - t)) + (b - t)
}

// QuickTwoSum is TwoSum for |a| >= |b| or a = 0.
func QuickTwoSum(a, b float64) (s, e float64) {
	s = a + b
	return s, b - (s - a)
}

// TwoProd returns p + e = a * b exactly, unless e underflows.
func TwoProd(a, b float64) (p, e float64) {
	p = float64(a * b)
	return p, math.FMA(a, b, -p)
}

// Sum returns a + b for plain numbers, exactly.
func Sum(a, b float64) DD {
	s, e := TwoSum(a, b)
	return DD{s, e}
}

// Prod returns a * b for plain numbers, exactly unless it underflows.
func Prod(a, b float64) DD {
	p, e := TwoProd(a, b)
	return DD{p, e}
}

// Add returns a + b with relative error below 3u² (algorithm 6).
func (a DD) Add(b DD) DD {
	s, e := TwoSum(a.Hi, b.Hi)
	t, f := TwoSum(a.Lo, b.Lo)
	s, e = QuickTwoSum(s, e+t)
	s, e = QuickTwoSum(s, e+f)
	return DD{s, e}
}

// AddF returns a + b with relative error below 2u² (algorithm 4).
func (a DD) AddF(b float64) DD {
	s, e := TwoSum(a.Hi, b)
	s, e = QuickTwoSum(s, e+a.Lo)
	return DD{s, e}
}

// Sub returns a - b.
func (a DD) Sub(b DD) DD { return a.Add(DD{-b.Hi, -b.Lo}) }

// Neg returns -a.
func (a DD) Neg() DD { return DD{-a.Hi, -a.Lo} }

// Abs returns |a|.
func (a DD) Abs() DD {
	if a.Hi < 0 || a.Hi == 0 && a.Lo < 0 {
		return DD{-a.Hi, -a.Lo}
	}
	return a
}

// Mul returns a * b with relative error below 5u² (algorithm 12).
func (a DD) Mul(b DD) DD {
	p, e := TwoProd(a.Hi, b.Hi)
	t := math.FMA(a.Hi, b.Lo, float64(a.Lo*b.Hi))
	p, e = QuickTwoSum(p, e+t)
	return DD{p, e}
}

// MulF returns a * b with relative error below 2u² (algorithm 9).
func (a DD) MulF(b float64) DD {
	p, e := TwoProd(a.Hi, b)
	p, e = QuickTwoSum(p, math.FMA(a.Lo, b, e))
	return DD{p, e}
}

// Scale returns a * 2^k, exact unless it leaves the normal range.
func (a DD) Scale(k int) DD {
	return DD{math.Ldexp(a.Hi, k), math.Ldexp(a.Lo, k)}
}

// Sqr returns a².
func (a DD) Sqr() DD {
	p, e := TwoProd(a.Hi, a.Hi)
	p, e = QuickTwoSum(p, e+2*float64(a.Hi*a.Lo))
	return DD{p, e}
}

// Div returns a / b with relative error below 10u² (algorithm 18).
func (a DD) Div(b DD) DD {
	q := a.Hi / b.Hi
	r := a.Sub(b.MulF(q))
	q2 := r.Hi / b.Hi
	r = r.Sub(b.MulF(q2))
	q3 := r.Hi / b.Hi
	s, e := QuickTwoSum(q, q2)
	return DD{s, e}.AddF(q3)
}

// DivF returns a / b.
func (a DD) DivF(b float64) DD {
	q := a.Hi / b
	p, e := TwoProd(q, b)
	s, f := TwoSum(a.Hi, -p)
	q2 := (s + (f + (a.Lo - e))) / b
	q, q2 = QuickTwoSum(q, q2)
	return DD{q, q2}
}

// Sqrt returns the square root of a, NaN for a < 0.
func (a DD) Sqrt() DD {
	if a.Hi == 0 {
		return DD{}
	}
	s := math.Sqrt(a.Hi)
	p, e := TwoProd(s, s)
	r := a.Sub(DD{p, e})
	s, e = QuickTwoSum(s, r.Hi/(2*s))
	return DD{s, e}
}

// Cmp returns -1, 0 or +1 as a is below, at or above b.
func (a DD) Cmp(b DD) int {
	switch {
	case a.Hi < b.Hi || a.Hi == b.Hi && a.Lo < b.Lo:
		return -1
	case a.Hi > b.Hi || a.Hi == b.Hi && a.Lo > b.Lo:
		return 1
	}
	return 0
}
