package special

import (
	"math"

	"subsume.example/internal/dd"
)

// Finite sums for whole degrees of freedom: all terms positive, in double-double with
// plain coefficients, so they cost little more than one exponential.

// finiteGammaMax bounds 2a in gammaFinite: the coefficients stay exact.
const finiteGammaMax = 28

// twoOverSqrtPi = 2/sqrt(pi).
var twoOverSqrtPi = dd.DD{Hi: 0x1.20dd750429b6dp+0, Lo: 0x1.1ae3a914fed8p-56}

// gammaFinite returns Q(k/2, x) for 1 <= k <= finiteGammaMax and 0 < x < 650:
//
//	k even  e^-x Σ_{j<k/2} x^j/j!                                        (DLMF 8.4.10)
//	k odd   erfc(√x) + e^-x 2√(x/π) Σ_{j<(k-1)/2} (2x)^j/(1·3···(2j+1))   (DLMF 8.4.6 and 8.8.2)
//
// with erfc(√x) = e^-x √(2/π) M(√(2x)) by the Mills ratio of the normal law.
func gammaFinite(k int, x dd.DD) Scaled {
	e := dd.ExpQuick(dd.DD{Hi: -x.Hi, Lo: -x.Lo})
	if k&1 == 0 {
		// (n! e^x Q) = Σ x^j n!/j!, n = k/2 - 1; coefficients from the top are 1, n, n(n-1), ...
		n := float64(k/2 - 1)
		s, c := horner(x, n, 1)
		s.Hi, s.Lo = s.Hi/c, s.Lo/c+math.FMA(-s.Hi/c, c, s.Hi)/c
		return Scaled{M: mulPair(e, s)}
	}
	m := 2 * invSqrt2Pi * millsPositive(math.Sqrt(2*x.Hi))
	if k == 1 {
		p := float64(e.Hi * m)
		return Scaled{M: dd.DD{Hi: p, Lo: math.FMA(e.Hi, m, -p) + e.Lo*m}}
	}
	// (2n+1)!! times the sum, n = (k-3)/2: coefficients from the top are 1, 2n+1, (2n+1)(2n-1), ...
	n := float64(k - 2)
	s, c := horner(dd.DD{Hi: 2 * x.Hi, Lo: 2 * x.Lo}, n, 2)
	r := sqrtPair(x)
	s = mulPair(mulPair(s, r), divPair(twoOverSqrtPi, dd.DD{Hi: c}))
	h, l := dd.TwoSum(s.Hi, m)
	return Scaled{M: mulPair(e, dd.DD{Hi: h, Lo: l + s.Lo})}
}

// horner returns Σ x^j c_j with the top coefficient 1 and each lower one the next times
// n, n-step, n-2 step, ... down to the last positive factor (for step 2 the factor 1 is the last
// coefficient's divisor and not a term); and the lowest coefficient.
func horner(x dd.DD, n, step float64) (s dd.DD, c float64) {
	h, l, c := 1.0, 0.0, 1.0
	for f := n; f >= step; f -= step {
		c *= f
		p := float64(h * x.Hi)
		e := math.FMA(h, x.Hi, -p)
		l = l*x.Hi + h*x.Lo + e
		h, e = dd.TwoSum(p, c)
		l += e
	}
	return dd.DD{Hi: h, Lo: l}, c
}

// finiteBetaMax bounds the number of terms of betaFinite.
const finiteBetaMax = 16

// betaFinite returns x^a Σ_{j<n} (a)_j/j! y^j = I_x(a, n) for a whole n and x + y = 1 (complement of DLMF 8.17.24),
// for a a multiple of 1/2 to 2^-95.
func betaFinite(a float64, n int, x, y dd.DD) dd.DD {
	s := dd.DD{Hi: 1}
	for j := float64(n - 1); j >= 1; j-- {
		// (a+j-1)/j as a pair
		d := a + (j - 1)
		q := float64(d * reciprocal[int(j)])
		r := dd.DD{Hi: q, Lo: math.FMA(-q, j, d) * reciprocal[int(j)]}
		p := mulPair(mulPair(r, y), s)
		h, l := dd.QuickTwoSum(1, p.Hi)
		if p.Hi > 1 {
			h, l = dd.QuickTwoSum(p.Hi, 1)
		}
		s = dd.DD{Hi: h, Lo: l + p.Lo}
	}
	return mulPair(halfPower(x, int(2*a)), s)
}

// halfPower returns x^(k/2), k >= 0, by squaring and a root.
func halfPower(x dd.DD, k int) dd.DD {
	r := dd.DD{Hi: 1}
	if k&1 == 1 {
		r = sqrtPair(x)
	}
	for k >>= 1; k > 0; k >>= 1 {
		if k&1 == 1 {
			r = mulPair(r, x)
		}
		x = mulPair(x, x)
	}
	return r
}

// reciprocal[j] = 1/j.
var reciprocal = func() (t [finiteBetaMax + 1]float64) {
	for j := 1; j <= finiteBetaMax; j++ {
		t[j] = 1 / float64(j)
	}
	return t
}()
