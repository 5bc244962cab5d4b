package noncentral

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// fPath is a path through the saddle point for noncentral F, as chi2Path is for
// χ². With a = D1/2, b = D2/2, y = c/(1+c) the exponent is
//
//	φ(u) = (λ/2)(u-1) + (a+b) log u - b log((u-y)/(1-y))
//
// and the path is named by ρ = y/(U-y), so U = c(1+ρ)/((1+c)ρ), and ρ = c is
// U = 1. With A = λU/2 the saddle point is A + a = bρ; δ = A + a - bρ keeps
// what rounding of ρ leaves.
//
// For b >= 25 the path is the circle u = U e^{iθ}, on which
//
//	Re φ = φ(U) - 2A sin²(θ/2) - (b/2) log(1 + 4ρ(1+ρ) sin²(θ/2))
//	Im φ = δ sin θ + a(θ - sin θ) + b[2qρ sin²(θ/2) + q - atan q]
//
// with q = ρ sin θ/(1 + 2ρ sin²(θ/2)). For smaller b the ends of that integrand
// decay too slowly (like |θ|^-b), and the path is bent to the left around y:
// (u-y)/(U-y) = w = (1+iτ)², τ = sinh t, on which
//
//	φ = φ(U) + δz + b(w - 1 - log w) + (a+b)(log(1+z) - z),  z = (w-1)/(1+ρ).
type fPath struct {
	a, b  float64
	rho   float64
	u, e  float64 // U and U-1
	bigA  float64
	delta float64
	phi   dd.DD
	l1    float64 // log((1+ρ)/(1+c))
	bent  bool
	n, h  float64
	eta   float64 // distance of the pole from the path, +Inf if no matter
}

// bentBelow is the b below which the path is bent.
const bentBelow = 25

func newFPath(a, b float64, lam2 dd.DD, g *fArg, rho float64, bent bool) fPath {
	p := fPath{a: a, b: b, rho: rho, bent: bent}
	r1 := dd.Sum(1, rho)
	u := g.y().Mul(r1).DivF(rho)
	var e, l1, l2 dd.DD // U-1, log((1+ρ)/(1+c)), log(ρ/c)
	if g.shift == 0 {
		e = g.c.AddF(-rho).Div(g.c1.MulF(rho))
		l1 = dd.Log(r1.Div(g.c1))
		l2 = dd.Log(dd.From(rho).Div(g.c))
	} else {
		e = u.AddF(-1)
		l1 = dd.Log(r1)
		lc := g.logC()
		if g.shift > 0 {
			l1 = l1.Sub(lc)
		}
		l2 = dd.Log(dd.From(rho)).Sub(lc)
	}
	p.u, p.e, p.l1 = u.Float64(), e.Float64(), l1.Float64()
	A := u.Mul(lam2)
	p.bigA = A.Float64()
	p.delta = A.AddF(a).Sub(dd.Prod(b, rho)).Float64()
	p.phi = e.Mul(lam2).Add(dd.Sum(a, b).Mul(l1)).Sub(l2.MulF(a))
	slope := math.Abs(lam2.Hi + a - b*g.c.Hi) // |φ'(1)|
	if p.bent {
		p.n = bentNodes(b)
		s := math.Expm1(l2.Float64() / 2)
		p.eta = math.Inf(1)
		if math.Abs(s) < 1 {
			p.eta = math.Asin(math.Abs(s))
			slope *= 2 * p.u / (1 + rho) * (1 + s) * math.Cos(p.eta)
		}
	} else {
		p.n = circleNodes(b, rho, p.bigA)
		p.eta = math.Abs(math.Log1p(p.e))
	}
	p.h = 2 * math.Pi / p.n
	if slope > p.n || g.shift != 0 {
		p.eta = math.Inf(1)
	}
	return p
}

// circleNodes returns the number of nodes a turn for which the error term of
// the trapezoidal rule on the circle is below e^-41. Shifting θ to θ+iη inside
// multiplies the integrand by at most exp{-b'[(1+ρ)η + log(1-(1+ρ)(1-e^-η))]}
// with b' = b + A/(ρ(1+ρ)); minimized over η, this times e^-nη is the expression
// below.
func circleNodes(b, rho, bigA float64) float64 {
	bp := b + bigA/(rho*(1+rho))
	s := bp * rho * (1 + rho)
	n := math.Sqrt(82*s) + 15
	for range 60 {
		r := n / (bp * (1 + rho))
		if (bp*rho+n)*math.Log1p(r/(rho*(1+r)))-bp*math.Log1p(r) >= 42 {
			break
		}
		n *= 1.05
	}
	return n
}

func bentNodes(b float64) float64 { return math.Sqrt(82*4*b+70*70) * 1.1 }

// fSums are the three integrals over a path, each over e^φ(U): the tail without the pole's part, with
// the sign of the upper one, the density of log X and the derivative of the upper tail in λ,
//
//	(1/2πi) ∮ e^φ du/(u(u-1)),  (1/2πi) ∮ e^φ b y du/(u(u-y)),  (1/2πi) ∮ e^φ du/(2u).
//
// For b < smallB lower is the lower tail again in a form that does not cancel: without its
// factor B(u) = ((1-y)u/(u-y))^b, which is 1 at u = 1, the integrand of the tail gives 0 on a path
// left of the pole, so
//
//	P(F <= x) = -(1/2πi) ∮ e^φ (1 - 1/B(u)) du/(u(u-1)),
//
// where the pole is gone and every part is of the size of b, as the tail is.
type fSums struct{ tail, kernel, slope, lower float64 }

const smallB = 0.5

// small reports whether lower is wanted: never in the far upper tail.
func (p *fPath) small() bool { return p.b < smallB && (p.e < 0 || p.phi.Hi > -5) }

func (p *fPath) sums() (s fSums) {
	if p.bent {
		return p.bentSums()
	}
	return p.circleSums()
}

func (p *fPath) circleSums() (s fSums) {
	d2 := p.e * p.e
	for j := 0.5; j < maxNodes; j++ {
		th := j * p.h
		if !(th <= math.Pi) {
			break
		}
		sh, ch := math.Sincos(th / 2)
		sh2 := sh * sh
		sin := 2 * sh * ch
		r2 := 2 * p.rho * sh2
		m := 2*p.bigA*sh2 + p.b/2*math.Log1p(2*r2*(1+p.rho))
		if !(m <= cut) {
			break
		}
		q := p.rho * sin / (1 + r2)
		psi := p.delta*sin + p.a*sinDefect(th, sin) + p.b*(q*r2+atanDefect(q))
		sp, cp := math.Sincos(psi)
		f := math.Exp(-m)
		// Re of e^{iψ}/(u-1)
		s.tail += f * (cp*(p.e-2*p.u*sh2) + p.u*sp*sin) / (d2 + 4*p.u*sh2)
		// Re of e^{iψ} (U-y)/(u-y)
		wr, wi := 1-2*(1+p.rho)*sh2, (1+p.rho)*sin
		s.kernel += f * (cp*wr + sp*wi) / (wr*wr + wi*wi)
		s.slope += f * cp
	}
	c := p.h / math.Pi
	s.tail *= c
	s.kernel *= c * p.b * p.rho
	s.slope *= c / 2
	return s
}

func (p *fPath) bentSums() (s fSums) {
	r := 1 + p.rho
	small := p.small()
	last := 0.0
	for j := 0.5; j < maxNodes; j++ {
		tau, w := sinhCosh(j * p.h)
		q := tau * tau
		zr, zi := -q/r, 2*tau/r
		m := p.b*(q+math.Log1p(q)) - p.delta*zr - (p.a+p.b)*(math.Log1p(2*zr+zr*zr+zi*zi)/2-zr)
		if !(m <= cut && m >= last) {
			break // where m turns the path crosses the valley that ends at u = 0
		}
		last = m
		arg := math.Atan2(zi, 1+zr)
		psi := 2*p.b*atanDefect(tau) + p.delta*zi + (p.a+p.b)*(arg-zi)
		sp, cp := math.Sincos(psi)
		f := w * math.Exp(-m)
		ar, ai := 1+zr, zi
		// Re of e^{iψ}(1+iτ)/((1+z)(U-1+Uz))
		nr, ni := cp-tau*sp, sp+tau*cp
		br, bi := p.e+p.u*zr, p.u*zi
		dr, di := ar*br-ai*bi, ar*bi+ai*br
		d2 := dr*dr + di*di
		tr, ti := (nr*dr+ni*di)/d2, (ni*dr-nr*di)/d2
		s.tail += f * tr
		if small {
			// 1 - 1/B = 1 - e^{x+iη}
			x := p.b * (math.Log1p(q) - p.l1 - math.Log1p(2*zr+zr*zr+zi*zi)/2)
			eta := p.b * (2*math.Atan(tau) - arg)
			es, ec := math.Sincos(eta / 2)
			ex := math.Exp(x)
			s.lower += f * (tr*(2*ex*es*es-math.Expm1(x)) + ti*ex*2*es*ec)
		}
		// Re of e^{iψ}/((1+z)(1+iτ))
		dr, di = ar-tau*ai, ai+tau*ar
		s.kernel += f * (cp*dr + sp*di) / (dr*dr + di*di)
		// Re of e^{iψ}(1+iτ)/(1+z)
		s.slope += f * (nr*ar + ni*ai) / (ar*ar + ai*ai)
	}
	c := 2 * p.h / (math.Pi * r)
	s.tail *= c
	s.kernel *= c * p.b * p.rho
	s.slope *= c / 2
	s.lower *= -c
	return s
}

// result joins the sums with the pole's part and the scale.
func (p *fPath) result() (t special.Scaled, upper bool, kernel, slope special.Scaled) {
	s := p.sums()
	upper = p.e >= 0
	if !upper {
		s.tail = -s.tail
	}
	at := func(v float64) special.Scaled { return special.Scaled{L: p.phi, M: dd.From(v)} }
	if p.small() {
		if l := at(s.lower); l.DD().Hi < 0.6 {
			return l, false, at(s.kernel), at(s.slope)
		}
	}
	return at(s.tail + poleTerm(p.eta, p.n, p.phi.Hi)), upper, at(s.kernel), at(s.slope)
}

const (
	cut = 43 // e^-cut is beneath the accuracy of a sum
	// maxNodes is a belt: with h = 2π/n and n about sqrt(82 S) + 15 for the curvature S the integrand
	// falls below e^-cut within 9/sqrt(S), 13 steps, for large S; for b just above 25 and large ρ the
	// circle takes 66 steps, and the bent path 41 for b = 25, 90 for b = 5e-4.
	maxNodes = 2000
)
