package noncentral

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// The Poisson mixtures of the region with few terms. With w_j the Poisson(λ/2)
// weights and T_j = P_j - P_{j+1} the drop of the central lower tail when the
// degrees of freedom rise by 2,
//
//	lower = Σ T_j W_j,  W_j = w_0 + ... + w_j
//	upper = Σ w_j Q_j,  Q_{j+1} = Q_j + T_j
//
// (summation by parts of the mixture, as in Benton and Krishnamoorthy 2003,
// CSDA 43, section 2): every term is positive, no central tail is needed for
// the lower sum and one for the upper, and all recurrences run upwards
// multiplying or adding positive numbers. They are carried in double-double.
//
// The index of the dominating term is below 45 in the whole region (A in the
// contour's notation), the terms beyond it fall like those of a Poisson law,
// so both sums end within maxTerms; the bound is only a belt.
const (
	maxTerms = 4000
	tiny     = 0x1p-62
)

// drops is the law of the T_j: T_{j+1}/T_j = y (p+j)/(a+1+j), where p is a+b
// for F and absent (y = x/2) for χ².
type drops struct {
	y    dd.DD
	p    dd.DD
	a1   dd.DD // a+1
	beta bool
}

func (d *drops) ratio(j float64) dd.DD {
	n := d.y
	if d.beta {
		n = n.Mul(d.p.AddF(j))
	}
	return n.Div(d.a1.AddF(j))
}

// lowerSum returns Σ T_j W_j over T_0 w_0. Where y is near 1 the T_j fall slowly:
// there the sum ends when the weights have died out, Σ_{i>=j} T_i being P_j.
func (m *mixture) lowerSum() dd.DD {
	d, half := &m.drops, m.half
	slow := m.beta && m.y.Hi > 0.5
	z := 1.0
	if half.Hi > 1 && !slow { // slow: λ/2 is A/U below 90
		_, e := math.Frexp(half.Hi)
		z = math.Ldexp(1, e)
	}
	hz := half.MulF(1 / z)
	// T_j carries z^j, w_j and W_j carry z^-j: neither leaves the range.
	w, W, T, sum := dd.From(1), dd.From(1), dd.From(1), dd.DD{}
	for j := range maxTerms {
		f := float64(j)
		t := T.Mul(W)
		if slow && w.Hi < tiny/8*W.Hi && half.Hi < (f+1)/2 {
			// the rest is W Σ T_i
			return sum.Add(W.Mul(m.lowerRatio(j)))
		}
		sum = sum.Add(t)
		r := d.ratio(f).MulF(z)
		// The quotient of all later terms is at most q; that of T tends to y from either side.
		rt := r.Hi / z
		if m.beta {
			rt = max(rt, m.y.Hi)
		}
		q := rt * (1 + w.Hi/W.Hi*half.Hi/(f+1))
		if t.Hi < tiny*sum.Hi*(1-q) {
			break
		}
		w = w.Mul(hz).DivF(f + 1)
		W = W.MulF(1 / z).Add(w)
		T = T.Mul(r)
	}
	return sum
}

// upperSum returns Σ w_j Q_j over w_0 T_0 with q0 = Q_0/T_0.
func upperSum(d *drops, half, q0 dd.DD) dd.DD {
	// Q_j and T_j carry z^-j, w_j carries z^j, as T_{j+1}/T_j may be huge.
	z := 1.0
	if r := d.ratio(0).Hi; r > 1 {
		_, e := math.Frexp(r)
		z = math.Ldexp(1, e)
	}
	hz := half.MulF(z)
	w, Q, T, sum := dd.From(1), q0, dd.From(1), dd.DD{}
	for j := range maxTerms {
		f := float64(j)
		sum = sum.Add(w.Mul(Q))
		w = w.Mul(hz).DivF(f + 1)
		next := Q.Add(T).MulF(1 / z)
		q := hz.Hi / (f + 2) * next.Hi / Q.Hi // at least the ratio of all later terms
		if q < 1 && w.Hi*next.Hi < tiny*sum.Hi*(1-q) {
			break
		}
		Q = next
		T = T.Mul(d.ratio(f)).MulF(1 / z)
	}
	return sum
}

// kernelSum returns Σ w_j T_j (a+j) over w_0 T_0 a, times 2^-shift: the density of log X over its
// central value.
func kernelSum(d *drops, a float64, half dd.DD) (sum dd.DD, shift int) {
	t, sum := dd.From(1), dd.From(1)
	for j := range maxTerms {
		f := float64(j)
		n := d.y
		if d.beta {
			n = n.Mul(d.p.AddF(f))
		}
		r := n.Mul(half).Div(dd.Sum(a, f).MulF(f + 1))
		t = t.Mul(r)
		sum = sum.Add(t)
		if r.Hi < 0.5 && t.Hi < tiny*sum.Hi {
			break
		}
		if sum.Hi > 0x1p600 {
			t, sum, shift = t.Scale(-600), sum.Scale(-600), shift+600
		}
	}
	return sum, shift
}

// dropSum returns Σ w_j T_j over w_0 T_0.
func dropSum(d *drops, half dd.DD) dd.DD {
	t, sum := dd.From(1), dd.From(1)
	for j := range maxTerms {
		f := float64(j)
		r := d.ratio(f).Mul(half).DivF(f + 1)
		t = t.Mul(r)
		sum = sum.Add(t)
		if r.Hi < 0.5 && t.Hi < tiny*sum.Hi {
			break
		}
	}
	return sum
}

// over returns s/t as a double-double.
func over(s, t special.Scaled) dd.DD {
	return special.Scaled{L: s.L.Sub(t.L), M: s.M.Div(t.M)}.DD()
}

// complementOver returns (1-s)/t.
func complementOver(s, t special.Scaled) dd.DD {
	return over(special.Scaled{M: s.DD().Neg().AddF(1)}, t)
}

// mixture is a Poisson mixture of central laws at a point.
type mixture struct {
	drops
	a, b float64
	half dd.DD          // λ/2
	y1   dd.DD          // 1-y, for F
	t0   special.Scaled // T_0, see first
	end  int            // -1, +1: y is at 0 or 1 to all digits, the central tail that is not 1 is c
	c    special.Scaled
	// log(1-y), where end is 1
	logY1 dd.DD
}

// upperRatio returns Q_0/T_0.
func (m *mixture) upperRatio() dd.DD {
	var c special.Scaled
	var upper bool
	switch {
	case m.end != 0:
		c, upper = m.c, m.end > 0
	case m.beta:
		c, upper = special.BetaTail(dd.From(m.a), dd.From(m.b), m.y, m.y1)
	default:
		c, upper = special.GammaTail(dd.From(m.a), m.y)
	}
	if upper {
		return over(c, m.t0)
	}
	return complementOver(c, m.t0)
}

// lowerRatio returns P_j/T_0 (for F).
func (m *mixture) lowerRatio(j int) dd.DD {
	if m.end > 0 {
		q, _ := special.BetaTailTiny(dd.From(m.b), dd.Sum(m.a, float64(j)), m.logY1)
		return complementOver(q, m.t0)
	}
	c, upper := special.BetaTail(dd.Sum(m.a, float64(j)), dd.From(m.b), m.y, m.y1)
	if upper {
		return complementOver(c, m.t0)
	}
	return over(c, m.t0)
}

// fullTail returns a tail without the quick form.
func (m *mixture) fullTail(upper bool) special.Scaled {
	m.first()
	if upper {
		return m.scaled(upperSum(&m.drops, m.half, m.upperRatio()))
	}
	return m.scaled(m.lowerSum())
}

// scaled returns s T_0 w_0.
func (m *mixture) scaled(s dd.DD) special.Scaled {
	return special.Scaled{L: m.t0.L.Sub(m.half), M: m.t0.M.Mul(s)}
}

// first sets T_0 in full.
func (m *mixture) first() {
	switch {
	case m.end != 0 || m.t0.M.Hi != 0:
		return
	case m.beta:
		m.t0 = special.BetaKernel(dd.From(m.a), dd.From(m.b), m.y, m.y1)
	default:
		m.t0 = special.GammaKernel(dd.From(m.a), m.y)
	}
	m.t0.M = m.t0.M.DivF(m.a)
}

// kernel returns the density of log X.
func (m *mixture) kernel() special.Scaled {
	if v, ok := m.quickKernel(); ok {
		return special.Scaled{M: v}
	}
	return m.fullKernel()
}

func (m *mixture) fullKernel() special.Scaled {
	m.first()
	sum, shift := kernelSum(&m.drops, m.a, m.half)
	k := m.scaled(sum.MulF(m.a))
	if shift != 0 {
		k.L = k.L.Add(dd.Ln2.MulF(float64(shift)))
	}
	return k
}

// slope returns Σ w_j T_j/2, the derivative of the upper tail in λ.
func (m *mixture) slope() special.Scaled {
	m.first()
	return m.scaled(dropSum(&m.drops, m.half).MulF(0.5))
}

// large reports whether a tail is above 0.6, so that the other one is wanted.
func large(t special.Scaled) bool {
	if t.L.Hi == 0 {
		return t.M.Hi > 0.6
	}
	return t.L.Hi+math.Log(t.M.Hi) > -0.51
}

// all returns the wanted tail or, if that is large, the other one, with kernel and slope.
func (m *mixture) all(upper bool) (t special.Scaled, up bool, kernel, slope special.Scaled) {
	for range 2 {
		r, ok := m.quick(upper)
		if ok {
			t = special.Scaled{M: r.tail}
			kernel, slope = special.Scaled{M: dd.From(r.kernel)}, special.Scaled{M: dd.From(r.slope)}
		} else {
			t, kernel, slope = m.fullTail(upper), m.kernel(), m.slope()
		}
		if !large(t) {
			return t, upper, kernel, slope
		}
		upper = !upper
	}
	return t, !upper, kernel, slope
}
