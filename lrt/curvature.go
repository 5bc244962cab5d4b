package lrt

import "math"

// survey finds a unit of length for every coordinate and fills curv with a
// first curvature: the diagonal of second differences, which scales a fit
// whatever the units of its parameters. u must be a point of finite log
// likelihood f.
func (p *problem) survey(u []float64, f float64, curv []float64) {
	m := p.co.m
	for j := range m {
		identity := p.co.links[j].kind == linkIdentity
		if !identity {
			p.scale[j] = 0.1
			if p.each || p.gradient {
				curv[j*m+j] = 100
				continue
			}
		} else if p.scale[j] = 1e-3 * math.Abs(u[j]); p.scale[j] == 0 {
			p.scale[j] = 1e-3
		}
		curv[j*m+j] = p.secondDifference(u, f, j)
		p.scale[j] = 1 / math.Sqrt(curv[j*m+j])
		p.first[j] = p.scale[j]
	}
}

// secondDifference searches a displacement of coordinate j that changes the log
// likelihood visibly and not wildly, and returns the curvature seen there,
// always positive.
func (p *problem) secondDifference(u []float64, f float64, j int) float64 {
	copy(p.v, u)
	h := p.step(u, j, 1)
	grow := false
	for range 40 {
		p.v[j] = u[j] + h
		a := p.value(p.v)
		p.v[j] = u[j] - h
		b := p.value(p.v)
		p.v[j] = u[j]
		d := math.Max(math.Abs(a-f), math.Abs(b-f))
		switch {
		case p.ev.err != nil:
			return 1
		case math.IsNaN(d) || d > 100:
			if grow {
				h /= 3
				return 1 / (h * h)
			}
			h /= 32
		case d < 1e4*p.noise && d < 1e-3:
			grow = true
			h *= 16
			wide := math.Max(math.Abs(u[j]), 1)
			far := 1e6 * wide
			if u[j] == 0 { // zero says nothing of the unit: stresses in pascal, counts of molecules
				far = 1e30
			}
			if h > far {
				return 1 / (wide * wide) // nothing depends on it
			}
			if p.co.links[j].kind != linkIdentity && h > 4 {
				return 1 / (h * h)
			}
		default:
			c := math.Abs(a+b-2*f) / (h * h)
			if least := d * d / (h * h) * 1e-2; c < least {
				c = least // far out, where the likelihood is straight
			}
			return math.Max(c, 1e-300)
		}
	}
	return 1 / (h * h)
}

// outer fills curv with the sum of the outer products of the observations'
// scores, an estimate of the information that needs no second derivatives
// (Berndt, Hall, Hall, Hausman 1974). It reports whether it is of any use.
func (p *problem) outer(curv []float64) bool {
	m, n := p.co.m, p.ev.core.n
	if !p.each || n < 2*m {
		return false
	}
	for i := range curv {
		curv[i] = 0
	}
	for c, sc := range p.score {
		for d := range c + 1 {
			sd := p.score[d]
			if !p.grouped {
				curv[c*m+d] = dot(sc, sd)
				curv[d*m+c] = curv[c*m+d]
				continue
			}
			oc, od := p.owner[c], p.owner[d]
			for i, v := range sc {
				if j, k := oc[i], od[i]; j >= 0 && k >= 0 {
					curv[int(j)*m+int(k)] += v * sd[i]
					if c != d {
						curv[int(k)*m+int(j)] += v * sd[i]
					}
				}
			}
		}
	}
	for j := range m {
		if d := curv[j*m+j]; !(d > 0) || math.IsInf(d, 1) {
			return false
		}
	}
	return true
}

// regroup finds coordinates that no observation shares, from the zeros of a
// full set of scores; they can be displaced together (Curtis, Powell, Reid
// 1974). Differences of an untouched term are exactly zero.
func (p *problem) regroup() {
	m, n := p.co.m, p.ev.core.n
	if !p.each || p.grouped || m < 3 {
		return
	}
	var groups [][]int
	var owners [][]int32
next:
	for j := range m {
		for g := range groups {
			free := true
			for i, v := range p.score[j] {
				if v != 0 && owners[g][i] >= 0 {
					free = false
					break
				}
			}
			if free {
				groups[g] = append(groups[g], j)
				for i, v := range p.score[j] {
					if v != 0 {
						owners[g][i] = int32(j)
					}
				}
				continue next
			}
		}
		own := make([]int32, n)
		for i := range own {
			own[i] = -1
			if p.score[j][i] != 0 {
				own[i] = int32(j)
			}
		}
		groups, owners = append(groups, []int{j}), append(owners, own)
	}
	if 4*len(groups) > 3*m {
		return
	}
	p.groups, p.owner, p.grouped = groups, owners, true
	p.score = p.score[:len(groups)]
}

// confirm checks the groups at u with one evaluation, all coordinates displaced
// at once: every observation must change by what its owners' scores say. A
// failure returns to single coordinates.
func (p *problem) confirm(u []float64) bool {
	if !p.grouped {
		return true
	}
	t := 2 * math.Sqrt(p.noise)
	for j := range u {
		s := 1.0
		if j%2 == 1 {
			s = -0.7
		}
		p.v[j] = u[j] + s*p.step(u, j, 8*t)
	}
	if math.IsNaN(p.value(p.v)) {
		p.singletons()
		return false
	}
	for i, b := range p.base {
		want, size := 0.0, 0.0
		for c := range p.groups {
			if j := p.owner[c][i]; j >= 0 {
				d := p.score[c][i] * (p.v[j] - u[j])
				want += d
				size += math.Abs(d)
			}
		}
		if got := p.work[i] - b; math.Abs(got-want) > 0.05*size+64*epsilon*(1+math.Abs(b)) {
			p.singletons()
			return false
		}
	}
	return true
}

// information fills info with −∂²/∂u∂u' at u by the best means the model
// offers, and reports whether it could be had. wide asks for the accurate form
// (steps extrapolated), which costs twice as much.
func (p *problem) information(u []float64, f float64, info []float64, wide bool) bool {
	switch {
	case p.hessian:
		return p.ownHessian(u, info)
	case p.gradient:
		return p.gradientDifferences(u, info, wide)
	}
	if !wide {
		return p.valueDifferences(u, f, info, 2*math.Sqrt(math.Sqrt(p.noise)), len(p.groups) > 6)
	}
	// One Richardson extrapolation from steps of t and t/2 standard errors.
	t := 4 * math.Pow(p.noise, 1.0/6)
	half := make([]float64, len(info))
	if !p.valueDifferences(u, f, info, t, false) || !p.valueDifferences(u, f, half, t/2, false) {
		return p.valueDifferences(u, f, info, 2*math.Sqrt(math.Sqrt(p.noise)), false)
	}
	for i, v := range half {
		info[i] = (4*v - info[i]) / 3
	}
	return finite(info)
}

// valueDifferences takes second differences of the log likelihood; pairs of
// groups cost two evaluations each, one when cheap.
func (p *problem) valueDifferences(u []float64, f float64, info []float64, t float64, cheap bool) bool {
	m := p.co.m
	for i := range info {
		info[i] = 0
	}
	one := []float64{f}
	base, n := one, 1
	if p.each {
		base, n = p.base, len(p.base)
	}
	G := len(p.groups)
	if need := (2*G + 2) * n; len(p.space) < need {
		p.space = make([]float64, need)
	}
	up, down := p.space[:G*n], p.space[G*n:2*G*n]
	h := make([]float64, m)
	for j := range m {
		h[j] = p.step(u, j, t)
		p.doubt[j] = 16 * p.noise / (h[j] * h[j])
	}
	eval := func(out []float64) bool {
		v := p.value(p.v)
		if math.IsNaN(v) {
			return false
		}
		if p.each {
			copy(out, p.work)
		} else {
			out[0] = v
		}
		return true
	}
	shift := func(g int, s float64) {
		for _, j := range p.groups[g] {
			p.v[j] = u[j] + s*h[j]
		}
	}
	own := func(g, i int) int {
		if p.grouped {
			return int(p.owner[g][i])
		}
		return p.groups[g][0]
	}
	copy(p.v, u)
	for g := range p.groups {
		a, b := up[g*n:g*n+n], down[g*n:g*n+n]
		shift(g, 1)
		ok := eval(a)
		shift(g, -1)
		ok = ok && eval(b)
		shift(g, 0)
		if !ok {
			return false
		}
		for i := range n {
			if j := own(g, i); j >= 0 {
				info[j*m+j] -= ((a[i] - base[i]) + (b[i] - base[i])) / (h[j] * h[j])
			}
		}
	}
	pp, mm := p.space[2*G*n:(2*G+1)*n], p.space[(2*G+1)*n:(2*G+2)*n]
	for g := range p.groups {
		for k := range g {
			shift(g, 1)
			shift(k, 1)
			ok := eval(pp)
			if ok && !cheap {
				shift(g, -1)
				shift(k, -1)
				ok = eval(mm)
			}
			shift(g, 0)
			shift(k, 0)
			if !ok {
				return false
			}
			for i := range n {
				j, l := own(g, i), own(k, i)
				if j < 0 || l < 0 {
					continue
				}
				d := (pp[i] - base[i]) - (up[g*n+i] - base[i]) - (up[k*n+i] - base[i])
				if !cheap {
					d = 0.5 * (d + (mm[i] - base[i]) - (down[g*n+i] - base[i]) - (down[k*n+i] - base[i]))
				}
				info[j*m+l] -= d / (h[j] * h[l])
			}
		}
	}
	for g := range p.groups {
		for k := range g {
			for _, j := range p.groups[g] {
				for _, l := range p.groups[k] {
					v := info[j*m+l] + info[l*m+j]
					info[j*m+l], info[l*m+j] = v, v
				}
			}
		}
	}
	return finite(info)
}

// gradientDifferences differences the model's gradient: one-sided, or central
// with one extrapolation when wide.
func (p *problem) gradientDifferences(u []float64, info []float64, wide bool) bool {
	m := p.co.m
	v := append([]float64(nil), u...)
	g0 := make([]float64, m)
	if !wide && !p.pullBack(u, g0) {
		return false
	}
	part := func(j int, h float64, out []float64) bool {
		v[j] = u[j] + h
		ok := p.pullBack(v, p.g2)
		v[j] = u[j] - h
		ok = ok && p.pullBack(v, p.g3)
		v[j] = u[j]
		for k := range out {
			out[k] = -(p.g2[k] - p.g3[k]) / (2 * h)
		}
		return ok
	}
	a, b := make([]float64, m), make([]float64, m)
	for j := range m {
		row := info[j*m : j*m+m]
		if wide {
			h := p.step(u, j, 0.02)
			if !part(j, h, a) || !part(j, h/2, b) {
				return false
			}
			for k := range row {
				row[k] = (4*b[k] - a[k]) / 3
			}
			continue
		}
		h := p.step(u, j, 1e-4)
		v[j] = u[j] + h
		if !p.pullBack(v, p.g2) {
			v[j] = u[j] - h
			if h = -h; !p.pullBack(v, p.g2) {
				return false
			}
		}
		v[j] = u[j]
		for k := range row {
			row[k] = -(p.g2[k] - g0[k]) / h
		}
	}
	for j := range m {
		for k := range j {
			s := 0.5 * (info[j*m+k] + info[k*m+j])
			info[j*m+k], info[k*m+j] = s, s
		}
	}
	return finite(info)
}

// ownHessian carries the model's Hessian to the coordinates u.
func (p *problem) ownHessian(u []float64, info []float64) bool {
	m, n := p.co.m, len(p.ev.core.params)
	g := make([]float64, m)
	if !p.pullBack(u, g) {
		return false
	}
	theta := p.at[len(p.at)-1]
	h := make([]float64, n*n)
	if !p.ev.hess(theta, h) {
		return false
	}
	for j := range m {
		for k := range m {
			var s float64
			for a := range n {
				if w := p.jac[a*m+j]; w != 0 {
					for b := range n {
						s += w * p.jac[b*m+k] * h[a*n+b]
					}
				}
			}
			info[j*m+k] = -s
		}
	}
	for j, l := range p.co.links {
		var s float64
		for a, b := range p.co.basis {
			s += b[j] * p.gRoot[a]
		}
		info[j*m+j] -= s * l.bend(u[j])
	}
	return finite(info)
}
