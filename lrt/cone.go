package lrt

import (
	"context"
	"fmt"
	"math"
	"sort"
	"strings"

	"gonum.org/v1/gonum/mat"
	"subsume.example/dist"
)

// Cone describes a comparison in which inequalities take part, so that
// −2 log λ tends to a mixture of χ² laws (chi-bar-squared) instead of one.
type Cone struct {
	// NullIsCone is false where equalities are tested against a cone (a parameter
	// fixed at the end of its range: a variance component at 0), true where the
	// restricted space itself is the cone (mean ≥ 0 against any mean; the
	// law is that at its vertex, the least favourable point).
	NullIsCone bool
	// Names are the parameters at the boundary.
	Names []string
	// Covariance of their estimates in the full space, up to a factor, the other
	// parameters profiled out; row-major.
	Covariance []float64
	// Interior counts the restrictions beside those of the boundary; it is
	// added to the degrees of freedom of every component.
	Interior int
}

// law returns the mixture.
func (k *Cone) law(ctx context.Context, s *Settings) (dist.ChiBarSquared, string, error) {
	q := len(k.Names)
	ws := &dist.WeightSettings{}
	if s != nil {
		ws.Seed, ws.Workers = s.Seed, s.Workers
	}
	w, err := dist.BoundaryWeights(ctx, mat.NewSymDense(q, append([]float64(nil), k.Covariance...)), ws)
	if err != nil {
		return dist.ChiBarSquared{}, "", err
	}
	law := dist.NewChiBarSquared(w.Value...)
	if k.NullIsCone {
		law = law.Reverse()
	}
	if k.Interior > 0 {
		law = law.Shift(k.Interior)
	}
	why := "under the restriction " + strings.Join(k.Names, ", ") + " is at the end of its range, so −2 log λ tends to a mixture of χ² laws (Self and Liang 1987)"
	if k.NullIsCone {
		why = "the restricted space is a cone: at its vertex, the least favourable point, −2 log λ tends to a mixture of χ² laws (Kudô 1963; Shapiro 1988)"
	}
	if w.Draws > 0 {
		why += fmt.Sprintf("; weights from %d draws", w.Draws)
	}
	return law, why, nil
}

// test refers the statistic to the mixture.
func (k *Cone) test(ctx context.Context, x float64, s *Settings) (Test, error) {
	law, why, err := k.law(ctx, s)
	if err != nil {
		return Test{}, err
	}
	t := Test{Kind: Asymptotic, Name: "χ̄²", Statistic: x, Law: law, Why: why}
	if x <= 1e-8 { // 0 within rounding
		t.P = 1 // P(X ≥ 0), the atom included
		return t, nil
	}
	if math.IsInf(x, 1) {
		t.LogP = -inf
		return t, nil
	}
	t.P, t.LogP = tails(law.Survival(x), x, law.LogSurvival)
	return t, nil
}

// edge is a linear form of the parameters that the restricted space holds at,
// or within, the end of its range in the full space.
type edge struct {
	param int
	value float64
	upper bool
}

// cone finds out whether inequalities take part in a pair of declared spaces
// and fills p.Cone, or p.Irregular where no mixture is known.
func (d *Declared) cone(ctx context.Context, small *Declared, p *Pair) error {
	if p.Irregular != "" || d.core.drawn {
		return nil
	}
	irregular := func(format string, args ...any) error {
		p.Irregular = fmt.Sprintf(format, args...)
		p.Warnings = append(p.Warnings, Warning{"irregular", p.Irregular})
		return nil
	}
	same := d.frame.layer == small.frame.layer
	var fixed, cut []edge
	if same {
		fixed = d.frame.edgesFixedIn(small.frame)
		cut = small.frame.cutInside(d.frame)
	}
	// Parameters at an end that the question is not about.
	if p.Restricted.detail != nil {
		for _, h := range p.Restricted.detail.peak.held {
			if !edgeAmong(cut, h.param) {
				return irregular("the nuisance parameter %s is at the end of its range, where the law of −2 log λ is not known: a bootstrap can be asked for, but is not guaranteed there either", small.frame.params[h.param].Name)
			}
		}
	}
	cut = d.frame.independentEdges(cut, p.Restricted)
	switch {
	case len(fixed) == 0 && len(cut) == 0:
		return nil
	case len(fixed) > 0 && len(cut) > 0:
		return irregular("%s is fixed at the end of its range and %s is bounded: the law of −2 log λ is not known", d.frame.params[fixed[0].param].Name, d.frame.params[cut[0].param].Name)
	}
	k := &Cone{NullIsCone: len(cut) > 0}
	es := fixed
	if k.NullIsCone {
		es = cut
	}
	for _, e := range es {
		k.Names = append(k.Names, d.frame.params[e.param].Name)
	}
	k.Interior = int(p.DF)
	if !k.NullIsCone {
		k.Interior -= len(es)
	}
	if k.Interior < 0 {
		return irregular("%d parameters are at the end of their range under %g degrees of freedom", len(es), p.DF)
	}
	if len(es) == 1 { // ½ : ½ whatever the variance
		k.Covariance = []float64{1}
		p.Cone = k
		return nil
	}
	if p.Restricted.detail == nil {
		return irregular("the curvature at the restricted estimate is not known")
	}
	cov, err := d.edgeCovariance(ctx, p.Restricted.Estimate, p.Full, es)
	if err != nil {
		if ctx.Err() != nil {
			return ctx.Err()
		}
		return irregular("the covariance of %s at the boundary cannot be had (%v), so the mixture's weights are unknown: simulate", strings.Join(k.Names, ", "), err)
	}
	k.Covariance = cov
	p.Cone = k
	return nil
}

func edgeAmong(es []edge, param int) bool {
	for _, e := range es {
		if e.param == param {
			return true
		}
	}
	return false
}

// edgesFixedIn lists the parameters that small fixes at an end of their range
// in f, independent modulo f's own equations.
func (f *frame) edgesFixedIn(small *frame) []edge {
	var es []edge
	eq := f.eq
	for j, p := range f.params {
		row := make([]float64, len(f.params))
		row[j] = 1
		lo, hi := p.Lower, p.Upper
		if f.lower != nil {
			lo, hi = math.Max(lo, f.lower[j]), math.Min(hi, f.upper[j])
		}
		for _, end := range []edge{{j, lo, false}, {j, hi, true}} {
			if math.IsInf(end.value, 0) || small.eq.status(row, end.value) != implied {
				continue
			}
			next, st := eq.add(row, end.value)
			if st == independent {
				eq = next
				es = append(es, end)
			}
			break
		}
	}
	return es
}

// cutInside lists the bounds of f that larger does not have and that f's
// equations leave open.
func (f *frame) cutInside(larger *frame) []edge {
	var es []edge
	for _, b := range f.bounds() {
		j := f.index[b.Name]
		row := make([]float64, len(f.params))
		row[j] = 1
		if left, _, _ := f.eq.reduce(row, 0); zero(left) {
			continue // fixed anyway
		}
		lo, hi := -inf, inf
		if larger.lower != nil {
			lo, hi = larger.lower[j], larger.upper[j]
		}
		if !math.IsInf(b.Lower, -1) && b.Lower > lo {
			es = append(es, edge{j, b.Lower, false})
		}
		if !math.IsInf(b.Upper, 1) && b.Upper < hi {
			es = append(es, edge{j, b.Upper, true})
		}
	}
	return es
}

// independentEdges keeps one edge of each parameter, the nearer to the estimate,
// and leaves out those that depend on others under f's equations.
func (f *frame) independentEdges(es []edge, at Fit) []edge {
	if at.detail != nil {
		x := at.detail.peak.x
		sort.SliceStable(es, func(a, b int) bool {
			return math.Abs(x[es[a].param]-es[a].value) < math.Abs(x[es[b].param]-es[b].value)
		})
	}
	var out []edge
	eq := f.eq
	for _, e := range es {
		row := make([]float64, len(f.params))
		row[e.param] = 1
		if next, st := eq.add(row, e.value); st == independent {
			eq = next
			out = append(out, e)
		}
	}
	sort.SliceStable(out, func(a, b int) bool { return out[a].param < out[b].param })
	return out
}

// edgeCovariance returns the covariance of the inward distances of es from
// their ends, by the observed information of the full space at a point of the
// restricted one. Differences stay inside the ranges.
func (d *Declared) edgeCovariance(ctx context.Context, theta []float64, full Fit, es []edge) ([]float64, error) {
	ev := &evaluator{ctx: ctx, core: d.core, audited: true}
	co, err := newCoordinates(d.frame, &coordOptions{useBounds: true})
	if err != nil {
		return nil, err
	}
	for j := range co.links {
		co.links[j].kind = linkIdentity
	}
	x := theta
	if d.frame.layer != nil {
		x = d.frame.nearest(ev, theta)
	}
	p := newProblem(ev, co)
	p.gradient, p.hessian, p.each = false, false, false
	z := make([]float64, co.m)
	for j, k := range co.free {
		z[j] = x[k]
	}
	f := p.value(z)
	if ev.err != nil {
		return nil, ev.err
	}
	if math.IsNaN(f) {
		return nil, fmt.Errorf("%w: the log likelihood is not finite there", ErrInvalid)
	}
	p.noise = 4 * epsilon * (1 + math.Abs(f))
	info, err := p.inwardInformation(z, f, full)
	if err != nil {
		return nil, err
	}
	inv, ok := invertInformation(info, co.m)
	if !ok {
		return nil, fmt.Errorf("%w: the information is not positive there", ErrInvalid)
	}
	q := len(es)
	cov := make([]float64, q*q)
	sign := func(e edge) float64 {
		if e.upper {
			return -1
		}
		return 1
	}
	for a, e := range es {
		for b, g := range es {
			var s float64
			for i, v := range co.basis[e.param] {
				if v != 0 {
					s += v * dot(inv[i*co.m:i*co.m+co.m], co.basis[g.param])
				}
			}
			cov[a*q+b] = s * sign(e) * sign(g)
		}
	}
	return cov, nil
}

// tap is one point of a difference formula.
type tap struct{ at, weight float64 }

var (
	centralFirst  = []tap{{1, 0.5}, {-1, -0.5}}
	centralSecond = []tap{{1, 1}, {0, -2}, {-1, 1}}
	inwardFirst   = []tap{{0, -11. / 6}, {1, 3}, {2, -1.5}, {3, 1. / 3}}
	inwardSecond  = []tap{{0, 35. / 12}, {1, -26. / 3}, {2, 9.5}, {3, -14. / 3}, {4, 11. / 12}}
)

// inwardInformation is −∂²/∂z∂z' by differences that are central where both
// sides can be seen and one-sided at the ends of ranges.
func (p *problem) inwardInformation(z []float64, f float64, full Fit) ([]float64, error) {
	m := p.co.m
	h := make([]float64, m)
	oneSided := make([]bool, m)
	v := append([]float64(nil), z...)
	at := func(j int, s float64) float64 {
		v[j] = z[j] + s
		g := p.value(v)
		v[j] = z[j]
		return g
	}
	for j := range m {
		// The unit: a displacement that costs about 1/2 in log likelihood beside the slope.
		unit := math.Abs(z[j])
		if k := p.co.free[j]; unit == 0 && len(full.Estimate) == len(p.co.f.params) {
			unit = math.Abs(full.Estimate[k] - z[j])
		}
		if unit == 0 {
			unit = 1
		}
		dir := 1.0
		if math.IsNaN(at(j, 1e-9*unit)) {
			dir = -1
		}
		oneSided[j] = dir < 0 || math.IsNaN(at(j, -1e-9*unit))
		h[j] = dir * unit
		for range 200 {
			g := at(j, h[j])
			if p.ev.err != nil {
				return nil, p.ev.err
			}
			d := math.Abs(g - f)
			if math.IsNaN(d) || d > 2 {
				h[j] /= 2
			} else if d < 0.05 {
				if math.Abs(h[j]) > 1e9*unit {
					break
				}
				h[j] *= 2.5
			} else {
				break
			}
		}
		h[j] *= 0.02
		if !oneSided[j] && math.IsNaN(at(j, -h[j])) {
			oneSided[j] = true
		}
		if oneSided[j] {
			h[j] *= 2
		}
	}
	taps := func(j, order int) []tap {
		switch {
		case oneSided[j] && order == 1:
			return inwardFirst
		case oneSided[j]:
			return inwardSecond
		case order == 1:
			return centralFirst
		}
		return centralSecond
	}
	info := make([]float64, m*m)
	for j := range m {
		var s float64
		for _, t := range taps(j, 2) {
			g := f
			if t.at != 0 {
				g = at(j, t.at*h[j])
			}
			s += t.weight * (g - f)
		}
		info[j*m+j] = -s / (h[j] * h[j])
		for k := range j {
			s = 0
			for _, a := range taps(j, 1) {
				v[j] = z[j] + a.at*h[j]
				for _, b := range taps(k, 1) {
					s += a.weight * b.weight * (at(k, b.at*h[k]) - f)
				}
			}
			v[j] = z[j]
			info[j*m+k] = -s / (h[j] * h[k])
			info[k*m+j] = info[j*m+k]
		}
	}
	if p.ev.err != nil {
		return nil, p.ev.err
	}
	if !finite(info) {
		return nil, fmt.Errorf("%w: differences leave the possible values", ErrInvalid)
	}
	return info, nil
}
