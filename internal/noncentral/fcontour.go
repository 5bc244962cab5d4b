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
	bent  bool
	n, h  float64
	eta   float64 // distance of the pole from the path, +Inf if no matter
}

func newFPath(a, b float64, lam2 dd.DD, g *fArg, rho float64) fPath {
	p := fPath{a: a, b: b, rho: rho, bent: b < 25}
	r1 := dd.Sum(1, rho)
	u := g.y().Mul(r1).DivF(rho)
	var e, l1, l2 dd.DD // U-1, log((1+ρ)/(1+c)), log(ρ/c)
	if g.shift == 0 {
		e = g.c.AddF(-rho).Div(g.c1.MulF(rho))
		l1 = dd.Log(r1.Div(g.c1))
		l2 = dd.Log(dd.From(rho).Div(g.c))
	} else {
		e = u.AddF(-1)
		l1 = dd.Log(r1).Sub(g.logC1)
		l2 = dd.Log(dd.From(rho)).Sub(g.logC)
	}
	p.u, p.e = u.Float64(), e.Float64()
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

// circleNode returns the modulus exponent, the phase, sin²(θ/2) and sin θ.
func (p *fPath) circleNode(th float64) (m, psi, sh2, sin, q float64) {
	sh, ch := math.Sincos(th / 2)
	sh2 = sh * sh
	sin = 2 * sh * ch
	r2 := 2 * p.rho * sh2
	m = 2*p.bigA*sh2 + p.b/2*math.Log1p(2*r2*(1+p.rho))
	q = p.rho * sin / (1 + r2)
	psi = p.delta*sin + p.a*sinDefect(th, sin) + p.b*(q*r2+atanDefect(q))
	return m, psi, sh2, sin, q
}

// bentNode returns the modulus exponent and the phase at τ, and z.
func (p *fPath) bentNode(tau float64) (m, psi, zr, zi float64) {
	q := tau * tau
	r := 1 + p.rho
	zr, zi = -q/r, 2*tau/r
	m = p.b*(q+math.Log1p(q)) - p.delta*zr - (p.a+p.b)*(math.Log1p(2*zr+zr*zr+zi*zi)/2-zr)
	psi = 2*p.b*atanDefect(tau) + p.delta*zi + (p.a+p.b)*(math.Atan2(zi, 1+zr)-zi)
	return m, psi, zr, zi
}

const cut = 43 // e^-cut is beneath the accuracy of a sum

func (p *fPath) tail() (t special.Scaled, upper bool) {
	upper = p.e >= 0
	sum := 0.0
	if p.bent {
		sum = p.bentTail()
	} else {
		sum = p.circleTail()
	}
	if !upper {
		sum = -sum
	}
	return special.Scaled{L: p.phi, M: dd.From(sum + poleTerm(p.eta, p.n, p.phi.Hi))}, upper
}

func (p *fPath) circleTail() float64 {
	sum, d2 := 0.0, p.e*p.e
	for j := 0.5; ; j++ {
		th := j * p.h
		m, psi, sh2, sin, _ := p.circleNode(th)
		if m > cut || th > math.Pi {
			break
		}
		sp, cp := math.Sincos(psi)
		sum += math.Exp(-m) * (cp*(p.e-2*p.u*sh2) + p.u*sp*sin) / (d2 + 4*p.u*sh2)
	}
	return sum * p.h / math.Pi
}

func (p *fPath) bentTail() float64 {
	sum := 0.0
	for j := 0.5; ; j++ {
		tau, w := sinhCosh(j * p.h)
		m, psi, zr, zi := p.bentNode(tau)
		if m > cut {
			break
		}
		// Re of e^{iψ}(1+iτ)/((1+z)(e+Uz))
		sp, cp := math.Sincos(psi)
		nr, ni := cp-tau*sp, sp+tau*cp
		ar, ai := 1+zr, zi
		br, bi := p.e+p.u*zr, p.u*zi
		dr, di := ar*br-ai*bi, ar*bi+ai*br
		sum += w * math.Exp(-m) * (nr*dr + ni*di) / (dr*dr + di*di)
	}
	return sum * 2 * p.h / (math.Pi * (1 + p.rho))
}

// kernel returns x times the density of F:
// (1/2πi) ∮ e^φ b y/(u(u-y)) du.
func (p *fPath) kernel() special.Scaled {
	sum := 0.0
	if p.bent {
		for j := 0.5; ; j++ {
			tau, w := sinhCosh(j * p.h)
			m, psi, zr, zi := p.bentNode(tau)
			if m > cut {
				break
			}
			// Re of e^{iψ}/((1+z)(1+iτ))
			sp, cp := math.Sincos(psi)
			dr, di := 1+zr-tau*zi, zi+tau*(1+zr)
			sum += w * math.Exp(-m) * (cp*dr + sp*di) / (dr*dr + di*di)
		}
		sum *= 2 / (1 + p.rho)
	} else {
		for j := 0.5; ; j++ {
			th := j * p.h
			m, psi, sh2, sin, q := p.circleNode(th)
			if m > cut || th > math.Pi {
				break
			}
			arg := math.Atan2(sin, 1-2*sh2) + math.Atan(q)
			sum += math.Exp(-m) * math.Cos(psi-arg) / math.Sqrt(1+4*p.rho*(1+p.rho)*sh2)
		}
	}
	return special.Scaled{L: p.phi, M: dd.From(sum * p.h / math.Pi * p.b * p.rho)}
}

// slope returns the derivative of the upper tail in λ: (1/2πi) ∮ e^φ du/(2u).
func (p *fPath) slope() special.Scaled {
	sum := 0.0
	if p.bent {
		for j := 0.5; ; j++ {
			tau, w := sinhCosh(j * p.h)
			m, psi, zr, zi := p.bentNode(tau)
			if m > cut {
				break
			}
			// Re of e^{iψ}(1+iτ)/(1+z)
			sp, cp := math.Sincos(psi)
			nr, ni := cp-tau*sp, sp+tau*cp
			dr, di := 1+zr, zi
			sum += w * math.Exp(-m) * (nr*dr + ni*di) / (dr*dr + di*di)
		}
		sum *= 2 / (1 + p.rho)
	} else {
		for j := 0.5; ; j++ {
			th := j * p.h
			m, psi, _, _, _ := p.circleNode(th)
			if m > cut || th > math.Pi {
				break
			}
			sum += math.Exp(-m) * math.Cos(psi)
		}
	}
	return special.Scaled{L: p.phi, M: dd.From(sum * p.h / (2 * math.Pi))}
}
