package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"

	"subsume.example/dist"
)

// Interval holds the values of a parameter that a comparison at 1 − Level would
// not reject, from the estimate outwards.
type Interval struct {
	Name                   string
	Level                  float64
	Lower, Estimate, Upper float64
	// LowerWhy and UpperWhy say why an end is infinite or the end of the parameter's
	// range; "" for an end where the comparison begins to reject.
	LowerWhy, UpperWhy string
	// Exact says that the reference is exact (F or χ² of a certified linear pair).
	Exact bool
	Why   string // which reference was inverted
}

// String writes the interval for people.
func (i Interval) String() string {
	s := fmt.Sprintf("%s: %.6g, %g %% from %.6g to %.6g (%s)", i.Name, i.Estimate, 100*i.Level, i.Lower, i.Upper, i.Why)
	if i.LowerWhy != "" {
		s += "; below: " + i.LowerWhy
	}
	if i.UpperWhy != "" {
		s += "; above: " + i.UpperWhy
	}
	return s
}

// Quantity is a smooth function of a declared space's parameters, in the order
// of Params.
type Quantity struct {
	Name string
	Of   func(x []float64) float64
}

// Profile returns the profile likelihood interval of a parameter: every value v
// at which the comparison of the space with the parameter fixed at v against the
// space itself is not significant. For linear spaces that are restrictable it
// inverts the exact F test by the same search; for declared ones −2 log λ with
// χ²(1). level 0 means that of the settings. The ends are bracketed before
// they are solved for, to about 1e-8 standard errors; an end that does not exist is
// ±Inf, or the end of the range, with the reason.
//
// Errors wrap ErrInvalid, ErrNotRestrictable, or those of the fits.
func Profile(ctx context.Context, full Space, name string, level float64, s *Settings) (Interval, error) {
	pr, err := newProfiler(ctx, full, s, level, []string{name})
	if err != nil {
		return Interval{}, profileError(name, err)
	}
	pr.restrict = func(v []float64) (Space, error) { return Restrict(pr.full, Fix(name, v[0])) }
	i, err := pr.interval(ctx, name)
	return i, profileError(name, err)
}

// ProfileOf returns the profile likelihood interval of a smooth function of the
// parameters of a declared space. The function must change strictly with at
// least one free parameter near the estimate; that parameter is eliminated.
func ProfileOf(ctx context.Context, full Space, q Quantity, level float64, s *Settings) (Interval, error) {
	d, ok := full.(declaredSpace)
	if !ok || q.Of == nil {
		return Interval{}, profileError(q.Name, fmt.Errorf("%w: a declared space and a function are needed", ErrInvalid))
	}
	pr, err := newProfiler(ctx, full, s, level, nil)
	if err != nil {
		return Interval{}, profileError(q.Name, err)
	}
	if err := pr.eliminate(ctx, d.declared(), q); err != nil {
		return Interval{}, profileError(q.Name, err)
	}
	i, err := pr.interval(ctx, q.Name)
	return i, profileError(q.Name, err)
}

func profileError(name string, err error) error {
	if err == nil {
		return nil
	}
	return &ComparisonError{Comparison: name, Place: "profile", Err: err}
}

// profiler evaluates one family of restrictions of a space.
type profiler struct {
	full     Space
	level    float64
	base     Fit
	declared *Declared // nil: a linear space
	centre   []float64 // the estimate
	unit     []float64 // about a standard error, on the scale of links
	links    []link
	lo, hi   []float64 // ranges
	restrict func(v []float64) (Space, error)
	critical float64
	exact    bool
	why      string
	last     []float64 // root estimate of the last fit, to start the next
	names    []string
	evaluate func(x []float64) float64 // of a quantity that is no parameter
}

// errHigher tells that a restricted fit rose above the full one.
var errHigher = errors.New("higher")

func newProfiler(ctx context.Context, full Space, s *Settings, level float64, names []string) (*profiler, error) {
	if level == 0 {
		level = s.level()
	}
	if full == nil || !(level > 0 && level < 1) {
		return nil, fmt.Errorf("%w: level %g, space %T", ErrInvalid, level, full)
	}
	pr := &profiler{full: full, level: level, names: names}
	d, ok := full.(declaredSpace)
	if !ok {
		if _, ok := full.(Restrictable); !ok {
			return nil, fmt.Errorf("%w: %T", ErrNotRestrictable, full)
		}
		return pr, nil
	}
	pr.declared = d.declared()
	fit, err := full.Maximize(ctx)
	if err != nil {
		return nil, err
	}
	pr.critical = dist.ChiSquared{K: float64(max(1, len(names)))}.UpperQuantile(1 - level)
	pr.why = "inversion of −2 log λ referred to χ²"
	return pr, pr.rebase(ctx, fit, names)
}

// rebase sets the estimate and the units.
func (pr *profiler) rebase(ctx context.Context, fit Fit, names []string) error {
	d := pr.declared
	pr.base, pr.last = fit, fit.Estimate
	if len(names) == 0 {
		return nil
	}
	e, err := d.Estimates(ctx, fit)
	if err != nil && ctx.Err() != nil {
		return err
	}
	pr.centre, pr.unit, pr.links, pr.lo, pr.hi = nil, nil, nil, nil, nil
	for _, name := range names {
		j, ok := d.frame.index[name]
		if !ok {
			return d.frame.unknown(name)
		}
		p := d.frame.params[j]
		lo, hi := p.Lower, p.Upper
		if d.frame.lower != nil {
			lo, hi = math.Max(lo, d.frame.lower[j]), math.Min(hi, d.frame.upper[j])
		}
		l := linkFor(lo, hi)
		v := fit.detail.peak.x[j]
		unit := 1.0
		if err == nil && e.StdErr[j] > 0 && !math.IsInf(e.StdErr[j], 0) {
			_, slope := l.to(l.from(v))
			unit = e.StdErr[j] / math.Abs(slope)
		} else if l.kind == linkIdentity {
			unit = math.Max(math.Abs(v), 1)
		}
		if err == nil && e.StdErr[j] == 0 {
			return fmt.Errorf("%w: %s is fixed in the space", ErrInvalid, name)
		}
		if l.kind != linkIdentity {
			unit = math.Min(unit, 3)
		}
		if v == lo || v == hi { // no place on the fitting scale: walk on the natural one
			l, unit = link{linkIdentity, lo, hi}, math.Max(1e-3, 1e-3*math.Abs(v))
		}
		pr.lo, pr.hi = append(pr.lo, lo), append(pr.hi, hi)
		pr.centre, pr.unit, pr.links = append(pr.centre, v), append(pr.unit, unit), append(pr.links, l)
	}
	return nil
}

// at returns the statistic with the quantities fixed at v: 0 at the estimate,
// +Inf where nothing is possible.
func (pr *profiler) at(ctx context.Context, v []float64) (float64, Fit, error) {
	small, err := pr.restrict(v)
	if err != nil {
		if errors.Is(err, ErrContradiction) {
			return inf, Fit{}, nil
		}
		return nan, Fit{}, err
	}
	if pr.declared == nil {
		return pr.linear(ctx, small)
	}
	d := small.(*Declared)
	from := pr.last
	fit, err := d.fit(ctx, func(ev *evaluator) ([][]float64, error) {
		return [][]float64{d.frame.nearest(ev, from)}, ev.err
	})
	if errors.Is(err, ErrNoStart) || errors.Is(err, ErrContradiction) {
		return inf, Fit{}, nil
	}
	if err != nil {
		return nan, Fit{}, fmt.Errorf("at %g: %w", v, err)
	}
	t := 2 * (pr.base.LogLikelihood - fit.LogLikelihood)
	if t < -1e-6*(1+1e-6*math.Abs(pr.base.LogLikelihood)) {
		return t, fit, errHigher
	}
	pr.last = fit.Estimate
	return math.Max(t, 0), fit, nil
}

// linear is the statistic of a linear pair: F, or χ² with known variance.
func (pr *profiler) linear(ctx context.Context, small Space) (float64, Fit, error) {
	p, err := Comparison{Restricted: small, Full: pr.full}.Fit(ctx, nil)
	if err != nil {
		return nan, Fit{}, err
	}
	l := p.Linear
	d1, d2 := l.DF()
	if l.M == 0 || d1 != 1 {
		return nan, Fit{}, fmt.Errorf("%w: fixing the value tests %g degrees of freedom of a pair that is linear: %v", ErrInvalid, d1, l.M > 0)
	}
	pr.exact = l.Certified
	if l.Known > 0 {
		pr.critical, pr.why = dist.ChiSquared{K: 1}.UpperQuantile(1-pr.level), "inversion of χ² with known variance"
	} else {
		if d2 <= 0 {
			return nan, Fit{}, ErrNoErrorDF
		}
		pr.critical, pr.why = dist.F{D1: 1, D2: d2}.UpperQuantile(1-pr.level), "inversion of the exact F test"
		if !l.Certified {
			pr.why = "inversion of an F test that is not certified exact"
		}
	}
	f, _, _ := l.F()
	if math.IsNaN(f) {
		return nan, Fit{}, ErrNoVariation
	}
	return f, p.Restricted, nil
}

// locate finds estimate and unit of a linear space: F is a parabola in v.
func (pr *profiler) locate(ctx context.Context) error {
	mid, h := 0.0, 1.0
	for range 4 {
		var f [3]float64
		for i := range f {
			v, _, err := pr.at(ctx, []float64{mid + h*float64(i-1)})
			if err != nil {
				return err
			}
			f[i] = v
		}
		if math.IsInf(f[0]+f[1]+f[2], 0) {
			return fmt.Errorf("%w: the residual is nil, every other value is rejected", ErrNoVariation)
		}
		a, b := (0.5*(f[2]+f[0])-f[1])/(h*h), 0.5*(f[2]-f[0])/h
		if !(a > 0) {
			h *= 1024
			continue
		}
		mid -= b / (2 * a)
		h = 1 / math.Sqrt(a)
	}
	pr.centre, pr.unit, pr.links = []float64{mid}, []float64{h}, []link{linkFor(-inf, inf)}
	pr.lo, pr.hi = []float64{-inf}, []float64{inf}
	return nil
}

func (pr *profiler) interval(ctx context.Context, name string) (Interval, error) {
	if pr.declared == nil {
		if err := pr.locate(ctx); err != nil {
			return Interval{}, err
		}
	}
	for try := 0; ; try++ {
		i := Interval{Name: name, Level: pr.level, Estimate: pr.centre[0]}
		var err error
		if i.Lower, i.LowerWhy, err = pr.end(ctx, -1); err == nil {
			i.Upper, i.UpperWhy, err = pr.end(ctx, 1)
		}
		i.Exact, i.Why = pr.exact, pr.why
		var higher *higherError
		if errors.As(err, &higher) && try < 3 {
			fit, err := pr.declared.MaximizeFrom(ctx, higher.fit)
			if err != nil {
				return i, err
			}
			if err := pr.recentre(ctx, fit); err != nil {
				return i, err
			}
			continue
		}
		return i, err
	}
}

// recentre moves to a higher maximum that the profile has found.
func (pr *profiler) recentre(ctx context.Context, fit Fit) error {
	if pr.evaluate != nil {
		pr.base, pr.last = fit, fit.Estimate
		pr.centre[0] = pr.evaluate(fit.detail.peak.x)
		return nil
	}
	return pr.rebase(ctx, fit, pr.names)
}

type higherError struct{ fit Fit }

func (e *higherError) Error() string {
	return "the profile rises above the maximum: " + errHigher.Error()
}

// along evaluates the signed distance √T at centre + w·direction on the scale
// of the links.
func (pr *profiler) along(ctx context.Context, dir []float64, w float64) (float64, []float64, error) {
	v := make([]float64, len(dir))
	for k, l := range pr.links {
		v[k], _ = l.to(l.from(pr.centre[k]) + w*dir[k])
		if dir[k] == 0 {
			v[k] = pr.centre[k]
		}
	}
	t, fit, err := pr.at(ctx, v)
	if errors.Is(err, errHigher) {
		return nan, v, &higherError{fit}
	}
	return math.Sqrt(t), v, err
}

// end solves for one end of a one-parameter interval.
func (pr *profiler) end(ctx context.Context, side float64) (float64, string, error) {
	pr.last = pr.base.Estimate
	l := pr.links[0]
	edge := pr.hi[0]
	if side < 0 {
		edge = pr.lo[0]
	}
	if pr.centre[0] == edge {
		return edge, "the estimate is at the end of the range", nil
	}
	// Outwards on the fitting scale, where the end of a range is at infinity:
	// upwards it is that of the parameter, mirrored for links that fall.
	dir := side
	if l.kind == linkBelow {
		dir = -side
	}
	w, why, err := pr.reach(ctx, []float64{dir * pr.unit[0]}, edge)
	if err != nil {
		return nan, "", err
	}
	if why != "" {
		return edge, why, nil
	}
	v, _ := l.to(l.from(pr.centre[0]) + w*dir*pr.unit[0])
	return v, "", nil
}

// reach returns the w at which √T along dir reaches the critical value, or
// why it never does. edge is the end of the range that way.
func (pr *profiler) reach(ctx context.Context, dir []float64, edge float64) (float64, string, error) {
	target := math.Sqrt(pr.critical)
	if len(dir) == 1 && pr.links[0].kind == linkIdentity && !math.IsInf(edge, 0) {
		t, _, err := pr.at(ctx, []float64{edge})
		if err != nil && !errors.Is(err, errHigher) {
			return nan, "", err
		}
		if t <= pr.critical {
			return nan, "the end of the range is not rejected", nil
		}
	}
	a, ra := 0.0, 0.0
	b := target
	var rb float64
	for i := 0; ; i++ {
		var err error
		var v []float64
		if rb, v, err = pr.along(ctx, dir, b); err != nil {
			return nan, "", err
		}
		if rb >= target {
			break
		}
		a, ra = b, rb
		curved := len(dir) == 1 && pr.links[0].kind != linkIdentity
		if curved && !math.IsInf(edge, 0) && math.Abs(b*dir[0]) > 25 {
			// So close to the end of the range that the end itself decides.
			t, _, err := pr.at(ctx, []float64{edge})
			if err != nil && !errors.Is(err, errHigher) {
				return nan, "", err
			}
			if t <= pr.critical {
				return nan, "the end of the range is not rejected", nil
			}
		}
		if i >= 60 || curved && math.Abs(b*dir[0]) > 600 || math.Abs(v[0]) > 1e200 {
			if math.IsInf(edge, 0) {
				return nan, fmt.Sprintf("no value is rejected: −2 log λ stays below %.4g, at %.4g for %.3g", pr.critical, rb*rb, v[0]), nil
			}
			return nan, "values up to the end of the range are not rejected", nil
		}
		b *= 2
		if rb > 0.2*target { // the distance is nearly linear: aim, and a little beyond
			b = math.Min(b, a*target/rb*1.1)
		}
	}
	// Regula falsi with halving (Dowell and Jarratt 1971, the Illinois rule), bisection where it
	// stalls or nothing is possible beyond.
	fa, fb := ra-target, rb-target
	sideLast := 0
	for range 100 {
		if b-a <= 1e-9*math.Max(1, b) {
			break
		}
		w := 0.5 * (a + b)
		if !math.IsInf(fb, 1) {
			if c := b - fb*(b-a)/(fb-fa); c > a && c < b {
				w = c
			}
		}
		r, _, err := pr.along(ctx, dir, w)
		if err != nil {
			return nan, "", err
		}
		f := r - target
		if math.Abs(f) < 1e-9 {
			return w, "", nil
		}
		if f < 0 {
			a, fa = w, f
			if sideLast == -1 {
				fb /= 2
			}
			sideLast = -1
		} else {
			b, fb = w, f
			if sideLast == 1 {
				fa /= 2
			}
			sideLast = 1
		}
	}
	return 0.5 * (a + b), "", nil
}

// eliminate prepares the restriction q(x) = v: one free coordinate becomes a
// function of the others.
func (pr *profiler) eliminate(ctx context.Context, d *Declared, q Quantity) error {
	ev := &evaluator{ctx: ctx, core: d.core, audited: true}
	co, err := newCoordinates(d.frame, &coordOptions{useBounds: true})
	if err != nil {
		return err
	}
	var failure error
	of := func(x []float64) (v float64) {
		defer func() {
			if r := recover(); r != nil {
				failure = &ModelError{Model: d.core.name, Func: "quantity " + q.Name, Names: nil, Theta: append([]float64(nil), x...), Err: fmt.Errorf("%w: %v", ErrPanic, r)}
				v = nan
			}
		}()
		return q.Of(x)
	}
	x := pr.base.detail.peak.x
	value := of(x)
	if failure != nil {
		return failure
	}
	if math.IsNaN(value) || math.IsInf(value, 0) || co.m == 0 {
		return fmt.Errorf("%w: the quantity is %g at the estimate, which has %d free parameters", ErrInvalid, value, co.m)
	}
	pk, err := d.located(ev, pr.base)
	if err != nil {
		return err
	}
	cov, err := pk.covariance()
	if err != nil {
		return err
	}
	// Slopes per standard error of each free coordinate.
	u0 := co.nearest(x)
	y := make([]float64, len(x))
	n := len(x)
	best, pick, variance := 0.0, -1, 0.0
	slopes := make([]float64, co.m)
	for j, k := range co.free {
		se := math.Sqrt(cov[k*n+k])
		_, dz := co.links[j].to(u0[j])
		if !(se > 0) || dz == 0 {
			continue
		}
		h := 1e-3 * math.Min(se/math.Abs(dz), 0.5)
		if co.links[j].kind == linkIdentity {
			h = 1e-3 * se
		}
		v := append([]float64(nil), u0...)
		v[j] += h
		if !co.point(v, y) {
			continue
		}
		up := of(y)
		v[j] -= 2 * h
		if !co.point(v, y) {
			continue
		}
		slopes[j] = (up - of(y)) / (2 * h * dz)
		if s := math.Abs(slopes[j] * se); s > best {
			best, pick = s, j
		}
	}
	if failure != nil {
		return failure
	}
	if pick < 0 {
		return fmt.Errorf("%w: the quantity does not change with any free parameter at the estimate", ErrInvalid)
	}
	for i, a := range co.free {
		for j, b := range co.free {
			variance += slopes[i] * slopes[j] * cov[a*n+b]
		}
	}
	var params []Param
	for j, k := range co.free {
		if j != pick {
			params = append(params, Param{d.frame.params[k].Name, co.links[j].lo, co.links[j].hi})
		}
	}
	pr.centre, pr.unit, pr.links = []float64{value}, []float64{math.Sqrt(variance)}, []link{linkFor(-inf, inf)}
	pr.lo, pr.hi = []float64{-inf}, []float64{inf}
	if !(pr.unit[0] > 0) || math.IsInf(pr.unit[0], 1) {
		pr.unit[0] = math.Max(math.Abs(value), 1)
	}
	pr.evaluate = of
	pr.restrict = func(v []float64) (Space, error) {
		start := make([]float64, 0, co.m)
		for j := range co.free {
			if j != pick {
				z, _ := co.links[j].to(u0[j])
				start = append(start, z)
			}
		}
		to := func(phi, theta []float64) {
			for k := range theta {
				theta[k] = nan
			}
			u := make([]float64, co.m)
			i := 0
			for j := range u {
				if j != pick {
					u[j] = co.links[j].from(phi[i])
					i++
				}
			}
			own := *co // scratch of its own: maps run concurrently
			own.z, own.dz = make([]float64, co.m), make([]float64, co.m)
			w := make([]float64, n)
			miss := func(t float64) float64 {
				u[pick] = t
				if !own.point(u, w) {
					return nan
				}
				return q.Of(w) - v[0]
			}
			if t, ok := solveNear(miss, u0[pick], slopes[pick]); ok {
				miss(t)
				copy(theta, w)
			}
		}
		return Restrict(d, Via(Map{Params: params, To: to, Start: start}))
	}
	if pr.full != Space(d) {
		pr.full = d
	}
	return nil
}

// solveNear finds the root of f nearest to t0, outwards by doubling steps, then
// by bisection with secant steps.
func solveNear(f func(float64) float64, t0, slope float64) (float64, bool) {
	f0 := f(t0)
	if f0 == 0 {
		return t0, true
	}
	if math.IsNaN(f0) {
		return nan, false
	}
	step := 1e-3 * math.Max(1, math.Abs(t0))
	if s := math.Abs(f0 / slope); s > 0 && !math.IsInf(s, 0) {
		step = math.Min(math.Max(s*1.5, 1e-12*math.Abs(t0)), 1e3*math.Max(1, math.Abs(t0)))
	}
	left, right := t0, t0
	fl, fr := f0, f0
	for range 80 {
		r := right + step
		if v := f(r); !math.IsNaN(v) {
			if v == 0 {
				return r, true
			}
			if (v > 0) != (fr > 0) {
				return root(f, right, r, fr, v), true
			}
			right, fr = r, v
		}
		l := left - step
		if v := f(l); !math.IsNaN(v) {
			if v == 0 {
				return l, true
			}
			if (v > 0) != (fl > 0) {
				return root(f, l, left, v, fl), true
			}
			left, fl = l, v
		}
		step *= 2
	}
	return nan, false
}

// root solves f = 0 between a and b of opposite signs to the last digits.
func root(f func(float64) float64, a, b, fa, fb float64) float64 {
	last := 0
	for range 200 {
		c := b - fb*(b-a)/(fb-fa)
		if !(c > a && c < b) {
			c = a + 0.5*(b-a)
			if c == a || c == b {
				break
			}
		}
		v := f(c)
		if v == 0 {
			return c
		}
		if (v > 0) == (fa > 0) {
			a, fa = c, v
			if last == -1 {
				fb /= 2
			}
			last = -1
		} else {
			b, fb = c, v
			if last == 1 {
				fa /= 2
			}
			last = 1
		}
		if b-a <= 2*epsilon*math.Max(math.Abs(a), math.Abs(b)) {
			break
		}
	}
	if math.Abs(fa) < math.Abs(fb) {
		return a
	}
	return b
}
