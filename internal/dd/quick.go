package dd

import "math"

// The quick functions give about 64 bits, enough for a float64 result that is
// right to a few thousandths of an ulp, at a tenth of the cost of the full
// ones: only the leading terms of each series keep their low parts.

// ExpQuickScaled returns m and k with e^a = m 2^k, m in [1, 2), with relative error below
// 2^-63, for |a| < 2^16.
func ExpQuickScaled(a DD) (m DD, k int) {
	// r = a - n log(2)/64: the first product is exact.
	n := math.RoundToEven(a.Hi * (64 / math.Ln2))
	r := math.FMA(-n, ln2by64p1, a.Hi)
	r2 := math.FMA(-n, ln2by64p2, a.Lo)
	h := r + r2
	l := r2 - (h - r)
	i := int(n)
	t := &exp2Table[i&63]
	// e^r - 1 = r + r²/2 + ..., |r| <= 0.0055.
	q := h * h
	p := q * ((0.5 + h*(1.0/6)) + q*((1.0/24+h*(1.0/120))+q*(1.0/720+h*(1.0/5040))))
	ph := float64(t.Hi * h)
	pl := math.FMA(t.Hi, h, -ph)
	s := t.Hi + ph
	e := ph - (s - t.Hi)
	e += t.Lo + (pl + math.FMA(t.Hi, l+p, t.Lo*h))
	hi := s + e
	return DD{hi, e - (hi - s)}, i >> 6
}

// ExpQuick returns e^a with relative error below 2^-63 for -690 < a < 700.
func ExpQuick(a DD) DD {
	m, k := ExpQuickScaled(a)
	f := math.Float64frombits(uint64(k+1023) << 52)
	return DD{m.Hi * f, m.Lo * f}
}

// LogQuick returns log a for a normal number a > 0: absolute error below 2^-64 of
// max(1, |log a|), and relative error below 2^-63 near 1.
func LogQuick(a DD) DD {
	bits := math.Float64bits(a.Hi)
	e := int(bits>>52) - 1023
	i := int(bits>>45) & 127
	t := &logTable[i]
	m := math.Float64frombits(bits&(1<<52-1) | 1023<<52)
	ml := a.Lo
	if e < 1023 {
		ml *= math.Float64frombits(uint64(1023-e) << 52)
	} else {
		ml *= 0x1p-1023
	}
	if i >= 53 {
		e++
	}
	h := float64(m * t.c)
	l := math.FMA(m, t.c, -h) + ml*t.c
	d := h - 1
	z := d + l
	l -= z - d
	// log(1+z) = z - z²/2 + z³/3 - ..., |z| <= 2^-6.
	q := float64(z * z)
	ql := math.FMA(z, z, -q)
	q4 := q * q
	p := z * q * (((1.0/3 - z*(1.0/4)) + q*(1.0/5-z*(1.0/6))) + q4*((1.0/7-z*(1.0/8))+q*(1.0/9-z*(1.0/10))+q4*(1.0/11-z*(1.0/12))))
	g := -0.5 * q // exact
	s := g + z
	low := g - (s - z)
	low += p + (l - (0.5*ql + z*l))
	if e == 0 && t.hi == 0 {
		hi := s + low
		return DD{hi, low - (hi - s)}
	}
	n := float64(e)
	big := float64(n * ln2p1)
	b, c := TwoSum(big, t.hi)
	c += math.FMA(n, ln2p2, t.lo)
	hi, f := TwoSum(b, s)
	low += f + c
	r := hi + low
	return DD{r, low - (r - hi)}
}

// DivQuick returns a / b with relative error below 2^-100.
func (a DD) DivQuick(b DD) DD {
	q := a.Hi / b.Hi
	r := (math.FMA(-q, b.Hi, a.Hi) + (a.Lo - float64(q*b.Lo))) / b.Hi
	h := q + r
	return DD{h, r - (h - q)}
}

// Quotient returns b / a with relative error below 2^-99, given inv = 1/a.Hi rounded: it saves
// divisions where several quotients share a divisor.
func (a DD) Quotient(b DD, inv float64) DD {
	q := float64(b.Hi * inv)
	r := (math.FMA(-q, a.Hi, b.Hi) + (b.Lo - float64(q*a.Lo))) * inv
	h := q + r
	return DD{h, r - (h - q)}
}
