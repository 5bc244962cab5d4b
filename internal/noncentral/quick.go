package noncentral

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// The quick form of the mixtures serves the everyday values: T_0 and the
// central tail inside the normal range, λ at most quickLambda. Numbers are pairs hi + lo that are not
// renormalized (lo stays below some 100 ulps of hi), so that the chain of
// dependent operations is as short as in plain arithmetic; products lose
// 2^-100, and the central pieces hold 2^-58 or so. As the terms are absolute and T_j, Q_j and
// W_j e^{-λ/2} at most 1, none leaves the range.
const (
	quickLambda = 600
	quickSmall  = 1e-150 // times e^{-λ/2} still a normal number
	quickTerms  = 160
	plain       = 0x1p-10 // terms below this part of the sum need no low parts
	quickTiny   = 0x1p-58 // terms below this part of the sum, falling by half, end it
)

// reciprocal holds 1/j as a pair.
var reciprocal = func() (r [quickTerms + 2]dd.DD) {
	for j := 1; j < len(r); j++ {
		h := 1 / float64(j)
		r[j] = dd.DD{Hi: h, Lo: math.FMA(-float64(j), h, 1) * h}
	}
	return r
}()

// quickSums runs over the mixture at once: the wanted tail, and in plain arithmetic the kernel and
// the slope.
type quickSums struct {
	tail          dd.DD
	kernel, slope float64
}

// quick returns the tail and, if wanted, the density of log X and the
// derivative in λ; ok is false outside its range.
func (m *mixture) quick(upper bool) (r quickSums, ok bool) {
	if m.end != 0 || !(m.half.Hi <= quickLambda/2) {
		return r, false
	}
	t, ok := m.quickFirst()
	if !ok {
		return r, false
	}
	t = t.DivF(m.a)
	if upper {
		ok = m.quickUpper(t, &r)
	} else {
		ok = m.quickLower(t, &r)
	}
	e := dd.ExpQuick(m.half.Neg())
	r.tail = r.tail.Mul(e)
	r.kernel *= e.Hi
	r.slope *= e.Hi / 2
	return r, ok
}

// quickFirst returns T_0 a.
func (m *mixture) quickFirst() (dd.DD, bool) {
	var t special.Scaled
	if m.beta {
		t = special.BetaKernelQuick(dd.From(m.a), dd.From(m.b), m.y, m.y1)
	} else {
		t = special.GammaKernelQuick(dd.From(m.a), m.y)
	}
	return t.M, t.L.Hi == 0 && t.M.Hi > quickSmall
}

// quickKernel returns the density of log X.
func (m *mixture) quickKernel() (dd.DD, bool) {
	if m.end != 0 || !(m.half.Hi <= quickLambda/2) {
		return dd.DD{}, false
	}
	t, ok := m.quickFirst()
	if !ok {
		return dd.DD{}, false
	}
	// g_{j+1}/g_j = (λ/2) y (p+j)/((j+1) (a+j))
	z := m.y.Mul(m.half)
	gh, gl := t.Hi, t.Lo
	sh, sl := 0.0, 0.0
	for j := range quickTerms {
		f := float64(j)
		s, e := dd.TwoSum(sh, gh)
		sh, sl = s, sl+(e+gl)
		nh, nl := z.Hi, z.Lo
		if m.beta {
			b, be := dd.TwoSum(m.p.Hi, f)
			be += m.p.Lo
			nh = float64(z.Hi * b)
			nl = math.FMA(z.Hi, b, -nh) + (float64(z.Hi*be) + float64(z.Lo*b))
		}
		d, de := dd.TwoSum(m.a, f)
		p := float64(d * (f + 1))
		de = math.FMA(d, f+1, -p) + float64(de*(f+1))
		i := 1 / p
		il := i * (math.FMA(-p, i, 1) - float64(de*i))
		c := float64(nh * i)
		cl := math.FMA(nh, i, -c) + (float64(nh*il) + float64(nl*i))
		p = float64(gh * c)
		gl = math.FMA(gh, c, -p) + (float64(gh*cl) + float64(gl*c))
		gh = p
		if c < 0.5 && gh < tiny*sh {
			return dd.Sum(sh, sl).Mul(dd.ExpQuick(m.half.Neg())), true
		}
	}
	return dd.DD{}, false
}

// centralTail returns a tail of the central law with a+j in place of a, as a pair.
func (m *mixture) centralTail(j int, upper bool) (dd.DD, bool) {
	var c special.Scaled
	var up bool
	if m.beta {
		c, up = special.BetaTail(dd.Sum(m.a, float64(j)), dd.From(m.b), m.y, m.y1)
	} else {
		c, up = special.GammaTail(dd.From(m.a), m.y)
	}
	v := c.M
	if c.L.Hi != 0 {
		v = c.DD()
	}
	if up != upper {
		v = v.Neg().AddF(1)
	}
	return v, v.Hi > quickSmall
}

// quickUpper adds up w_j Q_j.
func (m *mixture) quickUpper(t dd.DD, r *quickSums) bool {
	q, ok := m.centralTail(0, true)
	if !ok {
		return false
	}
	var (
		wh, wl = 1.0, 0.0
		th, tl = t.Hi, t.Lo
		qh, ql = q.Hi, q.Lo
		sh, sl float64
		kernel float64
		slope  float64
		hh, hl = m.half.Hi, m.half.Lo
		yh, yl = m.y.Hi, m.y.Lo
		ph, pl = m.p.Hi, m.p.Lo
		ah, al = m.a1.Hi, m.a1.Lo
		aj     = m.a
	)
	for j := range quickTerms {
		f := float64(j)
		// sum += w Q
		p := float64(wh * qh)
		e := math.FMA(wh, qh, -p) + (float64(wh*ql) + float64(wl*qh))
		s, e2 := dd.TwoSum(sh, p)
		sh, sl = s, sl+(e+e2)
		g := float64(wh * th)
		slope += g
		kernel += float64(g * (aj + f))
		// w *= (λ/2)/(j+1)
		v := &reciprocal[j+1]
		c := float64(hh * v.Hi)
		cl := math.FMA(hh, v.Hi, -c) + (float64(hh*v.Lo) + float64(hl*v.Hi))
		p = float64(wh * c)
		wl = math.FMA(wh, c, -p) + (float64(wh*cl) + float64(wl*c))
		wh = p
		// Q += T
		s, e = dd.TwoSum(qh, th)
		qh, ql = s, ql+(e+tl)
		next := float64(wh * qh)
		falls := (f+2)*qh > 2*hh*(qh+th) // the terms fall by half or more from here
		// T *= y (p+j)/(a+1+j)
		nh, nl := yh, yl
		if m.beta {
			b, be := dd.TwoSum(ph, f)
			be += pl
			nh = float64(yh * b)
			nl = math.FMA(yh, b, -nh) + (float64(yh*be) + float64(yl*b))
		}
		d, de := dd.TwoSum(ah, f)
		de += al
		i := 1 / d
		il := i * (math.FMA(-d, i, 1) - float64(de*i))
		c = float64(nh * i)
		cl = math.FMA(nh, i, -c) + (float64(nh*il) + float64(nl*i))
		p = float64(th * c)
		tl = math.FMA(th, c, -p) + (float64(th*cl) + float64(tl*c))
		th = p
		if falls && next < plain*sh {
			// the rest in plain arithmetic
			for k := j + 1; k < quickTerms; k++ {
				f = float64(k)
				p = float64(wh * qh)
				sl += p
				g = float64(wh * th)
				slope += g
				kernel += float64(g * (aj + f))
				if p < quickTiny*sh {
					r.tail = dd.Sum(sh, sl)
					r.kernel, r.slope = kernel, slope
					return true
				}
				wh *= float64(hh * reciprocal[k+1].Hi)
				qh += th
				c = yh / (ah + f)
				if m.beta {
					c *= ph + f
				}
				th *= c
			}
			return false
		}
	}
	return false
}

// quickLower adds up T_j W_j.
func (m *mixture) quickLower(t dd.DD, r *quickSums) bool {
	var (
		wh, wl = 1.0, 0.0
		Wh, Wl = 1.0, 0.0
		th, tl = t.Hi, t.Lo
		sh, sl float64
		kernel float64
		slope  float64
		hh, hl = m.half.Hi, m.half.Lo
		yh, yl = m.y.Hi, m.y.Lo
		ph, pl = m.p.Hi, m.p.Lo
		ah, al = m.a1.Hi, m.a1.Lo
		aj     = m.a
		slow   = m.beta && yh > 0.5
	)
	for j := range quickTerms {
		f := float64(j)
		if slow && wh < tiny/8*Wh && hh < (f+1)/2 {
			// the rest is W P_j
			c, ok := m.centralTail(j, false)
			r.tail = dd.Sum(sh, sl).Add(dd.Sum(Wh, Wl).Mul(c))
			r.kernel, r.slope = kernel, slope
			return ok
		}
		// sum += T W
		p := float64(Wh * th)
		e := math.FMA(Wh, th, -p) + (float64(Wh*tl) + float64(Wl*th))
		s, e2 := dd.TwoSum(sh, p)
		sh, sl = s, sl+(e+e2)
		g := float64(wh * th)
		slope += g
		kernel += float64(g * (aj + f))
		last := p
		// w *= (λ/2)/(j+1), W += w
		v := &reciprocal[j+1]
		c := float64(hh * v.Hi)
		cl := math.FMA(hh, v.Hi, -c) + (float64(hh*v.Lo) + float64(hl*v.Hi))
		p = float64(wh * c)
		wl = math.FMA(wh, c, -p) + (float64(wh*cl) + float64(wl*c))
		wh = p
		s, e = dd.TwoSum(Wh, wh)
		Wh, Wl = s, Wl+(e+wl)
		// T *= y (p+j)/(a+1+j)
		nh, nl := yh, yl
		if m.beta {
			b, be := dd.TwoSum(ph, f)
			be += pl
			nh = float64(yh * b)
			nl = math.FMA(yh, b, -nh) + (float64(yh*be) + float64(yl*b))
		}
		d, de := dd.TwoSum(ah, f)
		de += al
		i := 1 / d
		il := i * (math.FMA(-d, i, 1) - float64(de*i))
		c = float64(nh * i)
		cl = math.FMA(nh, i, -c) + (float64(nh*il) + float64(nl*i))
		p = float64(th * c)
		tl = math.FMA(th, c, -p) + (float64(th*cl) + float64(tl*c))
		th = p
		if slow {
			continue // to the rest: the weights die out before T does
		}
		// The quotient of all later terms is at most q; that of T tends to y from either side.
		if m.beta {
			c = max(c, yh)
		}
		q := c * (1 + wh/Wh)
		if q < 0.7 && last < plain*sh {
			// the rest in plain arithmetic
			for k := j + 1; k < quickTerms; k++ {
				f = float64(k)
				p = float64(Wh * th)
				sl += p
				g = float64(wh * th)
				slope += g
				kernel += float64(g * (aj + f))
				if p < quickTiny*sh {
					r.tail = dd.Sum(sh, sl)
					r.kernel, r.slope = kernel, slope
					return true
				}
				wh *= float64(hh * reciprocal[k+1].Hi)
				Wh += wh
				c = yh / (ah + f)
				if m.beta {
					c *= ph + f
				}
				th *= c
			}
			return false
		}
	}
	return false
}
