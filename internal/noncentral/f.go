package noncentral

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// The regions of noncentral F(2a, 2b, λ) at x, with ρ and A of the saddle point
// (see fPath):
//
//	A + b log(1+ρ) >= 42   contour integral: circle for b >= 25, a path bent around y for smaller b
//	else                   Poisson mixture in double-double
//
// What the paths leave out near u = 0 is below e^-42 of the integral. Where the
// mixture is used, A < 42, the index of its dominating term.
const fFew = 42

// fArg is the argument of a noncentral F tail: c = D1 x/D2 and 1+c. Where c is beyond 2^±400,
// and may leave the range of float64, c is scaled by 2^-shift; one of c and 1 is then lost beside the
// other.
type fArg struct {
	c, c1 dd.DD // c1 is +Inf for shift > 0
	shift int
}

// newFArg takes x 2^ex.
func newFArg(d1, d2 float64, x dd.DD, ex int) fArg {
	if ex == 0 && x.Hi > 0x1p-300 && x.Hi < 0x1p300 {
		if c := x.MulF(d1).DivF(d2); c.Hi > 0x1p-390 && c.Hi < 0x1p390 {
			return fArg{c: c, c1: c.AddF(1)}
		}
	}
	fx, e0 := math.Frexp(x.Hi)
	ex += e0
	fl := math.Ldexp(x.Lo, -e0)
	f1, e1 := math.Frexp(d1)
	f2, e2 := math.Frexp(d2)
	g := fArg{c: dd.DD{Hi: fx, Lo: fl}.MulF(f1).DivF(f2), shift: ex + e1 - e2}
	switch e := g.shift; {
	case e <= -400:
		g.c1 = dd.From(1)
	case e >= 400:
		g.c1 = dd.From(math.Inf(1))
	default:
		g.c, g.shift = g.c.Scale(e), 0
		g.c1 = g.c.AddF(1)
	}
	return g
}

// logC returns log c.
func (g *fArg) logC() dd.DD {
	return dd.Log(g.c).Add(dd.Ln2.MulF(float64(g.shift)))
}

// y returns c/(1+c), 0 where it underflows.
func (g *fArg) y() dd.DD {
	switch {
	case g.shift == 0:
		return g.c.Div(g.c1)
	case g.shift > 0:
		return dd.From(1)
	}
	return g.c.Scale(g.shift)
}

// fSaddle returns ρ at the saddle point and A there.
func fSaddle(a, b, lam2, y float64) (rho, A float64) {
	// bρ = a + (λy/2)(1 + 1/ρ): bρ² - (a + λy/2)ρ - λy/2 = 0.
	m := a + lam2*y
	rho = (m + math.Sqrt(m*m+4*b*lam2*y)) / (2 * b)
	return rho, lam2 * y * (1 + 1/rho)
}

func fMixture(a, b float64, half dd.DD, g *fArg) mixture {
	da, db := dd.From(a), dd.From(b)
	m := mixture{a: a, b: b, half: half}
	m.beta = true
	m.y, m.p, m.a1 = g.y(), dd.Sum(a, b), dd.Sum(a, 1)
	switch {
	case g.shift < 0:
		m.c, _ = special.BetaTailTiny(da, db, g.logC())
		m.t0, m.end = m.c, -1
	case g.shift > 0:
		m.logY1 = g.logC().Neg()
		m.c, m.t0 = special.BetaTailTiny(db, da, m.logY1)
		m.t0.M = m.t0.M.Div(da)
		m.end = 1
	default:
		m.y1 = dd.From(1).Div(g.c1)
	}
	return m
}

// beyond reports whether the saddle point lies right of the pole.
func (g *fArg) beyond(rho float64) bool {
	return g.shift > 0 || g.shift == 0 && rho <= g.c.Hi
}

// F is noncentral F at a point.
type F struct {
	contour bool
	right   bool
	path    fPath
	mix     mixture
}

// AtF prepares noncentral F at x, for finite d1, d2, x > 0, λ >= 0.
func AtF(d1, d2, lambda, x float64) (p F) {
	return atF(d1, d2, dd.From(lambda/2), dd.From(x), 0)
}

// atF takes λ/2 and x 2^ex in double-double.
func atF(d1, d2 float64, half, x dd.DD, ex int) (p F) {
	g := newFArg(d1, d2, x, ex)
	a, b := d1/2, d2/2
	rho, A := fSaddle(a, b, half.Hi, g.y().Hi)
	if A+b*math.Log1p(rho) >= fFew {
		p.contour = true
		p.path = newFPath(a, b, half, &g, rho, b < bentBelow)
		return p
	}
	p.right = g.beyond(rho)
	p.mix = fMixture(a, b, half, &g)
	return p
}

// All returns one tail, the upper one if upper is set, and the smaller one or at least one not
// near 1; the density of log X, x times that of X; and the derivative of the upper
// tail in λ. The latter two are good for Newton steps; see Kernel.
func (p *F) All() (t special.Scaled, upper bool, kernel, slope special.Scaled) {
	if p.contour {
		return p.path.result()
	}
	return p.mix.all(p.right)
}

// Tail returns the first two results of All.
func (p *F) Tail() (t special.Scaled, upper bool) {
	t, upper, _, _ = p.All()
	return t, upper
}

// Kernel returns the density of log X to full accuracy.
func (p *F) Kernel() (kernel special.Scaled) {
	if p.mixed() {
		return p.mix.kernel()
	}
	_, _, kernel, _ = p.All()
	return kernel
}

func (p *F) mixed() bool { return !p.contour }

// LogDensityTwo returns the logarithm of the density for d1 = 2, which rises to -λ/2 at x = 0
// and so comes arbitrarily near 0; with c = 2x/d2 and b = d2/2 (for d2 = +Inf: bc = x) it is
//
//	-(b+1) log(1+c) - λ/2 + log(1 + Σ_{j>=1} (λy/2)^j (b+1)...(b+j)/(j!)²)
//
// without cancellation for small x and λ; ok is false elsewhere.
func LogDensityTwo(d2, lambda, x float64) (l float64, ok bool) {
	if !(x > 1e-280 && x < 0.5 && lambda < 0.5) {
		return 0, false
	}
	half := dd.From(lambda / 2)
	var z, p, v dd.DD // z the part of a term's quotient that does not change, v = -(b+1) log(1+c)
	if math.IsInf(d2, 1) {
		z, v = half.MulF(x), dd.From(-x)
	} else {
		c := dd.From(2 * x).DivF(d2)
		if !(c.Hi < 1) {
			return 0, false
		}
		p = dd.Sum(d2/2, 1)
		v = dd.Log1p(c).Mul(p).Neg()
		z = half.Mul(c).Div(c.AddF(1))
	}
	t, sum := dd.From(1), dd.DD{}
	for j := 1.0; j < 60; j++ {
		r := z
		if p.Hi != 0 {
			r = r.Mul(p.AddF(j - 1))
		}
		t = t.Mul(r).DivF(j * j)
		sum = sum.Add(t)
		if t.Hi < 0x1p-70*sum.Hi {
			break
		}
	}
	return v.Sub(half).Add(dd.Log1p(sum)).Float64(), t.Hi < 0x1p-60*sum.Hi || sum.Hi == 0
}

// FKernelFull is Kernel with more than 60 bits, for logarithms near 0: the mixture in double-double as long as
// its dominating index is below kernelFullMax, some 4000 terms at most.
func FKernelFull(d1, d2, lambda, x float64) special.Scaled {
	p := AtF(d1, d2, lambda, x)
	if p.contour && p.path.bigA > kernelFullMax {
		return p.Kernel()
	}
	g := newFArg(d1, d2, dd.From(x), 0)
	m := fMixture(d1/2, d2/2, dd.From(lambda/2), &g)
	return m.fullKernel()
}

const kernelFullMax = 1500
