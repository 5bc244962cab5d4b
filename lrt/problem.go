package lrt

import (
	"math"
	"math/bits"
)

// problem is one maximisation: a frame's free coordinates u over the data.
// Every function value is a log likelihood; NaN marks points to stay away from.
type problem struct {
	ev    *evaluator
	co    *coordinates
	chain []*frame    // co.f first, the root last
	at    [][]float64 // parameters by frame of the chain

	each, gradient, hessian bool // which of the model's functions are used

	scale []float64 // about one standard error, by coordinate: the unit of difference steps
	first []float64 // the unit that a climb's first look found, by coordinate
	noise float64   // rounding of a log likelihood here
	rough float64   // and what was measured of it, where that is much more than its size suggests
	doubt []float64 // curvature that rounding alone could have made, by coordinate

	base    []float64 // log likelihoods of the observations at the current point
	work    []float64 // the same at a displaced one
	groups  [][]int   // coordinates that may be displaced together
	owner   [][]int32 // by group, once found: which of them an observation depends on, −1: none
	score   [][]float64
	grouped bool // groups were found from zeros of the scores
	coarse  bool // wide central steps: the log likelihood is noisy

	v, per []float64 // displaced point, and one over its displacements
	space  []float64 // scratch of second differences
	gRoot  []float64
	jac    []float64 // root by u, for analytic derivatives
	g2, g3 []float64
}

func newProblem(ev *evaluator, co *coordinates) *problem {
	p := &problem{ev: ev, co: co}
	for f := co.f; f != nil; f = f.down() {
		p.chain = append(p.chain, f)
		p.at = append(p.at, make([]float64, len(f.params)))
	}
	c := ev.core
	p.each = c.each != nil && !ev.noEach
	p.gradient = c.gradient != nil && !ev.noGradient
	p.hessian = p.gradient && c.hessian != nil && !ev.noHessian && len(p.chain) == 1
	if p.gradient {
		p.each = false
	}
	m := co.m
	p.scale, p.v, p.doubt = make([]float64, m), make([]float64, m), make([]float64, m)
	p.per, p.first = make([]float64, m), make([]float64, m)
	if p.each {
		p.base, p.work = make([]float64, c.n), make([]float64, c.n)
	}
	p.singletons()
	if p.gradient {
		p.gRoot = make([]float64, len(c.params))
		p.jac = make([]float64, len(c.params)*m)
		p.g2, p.g3 = make([]float64, m), make([]float64, m)
	}
	return p
}

// singletons makes every coordinate a group of its own.
func (p *problem) singletons() {
	m := p.co.m
	p.groups, p.owner, p.score, p.grouped = nil, nil, nil, false
	for j := range m {
		p.groups = append(p.groups, []int{j})
	}
	if !p.each {
		return
	}
	n := p.ev.core.n
	all := make([]float64, m*n)
	for j := range m {
		p.score = append(p.score, all[j*n:j*n+n])
	}
}

// root fills the root parameters at u and returns them, nil outside the ranges.
func (p *problem) root(u []float64) []float64 {
	if !p.co.point(u, p.at[0]) {
		return nil
	}
	return p.descend()
}

// descend carries p.at[0] down to the root.
func (p *problem) descend() []float64 {
	for i := 0; i+1 < len(p.chain); i++ {
		if !p.mapped(p.chain[i].layer.m, p.at[i], p.at[i+1]) {
			return nil
		}
		for k, q := range p.chain[i+1].params {
			if v := p.at[i+1][k]; !(v >= q.Lower && v <= q.Upper) || math.IsInf(v, 0) {
				return nil
			}
		}
	}
	return p.at[len(p.at)-1]
}

func (p *problem) mapped(m Map, phi, theta []float64) bool {
	defer p.ev.guard("map of restriction", nil)
	for i := range theta {
		theta[i] = nan // a parameter that the map forgets is an error, not a stale value
	}
	m.To(phi, theta)
	return true
}

// value returns the log likelihood at u.
func (p *problem) value(u []float64) float64 {
	theta := p.root(u)
	if theta == nil {
		return nan
	}
	if p.each {
		return p.ev.rows(theta, p.work)
	}
	return p.ev.value(theta)
}

// settle makes the observations' values of the last call of value the base.
func (p *problem) settle(f float64) {
	p.noise = math.Max(4*epsilon*(1+math.Abs(f)), p.rough)
	if p.each {
		p.base, p.work = p.work, p.base
	}
}

// isRough measures the rounding of a log likelihood that is a small difference of
// large terms: its second difference over a millionth of a standard error and less is
// rounding and nothing else, and its values there are multiples of the last place of the
// large terms. It reports whether that is much more than the size of the log
// likelihood suggests, and lets p.noise know.
func (p *problem) isRough(u []float64) bool {
	if p.each || p.gradient || p.co.m == 0 {
		return false
	}
	f := p.value(u)
	a, b := make([]float64, len(u)), make([]float64, len(u))
	second, place := 0.0, lastPlace(f)
	for _, t := range []float64{1e-8, 3e-8} {
		for j := range u {
			h := p.step(u, j, t)
			a[j], b[j] = u[j]+h, u[j]-h
		}
		fa, fb := p.value(a), p.value(b)
		second = math.Max(second, math.Abs(fa+fb-2*f))
		place = math.Min(place, math.Min(lastPlace(fa), lastPlace(fb)))
	}
	for j := range u {
		a[j] = u[j] + p.step(u, j, 0.5)
	}
	if far := p.value(a); far != f && second < place { // rounding happened to agree, not to vanish
		second = math.Max(second, math.Min(place, lastPlace(far)))
	}
	if !(second > 64*4*epsilon*(1+math.Abs(f))) || math.IsInf(second, 1) {
		return false
	}
	p.rough = second
	return true
}

// lastPlace returns the largest power of two that x is a multiple of, NaN without one.
func lastPlace(x float64) float64 {
	if x == 0 || math.IsNaN(x) || math.IsInf(x, 0) {
		return nan
	}
	m, e := math.Frexp(x)
	return math.Ldexp(1, e-53+bits.TrailingZeros64(uint64(math.Abs(math.Ldexp(m, 53)))))
}

// step is a displacement of about t standard errors that the arithmetic
// represents exactly.
func (p *problem) step(u []float64, j int, t float64) float64 {
	h := t * p.scale[j]
	if least := 64 * (math.Nextafter(math.Abs(u[j]), inf) - math.Abs(u[j])); !(h > least) {
		h = least
	}
	if p.co.links[j].kind != linkIdentity {
		h = math.Min(h, 0.1)
	}
	return (u[j] + h) - u[j]
}

// slope fills g with the gradient at u, where the log likelihood is f and, if
// p.each, the base is settled. curv holds the curvatures −∂²/∂u² known so far
// (row-major, nil: unknown); they remove the first-order error of forward
// differences. It reports whether the gradient could be had.
func (p *problem) slope(u []float64, f float64, curv, g []float64) bool {
	if p.gradient {
		return p.pullBack(u, g)
	}
	if p.coarse {
		return p.central(u, g, math.Cbrt(math.Max(3*p.noise, 1e-10)))
	}
	t := 2 * math.Sqrt(p.noise)
	m := p.co.m
	copy(p.v, u)
	for c, group := range p.groups {
		sign := 1.0
		var fc float64
		for try := 0; ; try++ {
			for _, j := range group {
				p.v[j] = u[j] + sign*p.step(u, j, t)
			}
			fc = p.value(p.v)
			if !math.IsNaN(fc) || try == 1 {
				break
			}
			sign = -1 // the other side of a wall
		}
		if math.IsNaN(fc) {
			if p.ev.err == nil && p.grouped {
				p.singletons()
				return p.slope(u, f, curv, g)
			}
			if p.ev.err != nil {
				return false
			}
			for _, j := range group {
				g[j] = 0 // an isolated point in this direction
			}
			copy(p.v, u)
			continue
		}
		for _, j := range group {
			g[j] = 0
		}
		if p.each {
			s := p.score[c]
			if !p.grouped {
				j := group[0]
				per := 1 / (p.v[j] - u[j])
				for i, b := range p.base {
					s[i] = (p.work[i] - b) * per
				}
				g[j] = sum(s)
			} else {
				for _, j := range group {
					p.per[j] = 1 / (p.v[j] - u[j])
				}
				own := p.owner[c]
				for i, b := range p.base {
					s[i] = 0
					if j := own[i]; j >= 0 {
						s[i] = (p.work[i] - b) * p.per[j]
						g[j] += s[i]
					}
				}
			}
		} else {
			j := group[0]
			g[j] = (fc - f) / (p.v[j] - u[j])
		}
		for _, j := range group {
			if curv != nil {
				g[j] += 0.5 * (p.v[j] - u[j]) * curv[j*m+j]
			}
			p.v[j] = u[j]
		}
	}
	return finite(g)
}

// central fills g by central differences with steps of t standard errors.
func (p *problem) central(u, g []float64, t float64) bool {
	copy(p.v, u)
	for j := range g {
		h := p.step(u, j, t)
		p.v[j] = u[j] + h
		a := p.value(p.v)
		p.v[j] = u[j] - h
		b := p.value(p.v)
		p.v[j] = u[j]
		g[j] = (a - b) / (2 * h)
	}
	return finite(g)
}

// jacobian fills p.jac with ∂root/∂u at u.
func (p *problem) jacobian(u []float64) bool {
	m := p.co.m
	if len(p.chain) == 1 {
		if !p.co.point(u, p.at[0]) {
			return false
		}
		for k, b := range p.co.basis {
			for j, w := range b {
				p.jac[k*m+j] = w * p.co.dz[j]
			}
		}
		return true
	}
	// The map costs little beside a likelihood: central differences with one extrapolation.
	n := len(p.ev.core.params)
	copy(p.v, u)
	part := func(j int, h float64, out []float64) bool {
		p.v[j] = u[j] + h
		a := p.root(p.v)
		if a == nil {
			return false
		}
		copy(out, a)
		p.v[j] = u[j] - h
		b := p.root(p.v)
		p.v[j] = u[j]
		if b == nil {
			return false
		}
		for k := range out {
			out[k] = (out[k] - b[k]) / (2 * h)
		}
		return true
	}
	d1, d2 := make([]float64, n), make([]float64, n)
	for j := range m {
		h := 1e-3 * math.Max(math.Abs(u[j]), 1e-2)
		if p.co.links[j].kind != linkIdentity {
			h = 1e-3
		}
		if !part(j, h, d1) || !part(j, h/2, d2) {
			return false
		}
		for k := range n {
			p.jac[k*m+j] = (4*d2[k] - d1[k]) / 3
		}
	}
	return true
}

// pullBack fills g with the model's own gradient in the coordinates u.
func (p *problem) pullBack(u, g []float64) bool {
	if !p.jacobian(u) {
		return false
	}
	theta := p.root(u)
	if theta == nil || !p.ev.grad(theta, p.gRoot) {
		return false
	}
	m := p.co.m
	for j := range g {
		g[j] = 0
	}
	for k, v := range p.gRoot {
		for j, w := range p.jac[k*m : k*m+m] {
			g[j] += v * w
		}
	}
	return finite(g)
}
