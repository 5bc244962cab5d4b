package special

import (
	"math"

	"subsume.example/internal/dd"
)

// The quick path gives tails and densities inside the normal range to about 2^-60 in the
// prefactor and a few tenths of an ulp in the sum or continued fraction. Its answers are
// ordinary pairs hi + lo, as Scaled with L = 0.

// quickMax is where continued fractions become slow near the mode (of the smaller parameter for
// the beta law) and Mills' ratio takes over; quickLarge bounds the parameters of the quick path.
const (
	quickMax   = 1000
	quickLarge = 1e13
)

// fractionMax bounds the levels of a continued fraction.
const fractionMax = 128

// acc is a compensated sum hi + lo.
type acc struct{ hi, lo float64 }

// add adds the pair h + l.
func (s *acc) add(h, l float64) {
	t, e := dd.TwoSum(s.hi, h)
	s.hi = t
	s.lo += e + l
}

// addProd adds a (h + l).
func (s *acc) addProd(a, h, l float64) {
	p := float64(a * h)
	e := math.FMA(a, h, -p)
	t, f := dd.TwoSum(s.hi, p)
	s.hi = t
	s.lo += f + math.FMA(a, l, e)
}

// pair helpers: two or three ulps of the low part are lost, which is 2^-100.

func mulPair(a, b dd.DD) dd.DD {
	p := float64(a.Hi * b.Hi)
	e := math.FMA(a.Hi, b.Hi, -p) + (a.Hi*b.Lo + a.Lo*b.Hi)
	h := p + e
	return dd.DD{Hi: h, Lo: e - (h - p)}
}

func divPair(a, b dd.DD) dd.DD {
	q := a.Hi / b.Hi
	r := (math.FMA(-q, b.Hi, a.Hi) + (a.Lo - q*b.Lo)) / b.Hi
	h := q + r
	return dd.DD{Hi: h, Lo: r - (h - q)}
}

func sqrtPair(a dd.DD) dd.DD {
	s := math.Sqrt(a.Hi)
	return dd.DD{Hi: s, Lo: (math.FMA(-s, s, a.Hi) + a.Lo) / (2 * s)}
}

// lgamma1p returns log Gamma(1+a+al) for 0 < a < 16 and a low part al, with an error below 2^-62.
func lgamma1p(a, al float64) (hi, lo float64) {
	if k := int(2 * a); float64(k) == 2*a && al == 0 {
		t := &lgammaHalf[k]
		return t.Hi, t.Lo
	}
	i := int(a * 16)
	t := &lgammaTable[i]
	h := a - (float64(i)+0.5)/16
	q := h * h
	q2 := q * q
	c := &t.c
	p := ((c[0] + h*c[1]) + q*(c[2]+h*c[3])) + q2*(((c[4]+h*c[5])+q*(c[6]+h*c[7]))+q2*((c[8]+h*c[9])+q*(c[10]+h*c[11])))
	e := float64(h * t.c1)
	el := math.FMA(h, t.c1, -e) + (h*t.c1l + t.c0l) + al*(t.c1+2*h*c[0])
	s := float64(q * p)
	// |c0| may be below |e| near the zeros at 0 and 1.
	hi, lo = dd.TwoSum(t.c0, e)
	u, v := dd.TwoSum(hi, s)
	return u, lo + v + el
}

// stirlingQuick returns the Stirling error for a >= 16, to about 2^-60.
func stirlingQuick(a float64) float64 {
	r := 1 / a
	q := r * r
	return r * (1.0/12 + q*(-1.0/360+q*(1.0/1260+q*(-1.0/1680+q*(1.0/1188+q*(-691.0/360360+q*(1.0/156-q*(3617.0/122400))))))))
}

// gammaQuickKernel returns x^a e^-x / Gamma(a) as exp(l) m.
func gammaQuickKernel(a float64, x dd.DD) (l acc, m dd.DD) {
	if a < stirlingMin {
		lx := dd.LogQuick(x)
		l.addProd(a, lx.Hi, lx.Lo)
		l.add(-x.Hi, -x.Lo)
		g, gl := lgamma1p(a, 0)
		l.add(-g, -gl)
		return l, dd.DD{Hi: a}
	}
	d, e := dd.TwoSum(x.Hi, -a)
	v := devianceQuick(divPair(dd.DD{Hi: d, Lo: e + x.Lo}, dd.DD{Hi: a}), x, dd.DD{Hi: a})
	l.addProd(-a, v.Hi, v.Lo)
	l.add(-stirlingQuick(a), 0)
	return l, sqrtPair(mulPair(dd.DD{Hi: a}, invTwoPi))
}

// devianceQuick returns u - log(1+u) with relative error below 2^-63, where 1 + u = p/q.
func devianceQuick(u, p, q dd.DD) dd.DD {
	if math.Abs(u.Hi) > 0.1 {
		g := dd.LogQuick(divPair(p, q))
		h, l := dd.TwoSum(u.Hi, -g.Hi)
		return dd.DD{Hi: h, Lo: l + (u.Lo - g.Lo)}
	}
	// s (u - 2 s² (1/3 + s²/5 + ...)), s = u/(2+u): the first two terms with their low parts.
	h, l := dd.QuickTwoSum(2, u.Hi)
	s := divPair(u, dd.DD{Hi: h, Lo: l + u.Lo})
	s2 := mulPair(s, s)
	r := s2.Hi
	t := r * (1.0/5 + r*(1.0/7+r*(1.0/9+r*(1.0/11+r*(1.0/13+r*(1.0/15))))))
	w := mulPair(s2, third)
	h, l = dd.TwoSum(u.Hi, -2*w.Hi)
	return mulPair(s, dd.DD{Hi: h, Lo: l + (u.Lo - 2*(w.Lo+r*t))})
}

// third = 1/3.
var third = dd.DD{Hi: 1.0 / 3, Lo: 0x1.5555555555555p-56}

// invTwoPi = 1/(2 pi).
var invTwoPi = dd.DD{Hi: 0x1.45f306dc9c883p-3, Lo: -0x1.6b01ec5417056p-57}

// quickScaled joins exp(l) and a pair; ok is false outside the range of the quick path.
func quickScaled(l acc, m dd.DD) (Scaled, bool) {
	if !(l.hi > -660 && l.hi < 660) {
		return Scaled{}, false
	}
	return Scaled{M: mulPair(dd.ExpQuick(dd.DD{Hi: l.hi, Lo: l.lo}), m)}, true
}

// quickGammaKernel is GammaKernel on the quick path.
func quickGammaKernel(a float64, x dd.DD) (Scaled, bool) {
	if !(a >= 1e-6 && a <= quickLarge && x.Hi > 1e-280 && x.Hi < 1e14) {
		return Scaled{}, false
	}
	return quickScaled(gammaQuickKernel(a, x))
}

// quickGammaTail is GammaTail on the quick path:
//
//	2a <= 28 whole, x > 0.6a  upper: finite sum
//	a >= 60, |η| <= 0.5, or a >= 1000, |η| <= 1.16
//	                  the tail on the side of x: uniform expansion (temme.go)
//	x <= (a+1)/4      lower: series, its first terms in double-double
//	x <= a            lower: continued fraction, the limit of the beta law's (DLMF 8.9.1, even part)
//	a < x < 2.5       upper: complement of the series, more terms in double-double
//	x > a             upper: continued fraction (DLMF 8.9.2, even part)
func quickGammaTail(a float64, x dd.DD) (t Scaled, upper, ok bool) {
	if !(a >= 1e-3 && a <= quickLarge && x.Hi > 1e-280 && x.Hi < 1e14) {
		return Scaled{}, false, false
	}
	x0 := x.Hi
	if k := 2 * a; k <= finiteGammaMax && k == math.Floor(k) && x0 > 0.6*a && x0 < 650 {
		return gammaFinite(int(k), x), true, true
	}
	if a >= temmeMin && x0 > 0.2*a {
		if t, upper, ok = temmeTail(a, x); ok {
			return t, upper, true
		}
	}
	l, m := gammaQuickKernel(a, x)
	f, ok := quickScaled(l, m)
	if !ok {
		return Scaled{}, false, false
	}
	if x0 <= a {
		if x0 > 0.25*(a+1) {
			if w, ok := gammaLowerFraction(a, x); ok {
				f.M = divPair(f.M, w)
				return f, false, true
			}
		}
		f.M = divPair(mulPair(f.M, gammaQuickSeries(a, x, pairLevels(x0/(a+1)))), dd.DD{Hi: a})
		return f, false, true
	}
	if x0 < 2.5 {
		p := divPair(mulPair(f.M, gammaQuickSeries(a, x, 18)), dd.DD{Hi: a})
		if p.Hi > 0.99 {
			return Scaled{}, false, false
		}
		s := 1 - p.Hi
		return Scaled{M: dd.DD{Hi: s, Lo: ((1 - s) - p.Hi) - p.Lo}}, true, true
	}
	w, ok := gammaFraction(a, x)
	if !ok {
		f.M = f.M.MulF(gammaMills(x0-a+x.Lo, x0, true))
		return f, true, x0 >= 8
	}
	f.M = divPair(f.M, w)
	return f, true, true
}

// gammaQuickSeries returns Σ x^n/((a+1) ... (a+n)) for x < a + 2, the first m levels of the nested form
// in double-double, the rest summed plainly: at most 300 terms.
func gammaQuickSeries(a float64, x dd.DD, m int) dd.DD {
	t, sum := 1.0, 1.0
	for n := float64(m + 1); n < 300; n++ {
		t *= x.Hi / (a + n)
		sum += t
		if t < 0x1p-58*sum {
			break
		}
	}
	s := dd.DD{Hi: sum}
	for k := m; k >= 1; k-- {
		d, e := dd.TwoSum(a, float64(k))
		p := mulPair(divPair(x, dd.DD{Hi: d, Lo: e}), s)
		h, l := dd.TwoSum(1, p.Hi)
		s = dd.DD{Hi: h, Lo: l + p.Lo}
	}
	return s
}

// gammaFraction returns the w with Γ(a, x) = x^a e^-x / w:
//
//	w = x+1-a - 1(1-a)/(x+3-a - 2(2-a)/(x+5-a - ...))
//
// The inner levels are run forward until two convergents agree, at most fractionMax levels; the
// outer one is in double-double, which damps their rounding errors.
func gammaFraction(a float64, x dd.DD) (w dd.DD, ok bool) {
	b0, e := dd.TwoSum(x.Hi, -a)
	c := b0 + e // x - a, rounded
	// v = b1 - c2/(b2 - c3/(b3 - ...)), b_k = x-a+2k+1, c_k = k(k-a).
	p0, p1 := 1.0, c+3
	q0, q1 := 0.0, 1.0
	last := 0.0
	v := p1
	for k := 2.0; k < 2+fractionMax; k += 4 {
		for j := range 4 {
			n := k + float64(j)
			b, g := c+(2*n+1), n*(n-a)
			p0, p1 = p1, b*p1-g*p0
			q0, q1 = q1, b*q1-g*q0
		}
		v = p1 / q1
		if math.Abs(v-last) <= 0x1p-50*v {
			ok = true
			break
		}
		last = v
		if p1 > 0x1p400 {
			p0, p1, q0, q1 = p0*0x1p-400, p1*0x1p-400, q0*0x1p-400, q1*0x1p-400
		}
	}
	r := (1 - a) / v
	h, l := dd.TwoSum(b0, 1)
	h, l2 := dd.TwoSum(h, -r)
	return dd.DD{Hi: h, Lo: l + l2 + e + x.Lo}, ok
}

// gammaLowerFraction returns the w with γ(a, x) = x^a e^-x / w for x <= a: the fraction of
// Didonato and Morris (see betaFraction) for b -> +Inf at x/b, w = β0 + α1/(β1 + ...),
//
//	α_m = (a+m-1) m x² / (a+2m-1)²
//	β_m = m + m x/(a+2m-1) + (a+m) (a-x+1+2m)/(a+2m+1).
func gammaLowerFraction(a float64, x dd.DD) (w dd.DD, ok bool) {
	x0 := x.Hi
	c, ce := dd.TwoSum(a, -x0)
	ce -= x.Lo
	c1 := c + ce + 1
	d := x0 / (a + 1)
	r := 1 / (a + 3)
	a1 := a * d * d
	p0, p1 := 1.0, 1+d+(a+1)*(c1+2)*r
	q0, q1 := 0.0, 1.0
	v := p1
	last := 0.0
	for k := 2.0; k < 2+fractionMax; k += 4 {
		for j := range 4 {
			m := k + float64(j)
			d = x0 * r
			r = 1 / (a + (2*m + 1))
			al := (a + (m - 1)) * m * d * d
			be := m + m*d + (a+m)*(c1+2*m)*r
			p0, p1 = p1, be*p1+al*p0
			q0, q1 = q1, be*q1+al*q0
		}
		v = p1 / q1
		if math.Abs(v-last) <= 0x1p-50*math.Abs(v) {
			ok = true
			break
		}
		last = v
		if p1 > 0x1p400 {
			p0, p1, q0, q1 = p0*0x1p-400, p1*0x1p-400, q0*0x1p-400, q1*0x1p-400
		}
	}
	h, l := dd.TwoSum(c, 1)
	num := mulPair(dd.DD{Hi: h, Lo: l + ce}, dd.DD{Hi: a})
	h, l = dd.TwoSum(a, 1)
	b0 := divPair(num, dd.DD{Hi: h, Lo: l})
	h, l = dd.TwoSum(b0.Hi, a1/v)
	return dd.DD{Hi: h, Lo: l + b0.Lo}, ok
}

// pairLevels returns how many levels of a nested series with quotient r need double-double, so that
// the rounding errors of the rest count for less than a tenth.
func pairLevels(r float64) int {
	switch {
	case r < 0.03:
		return 1
	case r < 0.2:
		return 2
	case r < 0.4:
		return 3
	}
	return 5
}
