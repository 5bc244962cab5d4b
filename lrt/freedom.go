package lrt

import (
	"context"
	"fmt"
	"math"
	"strings"
)

// freedom sets the degrees of freedom of a pair of declared spaces: the rank of
// the restriction on the directions that the data determine at the restricted
// estimate. A rank that is different at the full estimate means that −2 log λ
// has no χ² law.
func (d *Declared) freedom(ctx context.Context, small *Declared, p *Pair) error {
	if p.Full.detail == nil || p.Restricted.detail == nil {
		p.DF = float64(p.Full.Dim - p.Restricted.Dim)
		return checkPair(*p)
	}
	q, r := p.Full.detail.peak, p.Restricted.detail.peak
	p.DF = float64(p.Full.Dim - p.Restricted.Dim)
	lossFull, lossSmall := q.loss, r.loss
	p.DF -= float64(lossFull - lossSmall)
	if p.DF < 0 {
		p.DF = 0
	}
	// At the restricted estimate, in the full space's coordinates.
	if p.Full.Dim > p.Restricted.Dim && !d.core.drawn {
		names, loss, ok := d.lostAt(ctx, q.p, p.Restricted)
		if ok && loss > lossFull {
			p.Irregular = fmt.Sprintf("under the restriction the data say nothing about %s of the full space, so −2 log λ has no χ² law (simulate it)", strings.Join(names, ", "))
			p.Warnings = append(p.Warnings, Warning{"irregular", p.Irregular})
		}
	}
	if err := d.cone(ctx, small, p); err != nil {
		return err
	}
	return checkPair(*p)
}

// lostAt counts the directions of d that change nothing at the estimate of a
// smaller space; used is the workspace of d's own fit, if any.
func (d *Declared) lostAt(ctx context.Context, used *problem, at Fit) (names []string, loss int, ok bool) {
	if d.frame.layer != nil {
		return nil, 0, false
	}
	co, err := newCoordinates(d.frame, nil)
	if err != nil || co.m == 0 {
		return nil, 0, false
	}
	ev := &evaluator{ctx: ctx, core: d.core}
	var p *problem
	if used != nil && used.co.m == co.m && used.ev.core == d.core && len(used.chain) == 1 {
		p, co = used, used.co
		p.ev.ctx, p.coarse = ctx, false
		ev = p.ev
	} else {
		p = newProblem(ev, co)
	}
	u := co.nearest(at.Estimate)
	if !co.point(u, p.at[0]) {
		return nil, 0, false
	}
	for k, v := range at.Estimate { // an estimate on the edge of a range has no point on the fitting scale
		if math.Abs(p.at[0][k]-v) > 1e-6*math.Max(math.Abs(v), 1e-6) {
			return d.lostOnEdge(ev, co, at)
		}
	}
	f := p.value(u)
	if math.IsNaN(f) {
		return nil, 0, false
	}
	p.settle(f)
	curv := make([]float64, co.m*co.m)
	if p != used { // else the fit has left good units
		p.survey(u, f, curv)
	}
	if !p.gradient && !p.each && co.m > 6 {
		// A full set of second differences would cost more than the fits: single parameters only.
		for j := range co.m {
			if p.idle(u, f, j) {
				loss++
				names = appendNew(names, co.names(j)...)
			}
		}
		return names, loss, ev.err == nil
	}
	if p.each {
		g := make([]float64, co.m)
		if !p.slope(u, f, nil, g) {
			return nil, 0, false
		}
		if !p.confirm(u) {
			p.slope(u, f, nil, g)
		}
		if p.outer(curv) {
			p.regroup()
			p.rescale(curv)
		}
	}
	q := &peak{p: p}
	q.u, q.f = u, f
	q.info = make([]float64, co.m*co.m)
	if !p.information(u, f, q.info, false) {
		return nil, 0, false
	}
	_, flats, _ := p.spectrum(q)
	for _, v := range flats {
		names = appendNew(names, p.moved(v)...)
	}
	return names, len(flats), ev.err == nil
}

// idle reports whether coordinate j alone changes nothing.
func (p *problem) idle(u []float64, f float64, j int) bool {
	v := append([]float64(nil), u...)
	for _, t := range []float64{3, -3, 30, -30} { // the first that shows a change is enough
		v[j] = u[j] + t*p.scale[j]
		if g := p.value(v); math.IsNaN(g) || math.Abs(g-f) > 1e-7 {
			return false
		}
	}
	return true
}

// lostOnEdge is lostAt for an estimate with parameters at ends of their ranges:
// single parameters away from the ends are moved, the others stay.
func (d *Declared) lostOnEdge(ev *evaluator, co *coordinates, at Fit) (names []string, loss int, ok bool) {
	f := ev.value(at.Estimate)
	theta := append([]float64(nil), at.Estimate...)
	for k := range theta {
		if co.single[k] < 0 || len(co.names(co.single[k])) > 1 {
			continue
		}
		l := linkFor(co.lo[k], co.hi[k])
		if at.Estimate[k] == co.lo[k] || at.Estimate[k] == co.hi[k] {
			continue
		}
		still := true
		for _, t := range []float64{0.5, -0.5} {
			u := l.from(at.Estimate[k])
			if l.kind == linkIdentity {
				t *= math.Max(1, math.Abs(u))
			}
			theta[k], _ = l.to(u + t)
			g := ev.value(theta)
			still = still && math.Abs(g-f) <= 1e-9*(1+math.Abs(f))
		}
		theta[k] = at.Estimate[k]
		if still {
			loss++
			names = append(names, d.frame.params[k].Name)
		}
	}
	return names, loss, ev.err == nil
}
