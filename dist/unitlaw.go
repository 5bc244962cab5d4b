package dist

import (
	"math"

	"subsume.example/internal/special"
)

// tail is mant * exp(log): a probability or a density far below the smallest
// float64 keeps its digits. mant is of moderate size, or 0.
type tail struct{ mant, log float64 }

func (t tail) value() float64 {
	if t.log == 0 {
		return t.mant
	}
	return t.mant * math.Exp(t.log)
}

func (t tail) logValue() float64 {
	if t.mant == 0 {
		return math.Inf(-1)
	}
	return t.log + math.Log(t.mant)
}

// unitTails are both tails and the density of a statistic at known scale.
type unitTails struct{ lower, upper, density tail }

// unitKind says which statistic a unitLaw describes.
type unitKind uint8

const (
	unitRange   unitKind = iota // range of n+1 standard normals
	unitModulus                 // largest modulus of n+1 standard normals
	unitLargest                 // largest of correlated normals, or their largest modulus
	unitBelow                   // minus the largest of correlated normals
)

// unitLaw is the law of a positive statistic W of normals with known scale,
// of which studentized.go makes the law of W/s. It is a plain struct with a
// switch, not an interface, so that no evaluation allocates.
type unitLaw struct {
	kind   unitKind
	n      int         // k - 1
	middle float64     // near the median: below it the lower tail is summed, above it the upper one
	one    float64     // below it the tails are constant to within 1e-18
	inf    float64     // above it P(W <= w) = 1 to within 1e-18
	power  float64     // P(W <= w) ~ w^power at 0
	step   float64     // largest step in log w that resolves the law
	inner  float64     // step of the inner lattice
	bell   [96]float64 // exp(-t²/2) at its nodes t = 0, inner, 2 inner, ...
	cells  *cells      // interpolated tails of a batch, nil otherwise

	quad float64 // c in P(W > w) ~ exp(-c w²/2)
	// Below one, P(W > w) is base and P(W <= w) is 1-base: 1 and 0 unless W may be
	// negative and only its positive part is looked at.
	base    float64
	linear  float64 // below it the tails are linear, with slope as the density
	slope   float64
	product product
}

// tails evaluates the law at w > 0; the density only if asked for.
func (u *unitLaw) tails(w float64, density bool) unitTails {
	if u.cells != nil && !density {
		return u.cells.at(u, w)
	}
	return u.direct(w, density)
}

func (u *unitLaw) direct(w float64, density bool) unitTails {
	switch u.kind {
	case unitRange:
		if u.n == 1 {
			return rangeOfTwo(w)
		}
		return u.rangeTails(w, density)
	case unitModulus:
		return u.modulusTails(w)
	}
	return u.productTails(w, density)
}

// newUnitRange prepares the range of k normals.
func newUnitRange(k int) unitLaw {
	kf := float64(k)
	n := kf - 1
	// The largest and the smallest are nearly independent, so the median of
	// the range is about twice the point where Φ^k = 0.6; only speed depends on it.
	u := unitLaw{kind: unitRange, n: k - 1, power: n, quad: 0.5, base: 1}
	u.middle = 2 * special.NormalUpperQuantile(-math.Expm1(math.Log(0.55)/kf))
	if k == 2 {
		u.middle = 0.95
	}
	u.middle = math.Max(u.middle, 0.9)
	// P(W <= w) <= k (2Φ(w/2)-1)^n and <= sqrt(k) (w/sqrt(2π))^n.
	c := math.Exp(-(41.5 + math.Log(kf)) / n)
	u.one = math.Min(2*special.NormalUpperQuantile(0.5-0.5*c), c*math.Sqrt(2*math.Pi))
	// P(W > w) <= k(k-1)/2 pairs, each 2Q(w/sqrt 2).
	u.inf = math.Sqrt2 * special.NormalUpperQuantile(1e-18/(kf*n))
	// The law of the largest is nearly Gumbel's with rate b, whose Fourier
	// transform falls as exp(-π ω/(2b)); the range has the square of it.
	b := math.Max(1, special.NormalUpperQuantile(1/kf)+0.35)
	u.inner = math.Min(0.43, 0.43/b)
	for i := range u.bell {
		t := u.inner * float64(i)
		if t > 10 {
			break
		}
		u.bell[i] = math.Exp(-0.5 * t * t)
	}
	u.step = math.Min(0.12, 0.72/(b*u.middle))
	return u
}

// rangeOfTwo is the range of two normals, |N(0, 2)|.
func rangeOfTwo(w float64) unitTails {
	y := w / math.Sqrt2
	d := special.NormalDensity(y)
	t := unitTails{density: tail{math.Sqrt2 * d, 0}}
	if w < 1 {
		p := math.Erf(0.5 * w)
		t.lower, t.upper = tail{p, 0}, tail{1 - p, 0}
		return t
	}
	a := -0.25 * w * w
	m := special.Mills(y) * math.Sqrt(2/math.Pi)
	t.upper = tail{m, a}
	t.density = tail{1 / math.Sqrt(math.Pi), a}
	t.lower = tail{1 - t.upper.value(), 0}
	return t
}

// rangeTails sums the law of the range W of k = n+1 normals. With z the
// largest, a = w/2, z = t + a and D(t) = Φ(t+a) - Φ(t-a),
//
//	P(W <= w) = k ∫ φ(t+a) D(t)^n dt
//	P(W > w)  = k ∫ φ(t+a) [Φ(t+a)^n - D(t)^n] dt
//	density   = k n ∫ φ(t+a) φ(t-a) D(t)^(n-1) dt
//
// (Pearson and Hartley, Biometrika 32, 1942, equation 2, in another
// variable). D is even, so nodes ±t share all their parts. The integrands are
// entire and fall like normal densities: the trapezoidal rule converges
// exponentially (Goodwin, Proc. Camb. Phil. Soc. 45, 1949), limited by the
// Gumbel shape for many groups, where the step falls like 1/sqrt(2 log k).
// The difference of powers is Φ(t-a) times an all-positive sum (powerSum).
//
//	region        rule                                      why
//	k w² < 1e-7   √k (w/√(2π))^n [1 - w² n(n+3)/(24 k)]     two terms are exact
//	w < 0.7       lattice step 0.7/√k, D(t)/D(0) by cosh    D without cancellation
//	w < middle    lower tail on the lattice, upper = 1 - it  neither is small
//	else          upper tail on the lattice, exp(-a²) outside
func (u *unitLaw) rangeTails(w float64, density bool) unitTails {
	n := float64(u.n)
	k := n + 1
	switch {
	case k*w*w < 1e-7:
		t := unitTails{}
		lw := math.Log(w) - 0.9189385332046728
		t.lower = tail{math.Sqrt(k) * (1 - w*w*n*(n+3)/(24*k)), n * lw}
		t.upper = tail{1 - t.lower.value(), 0}
		// d/dw log = n/w - w n(n+3)/(12k)
		t.density = tail{t.lower.mant * n * (1 - w*w*(n+3)/(12*k)) * 0.3989422804014327, (n - 1) * lw}
		return t
	case w < 0.7 && w < u.middle:
		return u.rangeSmall(w, density)
	case w < u.middle:
		return u.rangeLower(w, density)
	}
	return u.rangeUpper(w, density)
}

// rangeSmall serves w < 0.7. D(t)/D(0) = exp(-t²/2) G(t)/G(0) with
// G(t) = ∫_0^1 exp(-(a x)²/2) cosh(a t x) dx by eight Gauss points on [-1, 1],
// the hyperbolic cosines by their three-term recurrence along the lattice.
func (u *unitLaw) rangeSmall(w float64, density bool) unitTails {
	n := float64(u.n)
	a := 0.5 * w
	h := 0.7 / math.Sqrt(n+1)
	var c, prev, cur [5]float64 // cosh(h a x_m i) at i-1 and i; the last has x = 1
	var g [4]float64
	g0 := 0.0
	for m := range 4 {
		x := a * special.Gauss8X[m]
		g[m] = special.Gauss8W[m] * math.Exp(-0.5*x*x)
		g0 += g[m]
		cur[m], prev[m] = 1, math.Cosh(h*x)
		c[m] = 2 * prev[m]
	}
	cur[4], prev[4] = 1, math.Cosh(h*a)
	c[4] = 2 * prev[4]
	r := 1 / g0
	lo, den := 0.5, 0.5
	for i := 1; i < 200; i++ {
		s := 0.0
		for m := range 5 {
			next := prev[m]
			if i > 1 {
				next = c[m]*cur[m] - prev[m]
				prev[m] = cur[m]
			} else {
				prev[m] = 1
			}
			cur[m] = next
			if m < 4 {
				s += g[m] * next
			}
		}
		t := h * float64(i)
		p := powInt(s*r, u.n-1) * math.Exp(-0.5*t*t*(n+1))
		q := p * s * r * cur[4]
		lo += q
		if density {
			den += p // φ(t+a)φ(t-a) = φ(t)² exp(-a²), and D^(n-1)
		}
		if q < 1e-18*lo {
			break
		}
	}
	d0 := math.Erf(a * math.Sqrt2 * 0.5)
	l := n * math.Log(d0)
	var t unitTails
	t.lower = tail{2 * h * (n + 1) * 0.3989422804014327 * math.Exp(-0.5*a*a) * lo, l}
	t.upper = tail{1 - t.lower.value(), 0}
	t.density = tail{2 * h * (n + 1) * n * 0.15915494309189535 * math.Exp(-a*a) * den / d0, l}
	return t
}

// rangeLower serves 0.7 <= w < middle, scaled by D(0)^n.
func (u *unitLaw) rangeLower(w float64, density bool) unitTails {
	n := float64(u.n)
	a := 0.5 * w
	d0 := 2 * special.NormalCentral(a)
	// D(t)^n is as narrow as 1/sqrt(n times the curvature of -log D at 0).
	h := math.Min(0.83*u.inner, 0.7/math.Sqrt(1+2*n*a*special.NormalDensity(a)/d0))
	r := 1 / d0
	fa := special.NormalDensity(a)
	p := math.Exp(-a * h) // φ(a±t) = φ(a) exp(-t²/2) p^(±i)
	pp, pm, pr := 1.0, 1.0, 1/p
	lo := fa
	den := 0.5 * fa * fa
	for i := 1; i < 2000; i++ {
		t := h * float64(i)
		pp *= p
		pm *= pr
		e := fa * math.Exp(-0.5*t*t)
		fp, fm := e*pp, e*pm
		var d float64
		if t < a {
			mp, mm := special.MillsPair(a+t, a-t)
			d = 1 - fp*mp - fm*mm
		} else {
			mp, mm := special.MillsPair(a+t, t-a)
			d = fm*mm - fp*mp
		}
		x := powInt(d*r, u.n-1)
		if density {
			den += fp * fm * x
		}
		x *= (fp + fm) * d * r
		lo += x
		if x < 1e-17*lo {
			break
		}
	}
	l := n * math.Log(d0)
	var t unitTails
	t.lower = tail{h * (n + 1) * lo, l}
	t.upper = tail{1 - t.lower.value(), 0}
	t.density = tail{2 * h * (n + 1) * n * den * r, l}
	return t
}

// rangeUpper serves w >= middle. Node t > 0 and its mirror image add
// φ(a+t) B S(1-A, D) + φ(a-t) A S(1-B, D), where A = Q(a+t), B = Q(a-t),
// D = 1-A-B and S(x, y) = (x^n - y^n)/(x - y).
func (u *unitLaw) rangeUpper(w float64, density bool) unitTails {
	n := float64(u.n)
	a := 0.5 * w
	h := u.inner
	up, den := 0.0, 0.0
	if a > 15 { // A and B vanish beside 1 wherever the integrand counts, S = n
		h = 0.45
		up = 0.5 * special.Mills(a)
		den = 0.5
		for i := 1; i < 20; i++ {
			t := h * float64(i)
			e := math.Exp(-t * t)
			up += 0.5 * e * (special.Mills(a-t) + special.Mills(a+t))
			den += e
			if e < 1e-18 {
				break
			}
		}
		c := 2 * h * (n + 1) * n * 0.15915494309189535
		l := -a * a
		if math.IsInf(l, -1) {
			return unitTails{lower: tail{1, 0}, upper: tail{0, 0}}
		}
		return unitTails{lower: tail{1, 0}, upper: tail{c * up, l}, density: tail{c * den, l}}
	}
	fa := special.NormalDensity(a)
	p := math.Exp(-a * h) // φ(a±t) = φ(a) exp(-t²/2) p^(±i)
	pp, pm, pr := 1.0, 1.0, 1/p
	grow := 6.283185307179586 * math.Exp(a*a)
	for i, e := range u.bell[:] {
		t := h * float64(i)
		fp, fm := fa*e*pp, fa*e*pm
		pp *= p
		pm *= pr
		e *= e
		// Q(a+t), and Q(a-t), Φ(a-t), Q(a-t)/φ(a-t) times exp(-t²).
		var mp, qa, pb, b float64
		if t < a {
			mp, b = special.MillsPair(a+t, a-t)
			pb = 1 - fm*b
			b *= e
		} else {
			mp, b = special.MillsPair(a+t, t-a)
			pb = fm * b
			b = (1 - pb) * fp * grow
		}
		qa = fp * mp
		d := pb - qa
		s1, s2, dn := powerSums(1-qa, pb, d, u.n)
		term := b*s1 + e*mp*s2
		dens := 2 * e * dn
		if i == 0 {
			term *= 0.5
			dens *= 0.5
		}
		up += term
		if density {
			den += dens
		}
		if term < 1e-17*up && t > 1 {
			break
		}
	}
	c := h * (n + 1) * 0.15915494309189535
	var t unitTails
	t.upper = tail{c * up, -a * a}
	t.lower = tail{1 - t.upper.value(), 0}
	t.density = tail{c * n * den, -a * a}
	return t
}

// powInt returns x^n for n >= 0 by repeated squaring.
func powInt(x float64, n int) float64 {
	y := 1.0
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			y *= x
		}
		x *= x
	}
	return y
}

// powerSums returns (x^n - d^n)/(x - d) for x = x1 and x = x2, as the sums
// Σ x^i d^(n-1-i) of positive terms by binary splitting, and d^(n-1), n >= 1.
func powerSums(x1, x2, d float64, n int) (s1, s2, dn float64) {
	s1, s2 = 1, 1
	p1, p2, pd := x1, x2, d
	dn = 1 // d^(m-1)
	top := 0
	for n>>(top+1) > 0 {
		top++
	}
	for b := top - 1; b >= 0; b-- {
		s1 *= p1 + pd
		s2 *= p2 + pd
		dn *= pd
		p1 *= p1
		p2 *= p2
		pd *= pd
		if n>>b&1 == 1 {
			s1 = s1*x1 + pd
			s2 = s2*x2 + pd
			dn = pd
			p1 *= x1
			p2 *= x2
			pd *= d
		}
	}
	return s1, s2, dn
}

// newUnitModulus prepares the largest modulus of k normals.
func newUnitModulus(k int) unitLaw {
	kf := float64(k)
	u := unitLaw{kind: unitModulus, n: k - 1, power: kf, quad: 1, base: 1}
	u.middle = special.NormalUpperQuantile(-0.5 * math.Expm1(-math.Ln2/kf))
	c := math.Exp(-41.5 / kf)
	u.one = math.Min(special.NormalUpperQuantile(0.5-0.5*c), c*math.Sqrt(math.Pi/2))
	u.inf = special.NormalUpperQuantile(0.5e-18 / kf)
	b := math.Max(1, special.NormalUpperQuantile(0.5/kf)+0.35)
	u.step = math.Min(0.12, 0.27/(b*u.middle))
	return u
}

// modulusTails has P(W <= w) = (2Φ(w)-1)^k.
func (u *unitLaw) modulusTails(w float64) unitTails {
	k := float64(u.n + 1)
	l := -0.5 * w * w
	d := 2 * k * 0.3989422804014327
	var t unitTails
	if w < 0.7 {
		p := math.Erf(w * math.Sqrt2 * 0.5)
		lp := math.Log(p)
		t.lower = tail{1, k * lp}
		t.upper = tail{-math.Expm1(k * lp), 0}
		t.density = tail{d / p * math.Exp(l), k * lp}
		return t
	}
	m := special.Mills(w) * 2 * 0.3989422804014327
	q := m * math.Exp(l)
	lp := math.Log1p(-q)
	t.density = tail{d, l + (k-1)*lp}
	if k*q < 1e-17 {
		t.upper = tail{k * m, l}
		t.lower = tail{1, 0}
		return t
	}
	t.lower = tail{1, k * lp}
	t.upper = tail{-math.Expm1(k * lp), 0}
	return t
}
