package lrt

import "math"

// summit is where a climb ended.
type summit struct {
	u          []float64
	f          float64
	marks      [][]mark // of coordinates running to the end of their range
	g          []float64
	info       []float64 // −∂²/∂u∂u' near the summit; nil: never taken
	taken      float64   // how near, in standard errors
	decrement  float64   // what a quadratic model still promises
	converged  bool
	edge       []int // coordinates running into the finite end of their range
	escaped    []int // coordinates running to infinity
	rising     bool  // and the log likelihood rises without end with them
	walls      []int // parameters held back by a wall
	iterations int
}

// mark is a log likelihood met at a distance from the start.
type mark struct{ d, f float64 }

// A step is taken in the largest region where the quadratic model is trusted:
// the ellipsoid whose half axes are radius standard errors.
type region struct {
	m      int
	curv   []float64 // −∂²/∂u∂u', the model
	factor []float64
	s, w   []float64
}

// solve fills r.s with the maximiser of g·s − ½ s·curv·s over the region
// (Moré and Sorensen 1983) and returns its scaled length and the damping used.
func (r *region) solve(g []float64, radius float64) (length, damp float64) {
	m := r.m
	diag := func(j int) float64 { return math.Max(math.Abs(r.curv[j*m+j]), 1e-300) }
	try := func(mu float64) bool {
		copy(r.factor, r.curv)
		for j := range m {
			r.factor[j*m+j] += mu * diag(j)
		}
		if !cholesky(r.factor, m) {
			return false
		}
		copy(r.s, g)
		choleskySolve(r.factor, m, r.s)
		length = 0
		for j, v := range r.s {
			length += v * v * diag(j)
		}
		length = math.Sqrt(length)
		return true
	}
	if try(0) && length <= radius {
		return length, 0
	}
	lo, hi := 0.0, 0.0
	mu := 1e-3
	for range 60 {
		if try(mu) {
			if length <= radius*1.1 && (length >= radius*0.7 || lo == 0 && mu <= 1e-12 || lo > 0 && hi > 0 && hi < lo*1.01) {
				break
			}
			if length > radius {
				lo = mu
			} else {
				hi = mu
			}
			// Newton on 1/length, which is nearly linear in mu.
			choleskyForward2(r.factor, m, r.s, r.w, diag)
			q := dot(r.w, r.w)
			next := mu + (length*length/q)*(length-radius)/radius
			if next > lo && (hi == 0 || next < hi) {
				mu = next
				continue
			}
		} else {
			lo = mu
		}
		if hi == 0 {
			mu = math.Max(10*mu, 1e-3)
		} else {
			mu = math.Max(math.Sqrt(lo*hi), 1e-3*hi)
		}
	}
	return length, mu
}

func choleskyForward2(l []float64, n int, s, w []float64, diag func(int) float64) {
	for j := range n {
		w[j] = s[j] * diag(j)
	}
	choleskyForward(l, n, w)
}

// promise returns the gain the model expects of step r.s.
func (r *region) promise(g []float64) float64 {
	m := r.m
	var v float64
	for j, s := range r.s {
		v += g[j]*s - 0.5*s*dot(r.curv[j*m:j*m+m], r.s)
	}
	return v
}

// update is the Broyden-Fletcher-Goldfarb-Shanno formula on the model, damped
// (Powell 1978) so that it stays positive definite.
func (r *region) update(s, y []float64) {
	m := r.m
	bs := r.w
	for j := range m {
		bs[j] = dot(r.curv[j*m:j*m+m], s)
	}
	sbs, sy := dot(s, bs), dot(s, y)
	if !(sbs > 0) {
		return
	}
	if sy < 0.2*sbs {
		t := 0.8 * sbs / (sbs - sy)
		for j := range y {
			y[j] = t*y[j] + (1-t)*bs[j]
		}
		sy = dot(s, y)
	}
	for j := range m {
		for k := range m {
			r.curv[j*m+k] += y[j]*y[k]/sy - bs[j]*bs[k]/sbs
		}
	}
}

// definite reports whether the model is concave.
func (r *region) definite() bool {
	copy(r.factor, r.curv)
	return cholesky(r.factor, r.m)
}

// diagonal replaces the model by its diagonal's size.
func (r *region) diagonal() {
	for j := range r.m {
		for k := range r.m {
			if j != k {
				r.curv[j*r.m+k] = 0
			}
		}
		r.curv[j*r.m+j] = math.Max(math.Abs(r.curv[j*r.m+j]), 1e-300)
	}
}

const (
	gainTol   = 1e-14 // what may be left to gain in log likelihood: by good gradients,
	plainTol  = 5e-12 // and by differences of whole log likelihoods
	closeTol  = 1e-9  // good enough when rounding hides the rest
	looseTol  = 1e-6  // still called a maximum, with a warning
	edgeRatio = 1e-4  // distance to the end of a range, against the start's, that calls for a look at the end itself
)

// climb maximises from u. With edges set it stops for a look at the end of a
// range that a coordinate runs into.
func (p *problem) climb(u0 []float64, edges bool) summit {
	m := p.co.m
	s := summit{u: append([]float64(nil), u0...), decrement: inf}
	s.f = p.value(s.u)
	if math.IsNaN(s.f) {
		return s
	}
	p.settle(s.f)
	if m == 0 {
		s.decrement, s.converged = 0, true
		return s
	}
	r := &region{m: m, curv: make([]float64, m*m), factor: make([]float64, m*m), s: make([]float64, m), w: make([]float64, m)}
	s.g = make([]float64, m)
	info := make([]float64, m*m)
	uInfo := make([]float64, m)
	haveInfo, infos := false, 0
	newton := p.hessian
	// How far, in standard errors, the summit may lie from where the curvature was
	// taken: little where that is cheap. check looks closer when it is not clearly regular.
	reach := 3.0
	if p.each && p.grouped {
		reach = 0.5
	}

	// The climb itself takes the curvature a dozen times; where it wants to end there are
	// some left, for one from far off can be so large that any gradient looks like none.
	takeInfo := func(most int) bool {
		if infos++; infos > most || !p.information(s.u, s.f, info, false) {
			return false
		}
		copy(uInfo, s.u)
		copy(r.curv, info)
		for j := range m { // a direction that the data say nothing about must not get an endless step
			d := math.Abs(info[j*m+j])
			r.curv[j*m+j] += 1e-6 * math.Max(d, 1e-4/(p.scale[j]*p.scale[j]))
		}
		haveInfo = true
		p.rescale(r.curv)
		return true
	}

	p.survey(s.u, s.f, r.curv)
	if !p.slope(s.u, s.f, nil, s.g) {
		return s
	}
	switch {
	case p.gradient:
		if !takeInfo(12) {
			haveInfo = false
		}
	case p.outer(r.curv):
		p.regroup()
		p.rescale(r.curv)
	}
	length, _ := r.solve(s.g, inf)
	radius := math.Max(length, 1)
	trial := make([]float64, m)
	gNew, y := make([]float64, m), make([]float64, m)
	stalls := 0
	cut := false // the radius is what a wall left of it: a small gain within it says nothing
	for s.iterations = 0; s.iterations < 1000 && p.ev.err == nil; s.iterations++ {
		length, damp := r.solve(s.g, radius)
		gain := r.promise(s.g)
		if damp == 0 {
			s.decrement = gain
		} else {
			s.decrement = inf
		}
		tol := gainTol
		if !p.each && !p.gradient {
			tol = plainTol + 2*p.noise
		}
		if damp == 0 && gain < 0.5 && (!haveInfo || p.far(s.u, uInfo, info) > reach) {
			if !p.confirm(s.u) {
				if !p.slope(s.u, s.f, r.curv, s.g) {
					break
				}
				continue
			}
			if takeInfo(48) {
				if r.definite() {
					length, _ := r.solve(s.g, inf)
					radius = math.Max(radius, length)
				}
				continue
			}
		}
		if damp == 0 && gain <= tol {
			s.converged = true
			// The last step gains nothing that f can show, yet the estimate has it for one evaluation.
			for j := range trial {
				trial[j] = s.u[j] + r.s[j]
			}
			if f := p.value(trial); f >= s.f-2*p.noise {
				copy(s.u, trial)
				s.f = f
				p.settle(f)
			}
			break
		}
		// No coordinate on a curved scale moves further than the likelihood can have been looked at.
		shrink := 1.0
		for j, l := range p.co.links {
			if l.kind != linkIdentity {
				if a := math.Abs(r.s[j]); a*shrink > 2.5 {
					shrink = 2.5 / a
				}
			}
		}
		if shrink < 1 {
			for j := range r.s {
				r.s[j] *= shrink
			}
			gain, length = r.promise(s.g), length*shrink
		}
		for j := range trial {
			trial[j] = s.u[j] + r.s[j]
		}
		f := p.value(trial)
		rho := (f - s.f) / gain
		if math.IsNaN(f) || rho < 0.1 && !(math.Abs(f-s.f) <= 4*p.noise && gain < 1e-6) {
			if p.ev.err != nil {
				break
			}
			if gain < closeTol && !math.IsNaN(f) && damp == 0 {
				s.decrement, s.converged = gain, true
				break
			}
			radius = 0.25 * length
			if math.IsNaN(f) {
				p.bump(trial, &s)
				cut = cut || len(s.walls) > 0
			}
			if gain > 16*p.noise && radius > 1e-9 && s.iterations < 990 {
				continue
			}
			if cut && damp > 0 {
				break
			}
			if gain < closeTol {
				s.decrement, s.converged = gain, true
				break
			}
			// The model promises what the likelihood does not keep: look again with fresh
			// curvature, then with wide differences.
			if stalls++; stalls == 1 || stalls == 2 && !p.gradient {
				p.coarse = stalls == 2
				p.value(s.u)
				p.settle(s.f)
				if !p.slope(s.u, s.f, r.curv, s.g) || !takeInfo(12) {
					break
				}
				radius = 1
				continue
			}
			break
		}
		s.walls, cut = nil, cut && damp > 0
		if rho > 0.75 && length > 0.7*radius {
			radius = 3 * radius
		} else if rho < 0.25 {
			radius = 0.5 * length
		}
		before := s.f
		p.settle(f)
		copy(gNew, s.g)
		if !p.slope(trial, f, r.curv, s.g) {
			break
		}
		for j := range y {
			y[j] = gNew[j] - s.g[j]
		}
		copy(s.u, trial)
		s.f = f
		switch {
		case newton:
			if !takeInfo(12) {
				newton = false
			}
		case !haveInfo && gain > 1 && p.outer(r.curv):
			p.regroup()
		case damp > 0 && haveInfo && !r.definite():
			if !takeInfo(12) {
				r.diagonal()
			}
		default:
			r.update(r.s, y)
		}
		p.rescale(r.curv)
		if f-before <= 4*p.noise && gain < 1e-8 && !cut {
			s.decrement = gain
			s.converged = true
			break
		}
		if p.running(u0, &s, edges) {
			break
		}
	}
	if haveInfo {
		s.info, s.taken = info, p.far(s.u, uInfo, info)
	}
	if j := p.beyondResolution(u0, &s); j >= 0 {
		s.edge, s.escaped, s.rising = nil, []int{j}, true
	}
	if !s.converged && len(s.edge)+len(s.escaped) == 0 {
		hit := s.walls
		if s.walls = p.blocked(&s, r); len(s.walls) == 0 && cut {
			s.walls = hit
		}
	}
	return s
}

// beyondResolution finds a likelihood that grew sharper than the numbers can
// tell: a standard error of a few units in the last place of its estimate. It
// only looks so because rounding stops it; the coordinate that shrank most is to
// blame. −1: none.
func (p *problem) beyondResolution(u0 []float64, s *summit) int {
	sharp := false
	for j, l := range p.co.links {
		a := math.Abs(s.u[j])
		sharp = sharp || l.kind == linkIdentity && a > 0 && p.scale[j] < 64*(math.Nextafter(a, inf)-a) && s.info != nil
	}
	worst, at := 8.0, -1
	for j, l := range p.co.links {
		if d := math.Abs(s.u[j] - u0[j]); sharp && l.kind != linkIdentity && d > worst {
			worst, at = d, j
		}
	}
	return at
}

// rescale takes the unit of difference steps from the curvature.
func (p *problem) rescale(curv []float64) {
	for j := range p.scale {
		if d := math.Abs(curv[j*p.co.m+j]); d > 0 && !math.IsInf(d, 1) {
			p.scale[j] = 1 / math.Sqrt(d)
		}
	}
}

// far is the distance between two points in the metric of info.
func (p *problem) far(u, v, info []float64) float64 {
	var d float64
	m := len(u)
	for j := range u {
		for k := range u {
			d += (u[j] - v[j]) * info[j*m+k] * (u[k] - v[k])
		}
	}
	if !(d >= 0) {
		return inf
	}
	return math.Sqrt(d)
}

// bump notes which walls a rejected trial went through.
func (p *problem) bump(trial []float64, s *summit) {
	p.co.point(trial, p.at[0])
	s.walls = s.walls[:0]
	for _, k := range p.co.walls {
		if x := p.at[0][k]; x < p.co.lo[k] || x > p.co.hi[k] {
			s.walls = append(s.walls, k)
		}
	}
}

// blocked returns the walls that a full step of the model would cross.
func (p *problem) blocked(s *summit, r *region) []int {
	if len(p.co.walls) == 0 || s.g == nil {
		return nil
	}
	r.solve(s.g, inf)
	trial := make([]float64, len(s.u))
	for j := range trial {
		trial[j] = s.u[j] + math.Max(math.Min(r.s[j], 2.5*math.Max(1, p.scale[j])), -2.5*math.Max(1, p.scale[j]))
	}
	p.bump(trial, s)
	return append([]int(nil), s.walls...)
}

// running looks for coordinates on their way to the end of their range or to
// infinity, and reports whether the climb should stop for them.
func (p *problem) running(u0 []float64, s *summit, edges bool) bool {
	for j, l := range p.co.links {
		d := s.u[j] - u0[j]
		toEdge, toInfinity := false, false
		switch l.kind {
		case linkAbove, linkBelow:
			toEdge = s.g[j] < 0 && d < math.Log(edgeRatio)
			toInfinity = d > 100 && s.g[j] > 0 || !edges && d < -80
			// Rising at a rate that stays the same over eleven decades from a start
			// that the model gave: without end, whatever rounding makes of it further on.
			farOff := 25.0
			if d < 0 {
				farOff = 16 // beyond the four decades of a first climb
			}
			if p.ev.core.start != nil && (d > 6 || d < -6 && !edges) {
				if s.marks == nil {
					s.marks = make([][]mark, len(s.u))
				}
				m := s.marks[j]
				switch {
				case len(m) == 0, len(m) == 1 && math.Abs(d) > 0.5*(6+farOff):
					s.marks[j] = append(m, mark{math.Abs(d), s.f})
				case len(m) == 2 && math.Abs(d) > farOff:
					early := (m[1].f - m[0].f) / (m[1].d - m[0].d)
					late := (s.f - m[1].f) / (math.Abs(d) - m[1].d)
					if late > 0.2 && late < 3*early && early < 3*late {
						toInfinity, s.rising = true, true
					}
				}
			}
		case linkBetween:
			toEdge = s.g[j]*s.u[j] > 0 && math.Abs(s.u[j])-math.Abs(u0[j]) > -math.Log(edgeRatio)
			toInfinity = !edges && math.Abs(s.u[j]) > 80
		default:
			unit := math.Max(math.Max(math.Abs(u0[j]), 1), p.first[j])
			toInfinity = math.Abs(d) > 1e9*unit && s.g[j]*d > 0
		}
		if toEdge && edges {
			s.edge = append(s.edge, j)
		}
		if toInfinity {
			s.escaped = append(s.escaped, j)
			if math.Abs(s.g[j]*math.Max(1, math.Abs(d)*boolFloat(l.kind == linkIdentity))) > 1e-3 {
				s.rising = true
			}
		}
	}
	return len(s.edge)+len(s.escaped) > 0
}

func boolFloat(b bool) float64 {
	if b {
		return 1
	}
	return 0
}
