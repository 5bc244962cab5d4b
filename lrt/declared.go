package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
)

// Declared is a declared model bound to data, or the part of it on which
// restrictions hold: a Space made by Bind and Restrict. It is immutable and
// safe for concurrent use when the model's functions are.
//
// It is fitted on an unconstrained scale (logarithm, logit) by a quasi-Newton
// method in a trust region. Gradients come from the model when it gives them,
// after a check; else from differences in units of standard errors. The
// curvature starts from the observations' scores when the model has Each, and
// is examined at the end. A maximum at the end of a range or at an imposed
// bound is found by fitting that face.
type Declared struct {
	core   *core
	frame  *frame
	closed func(data any) ([]float64, error)
}

var (
	_ PairFitter   = (*Declared)(nil)
	_ Restrictable = (*Declared)(nil)
	_ Nester       = (*Declared)(nil)
	_ Improver     = (*Declared)(nil)
	_ Simulator    = (*Declared)(nil)
)

// declaredSpace is met by *Declared and by types that embed it.
type declaredSpace interface{ declared() *Declared }

func (d *Declared) declared() *Declared { return d }

// Observations returns the identity of the sample.
func (d *Declared) Observations() Observations { return d.core.obs }

// Params returns the parameters in whose names restrictions are stated: the
// model's, or those of the last map.
func (d *Declared) Params() []Param { return append([]Param(nil), d.frame.params...) }

// String says in words what is restricted: "weibull: shape[1] = shape[2], scale ≥ 1".
func (d *Declared) String() string {
	name := d.core.name
	if name == "" {
		name = "model"
	}
	return name + ": " + d.frame.words()
}

// Restrict returns the part of the space on which the restrictions hold as
// well. Errors are *RestrictionError and wrap ErrInvalid or ErrContradiction;
// a redundant restriction is no error, and is named by a warning of the fit.
func (d *Declared) Restrict(rs ...Restriction) (Space, error) {
	f := d.frame
	for _, r := range rs {
		g, err := f.restrict(r)
		if err != nil {
			return nil, err
		}
		f = g
	}
	return &Declared{core: d.core, frame: f}, nil
}

// NestedIn reports whether the space lies inside larger, by its equations and
// bounds: nil, ErrNotNested naming what breaks it, or ErrNestingUnknown where
// maps leave it open.
func (d *Declared) NestedIn(larger Space) error {
	l, ok := larger.(declaredSpace)
	if !ok {
		return fmt.Errorf("%w: %T is not a declared space", ErrNestingUnknown, larger)
	}
	g := l.declared()
	if d.core.model != g.core.model {
		return fmt.Errorf("%w: the spaces come from two calls of Bind; derive both from one", ErrNotNested)
	}
	return d.frame.within(g.frame)
}

// detail is what a fit of a declared space keeps for standard errors.
type detail struct {
	frame *frame
	peak  *peak
}

// Maximize fits the space. Errors are *ModelError and wrap ErrNotConverged,
// ErrUnbounded, ErrNoStart, ErrBudget, ErrPanic or the context's error.
func (d *Declared) Maximize(ctx context.Context) (Fit, error) {
	return d.fit(ctx, d.starts)
}

// MaximizeFrom fits the space from the root estimate of another fit.
func (d *Declared) MaximizeFrom(ctx context.Context, start Fit) (Fit, error) {
	if len(start.Estimate) != len(d.core.params) {
		return Fit{}, &ModelError{Model: d.core.name, Func: "MaximizeFrom", Err: fmt.Errorf("%w: a start of %d values, want %d", ErrInvalid, len(start.Estimate), len(d.core.params))}
	}
	return d.fit(ctx, func(ev *evaluator) ([][]float64, error) {
		return [][]float64{d.frame.nearest(ev, start.Estimate)}, ev.err
	})
}

// starts returns the model's start in the frame's parameters, none when it has none.
func (d *Declared) starts(ev *evaluator) ([][]float64, error) {
	if d.core.start == nil {
		if d.frame.layer != nil {
			return [][]float64{d.frame.nearest(ev, nil)}, ev.err
		}
		return nil, nil
	}
	theta := ev.callStart()
	if ev.err != nil {
		return nil, ev.err
	}
	if len(theta) != len(d.core.params) {
		return nil, &ModelError{Model: d.core.name, Func: "Start", Err: fmt.Errorf("%w: it returned %d values, want %d", ErrInvalid, len(theta), len(d.core.params))}
	}
	for i, v := range theta {
		p := d.core.params[i]
		if math.IsNaN(v) || math.IsInf(v, 0) || v < p.Lower || v > p.Upper {
			ev.warn("start-outside-range", fmt.Sprintf("Start gives %s = %g, outside [%g, %g]; the fit starts inside", p.Name, v, p.Lower, p.Upper))
			theta[i] = linkFor(p.Lower, p.Upper).inside(v)
		}
	}
	return [][]float64{d.frame.nearest(ev, theta)}, ev.err
}

func (e *evaluator) callStart() (theta []float64) {
	defer e.guard("Start", nil)
	return append([]float64(nil), e.core.start()...)
}

func (e *evaluator) callClosed(f func(any) ([]float64, error)) (theta []float64, err error) {
	defer e.guard("closed form", nil)
	theta, err = f(e.core.data)
	return append([]float64(nil), theta...), err
}

func (d *Declared) closedForm() func(any) ([]float64, error) {
	if d.closed != nil {
		return d.closed
	}
	if f := d.frame; f.layer == nil && len(f.eq.rows) == 0 && f.lower == nil && d.core.closed != nil {
		return d.core.closed
	}
	if d.core.closedAt != nil {
		return func(any) ([]float64, error) {
			if theta, ok := d.core.closedAt(d); ok {
				return theta, nil
			}
			return nil, errNoClosedForm
		}
	}
	return nil
}

var errNoClosedForm = errors.New("no closed form")

// fit maximises from the starts and dresses the outcome.
func (d *Declared) fit(ctx context.Context, starts func(*evaluator) ([][]float64, error)) (Fit, error) {
	ev := &evaluator{ctx: ctx, core: d.core}
	q, err := d.best(ev, starts)
	if err != nil {
		return Fit{}, err
	}
	return d.dress(ev, q, false)
}

func (d *Declared) best(ev *evaluator, starts func(*evaluator) ([][]float64, error)) (*peak, error) {
	if err := ev.ctx.Err(); err != nil {
		return nil, err
	}
	if f := d.closedForm(); f != nil {
		q, err := d.byClosedForm(ev, f)
		if q != nil || err != nil {
			return q, err
		}
	}
	xs, err := starts(ev)
	if err != nil {
		return nil, err
	}
	return d.overBounds(ev, xs)
}

// byClosedForm evaluates the closed form and checks that no small step from it
// gains: nil and a warning when one does.
func (d *Declared) byClosedForm(ev *evaluator, f func(any) ([]float64, error)) (*peak, error) {
	theta, err := ev.callClosed(f)
	if ev.err != nil {
		return nil, ev.err
	}
	if errors.Is(err, errNoClosedForm) {
		return nil, nil
	}
	if err != nil {
		return nil, &ModelError{Model: d.core.name, Func: "closed form", Err: err}
	}
	if len(theta) != len(d.core.params) {
		return nil, &ModelError{Model: d.core.name, Func: "closed form", Err: fmt.Errorf("%w: it returned %d values, want %d", ErrInvalid, len(theta), len(d.core.params))}
	}
	co, err := newCoordinates(d.frame, nil)
	if err != nil {
		return nil, err
	}
	p := newProblem(ev, co)
	x := theta
	if d.frame.layer != nil {
		x = d.frame.nearest(ev, theta)
	}
	f0 := ev.value(theta)
	if ev.err != nil {
		return nil, ev.err
	}
	if math.IsNaN(f0) {
		ev.warn("closed-form-not-maximum", fmt.Sprintf("the log likelihood is not finite at the closed form %v: the space is fitted numerically", theta))
		return nil, nil
	}
	q := &peak{p: p, x: x, eq: d.frame.eq}
	q.f, q.converged, q.u = f0, true, co.nearest(x)
	p.settle(f0)
	for k := range x {
		if x[k] == co.lo[k] || x[k] == co.hi[k] {
			q.held = append(q.held, held{k, x[k], x[k] == co.hi[k]})
		}
	}
	if ev.core.drawn {
		return q, nil
	}
	p.survey(q.u, f0, make([]float64, co.m*co.m))
	v := append([]float64(nil), q.u...)
	for j := range v {
		for _, t := range []float64{1e-3, -1e-3} {
			v[j] = q.u[j] + p.step(q.u, j, t)
			if t < 0 {
				v[j] = q.u[j] - p.step(q.u, j, -t)
			}
			// A true maximum loses t²/2 here, a point d standard errors off gains about t·d.
			if g := p.value(v) - f0; g > 2e-6+1e3*p.noise {
				ev.warn("closed-form-not-maximum", fmt.Sprintf("the closed form is not a maximum: the log likelihood rises by %.2g at a small step of %s; the space is fitted numerically from there", g, co.names(j)[0]))
				q, err := d.overBounds(ev, [][]float64{x})
				return q, err
			}
		}
		v[j] = q.u[j]
	}
	return q, ev.err
}

// overBounds maximises over the frame; imposed bounds are honoured by fitting
// the faces they cut, the free one first.
func (d *Declared) overBounds(ev *evaluator, xs [][]float64) (*peak, error) {
	s := &search{ev: ev, f: d.frame}
	bs := d.frame.bounds()
	if len(bs) == 0 {
		return s.over(d.frame.eq, xs, nil, 0)
	}
	q, err := s.over(d.frame.eq, xs, nil, 0)
	if err == nil && s.inside(q, bs) {
		return q, nil
	}
	if ev.err != nil && isStop(ev.err) {
		return nil, ev.err
	}
	ev.err = nil
	var best *peak
	// Without the bounds there is no maximum, or it lies outside. Fit inside them, then the faces.
	in := &search{ev: ev, f: d.frame, useBounds: true}
	best, inErr := in.over(d.frame.eq, xs, nil, 0)
	if ev.err != nil && isStop(ev.err) {
		return nil, ev.err
	}
	ev.err = nil
	if inErr != nil && best == nil {
		if q == nil {
			return nil, inErr
		}
	}
	from := xs
	if best != nil {
		from = [][]float64{best.x}
	}
	for _, face := range faces(bs, d.frame.index, q) {
		eq, ok := d.frame.eq, true
		var hs []held
		for _, h := range face {
			row := make([]float64, len(d.frame.params))
			row[h.param] = 1
			next, st := eq.add(row, h.value)
			if st == contradicted {
				ok = false
				break
			}
			eq = next
			hs = append(hs, h)
		}
		if !ok || best != nil && holdsAll(best.held, hs) && len(hs) > 0 && sameHeld(best.held, hs) {
			continue
		}
		r, err := s.over(eq, from, hs, 1)
		if ev.err != nil {
			if isStop(ev.err) {
				return nil, ev.err
			}
			ev.err = nil
		}
		if err != nil || !s.inside(r, bs) {
			continue
		}
		if best == nil || r.f > best.f-1e-9*(1+math.Abs(best.f)) && len(r.held) > len(best.held) || r.f > best.f+1e-9*(1+math.Abs(best.f)) {
			best = r
		}
	}
	if best == nil {
		return nil, &ModelError{Model: d.core.name, Err: fmt.Errorf("%w within %s", ErrNotConverged, d.frame.said())}
	}
	return best, nil
}

func holdsAll(hs, of []held) bool {
	for _, h := range of {
		found := false
		for _, g := range hs {
			found = found || g == h
		}
		if !found {
			return false
		}
	}
	return true
}

func sameHeld(a, b []held) bool { return len(a) == len(b) && holdsAll(a, b) }

// inside reports whether the peak obeys the imposed bounds.
func (s *search) inside(q *peak, bs []Bound) bool {
	if q == nil {
		return false
	}
	for _, b := range bs {
		x := q.x[s.f.index[b.Name]]
		if x < b.Lower-1e-12*math.Abs(b.Lower) || x > b.Upper+1e-12*math.Abs(b.Upper) {
			return false
		}
	}
	return true
}

// faces lists the sets of bounds that may hold with equality: all of them for
// up to six bounds, else those that the unbounded peak violates, and each alone.
func faces(bs []Bound, index map[string]int, q *peak) [][]held {
	var ends [][]held // by bound, the ends it has
	for _, b := range bs {
		var e []held
		if !math.IsInf(b.Lower, -1) {
			e = append(e, held{index[b.Name], b.Lower, false})
		}
		if !math.IsInf(b.Upper, 1) {
			e = append(e, held{index[b.Name], b.Upper, true})
		}
		ends = append(ends, e)
	}
	if len(bs) <= 6 {
		all := [][]held{nil}
		for _, e := range ends {
			for _, f := range all[:len(all):len(all)] {
				for _, h := range e {
					all = append(all, append(append([]held(nil), f...), h))
				}
			}
		}
		return all[1:]
	}
	var list [][]held
	var violated []held
	for i, e := range ends {
		for _, h := range e {
			list = append(list, []held{h})
			if q != nil && (h.upper && q.x[h.param] > h.value || !h.upper && q.x[h.param] < h.value) {
				violated = append(violated, h)
			}
		}
		_ = i
	}
	if len(violated) > 1 {
		list = append(list, violated)
	}
	return list
}

// dress makes the Fit; keep holds on to the workspace for one more use.
func (d *Declared) dress(ev *evaluator, q *peak, keep bool) (Fit, error) {
	if q.x == nil {
		if q.p.root(q.u) == nil {
			return Fit{}, &ModelError{Model: d.core.name, Err: ErrNotConverged}
		}
		q.x = append([]float64(nil), q.p.at[0]...)
	}
	copy(q.p.at[0], q.x)
	theta := q.p.descend()
	if ev.err != nil {
		return Fit{}, ev.err
	}
	if theta == nil {
		return Fit{}, &ModelError{Model: d.core.name, Err: fmt.Errorf("%w: the estimate is outside the ranges", ErrNotConverged)}
	}
	if err := d.frame.honoured(q.p.at, q.p.chain); err != nil {
		return Fit{}, err
	}
	free, err := newCoordinates(d.frame, nil)
	if err != nil {
		return Fit{}, err
	}
	fit := Fit{N: d.core.n, Dim: free.m, LogLikelihood: q.f, Deviance: nan, Criterion: d.core.criterion,
		Estimate: append([]float64(nil), theta...), detail: &detail{d.frame, &peak{summit: summit{f: q.f}, x: q.x, held: q.held, flat: q.flat, loss: q.loss, eq: q.eq}}}
	if keep {
		fit.detail.peak.p = q.p
	}
	fit.Warnings = append(fit.Warnings, ev.warnings...)
	fit.Warnings = append(fit.Warnings, q.warn...)
	for _, h := range q.held {
		side := "lower"
		if h.upper {
			side = "upper"
		}
		fit.Warnings = append(fit.Warnings, Warning{"boundary", fmt.Sprintf("the maximum has %s at its %s bound %g", d.frame.params[h.param].Name, side, h.value)})
	}
	for f := d.frame; f != nil; f = f.down() {
		for _, r := range f.redundant {
			fit.Warnings = append(fit.Warnings, Warning{"redundant-restriction", "the restriction " + r + " says nothing that others do not"})
		}
	}
	return fit, nil
}

// honoured checks that maps keep the equations and bounds of the frames below.
func (f *frame) honoured(at [][]float64, chain []*frame) error {
	for i := 1; i < len(chain); i++ {
		g := chain[i]
		for r, row := range g.eq.rows {
			size := math.Abs(g.eq.rhs[r])
			for k, v := range row {
				size = math.Max(size, math.Abs(v*at[i][k]))
			}
			if math.Abs(dot(row, at[i])-g.eq.rhs[r]) > 1e-8*size {
				return &RestrictionError{"map", fmt.Errorf("%w: it does not keep %s", ErrContradiction, g.eq.words(r, g.params))}
			}
		}
		for _, b := range g.bounds() {
			if x := at[i][g.index[b.Name]]; x < b.Lower-1e-9*math.Abs(b.Lower) || x > b.Upper+1e-9*math.Abs(b.Upper) {
				return &RestrictionError{"map", fmt.Errorf("%w: it does not keep %s", ErrContradiction, b.words())}
			}
		}
	}
	return nil
}

// nearest returns the frame's parameters whose root image is closest to theta
// in relative least squares (theta nil: any start); for a frame without maps, theta itself.
func (f *frame) nearest(ev *evaluator, theta []float64) []float64 {
	if f.layer == nil {
		return append([]float64(nil), theta...)
	}
	target := []float64(nil)
	if theta != nil {
		target = f.layer.below.nearest(ev, theta)
	}
	return f.invert(ev, target)
}

// invert finds parameters whose image under the frame's map is near target.
func (f *frame) invert(ev *evaluator, target []float64) []float64 {
	if s := f.layer.m.Start; s != nil && len(s) == len(f.params) && target == nil {
		return append([]float64(nil), s...)
	}
	links := make([]link, len(f.params))
	x := make([]float64, len(f.params))
	u := make([]float64, len(f.params))
	for j, p := range f.params {
		links[j] = linkFor(p.Lower, p.Upper)
		if s := f.layer.m.Start; len(s) == len(x) {
			u[j] = links[j].from(s[j])
		}
	}
	image := make([]float64, len(f.layer.below.params))
	p := &problem{ev: ev}
	miss := func(u []float64) float64 {
		for j, l := range links {
			x[j], _ = l.to(u[j])
		}
		if ev.err != nil || !p.mapped(f.layer.m, x, image) {
			return 1e300
		}
		var s float64
		for k, q := range f.layer.below.params {
			if !(image[k] >= q.Lower && image[k] <= q.Upper) {
				return 1e300
			}
			if target != nil {
				d := (image[k] - target[k]) / math.Max(math.Abs(target[k]), 1e-3)
				s += d * d
			}
		}
		return s
	}
	if target != nil || miss(u) >= 1e300 {
		u = simplexSearch(miss, u, 300*(1+len(u)))
	}
	miss(u)
	return append([]float64(nil), x...)
}

// Redraw draws data of the same design at a fit and returns the comparison on
// them. The model needs Simulate; every space must be declared.
func (d *Declared) Redraw(ctx context.Context, at Fit, src rand.Source, c Comparison) (Comparison, error) {
	if err := ctx.Err(); err != nil {
		return c, err
	}
	fresh, err := d.simulate(at.Estimate, src)
	if err != nil {
		return c, err
	}
	return c.Each(func(s Space) (Space, error) {
		x, ok := s.(*Declared)
		if !ok {
			return nil, fmt.Errorf("%w: %T cannot be redrawn with a declared model", ErrInvalid, s)
		}
		if x.core.model != d.core.model {
			return nil, fmt.Errorf("%w: the spaces come from two calls of Bind", ErrDifferentObservations)
		}
		r := *x
		r.core = fresh
		return &r, nil
	})
}

func (d *Declared) simulate(theta []float64, src rand.Source) (fresh *core, err error) {
	if d.core.simulate == nil {
		return nil, &ModelError{Model: d.core.name, Func: "Simulate", Err: fmt.Errorf("%w: the model has no Simulate", ErrInvalid)}
	}
	if len(theta) != len(d.core.params) {
		return nil, &ModelError{Model: d.core.name, Func: "Simulate", Err: fmt.Errorf("%w: %d parameter values, want %d", ErrInvalid, len(theta), len(d.core.params))}
	}
	ev := &evaluator{core: d.core}
	func() {
		defer ev.guard("Simulate", theta)
		fresh, err = d.core.simulate(append([]float64(nil), theta...), src)
	}()
	if ev.err != nil {
		return nil, ev.err
	}
	if err != nil {
		return nil, &ModelError{Model: d.core.name, Func: "Simulate", Names: d.core.names, Theta: theta, Err: err}
	}
	return fresh, nil
}

// FitPair fits both spaces: the restricted one, then the full one from its own
// starts and from the restricted estimate. Where the likelihood falls steadily
// from the full estimate to the restricted one, both lie on one hill and the
// second climb is not made.
func (d *Declared) FitPair(ctx context.Context, c Comparison) (Pair, error) {
	r, ok := c.Restricted.(declaredSpace)
	if !ok || c.Error != nil {
		return fitSeparately(ctx, c)
	}
	var p Pair
	small := r.declared()
	switch err := small.NestedIn(d); {
	case err == nil:
		p.Nesting = "the full space's equations and bounds follow from the restricted space's"
	case errors.Is(err, ErrNestingUnknown):
		p.Warnings = append(p.Warnings, notChecked(err))
	default:
		return p, &ComparisonError{c.Name, "restricted", err}
	}
	if p.Nesting != "" && d.core.model == small.core.model && d.frame.within(small.frame) == nil {
		return p, fmt.Errorf("%w: both are %v", ErrNothingTested, d)
	}
	if _, plain := c.Full.(*Declared); !plain { // a type of the user's around it may fit by itself
		q, err := fitSeparately(ctx, c)
		if err != nil {
			return q, err
		}
		q.Nesting = p.Nesting
		return q, d.freedom(ctx, small, &q)
	}
	var err error
	if p.Restricted, err = c.Restricted.Maximize(ctx); err != nil {
		return p, &ComparisonError{c.Name, "restricted", err}
	}
	if p.Full, err = d.fitAbove(ctx, p.Restricted); err != nil {
		return p, &ComparisonError{c.Name, "full", err}
	}
	p.Warnings = append(p.Warnings, tagged("restricted", p.Restricted.Warnings)...)
	p.Warnings = append(p.Warnings, tagged("full", p.Full.Warnings)...)
	err = d.freedom(ctx, small, &p)
	p.Full.detail.peak.p = nil
	return p, err
}

func tagged(place string, ws []Warning) []Warning {
	var out []Warning
	for _, w := range ws {
		out = append(out, Warning{w.Code, place + " space: " + w.Text})
	}
	return out
}

func notChecked(err error) Warning {
	text := "neither space can show that the restricted one lies inside the full one: the caller vouches for it"
	if err != nil {
		text = err.Error() + ": the caller vouches for it"
	}
	return Warning{"nesting-not-checked", text}
}

// fitAbove fits d, knowing a fit of a space inside it.
func (d *Declared) fitAbove(ctx context.Context, below Fit) (Fit, error) {
	ev := &evaluator{ctx: ctx, core: d.core}
	var from []float64
	q, err := d.best(ev, func(ev *evaluator) ([][]float64, error) {
		xs, err := d.starts(ev)
		if err != nil || len(xs) > 0 {
			return xs, err
		}
		from = d.frame.nearest(ev, below.Estimate)
		return [][]float64{from}, ev.err
	})
	if ev.err != nil {
		return Fit{}, ev.err
	}
	if err != nil && isStop(err) || errors.Is(err, ErrUnbounded) {
		return Fit{}, err
	}
	if from == nil && (err != nil || !d.oneHill(ev, q, below)) {
		from = d.frame.nearest(ev, below.Estimate)
		second, err2 := d.overBounds(ev, [][]float64{from})
		switch {
		case ev.err != nil:
			return Fit{}, ev.err
		case err2 == nil && (q == nil || second.f > q.f+1e-9*(1+math.Abs(q.f))):
			if q != nil && q.converged && second.f > q.f+1e-6*(1+math.Abs(q.f)) {
				second.warn = append(second.warn, Warning{"several-maxima", fmt.Sprintf("its own start led to a log likelihood of %.8g, the restricted estimate to %.8g", q.f, second.f)})
			}
			q, err = second, nil
		}
	}
	if err != nil {
		return Fit{}, err
	}
	if q.f < below.LogLikelihood && below.LogLikelihood-q.f <= likelihoodSlack(q.f, below.LogLikelihood) {
		q.f = below.LogLikelihood // rounding
	}
	return d.dress(ev, q, true)
}

// oneHill reports whether the log likelihood falls steadily on the straight
// line, on the fitting scale, from the peak to another fit's estimate.
func (d *Declared) oneHill(ev *evaluator, q *peak, below Fit) bool {
	if q.f < below.LogLikelihood-likelihoodSlack(q.f, below.LogLikelihood) || !q.converged {
		return false
	}
	if len(q.held) > 0 || d.frame.layer != nil || q.p.co.m == 0 {
		return q.f >= below.LogLikelihood && len(q.held) > 0 && d.closedForm() != nil
	}
	if d.closedForm() != nil {
		return true
	}
	end := q.p.co.nearest(below.Estimate)
	v := make([]float64, len(end))
	last := q.f
	for _, t := range []float64{0.125, 0.375, 0.7, 1} {
		for j := range v {
			v[j] = q.u[j] + t*(end[j]-q.u[j])
		}
		f := q.p.value(v)
		if !(f <= last+q.p.noise) {
			return false
		}
		last = f
	}
	return true
}
