package special

import (
	"math"

	"subsume.example/internal/dd"
)

// The uniform expansion is used for a >= temmeMin and |η| <= 0.5, and for a >= 1000 and |η| <= temmeMax, where
// it covers tails down to e^-660.
const (
	temmeMin = 60
	temmeMax = 1.16
)

// temmeTail returns the upper tail Q(a, x) for x >= a, else the lower one, for a >= temmeMin, by the
// uniform expansion of Temme (1979; DLMF 8.12.3 to 8.12.8),
//
//	e^(-aη²/2) (M(|η|√a)/√(2π) ± Σ_k c_k(η) a^-k / √(2πa)),  η²/2 = x/a - 1 - log(x/a),
//
// with M Mills' ratio of the normal law and η of the sign of x - a. The exponent is in double-double. Five c_k leave
// c_5 a^-5/√a < 1e-18 at a = 1000, seven leave c_7 a^-7/√a < 2e-17 at a = 60; their Taylor series (radius 2√π)
// are cut below 1e-17 of the whole for |η| <= 0.02, 0.3, 0.5 and 1.16.
func temmeTail(a float64, x dd.DD) (t Scaled, upper, ok bool) {
	h, l := dd.TwoSum(x.Hi, -a)
	l += x.Lo
	upper = h+l >= 0
	v := devianceQuick(divPair(dd.DD{Hi: h, Lo: l}, dd.DD{Hi: a}), x, dd.DD{Hi: a})
	var e acc
	e.addProd(-a, v.Hi, v.Lo)
	eta := math.Sqrt(2 * v.Hi)
	if !(e.hi > -660 && eta <= temmeMax) || a < quickMax && eta > 0.5 {
		return Scaled{}, upper, false
	}
	m := millsPositive(math.Sqrt(-2 * (e.hi + e.lo)))
	if !upper {
		eta = -eta
	}
	r := 1 / a
	var s float64
	switch abs := math.Abs(eta); {
	case a < quickMax:
		s = taylor(temme0[:20], eta) + r*(taylor(temme1[:17], eta)+r*(taylor(temme2[:14], eta)+r*(taylor(temme3[:11], eta)+
			r*(taylor(temme4[:9], eta)+r*(taylor(temme5[:], eta)+r*taylor(temme6[:], eta))))))
	case abs <= 0.02:
		s = taylor(temme0[:9], eta) + r*(taylor(temme1[:7], eta)+r*(taylor(temme2[:4], eta)+r*(temme3[0]+r*temme4[0])))
	case abs <= 0.3:
		s = taylor(temme0[:17], eta) + r*(taylor(temme1[:14], eta)+r*(taylor(temme2[:11], eta)+r*(taylor(temme3[:8], eta)+r*taylor(temme4[:4], eta))))
	default:
		s = taylor(temme0[:], eta) + r*(taylor(temme1[:], eta)+r*(taylor(temme2[:], eta)+r*(taylor(temme3[:], eta)+r*taylor(temme4[:], eta))))
	}
	s /= math.Sqrt(a)
	if !upper {
		s = -s
	}
	b, c := dd.TwoSum(m, s)
	return Scaled{M: mulPair(dd.ExpQuick(dd.DD{Hi: e.hi, Lo: e.lo}), mulPair(dd.DD{Hi: b, Lo: c}, invSqrtTwoPi))}, upper, true
}

// taylor returns Σ c[n] x^n.
func taylor(c []float64, x float64) float64 {
	// Even and odd terms apart: two chains half as long.
	y := x * x
	p, q := 0.0, 0.0
	n := len(c)
	if n&1 == 1 {
		n--
		p = c[n]
	}
	for n -= 2; n >= 0; n -= 2 {
		p = p*y + c[n]
		q = q*y + c[n+1]
	}
	return p + x*q
}

// invSqrtTwoPi = 1/sqrt(2 pi).
var invSqrtTwoPi = dd.DD{Hi: 0x1.9884533d43651p-2, Lo: -0x1.cbc0d30ebfd15p-56}
