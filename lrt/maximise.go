package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/optimize"
)

// held is a parameter at an end of its range or at an imposed bound.
type held struct {
	param int
	value float64
	upper bool
}

// peak is the outcome of a maximisation over one frame.
type peak struct {
	summit
	p    *problem
	x    []float64 // the frame's parameters
	held []held
	flat []string // parameters with a direction that changes nothing
	loss int      // the number of such directions
	eq   echelon
	warn []Warning
}

// isStop tells the caller's stop (context, budget) and a panic from what a
// single point of the likelihood does wrong.
func isStop(err error) bool {
	return errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) || errors.Is(err, ErrBudget) || errors.Is(err, ErrPanic)
}

// search is the state of one fit over a frame: starts in, best peak out.
type search struct {
	ev        *evaluator
	f         *frame
	useBounds bool
}

// over maximises over the frame with the equations eq from the given starts,
// in parameters of the frame. The best peak wins, the earlier at a tie.
func (s *search) over(eq echelon, starts [][]float64, hs []held, depth int) (*peak, error) {
	co, err := newCoordinates(s.f, &coordOptions{eq: &eq, useBounds: s.useBounds})
	if err != nil {
		return nil, err
	}
	p := newProblem(s.ev, co)
	var us [][]float64
	for _, x := range starts {
		us = append(us, co.nearest(x))
	}
	if depth > 0 { // a face of a range, tried from one point
		if math.IsNaN(p.value(us[0])) {
			return nil, s.noStart(p, us[0])
		}
	} else if us, err = s.usable(p, us); err != nil {
		return nil, err
	}
	var best *peak
	for i, u := range us {
		if i == 0 {
			if f := p.value(u); !math.IsNaN(f) {
				p = p.audit(u, f)
			}
		}
		q, err := s.from(p, eq, u, hs, depth)
		if err != nil {
			return nil, err
		}
		if i > 0 && best != nil && math.Abs(q.f-best.f) > 1e-6*(1+math.Abs(best.f)) && q.converged && best.converged {
			best.warn = append(best.warn, Warning{"several-maxima", fmt.Sprintf("starts led to different maxima of the log likelihood: %.8g and %.8g; the larger is kept", best.f, q.f)})
			q.warn = append(q.warn, best.warn[len(best.warn)-1])
		}
		if best == nil || q.f > best.f+1e-12*math.Abs(best.f) || q.converged && !best.converged && q.f > best.f-looseTol {
			best = q
		}
	}
	return best, s.ev.err
}

// usable drops starts of impossible likelihood, and searches the ranges when
// none is left.
func (s *search) usable(p *problem, us [][]float64) ([][]float64, error) {
	want := 1
	var ok [][]float64
	for _, u := range us {
		if !math.IsNaN(p.value(u)) {
			ok = append(ok, u)
		}
		if s.ev.err != nil {
			return nil, s.ev.err
		}
	}
	if len(us) == 0 {
		want = 3
	}
	want = max(want, s.ev.core.starts)
	if len(ok) > 0 && len(ok) >= s.ev.core.starts {
		return ok, nil
	}
	if p.co.m == 0 {
		if len(ok) > 0 {
			return ok, nil
		}
		u := []float64{}
		if !math.IsNaN(p.value(u)) {
			return [][]float64{u}, nil
		}
		return nil, s.noStart(p, u)
	}
	// Points of a Kronecker sequence around the first start or the middle of the ranges, wider and wider.
	centre := make([]float64, p.co.m)
	if len(ok) > 0 {
		centre = ok[0]
	}
	type spot struct {
		t, u []float64
		f    float64
	}
	var spots []spot
	// The search looks at many scales: real parameters move as a hyperbolic sine.
	place := func(t, u []float64) {
		for j, l := range p.co.links {
			s := t[j]
			if l.kind == linkIdentity {
				s = math.Sinh(s) * math.Max(1, math.Abs(centre[j]))
			}
			u[j] = centre[j] + s
		}
	}
	for i := range 50 + 20*p.co.m {
		width := []float64{1, 3, 6, 12, 24}[i%5]
		t, u := make([]float64, p.co.m), make([]float64, p.co.m)
		for j := range t {
			t[j] = width * (2*frac(float64(i)*math.Sqrt(float64(prime(j)))+0.5) - 1)
		}
		place(t, u)
		f := p.value(u)
		if s.ev.err != nil {
			return nil, s.ev.err
		}
		if !math.IsNaN(f) {
			spots = append(spots, spot{t, u, f})
		}
	}
	for len(ok) < want && len(spots) > 0 {
		b := 0
		for i := range spots {
			if spots[i].f > spots[b].f {
				b = i
			}
		}
		// A short walk without derivatives comes from far out to where curvature means something.
		u := make([]float64, p.co.m)
		t := simplexSearch(func(t []float64) float64 {
			place(t, u)
			if f := p.value(u); !math.IsNaN(f) {
				return -f
			}
			return 1e300
		}, spots[b].t, 60*p.co.m)
		if s.ev.err != nil {
			return nil, s.ev.err
		}
		place(t, u)
		ok = append(ok, u)
		spots = append(spots[:b], spots[b+1:]...)
	}
	if len(ok) == 0 {
		return nil, s.noStart(p, centre)
	}
	return ok, nil
}

func (s *search) noStart(p *problem, u []float64) error {
	theta := p.root(u)
	if theta == nil && len(p.at) > 1 {
		return &ModelError{Model: s.ev.core.name, Err: fmt.Errorf("%w: the map of a restriction leads outside the ranges (%s)", ErrNoStart, s.f.words())}
	}
	return &ModelError{Model: s.ev.core.name, Func: "LogLikelihood", Names: s.ev.core.names, Theta: append([]float64(nil), theta...), Err: fmt.Errorf("%w (tried %d points); give Start", ErrNoStart, s.ev.calls)}
}

func prime(j int) int {
	n := 2
	for {
		is := true
		for d := 2; d*d <= n; d++ {
			if n%d == 0 {
				is = false
				break
			}
		}
		if is {
			if j == 0 {
				return n
			}
			j--
		}
		n++
	}
}

// from climbs from u, looks at ends of ranges and walls that the climb runs
// into, and repairs what the checks find.
func (s *search) from(p *problem, eq echelon, u []float64, hs []held, depth int) (*peak, error) {
	sm := p.climb(u, true)
	if s.ev.err == nil && p.rough == 0 && p.isRough(sm.u) {
		if len(sm.edge)+len(sm.escaped) == 0 {
			u = sm.u
		}
		sm = p.climb(u, true)
	}
	if s.ev.err != nil {
		return nil, s.ev.err
	}
	var child *peak
	if sm.converged {
		sm.edge = p.idleTowardsEnd(&sm)
	}
	if len(sm.edge) > 0 && depth <= len(s.f.params) {
		child = s.hold(p, eq, &sm, s.ends(p, sm.edge, sm.u), hs, depth)
		if s.ev.err != nil {
			return nil, s.ev.err
		}
		if child != nil && child.converged && child.f >= sm.f-1e-9*(1+math.Abs(sm.f)) {
			return child, nil
		}
		if !sm.converged {
			sm = p.climb(sm.u, false)
		}
	} else if len(sm.walls) > 0 && !sm.converged && depth <= len(s.f.params) {
		child = s.hold(p, eq, &sm, s.wallEnds(p, sm.walls, sm.u), hs, depth)
	}
	if s.ev.err != nil {
		return nil, s.ev.err
	}
	if sm.rising {
		return nil, s.unbounded(p, &sm)
	}
	q := &peak{summit: sm, p: p, eq: eq, held: hs}
	if err := s.check(q); err != nil {
		return nil, err
	}
	if child != nil && child.f >= q.f-1e-9*(1+math.Abs(q.f)) {
		return child, nil
	}
	return q, s.ev.err
}

// idleTowardsEnd lists the coordinates whose way to the finite end of their
// range makes no difference any more: the end itself may be the maximum.
func (p *problem) idleTowardsEnd(sm *summit) []int {
	var js []int
	m := p.co.m
	for j, l := range p.co.links {
		if l.kind == linkIdentity || sm.info != nil && math.Abs(sm.info[j*m+j]) > 1e-3 {
			continue
		}
		v := append([]float64(nil), sm.u...)
		d := -3.0
		if l.kind == linkBetween && sm.u[j] > 0 {
			d = 3
		}
		v[j] += d
		if f := p.value(v); math.Abs(f-sm.f) < 1e-6 {
			js = append(js, j)
		}
	}
	return js
}

// idleTowardsInfinity names the parameters whose growth beyond the estimate, by
// a factor of a hundred, makes no difference any more.
func (p *problem) idleTowardsInfinity(q *peak) []string {
	var names []string
	m := p.co.m
	for j, l := range p.co.links {
		if l.kind != linkAbove && l.kind != linkBelow || q.info == nil || math.Abs(q.info[j*m+j]) > 1e-3 {
			continue
		}
		v := append([]float64(nil), q.u...)
		v[j] += 4.6
		up := p.value(v)
		v[j] -= 9.2
		if math.Abs(up-q.f) < 1e-6 && math.Abs(p.value(v)-q.f) > math.Abs(up-q.f) {
			names = appendNew(names, p.co.names(j)...)
		}
	}
	return names
}

// hold maximises with parameters held at the ends they run into.
func (s *search) hold(p *problem, eq echelon, sm *summit, more []held, hs []held, depth int) *peak {
	all := append([]held(nil), hs...)
	for _, h := range more {
		row := make([]float64, len(s.f.params))
		row[h.param] = 1
		next, st := eq.add(row, h.value)
		if st == contradicted {
			return nil
		}
		eq = next
		all = append(all, h)
	}
	if len(more) == 0 || p.root(sm.u) == nil {
		return nil
	}
	x := append([]float64(nil), p.at[0]...)
	for _, h := range more {
		x[h.param] = h.value
	}
	q, err := s.over(eq, [][]float64{x}, all, depth+1)
	if err != nil { // no finite likelihood at the end, say: the climb goes on inside
		if s.ev.err != nil && !isStop(s.ev.err) {
			s.ev.err = nil
		}
		return nil
	}
	return q
}

// ends lists the parameters whose range ends where coordinates js run to.
func (s *search) ends(p *problem, js []int, u []float64) []held {
	var hs []held
	p.co.point(u, p.at[0])
	for _, j := range js {
		for k, only := range p.co.single {
			if only != j {
				continue
			}
			x, lo, hi := p.at[0][k], p.co.lo[k], p.co.hi[k]
			l := p.co.links[j]
			end := l.lo
			if l.kind == linkBelow || l.kind == linkBetween && u[j] > 0 {
				end = l.hi
			}
			at := p.co.origin[k] + p.co.basis[k][j]*end
			slack := 1e-9 * math.Max(math.Abs(at), math.Abs(x-at))
			if math.Abs(at-lo) <= slack {
				hs = append(hs, held{k, lo, false})
				break
			}
			if math.Abs(at-hi) <= slack {
				hs = append(hs, held{k, hi, true})
				break
			}
		}
	}
	return hs
}

func (s *search) wallEnds(p *problem, ks []int, u []float64) []held {
	var hs []held
	p.co.point(u, p.at[0])
	for _, k := range ks {
		x := p.at[0][k]
		if math.Abs(x-p.co.lo[k]) <= math.Abs(p.co.hi[k]-x) {
			hs = append(hs, held{k, p.co.lo[k], false})
		} else {
			hs = append(hs, held{k, p.co.hi[k], true})
		}
	}
	return hs
}

func (s *search) unbounded(p *problem, sm *summit) error {
	var names []string
	for _, j := range sm.escaped {
		names = append(names, p.co.names(j)...)
	}
	theta := append([]float64(nil), p.root(sm.u)...)
	return &ModelError{Model: s.ev.core.name, Func: "LogLikelihood", Names: s.ev.core.names, Theta: theta,
		Err: fmt.Errorf("%w: it rises without end with %s (a group of one observation, or of equal ones, cannot have a spread of its own)", ErrUnbounded, strings.Join(names, ", "))}
}

// check holds gradient and curvature at the end of a climb against those of a
// maximum, tries to repair, and gives up with ErrNotConverged.
func (s *search) check(q *peak) error {
	p := q.p
	if len(q.escaped) > 0 {
		var names []string
		for _, j := range q.escaped {
			names = append(names, p.co.names(j)...)
		}
		q.warn = append(q.warn, Warning{"maximum-at-infinity", "the log likelihood approaches its supremum only as " + strings.Join(names, ", ") + " runs to the end of its range; the estimate is where the search stopped"})
		q.converged = true
	}
	for try := 0; try < 4 && s.ev.err == nil; try++ {
		if !q.converged && q.decrement > looseTol && len(q.walls) == 0 {
			if try > 0 || p.co.m > 20 {
				break
			}
			if sm := p.climb(p.wander(q.u, q.f), false); sm.f >= q.f {
				q.summit = sm
			}
			continue
		}
		if p.co.m == 0 || len(q.escaped) > 0 {
			break
		}
		down, flats, ridges := p.spectrum(q)
		for _, v := range ridges {
			q.warn = append(q.warn, Warning{"maximum-at-infinity", "the log likelihood does not fall as " + strings.Join(p.moved(v), ", ") + " grows beyond the estimate: its supremum is at infinity or the data end there"})
		}
		if names := p.idleTowardsInfinity(q); len(names) > 0 {
			q.warn = append(q.warn, Warning{"maximum-at-infinity", "the log likelihood does not change as " + strings.Join(names, ", ") + " grows beyond the estimate: the data say only that it is large"})
		}
		q.flat, q.loss = nil, len(flats)
		for _, v := range flats {
			q.flat = appendNew(q.flat, p.moved(v)...)
		}
		if down == nil {
			break
		}
		// A saddle or a minimum: leave it both ways along the worst direction.
		best := q.summit
		v := make([]float64, p.co.m)
		for _, t := range []float64{1, -1, 4, -4} {
			for j := range v {
				v[j] = q.u[j] + t*down[j]
			}
			if sm := p.climb(v, false); sm.f > best.f+1e-9 {
				best = sm
			}
		}
		if best.f == q.f {
			q.warn = append(q.warn, Warning{"flat-top", "curvature at the estimate is not that of a maximum along " + strings.Join(p.moved(down), ", ") + ", yet no displaced start rises above it"})
			break
		}
		q.summit = best
	}
	if s.ev.err != nil {
		return s.ev.err
	}
	if names := p.beyondFloats(q); len(names) > 0 {
		return &ModelError{Model: s.ev.core.name, Names: s.ev.core.names, Theta: append([]float64(nil), p.root(q.u)...),
			Err: fmt.Errorf("%w: the curvature of the log likelihood along %s leaves the floating-point range: give the data in units nearer one", ErrNotConverged, strings.Join(names, ", "))}
	}
	if x := p.root(q.u); x == nil {
		return &ModelError{Model: s.ev.core.name, Err: fmt.Errorf("%w: the search left the ranges", ErrNotConverged)}
	}
	q.x = append([]float64(nil), p.at[0]...)
	if !q.converged {
		if q.decrement > looseTol && len(q.walls) == 0 {
			theta := append([]float64(nil), p.root(q.u)...)
			return &ModelError{Model: s.ev.core.name, Names: s.ev.core.names, Theta: theta,
				Err: fmt.Errorf("%w after %d evaluations: the gradient still promises %.3g in log likelihood; the likelihood may be rough or not smooth here", ErrNotConverged, s.ev.calls, q.decrement)}
		}
		q.warn = append(q.warn, Warning{"loose-maximum", fmt.Sprintf("the maximum is certain to about %.1g in log likelihood only", math.Max(q.decrement, p.noise))})
	}
	if len(q.flat) > 0 {
		q.warn = append(q.warn, Warning{"not-identifiable", "the data do not determine " + strings.Join(q.flat, ", ") + ": the log likelihood does not change along a direction of them"})
	}
	return nil
}

// wander improves u without derivatives (Nelder and Mead 1965), in units of standard errors.
func (p *problem) wander(u []float64, f float64) []float64 {
	v := make([]float64, len(u))
	at := func(x []float64) []float64 {
		for j := range v {
			v[j] = u[j] + x[j]*p.scale[j]
		}
		return v
	}
	prob := optimize.Problem{Func: func(x []float64) float64 {
		if r := f - p.value(at(x)); !math.IsNaN(r) {
			return r
		}
		return 1e300
	}}
	res, err := optimize.Minimize(prob, make([]float64, len(u)), &optimize.Settings{FuncEvaluations: 400 * (1 + len(u)), Converger: &optimize.FunctionConverge{Absolute: 1e-10, Iterations: 60 * len(u)}}, &optimize.NelderMead{})
	if res == nil || err != nil && len(res.X) != len(u) {
		return append([]float64(nil), u...)
	}
	return append([]float64(nil), at(res.X)...)
}

// spectrum looks at the curvature of a peak: the direction along which it is
// not a maximum, if any, the directions that change nothing, and those that
// change nothing one way.
func (p *problem) spectrum(q *peak) (down []float64, flats, ridges [][]float64) {
	m := p.co.m
	for j := range m {
		if q.info != nil && math.Abs(q.info[j*m+j]) <= p.doubt[j] {
			q.taken = inf
		}
	}
	if q.info != nil && q.taken > 0.5 && !clearlyRegular(q.info, m) {
		q.info = nil
	}
	if q.info == nil {
		q.taken = 0
		info := make([]float64, m*m)
		p.value(q.u)
		p.settle(q.f)
		for j := range m {
			p.scale[j] = math.Min(p.scale[j], p.unit(q, j))
		}
		if !p.information(q.u, q.f, info, false) {
			return nil, nil, nil
		}
		q.info = info
	}
	d := make([]float64, m)
	c := make([]float64, m*m)
	for j := range m {
		unit := p.unit(q, j)
		d[j] = math.Sqrt(math.Max(math.Abs(q.info[j*m+j]), 1e-8/(unit*unit)))
	}
	for j := range m {
		for k := range m {
			c[j*m+k] = q.info[j*m+k] / (d[j] * d[k])
		}
	}
	for j := range m {
		if math.Abs(q.info[j*m+j]) <= p.doubt[j] {
			for k := range m {
				c[j*m+k], c[k*m+j] = 0, 0
			}
		}
	}
	if clearlyRegular(c, m) { // the usual case
		return nil, nil, nil
	}
	var es mat.EigenSym
	if !es.Factorize(mat.NewSymDense(m, c), true) {
		return nil, nil, nil
	}
	values := es.Values(nil)
	var vs mat.Dense
	es.VectorsTo(&vs)
	for i, lambda := range values {
		if lambda > 1e-5*float64(m) {
			continue
		}
		v := make([]float64, m)
		for j := range v {
			v[j] = vs.At(j, i) / d[j]
		}
		// Curvature that small is the difference's rounding or a truly flat direction: walk ten units along it.
		change, least, up := 0.0, inf, 0.0
		w := make([]float64, m)
		for _, t := range []float64{10, -10} {
			for j := range w {
				w[j] = q.u[j] + t*v[j]
			}
			f := p.value(w)
			if math.IsNaN(f) {
				f = -inf
			}
			change, least = math.Max(change, math.Abs(f-q.f)), math.Min(least, math.Abs(f-q.f))
			up = math.Max(up, f-q.f)
		}
		switch {
		case change <= 1e-7*(1+1e-6*math.Abs(q.f)):
			flats = append(flats, v)
		case least <= 1e-9*(1+1e-6*math.Abs(q.f)) && up <= 1e-7:
			ridges = append(ridges, v)
		case up > 1e-7 && down == nil, lambda < -1e-4 && down == nil:
			s := 1 / math.Sqrt(math.Max(math.Abs(lambda), 1e-2))
			down = make([]float64, m)
			for j := range v {
				down[j] = s * v[j]
			}
		}
	}
	return down, flats, ridges
}

// clearlyRegular reports whether a is positive definite with every pivot well
// away from zero, relative to its diagonal.
func clearlyRegular(a []float64, m int) bool {
	l := append([]float64(nil), a...)
	if !cholesky(l, m) {
		return false
	}
	for j := range m {
		if d := l[j*m+j]; d*d < 1e-3*a[j*m+j] {
			return false
		}
	}
	return true
}

// unit is a length that coordinate j can be expected to matter over.
func (p *problem) unit(q *peak, j int) float64 {
	if p.co.links[j].kind != linkIdentity {
		return 1
	}
	if a := math.Max(math.Abs(q.u[j]), p.first[j]); a > 0 {
		return a
	}
	return 1
}

// beyondFloats names the parameters whose curvature at a summit could not be
// measured because the steps that resolve it are too small for float64: what was
// found is then the start and no maximum.
func (p *problem) beyondFloats(q *peak) []string {
	if p.co.m == 0 || q.info != nil || len(q.escaped) > 0 || len(q.walls) > 0 {
		return nil
	}
	var names []string
	for j, s := range p.scale {
		if !(s > 1e-60) {
			names = appendNew(names, p.co.names(j)...)
		}
	}
	return names
}

// moved names the parameters that take part in direction v.
func (p *problem) moved(v []float64) []string {
	var names []string
	big := 0.0
	for _, a := range v {
		big = math.Max(big, math.Abs(a))
	}
	for j, a := range v {
		if math.Abs(a) > 1e-3*big {
			names = appendNew(names, p.co.names(j)...)
		}
	}
	return names
}

func appendNew(list []string, more ...string) []string {
next:
	for _, s := range more {
		for _, t := range list {
			if s == t {
				continue next
			}
		}
		list = append(list, s)
	}
	return list
}

// simplexSearch minimises f from u without derivatives, in about so many calls.
func simplexSearch(f func([]float64) float64, u []float64, calls int) []float64 {
	res, err := optimize.Minimize(optimize.Problem{Func: f}, u, &optimize.Settings{FuncEvaluations: calls, Converger: &optimize.FunctionConverge{Absolute: 1e-14, Iterations: 30 * (1 + len(u))}}, &optimize.NelderMead{})
	if res == nil || err != nil && len(res.X) != len(u) {
		return u
	}
	return res.X
}
