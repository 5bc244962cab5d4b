package noncentral

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// chi2Path is a circle |u| = U in the plane of u = 1/(1-2s), s the argument of
// the moment generating function of noncentral χ², through its saddle point.
//
// With φ(u) = (λ/2)(u-1) + (k/2) log u - (x/2)(1-1/u),
//
//	P(X > x) = (1/2πi) ∮ exp φ(u) du/(u(u-1)),  density = (1/2πi) ∮ exp φ(u) du/(2u²)
//
// on a path from 0- below the cut to 0- above it that crosses the positive axis
// right of 1 (left of 1: minus the lower tail). On the circle u = U e^{iθ} the
// exponent is
//
//	φ(U) - 2(A+B) sin²(θ/2) + i[δ sin θ + (k/2)(θ - sin θ)]
//
// with A = λU/2, B = x/(2U), δ = A - B + k/2, which is 0 at the saddle point
// (kept for the rounding of U): modulus and phase need no cancellation. The
// trapezoidal rule converges geometrically; see rule.
type chi2Path struct {
	half  float64 // k/2
	u, e  float64 // U and U-1
	s     float64 // A+B
	delta float64
	phi   dd.DD
	n, h  float64
	eta   float64 // distance of the pole from the path, +Inf if no matter
}

func newChi2Path(k, lambda float64, x dd.DD, b float64) chi2Path {
	p := chi2Path{half: k / 2}
	p.u = x.Hi / (2 * b)
	u := dd.From(p.u)
	e := u.AddF(-1)
	p.e = e.Float64()
	da := dd.Prod(lambda/2, p.u)
	db := x.MulF(0.5).Div(u)
	p.s = da.Hi + db.Hi
	p.delta = da.Sub(db).AddF(k / 2).Float64()
	lu := dd.Log(u)
	p.phi = e.MulF(lambda / 2).Add(lu.MulF(k / 2)).Sub(e.Mul(db))
	// Shifting θ by iη multiplies the integrand by at most e^{s(e^η-1-η)}, the
	// error term of n nodes a turn by e^{-nη}: the least over η is
	// n - (s+n) log(1+n/s), below -41 with this n.
	p.n = math.Sqrt(82*p.s) + 15
	p.h = 2 * math.Pi / p.n
	p.eta = math.Abs(lu.Float64())
	if math.Abs(lambda+k-x.Hi) > 2*p.n {
		p.eta = math.Inf(1) // the shifted path of the error term does not reach the pole
	}
	return p
}

// result returns the upper tail if the path runs right of the pole at u = 1,
// else the lower one, the density of log X, (x/2) (1/2πi) ∮ e^φ du/u², and the
// derivative of the upper tail in λ, (1/2πi) ∮ e^φ du/(2u).
func (p *chi2Path) result(x float64) (t special.Scaled, upper bool, kernel, slope special.Scaled) {
	upper = p.e >= 0
	var st, sk, ss float64
	d2 := p.e * p.e
	for j := 0.5; j < maxNodes; j++ {
		th := j * p.h
		sh, ch := math.Sincos(th / 2)
		sh2 := sh * sh
		m := 2 * p.s * sh2
		if !(m <= cut && th <= math.Pi) {
			break
		}
		sin := 2 * sh * ch
		psi := p.delta*sin + p.half*sinDefect(th, sin)
		sp, cp := math.Sincos(psi)
		f := math.Exp(-m)
		st += f * (cp*(p.e-2*p.u*sh2) + p.u*sp*sin) / (d2 + 4*p.u*sh2)
		sk += f * (cp*(1-2*sh2) + sp*sin)
		ss += f * cp
	}
	c := p.h / math.Pi
	st *= c
	if !upper {
		st = -st
	}
	at := func(v float64) special.Scaled { return special.Scaled{L: p.phi, M: dd.From(v)} }
	return at(st + poleTerm(p.eta, p.n, p.phi.Hi)), upper, at(sk * c * (x / 2 / p.u)), at(ss * c / 2)
}

// poleTerm is the part of the trapezoidal rule's error that the pole of 1/s at
// distance eta from the path makes, with n nodes in 2π, over e^phi (Goodwin 1949, Proc. Camb. Phil. Soc. 45;
// Trefethen and Weideman 2014, SIAM Review 56, section 5).
func poleTerm(eta, n, phi float64) float64 {
	if eta > 1e300 {
		return 0
	}
	e := math.Exp(-n * eta)
	return math.Exp(-phi-n*eta) / (1 + e)
}
