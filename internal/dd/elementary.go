package dd

import "math"

// Elementary functions to about 100 bits. Each reduces its argument by a table
// (elementary_tables.go) and sums a short series: the leading terms in
// double-double, those below 2^-54 of the result in plain arithmetic.

// Exp returns e^a with relative error below 2^-100 as long as |a| < 2^10 and
// the result and its low part are normal numbers; 0 below and +Inf above the range.
func Exp(a DD) DD {
	m, k := ExpScaled(a)
	if k > 2000 {
		return DD{Hi: math.Inf(1)}
	}
	if k < -2000 {
		return DD{}
	}
	return m.Scale(k)
}

// ExpScaled returns m and k with e^a = m 2^k and m in [0.7, 1.5], so that the
// value may lie far outside the range of a float64. |a| is cut at 2^40; the
// relative error grows as 2^-106 |a| for |a| > 2^12. NaN gives NaN.
func ExpScaled(a DD) (m DD, k int) {
	switch {
	case math.IsNaN(a.Hi):
		return DD{Hi: a.Hi}, 0
	case a.Hi > 0x1p40:
		a = DD{Hi: 0x1p40}
	case a.Hi < -0x1p40:
		a = DD{Hi: -0x1p40}
	}
	n := math.RoundToEven(a.Hi * (1 / math.Ln2))
	// r = a - n log 2: for |n| <= 2^13 the first two products are exact.
	r := DD{Hi: a.Hi, Lo: a.Lo}
	if math.Abs(n) <= 1<<13 {
		s, e := TwoSum(a.Hi, -float64(n*ln2p1))
		f, g := TwoSum(e, a.Lo)
		s, f2 := TwoSum(s, f)
		r = DD{s, f2}.AddF(g)
		r = r.AddF(-float64(n * ln2p2))
		r = r.Add(Prod(n, -ln2p3))
	} else {
		r = r.Sub(Prod(n, ln2p1)).Sub(Prod(n, ln2p2)).Sub(Prod(n, ln2p3))
	}
	j := math.RoundToEven(r.Hi * 64)
	r = r.AddF(-j / 64)
	// e^r = 1 + r + r²/2 + ..., |r| <= 1/128.
	m = expTable[int(j)+expHalf]
	return m.Add(m.Mul(expm1Small(r))), int(n)
}

// expm1Small returns e^r - 1 for |r| <= 1/64.
func expm1Small(r DD) DD {
	x := r.Hi
	t := x * (invFactorial[8].Hi + x*(invFactorial[9].Hi+x*(invFactorial[10].Hi+x*(invFactorial[11].Hi+
		x*(invFactorial[12].Hi+x*invFactorial[13].Hi)))))
	p := invFactorial[7].AddF(t)
	for n := 6; n >= 1; n-- {
		p = p.Mul(r).Add(invFactorial[n])
	}
	return p.Mul(r)
}

// Expm1 returns e^a - 1 without cancellation.
func Expm1(a DD) DD {
	if math.Abs(a.Hi) <= 1.0/64 {
		if a.Hi == 0 {
			return a
		}
		return expm1Small(a)
	}
	e := Exp(a)
	if math.IsInf(e.Hi, 1) {
		return e
	}
	return e.AddF(-1)
}

// Log returns the natural logarithm of a: relative error below 2^-98, near 1
// too. -Inf for 0, NaN for a < 0, +Inf for +Inf.
func Log(a DD) DD {
	switch {
	case math.IsNaN(a.Hi) || a.Hi < 0:
		return DD{Hi: math.NaN()}
	case a.Hi == 0:
		return DD{Hi: math.Inf(-1)}
	case math.IsInf(a.Hi, 1):
		return DD{Hi: a.Hi}
	}
	shift := 0
	if a.Hi < 0x1p-900 {
		a, shift = DD{a.Hi * 0x1p200, a.Lo * 0x1p200}, -200
	}
	bits := math.Float64bits(a.Hi)
	e := int(bits>>52) - 1023
	i := int(bits>>45) & 127
	scale := math.Float64frombits(uint64(1023-e) << 52)
	if e >= 1023 {
		scale = 0x1p-1023
	}
	t := &logTable[i]
	if i >= 53 {
		e++
	}
	// z = m c - 1: both products are exact or rounded below 2^-106 of m c.
	h, l := TwoProd(a.Hi*scale, t.c)
	l2 := a.Lo * scale * t.c
	z := DD{Hi: h - 1}
	z.Hi, z.Lo = TwoSum(z.Hi, l)
	z = z.AddF(l2)
	r := log1pSmall(z)
	if i2 := e + shift; i2 != 0 || t.hi != 0 {
		n := float64(i2)
		c := DD{t.hi, t.lo}
		if i2 != 0 {
			s := Sum(float64(n*ln2p1), float64(n*ln2p2)).AddF(float64(n * ln2p3))
			c = s.Add(c)
		}
		r = c.Add(r)
	}
	return r
}

// log1pSmall returns log(1+z) for |z| <= 1/32 by 2 atanh(z/(2+z)).
func log1pSmall(z DD) DD {
	if z.Hi == 0 {
		return z
	}
	s := z.Div(z.AddF(2))
	q := s.Sqr()
	x := q.Hi
	t := x * (invOdd[4].Hi + x*(invOdd[5].Hi+x*(invOdd[6].Hi+x*(invOdd[7].Hi+x*(invOdd[8].Hi+x*invOdd[9].Hi)))))
	p := invOdd[3].AddF(t)
	p = p.Mul(q).Add(invOdd[2])
	p = p.Mul(q).Add(invOdd[1])
	p = p.Mul(q).Mul(s).Add(s)
	return DD{2 * p.Hi, 2 * p.Lo}
}

// Log1p returns log(1 + a) without cancellation: relative error below 2^-98.
func Log1p(a DD) DD {
	if math.Abs(a.Hi) <= 1.0/32 {
		return log1pSmall(a)
	}
	return Log(a.AddF(1))
}

// Log1pmx returns log(1+a) - a, which is at most 0, without cancellation near
// 0: relative error below 2^-95. NaN for a < -1.
func Log1pmx(a DD) DD {
	if math.Abs(a.Hi) > 0.2 {
		return Log1p(a).Sub(a)
	}
	if a.Hi == 0 {
		return DD{}
	}
	// With s = a/(2+a): log(1+a) = 2(s + s³/3 + ...) and a - 2s = a s, so
	// log(1+a) - a = -s (a - 2 s² (1/3 + s²/5 + ...)).
	s := a.Div(a.AddF(2))
	q := s.Sqr()
	x := q.Hi
	// |s| <= 1/9: s² <= 2^-6.3.
	t := 0.0
	for n := 20; n >= 9; n-- {
		t = x * (1/float64(2*n+1) + t)
	}
	p := invOdd[8].AddF(t)
	for n := 7; n >= 1; n-- {
		p = p.Mul(q).Add(invOdd[n])
	}
	p = p.Mul(q)
	return s.Mul(DD{2 * p.Hi, 2 * p.Lo}.Sub(a))
}

// Pow returns a^b for a >= 0: relative error about 2^-98 (1 + |b log a|).
// Pow(0, b) is 0, 1 or +Inf as b is above, at or below 0.
func Pow(a, b DD) DD {
	switch {
	case b.Hi == 0:
		return DD{Hi: 1}
	case a.Hi == 0 && b.Hi > 0:
		return DD{}
	case a.Hi == 0:
		return DD{Hi: math.Inf(1)}
	}
	return Exp(Log(a).Mul(b))
}
