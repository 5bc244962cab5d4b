package dist

import (
	"math"
	"math/rand/v2"
)

// studentizedLaw is everything that StudentizedRange and MaximumModulus have
// in common: the law of W/s made from the law of W and nu.
type studentizedLaw struct {
	u unitLaw
	s studentized
	// half is near log of the median, where the direct tail changes sides.
	half float64
}

func newStudentizedLaw(u unitLaw, nu float64) studentizedLaw {
	l := studentizedLaw{u: u, s: studentized{nu: nu}, half: math.Log(u.middle)}
	if !math.IsInf(nu, 1) {
		l.s.logC = logChiPeak(nu)
		l.half -= logChiMedian(nu)
	}
	return l
}

// logChiMedian is near the log of the median of s: Wilson and Hilferty's cube
// (Proc. Nat. Acad. Sci. 17, 1931) for nu >= 1, else the leading power.
func logChiMedian(nu float64) float64 {
	if nu >= 1 {
		return 1.5 * math.Log1p(-2/(9*nu))
	}
	a := 0.5 * nu
	g, _ := math.Lgamma(1 + a)
	return 0.5 * ((g-math.Ln2)/a - math.Log(a))
}

// tinyX is where the lower tail is its leading power of x alone.
const tinyX = 1e-200

// direct sums one integral at 0 < x < +Inf; the density is that of log x.
func (l *studentizedLaw) direct(x float64, want wanted, c *nodes) tail {
	if math.IsInf(l.s.nu, 1) {
		t := l.u.tails(x, want == wantDensity)
		switch want {
		case wantUpper:
			return t.upper
		case wantLower:
			return t.lower
		}
		return tail{t.density.mant * x, t.density.log}
	}
	shift := 0.0
	if x < tinyX && want != wantUpper {
		power := l.u.power
		if power == 0 && want == wantDensity {
			power = 1
		}
		shift = power * (logOf(x) - math.Log(tinyX))
		x = tinyX
		c = nil
	}
	var t tail
	if c == nil {
		t = l.s.integral(&l.u, x, want)
	} else {
		t = l.s.shared(&l.u, x, want, c)
	}
	t.log += shift
	return t
}

// smaller returns the smaller tail, or at least one that is below 0.9.
func (l *studentizedLaw) smaller(x float64, c *nodes) (t tail, upper bool) {
	want, other := wantLower, wantUpper
	if logOf(x) > l.half {
		want, other = wantUpper, wantLower
	}
	t = l.direct(x, want, c)
	if t.value() > 0.9 {
		t, want = l.direct(x, other, c), other
	}
	return t, want == wantUpper
}

func (l *studentizedLaw) cdf(x float64) float64 {
	t, upper := l.smaller(x, nil)
	if upper {
		return 1 - t.value()
	}
	return t.value()
}

func (l *studentizedLaw) survival(x float64) float64 {
	t, upper := l.smaller(x, nil)
	if upper {
		return t.value()
	}
	return 1 - t.value()
}

func (l *studentizedLaw) logCDF(x float64) float64 {
	t, upper := l.smaller(x, nil)
	if upper {
		return math.Log1p(-t.value())
	}
	return t.logValue()
}

func (l *studentizedLaw) logSurvival(x float64) float64 {
	t, upper := l.smaller(x, nil)
	if upper {
		return t.logValue()
	}
	return math.Log1p(-t.value())
}

func (l *studentizedLaw) prob(x float64) float64 {
	t := l.direct(x, wantDensity, nil)
	if v := t.value(); v > 1e-290 {
		return v / x
	}
	return math.Exp(t.logValue() - logOf(x))
}

func (l *studentizedLaw) logProb(x float64) float64 {
	return l.direct(x, wantDensity, nil).logValue() - logOf(x)
}

// solve returns the x at which the tail on the wanted side has the logarithm
// lp, by Newton's method for log tail against log x. The integrand is jointly
// log-concave in both, so the log tail is concave in log x (Prékopa 1973): from
// the second step on Newton's iterates approach the root from one side and
// cannot overshoot; a bracket guards against rounding.
func (l *studentizedLaw) solve(lp float64, want wanted) float64 {
	if math.IsInf(lp, -1) {
		if want == wantUpper {
			return math.Inf(1)
		}
		return 0
	}
	x := math.Exp(l.guess(lp, want))
	x = math.Max(1e-300, math.Min(x, 1e300))
	var known [384]bool
	var values [384]unitTails
	c := nodes{anchor: x, first: -192, known: known[:], values: values[:]}
	c.step, c.allowed = l.s.step(&l.u, wantDensity)
	lo, hi := 0.0, math.Inf(1)
	for range 100 {
		if far := logRatio(c.anchor, x); math.Abs(far) > math.Min(5, 100*c.step) { // log w - log q would lose digits
			c.anchor = x
			clear(c.known)
		}
		t := l.direct(x, want, &c)
		d := l.direct(x, wantDensity, &c)
		f := t.logValue() - lp
		slope := d.mant / t.mant * math.Exp(d.log-t.log)
		if want == wantUpper {
			slope = -slope
		}
		if f == 0 {
			return x
		}
		if (f > 0) == (want == wantUpper) {
			lo = x
		} else {
			hi = x
		}
		dy := -f / slope
		if math.IsNaN(dy) || math.Abs(dy) > 700 {
			dy = math.Copysign(700, dy)
			if (f > 0) == (want == wantUpper) {
				dy = math.Abs(dy)
			} else {
				dy = -math.Abs(dy)
			}
		}
		next := x * math.Exp(dy)
		switch {
		case math.IsInf(next, 1) && math.IsInf(hi, 1):
			if x == math.MaxFloat64 {
				return math.Inf(1)
			}
			next = math.MaxFloat64
		case next == 0 && lo == 0:
			if x == math.SmallestNonzeroFloat64 {
				return 0
			}
			next = math.SmallestNonzeroFloat64
		case !(next > lo && next < hi):
			if math.Abs(dy) < 1e-13 {
				return x
			}
			a, b := orderOf(lo), orderOf(hi)
			if b-a <= 1 {
				return x
			}
			next = fromOrder(a + (b-a)/2)
		}
		if math.Abs(dy) < 1e-9 {
			return next
		}
		x = next
	}
	return x
}

// guess starts solve: log S is taken for -(nu/2) log(1 + c (x²-m²)/nu) and the
// lower tail for a power of x/m, m near the median.
func (l *studentizedLaw) guess(lp float64, want wanted) float64 {
	g := -lp - math.Ln2
	if g <= 0 {
		return l.half
	}
	if want == wantLower {
		if l.u.power == 0 {
			return l.half - 1
		}
		return l.half - g/l.u.power
	}
	m2 := math.Exp(2 * l.half)
	c := l.u.quad
	if math.IsInf(l.s.nu, 1) {
		return 0.5 * math.Log(m2+2*g/c)
	}
	if r := 2 * g / l.s.nu; r < 500 && l.half < 300 {
		return 0.5 * math.Log(m2+l.s.nu/c*math.Expm1(r))
	}
	return l.half + g/l.s.nu
}

func (l *studentizedLaw) quantile(p float64) float64 {
	if p <= 0.5 {
		return l.solve(logOf(p), wantLower)
	}
	return l.solve(math.Log1p(-p), wantUpper)
}

func (l *studentizedLaw) upperQuantile(q float64) float64 {
	if q <= 0.5 {
		return l.solve(logOf(q), wantUpper)
	}
	return l.solve(math.Log1p(-q), wantLower)
}

// moments returns E W and E W² by the trapezoidal rule in log w.
func (u *unitLaw) moments() (m1, m2 float64) {
	h := 0.8 * math.Min(u.step, 0.5/math.Sqrt(1+u.power))
	for dir := 1; dir >= -1; dir -= 2 {
		for j := min(dir, 0); ; j += dir {
			w := u.middle * math.Exp(h*float64(j))
			x := u.tails(w, true).density.value() * w * w
			m1 += x
			m2 += x * w
			if x < 1e-18*m1 || j > 10000 || j < -10000 {
				break
			}
		}
	}
	return m1 * h, m2 * h
}

func (l *studentizedLaw) mean() float64 {
	if !(l.s.nu > 1) {
		return math.Inf(1)
	}
	m, _ := l.u.moments()
	return m * chiMoment(l.s.nu, -1)
}

func (l *studentizedLaw) variance() float64 {
	nu := l.s.nu
	switch {
	case nu <= 1:
		return math.NaN()
	case nu <= 2:
		return math.Inf(1)
	}
	m1, m2 := l.u.moments()
	return studentizedVariance(m1, m2, nu)
}

// studentizedVariance is m2 nu/(nu-2) - (m1 E 1/s)², nu > 2, in parts that do
// not cancel further than m2 - m1² does.
func studentizedVariance(m1, m2, nu float64) float64 {
	if math.IsInf(nu, 1) {
		return m2 - m1*m1
	}
	c := chiMoment(nu, -1)
	return (m2 - m1*m1) + 2*m2/(nu-2) - m1*m1*(c-1)*(c+1)
}

// chiMoment returns E s^r, nu s² chi-squared with nu degrees of freedom,
// r > -nu: Γ((nu+r)/2) / Γ(nu/2) (nu/2)^(-r/2).
func chiMoment(nu, r float64) float64 {
	if math.IsInf(nu, 1) {
		return 1
	}
	a, d := 0.5*nu, 0.5*r
	if a+d >= 10 && a >= 10 {
		return math.Exp((a+d-0.5)*math.Log1p(d/a) - d + stirlingRest(a+d) - stirlingRest(a))
	}
	g1, _ := math.Lgamma(a + d)
	g0, _ := math.Lgamma(a)
	return math.Exp(g1 - g0 - d*math.Log(a))
}

// stirlingRest is log Γ(a) - (a-1/2) log a + a - log(2π)/2 for a >= 10 (DLMF
// 5.11.1); the first term left out is below 2e-17.
func stirlingRest(a float64) float64 {
	r := 1 / (a * a)
	return (1.0/12 - r*(1.0/360-r*(1.0/1260-r*(1.0/1680-r*(1.0/1188-r*(691.0/360360-r/156)))))) / a
}

// logChiVariate draws log s.
func logChiVariate(src rand.Source, nu float64) float64 {
	if math.IsInf(nu, 1) {
		return 0
	}
	a := 0.5 * nu
	return 0.5 * (logGammaVariate(src, a) - math.Log(a))
}
