package noncentral

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// Noncentral t is a mixture of normal tails over the law of s = sqrt(V/ν),
// V chi-squared:
//
//	P(T > t) = E Q(ts - δ),   density = E s φ(ts - δ)
//
// (Johnson, Kotz and Balakrishnan 1995, section 31.4), both tails and every
// sign alike: P(T <= t; δ) = P(T > -t; -δ). In w = log s the integrand is
// positive, entire in w, log-concave as a function of s, and falls on both sides at least
// exponentially, so the trapezoidal rule converges geometrically (Trefethen and
// Weideman 2014, section 5). It is summed outwards from its peak s0; with d = w - log s0,
// z0 = t s0 - δ, Δ = t s0 (e^d - 1) the exponent is
//
//	-(ν s0²/2)(e^2d - 1 - 2d) - z0 t s0 (e^d - 1 - d) - Δ²/2 + L d,
//	L = ν(1 - s0²) - z0 t s0
//
// times the Mills ratio at z0 + Δ (for z0 <= 0 the terms of z0 are left out and the factor is Q
// itself). L is taken in double-double, so nothing cancels for ν of 1e12 either; s0
// need not be exact.
//
// For small ν the left end falls only like e^{νw}: there d = τ + c(1 - e^-τ) makes it double
// exponential.
type tMix struct {
	nu, t, delta float64
	s0, z0       float64
	x2           float64 // ν s0²/2
	l            float64 // L
	p            float64 // t s0
	h            float64
	c            float64 // of the stretched left end, 0 for none
	mills        bool
	scale        special.Scaled
}

// expDefect returns e^d - 1 - d without cancellation, given e^d - 1.
func expDefect(d, em1 float64) float64 {
	if d > 0.5 || d < -0.5 {
		return em1 - d
	}
	s := 1 + d/15
	s = 1 + d/14*s
	s = 1 + d/13*s
	s = 1 + d/12*s
	s = 1 + d/11*s
	s = 1 + d/10*s
	s = 1 + d/9*s
	s = 1 + d/8*s
	s = 1 + d/7*s
	s = 1 + d/6*s
	s = 1 + d/5*s
	s = 1 + d/4*s
	s = 1 + d/3*s
	return d * d / 2 * s
}

// quadraticPeak returns the positive root of (ν+t²)s² - tδ s - m = 0.
func quadraticPeak(nu, t, delta, m float64) float64 {
	// all divided by q² with q = max(sqrt ν, |t|), to stay in range
	q := max(math.Sqrt(nu), math.Abs(t))
	a := nu/q/q + (t/q)*(t/q)
	b := (t / q) * delta / 2 // times q
	r := math.Hypot(b, math.Sqrt(a*m))
	if b > 0 {
		return (b + r) / a / q
	}
	return m / (r - b) / q
}

// hazard returns φ(z)/Q(z).
func hazard(z float64) float64 {
	if z < -38 {
		return 0
	}
	return 1 / special.Mills(z)
}

// newTTail prepares E Q(ts - δ).
func newTTail(nu, t, delta float64) tMix {
	m := tMix{nu: nu, t: t, delta: delta}
	// ν - ν s² - ts r(ts - δ) falls in s; r(z) is near z for large z.
	s := quadraticPeak(nu, t, delta, nu)
	if t*s < delta {
		s = 1
	}
	lo, hi := 0.0, math.Inf(1)
	curv := nu
	for range 60 {
		z := t*s - delta
		r := hazard(z)
		ts := t * s
		g := nu - nu*s*s - ts*r
		curv = 2*nu*s*s + ts*r + ts*ts*r*(r-z)
		if g > 0 {
			lo = s
		} else {
			hi = s
		}
		if math.Abs(g) < 1e-3*math.Sqrt(max(curv, nu)) || math.Abs(g) < 1e-10*nu {
			break
		}
		next := s * math.Exp(max(-2, min(2, g/max(curv, nu*1e-3))))
		if !(next > lo && next < hi) {
			switch {
			case math.IsInf(hi, 1):
				next = 2 * s
			case lo == 0:
				next = s / 16
			default:
				next = math.Sqrt(lo) * math.Sqrt(hi)
			}
		}
		s = next
	}
	m.s0 = s
	m.setup(0, nu, curv)
	return m
}

// newTGauss prepares E s^extra φ(ts - δ), extra 0 or 1.
func newTGauss(nu, t, delta, extra float64) tMix {
	m := tMix{nu: nu, t: t, delta: delta}
	m.s0 = quadraticPeak(nu, t, delta, nu+extra)
	ts := t * m.s0
	m.mills = true
	m.setup(extra, nu+extra, 2*nu*m.s0*m.s0+ts*(ts-delta)+ts*ts)
	return m
}

// setup fills in what depends on the peak; extra is the power of s beside its density.
func (m *tMix) setup(extra float64, rate, curv float64) {
	s2 := dd.Prod(m.s0, m.s0)
	x := s2.MulF(m.nu / 2)
	m.x2 = x.Hi
	z := dd.Prod(m.t, m.s0).AddF(-m.delta)
	m.z0 = z.Float64()
	m.p = m.t * m.s0
	m.mills = m.mills || m.z0 > 0
	l := x.MulF(-2).Add(dd.Sum(m.nu, extra))
	if m.mills {
		l = l.Sub(z.Mul(dd.Prod(m.t, m.s0)))
	}
	m.l = l.Float64()

	if x.Hi < 1e-270 {
		lx := dd.Log(dd.From(m.s0)).MulF(2).Add(dd.Log(dd.From(m.nu / 2)))
		_, m.scale = special.GammaTailTiny(dd.From(m.nu/2), lx)
	} else {
		m.scale = special.GammaKernel(dd.From(m.nu/2), x)
	}
	if m.mills {
		m.scale.L = m.scale.L.Sub(z.Sqr().MulF(0.5))
		m.scale.M = m.scale.M.Mul(invSqrt2Pi)
	}
	n := math.Sqrt(82*max(curv, 0) + 60*60)
	if curv < 60 && rate < 12 {
		m.c = 0.1
		n *= 1.3
	}
	m.h = 2 * math.Pi / n
	m.scale.M = m.scale.M.MulF(2 * m.h)
	if extra > 0 {
		m.scale.M = m.scale.M.MulF(m.s0)
	}
}

var invSqrt2Pi = dd.DD{Hi: 0x1.9884533d43651p-2, Lo: -0x1.cbc0d30ebfd15p-56}

const sqrt2Pi = 2.5066282746310002

// term returns the integrand at the j-th node; tail: with its normal tail.
func (m *tMix) term(j float64, tail bool) float64 {
	d, w := j*m.h, 1.0
	if m.c > 0 {
		e := math.Expm1(-d)
		d -= m.c * e
		w = 1 + m.c*(1+e)
	}
	em1 := math.Expm1(d)
	dl := m.p * em1
	e := m.l*d - m.x2*expDefect(2*d, em1*(2+em1))
	if !m.mills {
		return w * math.Exp(e) * special.NormalUpper(m.z0+dl)
	}
	e -= m.z0*m.p*expDefect(d, em1) + dl*dl/2
	if !tail {
		return w * math.Exp(e)
	}
	z := m.z0 + dl
	if z < -6 {
		return w * math.Exp(e+z*z/2) * sqrt2Pi * special.NormalUpper(z)
	}
	return w * math.Exp(e) * special.Mills(z)
}

// sum adds the integrand over all nodes.
func (m *tMix) sum(tail bool) special.Scaled {
	s := m.term(0, tail)
	for _, dir := range [2]float64{1, -1} {
		last := s
		for j := 1.0; j < 4000; j++ {
			t := m.term(dir*j, tail)
			s += t
			if t <= 0x1p-58*s && t <= last {
				break
			}
			last = t
		}
	}
	r := m.scale
	r.M = r.M.MulF(s)
	return r
}

// tClose is the δ from which the upper tail is taken from noncentral F, too:
//
//	P(T <= t) = P(F <= t²) + P(T < -t),   P(T > t) = P(F > t²) - P(T < -t),   t, δ > 0,
//
// F being noncentral F(1, ν, δ²). For smaller δ the difference would cancel, for larger ones
// the normal tail falls too steeply for the trapezoidal rule.
const tClose = 2

// TTail returns one tail of noncentral t for finite ν > 0, t, δ: the upper one if upper is
// set, and the smaller one or at least one not near 1. For t > 0 (else both signs are turned):
//
//	δ <= 0      upper tail: sum of normal tails
//	0 < δ < 2   upper tail: sum of normal tails; lower: noncentral F and P(T < -t)
//	δ >= 2      noncentral F and P(T < -t)
func TTail(nu, t, delta float64) (v special.Scaled, upper bool) {
	flip := t < 0
	if flip {
		t, delta = -t, -delta
	}
	switch {
	case t == 0:
		v, upper = NormalTail(0, delta)
	case delta <= 0:
		v, upper = tSum(nu, t, delta), true
	case delta < tClose:
		if t > delta {
			v, upper = tSum(nu, t, delta), true
			if large(v) {
				v, upper = tLower(nu, t, delta), false
			}
		} else if v = tLower(nu, t, delta); large(v) {
			v, upper = tSum(nu, t, delta), true
		}
	default:
		p := tSquare(nu, t, delta)
		v, upper = p.Tail()
		if delta*delta/2 < 45-v.Log() {
			away := tSum(nu, t, -delta)
			if upper {
				away.M = away.M.Neg()
			}
			v = add(v, away)
		}
	}
	return v, upper != flip
}

// tSquare is the law of T² at t².
func tSquare(nu, t, delta float64) F {
	x, e := dd.Prod(t, t), 0
	if t > 1e150 || t < 1e-130 {
		f, k := math.Frexp(t)
		x, e = dd.Prod(f, f), 2*k
	}
	return atF(1, nu, dd.Prod(delta, delta).MulF(0.5), x, e)
}

// tLower returns P(T <= t), t, δ > 0.
func tLower(nu, t, delta float64) special.Scaled {
	p := tSquare(nu, t, delta)
	v, upper := p.Tail()
	if upper {
		v = special.Scaled{M: v.DD().Neg().AddF(1)}
	}
	return add(v, tSum(nu, t, -delta))
}

// add returns a + b, a > |b| or b > 0.
func add(a, b special.Scaled) special.Scaled {
	if b.L.Hi > a.L.Hi {
		a, b = b, a
	}
	b.L = b.L.Sub(a.L)
	a.M = a.M.Add(b.DD())
	return a
}

// tSum returns E Q(ts - δ).
func tSum(nu, t, delta float64) special.Scaled {
	m := newTTail(nu, t, delta)
	return m.sum(true)
}

// TDensity returns the density of noncentral t.
func TDensity(nu, t, delta float64) special.Scaled {
	m := newTGauss(nu, t, delta, 1)
	return m.sum(false)
}

// TSlope returns the derivative of the upper tail in δ, E φ(ts - δ).
func TSlope(nu, t, delta float64) special.Scaled {
	m := newTGauss(nu, t, delta, 0)
	return m.sum(false)
}

// NormalTail returns one tail of the normal law of mean δ at t.
func NormalTail(t, delta float64) (v special.Scaled, upper bool) {
	z := dd.Sum(t, -delta)
	upper = z.Hi > 0
	if upper {
		z = z.Neg()
	}
	return special.Scaled{L: z.Sqr().MulF(-0.5), M: invSqrt2Pi.MulF(special.Mills(-z.Hi))}, upper
}

// NormalDensity returns the density of the normal law of mean δ at t.
func NormalDensity(t, delta float64) special.Scaled {
	z := dd.Sum(t, -delta)
	return special.Scaled{L: z.Sqr().MulF(-0.5), M: invSqrt2Pi}
}
