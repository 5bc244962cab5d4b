package lrt

import (
	"context"
	"fmt"
	"math"
	"strings"
)

// Estimates are the parameters of a fitted declared space with their
// uncertainty, on the user's scale.
type Estimates struct {
	Names []string
	Value []float64
	// StdErr are standard errors from the observed information: 0 for a fixed
	// parameter, +Inf for one that the data do not determine, NaN for one at the
	// end of its range, where a standard error has no meaning.
	StdErr []float64
	// Covariance is row-major, len(Names) squared; NaN where StdErr is not finite.
	Covariance []float64
	// Robust are standard errors that do not trust the model's variance: the
	// sandwich of the information around the sum of the outer products of the
	// observations' scores (Huber 1967; White 1982). nil unless the model has
	// Each. Far from StdErr they say that the model is wrong, and χ² of λ with it.
	Robust   []float64
	Warnings []Warning
}

// Estimates returns the parameters of a fit of this space, in the names of
// Params, with standard errors from the observed information (minus the second
// derivatives of the log likelihood: the model's own, or extrapolated
// differences). The fit must come from Maximize, MaximizeFrom or a comparison
// of this space.
func (d *Declared) Estimates(ctx context.Context, fit Fit) (Estimates, error) {
	var e Estimates
	if fit.detail == nil || fit.detail.frame != d.frame {
		if len(fit.Estimate) != len(d.core.params) {
			return e, &ModelError{Model: d.core.name, Func: "Estimates", Err: fmt.Errorf("%w: not a fit of this space", ErrInvalid)}
		}
	}
	ev := &evaluator{ctx: ctx, core: d.core, audited: true}
	q, err := d.located(ev, fit)
	if err != nil {
		return e, err
	}
	n := len(d.frame.params)
	for _, p := range d.frame.params {
		e.Names = append(e.Names, p.Name)
	}
	e.Value = append([]float64(nil), q.x...)
	e.StdErr, e.Covariance = make([]float64, n), make([]float64, n*n)
	cov, err := q.covariance()
	if err != nil {
		return e, err
	}
	copy(e.Covariance, cov)
	for k := range n {
		e.StdErr[k] = math.Sqrt(e.Covariance[k*n+k])
	}
	if d.core.each != nil && q.p.co.m > 0 {
		if e.Robust, err = q.sandwich(d, n); err != nil {
			return e, err
		}
	}
	mark := func(k int, v float64) {
		e.StdErr[k] = v
		if e.Robust != nil {
			e.Robust[k] = v
		}
		for l := range n {
			e.Covariance[k*n+l], e.Covariance[l*n+k] = nan, nan
		}
	}
	for k, p := range d.frame.params {
		if e.StdErr[k] == 0 && !zero(q.p.co.basis[k]) {
			mark(k, inf) // free, yet without curvature
		}
		for _, h := range q.held {
			if h.param == k {
				mark(k, nan)
			}
		}
		for _, name := range q.flat {
			if name == p.Name {
				mark(k, inf)
			}
		}
	}
	if len(q.held) > 0 {
		e.Warnings = append(e.Warnings, Warning{"boundary", "a parameter is at the end of its range: the other standard errors hold it there"})
	}
	if len(q.flat) > 0 {
		e.Warnings = append(e.Warnings, Warning{"not-identifiable", "the data do not determine " + strings.Join(q.flat, ", ")})
	}
	return e, ev.err
}

// sandwich returns robust standard errors of the frame's n parameters, nil
// where the scores cannot be had.
func (q *peak) sandwich(d *Declared, n int) ([]float64, error) {
	ev := &evaluator{ctx: q.p.ev.ctx, core: d.core, audited: true, noGradient: true}
	p := newProblem(ev, q.p.co)
	if !p.each {
		return nil, nil
	}
	copy(p.scale, q.p.scale)
	m := p.co.m
	f := p.value(q.u)
	if math.IsNaN(f) {
		return nil, ev.err
	}
	p.settle(f)
	g, meat := make([]float64, m), make([]float64, m*m)
	inv, ok := invertInformation(q.info, m)
	if !ok || !p.slope(q.u, f, nil, g) {
		return nil, ev.err
	}
	for j := range m {
		for k := range m {
			meat[j*m+k] = dot(p.score[j], p.score[k])
		}
	}
	p.co.point(q.u, p.at[0])
	out := make([]float64, n)
	for k, b := range p.co.basis {
		// v = I⁻¹ times the gradient of parameter k; its variance is v' meat v.
		v := make([]float64, m)
		for i := range m {
			for j, w := range b {
				v[i] += inv[i*m+j] * w * p.co.dz[j]
			}
		}
		out[k] = math.Sqrt(quadratic(meat, v))
	}
	return out, nil
}

// located rebuilds the peak of a fit with a fresh evaluator, free coordinates
// only: parameters at the end of their range are held there.
func (d *Declared) located(ev *evaluator, fit Fit) (*peak, error) {
	q := &peak{eq: d.frame.eq}
	if fit.detail != nil && fit.detail.frame == d.frame {
		o := fit.detail.peak
		q.x, q.held, q.flat, q.loss, q.eq = o.x, o.held, o.flat, o.loss, o.eq
	} else {
		q.x = d.frame.nearest(ev, fit.Estimate)
	}
	for _, h := range q.held { // a closed form leaves them free
		row := make([]float64, len(d.frame.params))
		row[h.param] = 1
		q.eq, _ = q.eq.add(row, h.value)
	}
	co, err := newCoordinates(d.frame, &coordOptions{eq: &q.eq})
	if err != nil {
		return nil, err
	}
	q.p = newProblem(ev, co)
	if co.m == 0 {
		q.f = fit.LogLikelihood
		return q, ev.err
	}
	q.u = co.nearest(q.x)
	q.f = q.p.value(q.u)
	if ev.err != nil {
		return nil, ev.err
	}
	if math.IsNaN(q.f) {
		return nil, &ModelError{Model: d.core.name, Func: "LogLikelihood", Names: ev.core.names, Theta: fit.Estimate, Err: fmt.Errorf("%w: not finite at the estimate", ErrInvalid)}
	}
	q.p.settle(q.f)
	if err := q.p.measure(q); err != nil {
		return nil, err
	}
	return q, nil
}

// measure fills q.info accurately: a rough curvature first, for its units.
func (p *problem) measure(q *peak) error {
	m := p.co.m
	q.info = make([]float64, m*m)
	curv := make([]float64, m*m)
	p.survey(q.u, q.f, curv)
	if p.each {
		g := make([]float64, m)
		if p.slope(q.u, q.f, nil, g) && p.outer(curv) {
			p.regroup()
			p.rescale(curv)
		}
	}
	if p.information(q.u, q.f, q.info, false) {
		p.rescale(q.info)
	}
	if !p.information(q.u, q.f, q.info, true) {
		if p.ev.err != nil {
			return p.ev.err
		}
		return &ModelError{Model: p.ev.core.name, Err: fmt.Errorf("%w: no curvature at the estimate, which is too close to impossible values", ErrNotConverged)}
	}
	if q.flat == nil {
		_, flats, _ := p.spectrum(q)
		for _, v := range flats {
			q.flat = appendNew(q.flat, p.moved(v)...)
		}
		q.loss = len(flats)
	}
	return nil
}

// covariance returns that of the frame's parameters, p×p, at a peak with info.
// Directions that the data do not determine are left out.
func (q *peak) covariance() ([]float64, error) {
	co, m, n := q.p.co, q.p.co.m, len(q.p.co.f.params)
	cov := make([]float64, n*n)
	if m == 0 {
		return cov, nil
	}
	inv, ok := invertInformation(q.info, m)
	if !ok {
		return nil, &ModelError{Model: q.p.ev.core.name, Err: fmt.Errorf("%w: the curvature at the estimate is not that of a maximum", ErrNotConverged)}
	}
	co.point(q.u, q.p.at[0])
	jac := make([]float64, n*m)
	for k, b := range co.basis {
		for j, w := range b {
			jac[k*m+j] = w * co.dz[j]
		}
	}
	for k := range n {
		for l := range n {
			var s float64
			for i := range m {
				if w := jac[k*m+i]; w != 0 {
					s += w * dot(inv[i*m:i*m+m], jac[l*m:l*m+m])
				}
			}
			cov[k*n+l] = s
		}
	}
	return cov, nil
}

// invertInformation inverts a symmetric matrix through its scaled eigenvalues,
// leaving out those that are nil. Strongly negative ones are refused.
func invertInformation(info []float64, m int) ([]float64, bool) {
	l := append([]float64(nil), info...)
	inv := make([]float64, m*m)
	if clearlyRegular(info, m) {
		cholesky(l, m)
		e := make([]float64, m)
		for j := range m {
			for i := range e {
				e[i] = 0
			}
			e[j] = 1
			choleskySolve(l, m, e)
			for i := range m {
				inv[i*m+j] = e[i]
			}
		}
		return inv, true
	}
	return pseudoInverse(info, m)
}
