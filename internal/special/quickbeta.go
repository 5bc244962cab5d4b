package special

import (
	"math"

	"subsume.example/internal/dd"
)

// lgammaBig returns log Gamma(1+a) for 16 <= a <= 32.
func lgammaBig(a dd.DD) (hi, lo float64) {
	if k := int(2 * a.Hi); float64(k) == 2*a.Hi && a.Lo == 0 {
		t := &lgammaHalf[k]
		return t.Hi, t.Lo
	}
	var l acc
	g := dd.LogQuick(a)
	l.addProd(a.Hi, g.Hi, g.Lo)
	l.add(0.5*g.Hi, 0.5*g.Lo) // a + 1/2 rounds from 31.5 up
	l.addProd(a.Lo, g.Hi, 0)
	l.add(-a.Hi, -a.Lo)
	l.add(halfLog2Pi.Hi, halfLog2Pi.Lo)
	l.add(stirlingQuick(a.Hi), 0)
	return l.hi, l.lo
}

// betaQuickKernel returns x^a y^b / B(a, b) as exp(l) m. Logarithms that are multiplied by a
// large parameter are near 0 and relatively right.
func betaQuickKernel(a, b float64, x, y dd.DD) (l acc, m dd.DD) {
	s := dd.Sum(a, b)
	lo, hi := min(a, b), max(a, b)
	if lo >= stirlingMin {
		// With n = x b - y a: deviance a (u - log(1+u)) + b (v - log(1+v)), u = n/a, v = -n/b.
		n := mulPair(x, dd.DD{Hi: b})
		m := mulPair(y, dd.DD{Hi: a})
		h, e := dd.TwoSum(n.Hi, -m.Hi)
		n = dd.DD{Hi: h, Lo: e + (n.Lo - m.Lo)}
		u := devianceQuick(divPair(n, dd.DD{Hi: a}), mulPair(x, s), dd.DD{Hi: a})
		v := devianceQuick(divPair(n, dd.DD{Hi: -b}), mulPair(y, s), dd.DD{Hi: b})
		l.addProd(-a, u.Hi, u.Lo)
		l.addProd(-b, v.Hi, v.Lo)
		l.add(stirlingQuick(s.Hi)-stirlingQuick(a)-stirlingQuick(b), 0)
		return l, sqrtPair(mulPair(divPair(dd.Prod(a, b), s), invTwoPi))
	}
	u, v := dd.LogQuick(x), dd.LogQuick(y)
	if y.Hi < 0x1p-20 {
		u = log1mQuick(y)
	}
	if x.Hi < 0x1p-20 {
		v = log1mQuick(x)
	}
	l.addProd(a, u.Hi, u.Lo)
	l.addProd(b, v.Hi, v.Lo)
	g, gl := lgamma1p(lo, 0)
	l.add(-g, -gl)
	if hi >= stirlingMin {
		// Gamma(s)/Gamma(hi) = hi^lo exp((s-1/2) log(s/hi) - lo + δ(s) - δ(hi)).
		w := dd.LogQuick(dd.DD{Hi: hi})
		l.addProd(lo, w.Hi, w.Lo)
		w = dd.LogQuick(divPair(s, dd.DD{Hi: hi}))
		l.addProd(s.Hi-0.5, w.Hi, w.Lo)
		l.addProd(s.Lo, w.Hi, 0)
		l.add(-lo, 0)
		l.add(stirlingQuick(s.Hi)-stirlingQuick(hi), 0)
		return l, dd.DD{Hi: lo}
	}
	g, gl = lgamma1p(hi, 0)
	l.add(-g, -gl)
	if s.Hi < stirlingMin {
		g, gl = lgamma1p(s.Hi, s.Lo)
	} else {
		g, gl = lgammaBig(s)
	}
	l.add(g, gl)
	return l, divPair(dd.Prod(a, b), s)
}

// log1mQuick returns log(1-x) for x < 2^-20.
func log1mQuick(x dd.DD) dd.DD {
	q := x.Hi * x.Hi
	return dd.DD{Hi: -x.Hi, Lo: -x.Lo - q*(0.5+x.Hi*(1.0/3+x.Hi*0.25))}
}

// quickBetaKernel is BetaKernel on the quick path.
func quickBetaKernel(a, b float64, x, y dd.DD) (Scaled, bool) {
	if !(min(a, b) >= 1e-6 && max(a, b) <= quickLarge && min(x.Hi, y.Hi) > 1e-280) {
		return Scaled{}, false
	}
	return quickScaled(betaQuickKernel(a, b, x, y))
}

// quickBetaTail is BetaTail on the quick path. With the arguments exchanged so that
// x <= a/(a+b):
//
//	a or b whole <= 16, both multiples of 1/2         finite sum (finiteBetaTail)
//	quotient of terms below 0.5, or x < 0.35, a < 8   series, its first terms in double-double
//	x > 0.9, y (a+b) < 3                             complement of the series in y, more terms in double-double
//	both above quickMax                              Mills ratio by quadrature
//	otherwise                                        continued fraction of Didonato and Morris (1992); left
//	                                                 to the full path where it is slow (x near 1)
func quickBetaTail(a, b float64, x, y dd.DD) (t Scaled, upper, ok bool) {
	if !(min(a, b) >= 1e-3 && max(a, b) <= quickLarge && min(x.Hi, y.Hi) > 1e-280) {
		return Scaled{}, false, false
	}
	var c acc
	c.addProd(a, y.Hi, y.Lo)
	c.addProd(-b, x.Hi, x.Lo)
	if c.hi+c.lo < 0 {
		a, b, x, y, upper = b, a, y, x, true
		c.hi, c.lo = -c.hi, -c.lo
	}
	s := dd.Sum(a, b)
	r := x.Hi * max(1, s.Hi/(a+1))
	if r > 0.25 {
		if t, ok := finiteBetaTail(a, b, x, y); ok {
			return t, upper, true
		}
	}
	f, ok := quickBetaKernel(a, b, x, y)
	if !ok {
		return f, false, false
	}
	if r < 0.5 || x.Hi < 0.35 && a < 8 {
		f.M = divPair(mulPair(f.M, betaQuickSeries(a, s, x, pairLevels(r))), dd.DD{Hi: a})
		return f, upper, true
	}
	if x.Hi > 0.9 && y.Hi*s.Hi < 3 {
		p := divPair(mulPair(f.M, betaQuickSeries(b, s, y, 18)), dd.DD{Hi: b})
		if p.Hi > 0.99 {
			return Scaled{}, false, false
		}
		v := 1 - p.Hi
		return Scaled{M: dd.DD{Hi: v, Lo: ((1 - v) - p.Hi) - p.Lo}}, upper, true
	}
	if min(a, b) > quickMax && r > 0.6 {
		f.M = f.M.MulF(betaMills(c.hi+c.lo, s.Hi, x.Hi, y.Hi))
		return f, upper, true
	}
	w, ok := betaFraction(a, b, s.Hi, c, x)
	f.M = divPair(f.M, w)
	return f, upper, ok
}

// finiteBetaTail returns I_x(a, b) by a finite sum where one of a, b is whole and
// small, the other a multiple of 1/2:
//
//	b whole   directly
//	a whole   1 - I_y(b, a), down to 1e-10, which leaves 2^-60
func finiteBetaTail(a, b float64, x, y dd.DD) (Scaled, bool) {
	a2, b2 := 2*a, 2*b
	if a2 != math.Floor(a2) || b2 != math.Floor(b2) || a2 > 200 || b2 > 200 {
		return Scaled{}, false
	}
	if b <= finiteBetaMax && b == math.Floor(b) {
		if p := betaFinite(a, int(b), x, y); p.Hi > 1e-250 {
			return Scaled{M: p}, true
		}
		return Scaled{}, false
	}
	if a <= finiteBetaMax && a == math.Floor(a) {
		p := betaFinite(b, int(a), y, x)
		if v := 1 - p.Hi; v > 1e-10 {
			h, l := dd.QuickTwoSum(v, ((1-v)-p.Hi)-p.Lo)
			return Scaled{M: dd.DD{Hi: h, Lo: l}}, true
		}
	}
	return Scaled{}, false
}

// betaQuickSeries returns Σ (s)_n/((a+1) ... (a+n)) x^n: the first m levels of the nested form in
// double-double, the rest summed plainly, at most 300 terms.
func betaQuickSeries(a float64, s, x dd.DD, m int) dd.DD {
	t, sum := 1.0, 1.0
	for n := float64(m + 1); n < 300; n++ {
		t *= x.Hi * (s.Hi + (n - 1)) / (a + n)
		sum += t
		if t < 0x1p-58*sum {
			break
		}
	}
	r := dd.DD{Hi: sum}
	for k := m; k >= 1; k-- {
		d, e := dd.TwoSum(a, float64(k))
		g, h := dd.TwoSum(s.Hi, float64(k-1))
		p := divPair(mulPair(mulPair(x, dd.DD{Hi: g, Lo: h + s.Lo}), r), dd.DD{Hi: d, Lo: e})
		u, l := dd.TwoSum(1, p.Hi)
		r = dd.DD{Hi: u, Lo: l + p.Lo}
	}
	return r
}

// betaFraction returns the w with I_x(a, b) = x^a y^b / (B(a, b) w) (Didonato and Morris, ACM
// TOMS 18, 1992, equation 9): w = β0 + α1/(β1 + α2/(β2 + ...)) with c = a y - b x and
//
//	α_m = (a+m-1)(a+b+m-1) m (b-m) x² / (a+2m-1)²
//	β_m = m + m (b-m) x/(a+2m-1) + (a+m) (c + 1 + m (2-x))/(a+2m+1)
//
// The inner levels are run forward until two convergents agree, at most fractionMax; the outer one
// is in double-double.
func betaFraction(a, b, s float64, c acc, x dd.DD) (w dd.DD, ok bool) {
	x0 := x.Hi
	c1 := c.hi + c.lo + 1
	y1 := 2 - x0
	d := 1 / (a + 1) // 1/(a+2m-1)
	e := 1 / (a + 3) // 1/(a+2m+1)
	a1 := a * s * (b - 1) * (x0 * d) * (x0 * d)
	p0, p1 := 1.0, 1+(b-1)*x0*d+(a+1)*(c1+y1)*e
	q0, q1 := 0.0, 1.0
	v := p1
	last := 0.0
	for k := 2.0; k < 2+fractionMax; k += 4 {
		for j := range 4 {
			m := k + float64(j)
			d = e
			e = 1 / (a + (2*m + 1))
			u := x0 * d
			g := m * (b - m) * u
			al := (a + (m - 1)) * (s + (m - 1)) * g * u
			be := m + g + (a+m)*(c1+m*y1)*e
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
	// β0 = a (c+1)/(a+1)
	h, l := dd.TwoSum(c.hi, 1)
	num := mulPair(dd.DD{Hi: h, Lo: l + c.lo}, dd.DD{Hi: a})
	h, l = dd.TwoSum(a, 1)
	b0 := divPair(num, dd.DD{Hi: h, Lo: l})
	h, l = dd.TwoSum(b0.Hi, a1/v)
	return dd.DD{Hi: h, Lo: l + b0.Lo}, ok && h > 0
}
