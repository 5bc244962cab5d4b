package dist

import "math"

// studentized is the law of Q = W/s, W of a unitLaw and s independent,
// nu s² of the chi-squared law with nu degrees of freedom.
//
// With v = log s and g the density of v,
//
//	P(Q > q) = ∫ g(v) P(W > q e^v) dv,  P(Q <= q) = ∫ g(v) P(W <= q e^v) dv,
//	q density(q) = ∫ g(v) w density_W(w) dv,  w = q e^v,
//
// the three integrands positive, log-concave in v and analytic in a strip, so
// the trapezoidal rule on a lattice in v converges exponentially and each tail
// is a sum of positive terms. The smaller tail is summed, the larger is its
// complement. The lattice is walked from the mode outwards until the geometric
// bound of the rest is below 1e-17 of the sum. Its step is
//
//	1/h² = 2(nu + 2 slope)/0.72² + 1/step²
//
// (the normal shape of g, and the law's own resolution). The sums over even
// and odd nodes are two rules of twice the step; the error of their mean is the
// square of their difference where a strip of analyticity limits the rule, and
// its fourth power where the normal shape does. When that exceeds 1e-13 the step
// is halved.
// For small nu the left end falls only like e^(nu v); where P(W > w) = 1 and
// e^(2v) has vanished from g, terms are added as a geometric series, so the
// number of nodes stays bounded (about 60/h).
//
//	log g(v) = log C - nu (e^(2v) - 1 - 2v)/2,  C = 2 (nu/2)^(nu/2) e^(-nu/2) / Γ(nu/2)
type studentized struct {
	nu   float64
	logC float64
}

// wanted says which integral is summed.
type wanted uint8

const (
	wantUpper wanted = iota
	wantLower
	wantDensity // of log Q
)

// logChiPeak returns log of 2 a^a e^-a / Γ(a), a = nu/2: the density of
// log s at 0.
func logChiPeak(nu float64) float64 {
	a := 0.5 * nu
	if a >= 10 {
		return 0.5*math.Log(nu/math.Pi) - stirlingRest(a)
	}
	g, _ := math.Lgamma(a + 1)
	return math.Ln2 + math.Log(a) + (a*math.Log(a) - a - g)
}

// chiCurve returns (e^(2v) - 1 - 2v)/2 without cancellation.
func chiCurve(v float64) float64 {
	x := 2 * v
	if x > 0.6 || x < -0.6 {
		return 0.5*math.Expm1(x) - v
	}
	// x²/4 (1 + x/3 (1 + x/4 (1 + ...))), relative truncation below 1e-17.
	s := 1.0
	for m := 16.0; m >= 3; m-- {
		s = 1 + x/m*s
	}
	return 0.25 * x * x * s
}

// nodes keeps the values of the unit law on one lattice in log w, so that many
// q share them: node j is at anchor * exp(j step).
type nodes struct {
	anchor, step, allowed float64

	first  int // index of known[0]
	known  []bool
	values []unitTails
}

// at returns the law at node j, w away from the anchor by exp(j step).
func (c *nodes) at(u *unitLaw, j int, w float64) unitTails {
	i := j - c.first
	if i < 0 || i >= len(c.known) {
		return u.tails(w, true)
	}
	if !c.known[i] {
		c.known[i] = true
		c.values[i] = u.tails(w, true)
	}
	return c.values[i]
}

// integral sums one integral at 0 < q < +Inf.
func (s *studentized) integral(u *unitLaw, q float64, want wanted) tail {
	l := lattice{v0: s.mode(u, q, want)}
	l.step, l.allowed = s.step(u, want)
	l.w0 = q * math.Exp(l.v0)
	if !(l.w0 > 1e-290 && l.w0 < 1e290) {
		l.w0 = math.Exp(logOf(q) + l.v0)
	}
	for try := 0; ; try++ {
		t, ok := s.sum(u, &l, 0, want, nil)
		if ok || try == 4 {
			return t
		}
		l.step *= 0.5
	}
}

// shared is integral on the lattice of the cache. Should that lattice be too
// coarse, it falls back on a lattice of its own.
func (s *studentized) shared(u *unitLaw, q float64, want wanted, c *nodes) tail {
	l := lattice{w0: c.anchor, v0: logRatio(c.anchor, q), step: c.step, allowed: c.allowed}
	j := int(math.Round((s.mode(u, q, want) - l.v0) / l.step))
	if t, ok := s.sum(u, &l, j, want, c); ok {
		return t
	}
	return s.integral(u, q, want)
}

// logRatio returns log(a/b), accurate also for a near b.
func logRatio(a, b float64) float64 {
	if r := a / b; r > 0.5 && r < 2 {
		return math.Log1p((a - b) / b)
	} else if r > 1e-290 && r < 1e290 {
		return math.Log(r)
	}
	return logOf(a) - logOf(b)
}

// lattice places node j at w = w0 exp(j step), v = v0 + j step.
// allowed is the difference of even and odd nodes that its step may show.
type lattice struct{ w0, v0, step, allowed float64 }

// step is the step of the lattice in log w, and the difference of even and odd
// nodes that it may show.
func (s *studentized) step(u *unitLaw, want wanted) (h, allowed float64) {
	c := s.nu
	if want != wantUpper {
		c += u.power * 0.5
	}
	g := 0.72 / math.Sqrt(2*c)
	h = 1 / math.Sqrt(1/(g*g)+1/(u.step*u.step))
	share := h * h / (g * g)
	return h, math.Exp(-29.9 / (2 + 2*share))
}

// mode guesses where the integrand is largest: where s concentrates when the
// law of W has no say there, else where the two slopes meet.
func (s *studentized) mode(u *unitLaw, q float64, want wanted) float64 {
	edge := math.Log(u.middle) - logOf(q)
	// Beyond the middle of W the integrand goes like nu v - (nu + c q²)/2 e^(2v).
	hi := 0.0
	if r := u.quad * q * q / s.nu; math.IsInf(r, 0) {
		hi = 0.5*(math.Log(s.nu)-math.Log(u.quad)) - logOf(q)
	} else {
		hi = -0.5 * math.Log1p(r)
	}
	// Below it like (nu + power) v - nu/2 e^(2v).
	lo := 0.5 * math.Log1p(u.power/s.nu)
	switch want {
	case wantUpper:
		if hi >= edge {
			return hi
		}
		return math.Min(0, edge)
	case wantLower:
		if lo <= edge {
			return lo
		}
		return math.Max(0, edge)
	}
	return math.Max(hi, math.Min(lo, edge))
}

// flat says how far to the left of a node the terms are a geometric series.
type flat uint8

const (
	notFlat     flat = iota
	flatToInf        // the tail of W is 1 as long as w >= u.inf
	flatForever      // the tail of W is constant from here on
)

// term returns the integrand at node j, and whether the terms to the left of it
// are a geometric series, because the tail of W is constant and e^(2v) has vanished.
func (s *studentized) term(u *unitLaw, l *lattice, j int, want wanted, c *nodes) (t tail, f flat) {
	d := l.step * float64(j)
	v := l.v0 + d
	w := l.w0 * math.Exp(d)
	e := -s.nu * chiCurve(v)
	switch {
	case w <= u.one && want == wantUpper:
		t, f = tail{u.base, e}, flatForever
	case w <= u.one && want == wantLower && u.base < 1:
		t, f = tail{1 - u.base, e}, flatForever
	case w >= u.inf && want == wantLower:
		t, f = tail{1, e}, flatToInf
	}
	if f != notFlat {
		if s.nu*math.Exp(2*v) >= 1e-17 {
			f = notFlat
		}
		return t, f
	}
	var all unitTails
	if c != nil {
		all = c.at(u, j, w)
	} else {
		all = u.tails(w, want == wantDensity)
	}
	switch want {
	case wantUpper:
		t = all.upper
	case wantLower:
		t = all.lower
	default:
		t = all.density
		t.mant *= w
	}
	t.log += e
	return t, notFlat
}

// sum walks the lattice from near node j. ok is false when even and odd nodes
// disagree.
func (s *studentized) sum(u *unitLaw, l *lattice, j int, want wanted, c *nodes) (total tail, ok bool) {
	// Climb to the mode: the logarithm of the integrand is concave.
	const stride = 3
	t, _ := s.term(u, l, j, want, c)
	best := t.logValue()
	for dir := stride; dir >= -stride; dir -= 2 * stride {
		moved := false
		for range 2000 {
			t, _ = s.term(u, l, j+dir, want, c)
			x := t.logValue()
			if !(x > best) {
				break
			}
			best = x
			j += dir
			moved = true
		}
		if moved {
			break
		}
	}
	if math.IsInf(best, -1) {
		return tail{0, 0}, true
	}
	var acc [2]float64 // even and odd nodes
	t, _ = s.term(u, l, j, want, c)
	peak := t.mant * math.Exp(t.log-best)
	acc[j&1] = peak
	for dir := 1; dir >= -1; dir -= 2 {
		last := peak
		for i, count := j+dir, 0; count < 20000; i, count = i+dir, count+1 {
			t, flat := s.term(u, l, i, want, c)
			x := t.mant * math.Exp(t.log-best)
			acc[i&1] += x
			if flat != notFlat && dir < 0 { // x (r + r² + ... r^m), r = exp(-nu h), m even or infinite
				r := math.Exp(-s.nu * l.step)
				f := x * r / -math.Expm1(-2*s.nu*l.step)
				m := math.Inf(1)
				if flat == flatToInf { // up to where the lower tail of W leaves 1
					m = 2 * math.Floor((logRatio(l.w0, u.inf)/l.step+float64(i))/2)
				}
				if m > 0 {
					f *= -math.Expm1(-s.nu * l.step * m)
					acc[1-i&1] += f
					acc[i&1] += f * r
					if math.IsInf(m, 1) {
						break
					}
					i -= int(m)
					last = x * math.Exp(-s.nu*l.step*m)
					continue
				}
			}
			if x == 0 || x < last && x*x < 1e-17*(acc[0]+acc[1])*(last-x) {
				break
			}
			last = x
		}
	}
	sum := acc[0] + acc[1]
	ok = math.Abs(acc[0]-acc[1]) <= (l.allowed+1e-13*math.Abs(best))*sum
	return tail{sum * l.step, best + s.logC}, ok
}
