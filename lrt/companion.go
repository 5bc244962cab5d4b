package lrt

import (
	"context"
	"fmt"
	"math"

	"subsume.example/dist"
)

// ScoreTest asks for the score test (Rao 1948): the slope of the log
// likelihood at the restricted estimate, in the metric of the information there.
type ScoreTest struct{}

// WaldTest asks for the Wald test (Wald 1943): how far the full estimate is from
// the restriction, in units of its covariance. Unlike λ it depends on how
// the restriction is written.
type WaldTest struct{}

// Refer implements Reference.
func (ScoreTest) Refer(ctx context.Context, c Comparison, p Pair, _ *Settings) (Test, error) {
	s, _, err := companions(ctx, c, p)
	return s, err
}

// Refer implements Reference.
func (WaldTest) Refer(ctx context.Context, c Comparison, p Pair, _ *Settings) (Test, error) {
	_, w, err := companions(ctx, c, p)
	return w, err
}

func companions(ctx context.Context, c Comparison, p Pair) (score, wald Test, err error) {
	k, ok := c.Full.(Companion)
	if !ok {
		why := fmt.Sprintf("%T offers no score and no Wald test", c.Full)
		return absent("score", why), absent("Wald", why), nil
	}
	return k.ScoreWald(ctx, c, p)
}

func absent(name, why string) Test {
	return Test{Name: name, Statistic: nan, P: nan, LogP: nan, Why: why}
}

var _ Companion = (*Declared)(nil)

// ScoreWald returns the score and the Wald test of a pair of declared spaces
// in the same names. A test is absent, with the reason, where the pair has no
// χ² law, or an estimate is at the end of a range.
func (d *Declared) ScoreWald(ctx context.Context, c Comparison, p Pair) (score, wald Test, err error) {
	none := func(why string) (Test, Test, error) { return absent("score", why), absent("Wald", why), nil }
	r, ok := c.Restricted.(declaredSpace)
	switch {
	case !ok || p.Restricted.detail == nil || p.Full.detail == nil:
		return none("the spaces are not both declared")
	case r.declared().frame.layer != d.frame.layer && d.frame.layer != nil:
		return none("the restriction is a map on a map")
	case p.Irregular != "" || p.Cone != nil || p.DF <= 0:
		return none("−2 log λ has no χ² law here, and neither have its companions")
	}
	small := r.declared()
	if score, err = d.score(ctx, p); err != nil {
		return Test{}, Test{}, err
	}
	if small.frame.layer != d.frame.layer {
		return score, absent("Wald", "the restriction is a map, not equations"), nil
	}
	wald, err = d.wald(ctx, small, p)
	return score, wald, err
}

func companionTest(name, why string, x, df float64) Test {
	t := chiSquared(math.Max(x, 0), df)
	t.Name, t.Why = name, why
	return t
}

func (d *Declared) score(ctx context.Context, p Pair) (Test, error) {
	ev := &evaluator{ctx: ctx, core: d.core, audited: true}
	co, err := newCoordinates(d.frame, nil)
	if err != nil {
		return Test{}, err
	}
	q := &peak{p: newProblem(ev, co), x: p.Restricted.detail.peak.x}
	if d.frame.layer == nil {
		q.x = p.Restricted.Estimate // whatever maps the restricted space goes through
	}
	q.u = co.nearest(q.x)
	q.f = q.p.value(q.u)
	if ev.err != nil {
		return Test{}, ev.err
	}
	if math.IsNaN(q.f) || math.Abs(q.f-p.Restricted.LogLikelihood) > 1e-6*(1+math.Abs(q.f)) {
		return absent("score", "the restricted estimate is at the end of a range"), nil
	}
	q.p.settle(q.f)
	g := make([]float64, co.m)
	if q.p.gradient && d.core.expected != nil {
		if q.p.pullBack(q.u, g) && q.p.expectedInformation(q) {
			if inv, ok := invertInformation(q.info, co.m); ok {
				return companionTest("score", "slope at the restricted estimate in the metric of the expected information there (Rao 1948)", quadratic(inv, g), p.DF), nil
			}
		}
		return absent("score", "the expected information at the restricted estimate is not positive"), ev.err
	}
	if err := q.p.measure(q); err != nil {
		return absent("score", "no curvature at the restricted estimate"), ev.err
	}
	if q.p.gradient {
		q.p.pullBack(q.u, g)
	} else {
		q.p.central(q.u, g, math.Cbrt(3*q.p.noise))
	}
	if ev.err != nil {
		return Test{}, ev.err
	}
	// On the fitting scale the information at a point that is no maximum has a
	// term from the bend of the scale; the natural scale has none.
	for j, l := range co.links {
		_, slope := l.to(q.u[j])
		q.info[j*co.m+j] += g[j] / slope * l.bend(q.u[j])
	}
	inv, ok := invertInformation(q.info, co.m)
	if !ok || !finite(g) {
		return absent("score", "the observed information at the restricted estimate is not positive"), nil
	}
	return companionTest("score", "slope at the restricted estimate in the metric of the observed information there (Rao 1948)", quadratic(inv, g), p.DF), nil
}

func quadratic(a, g []float64) float64 {
	m := len(g)
	var x float64
	for j := range g {
		x += g[j] * dot(a[j*m:j*m+m], g)
	}
	return x
}

// expectedInformation carries the model's expected information to q.info.
func (p *problem) expectedInformation(q *peak) bool {
	m, n := p.co.m, len(p.ev.core.params)
	if !p.jacobian(q.u) {
		return false
	}
	theta := p.root(q.u)
	own := make([]float64, n*n)
	if theta == nil || !p.ev.information(theta, own) {
		return false
	}
	q.info = make([]float64, m*m)
	for j := range m {
		for k := range m {
			for a := range n {
				if w := p.jac[a*m+j]; w != 0 {
					for b := range n {
						q.info[j*m+k] += w * own[a*n+b] * p.jac[b*m+k]
					}
				}
			}
		}
	}
	return true
}

func (d *Declared) wald(ctx context.Context, small *Declared, p Pair) (Test, error) {
	ev := &evaluator{ctx: ctx, core: d.core, audited: true}
	q, err := d.located(ev, p.Full)
	if err != nil {
		return Test{}, err
	}
	if len(q.held) > 0 {
		return absent("Wald", "the full estimate is at the end of a range"), nil
	}
	cov, err := q.covariance()
	if err != nil {
		return absent("Wald", "the observed information at the full estimate is not positive"), nil
	}
	var rows [][]float64
	var miss []float64
	for i, row := range small.frame.eq.rows {
		left, rest, _ := d.frame.eq.reduce(row, small.frame.eq.rhs[i])
		if !zero(left) {
			rows = append(rows, left)
			miss = append(miss, dot(left, q.x)-rest)
		}
	}
	n, k := len(d.frame.params), len(rows)
	v := make([]float64, k*k)
	for a := range rows {
		for b := range rows {
			for i, w := range rows[a] {
				if w != 0 {
					v[a*k+b] += w * dot(cov[i*n:i*n+n], rows[b])
				}
			}
		}
	}
	inv, ok := pseudoInverse(v, k)
	if !ok {
		return absent("Wald", "the covariance of the restricted combinations is not positive"), nil
	}
	var x float64
	for a := range rows {
		x += miss[a] * dot(inv[a*k:a*k+k], miss)
	}
	return companionTest("Wald", "distance of the full estimate from the restriction in the metric of its covariance (Wald 1943); it depends on how the parameters are written", x, p.DF), nil
}

// SignedRoot asks for the signed root of −2 log λ of a comparison with one
// degree of freedom, referred to the normal law, and a one-sided p-value. The
// sign is that of Name in the full estimate minus its value in the restricted
// one. Both spaces must be declared.
type SignedRoot struct {
	Name string
	// Less asks for evidence that the parameter is smaller than the restriction
	// says; else larger.
	Less bool
}

// Refer implements Reference.
func (q SignedRoot) Refer(_ context.Context, c Comparison, p Pair, _ *Settings) (Test, error) {
	full, ok := c.Full.(declaredSpace)
	small, ok2 := c.Restricted.(declaredSpace)
	if !ok || !ok2 || p.Full.detail == nil || p.Restricted.detail == nil {
		return absent("signed root", "the spaces are not both declared"), nil
	}
	f, g := full.declared().frame, small.declared().frame
	j, ok := f.index[q.Name]
	if !ok {
		return Test{}, fmt.Errorf("signed root: %w", f.unknown(q.Name))
	}
	switch {
	case f.layer != g.layer:
		return absent("signed root", "the restriction is a map, not an equation"), nil
	case p.DF != 1 || p.Irregular != "":
		return absent("signed root", fmt.Sprintf("a signed root needs one degree of freedom; there are %g", p.DF)), nil
	case p.Cone != nil && q.Less:
		return absent("signed root", "the parameter cannot be smaller than the end of its range"), nil
	}
	delta := p.Full.detail.peak.x[j] - p.Restricted.detail.peak.x[j]
	r := math.Copysign(math.Sqrt(p.statistic()), delta)
	law := dist.StudentT{Nu: math.Inf(1)}
	t := Test{Kind: Asymptotic, Name: "signed root", Statistic: r, Law: law,
		Why: fmt.Sprintf("√(−2 log λ) with the sign of the change in %s tends to the standard normal law", q.Name)}
	x := r
	if q.Less {
		x = -r
	}
	t.P, t.LogP = tails(law.Survival(x), x, law.LogSurvival)
	return t, nil
}
