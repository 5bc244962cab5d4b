package lrt

import (
	"context"
	"fmt"
)

var (
	_ ExactReferrer     = (*Declared)(nil)
	_ BartlettCorrector = (*Declared)(nil)
	_ Pivot             = (*Declared)(nil)
)

// Implies reports whether the equations and bounds of the restrictions hold
// everywhere in the space. Maps are not looked at; a name that the space does
// not have makes it false.
func (d *Declared) Implies(rs ...Restriction) bool {
	for _, r := range rs {
		if r.Via != nil {
			return false
		}
		for _, e := range r.Equations {
			a, b, err := d.frame.equation(e)
			if err != nil || d.frame.eq.status(a, b) != implied {
				return false
			}
		}
		for _, b := range r.Bounds {
			j, ok := d.frame.index[b.Name]
			if !ok {
				return false
			}
			if lo, hi := d.frame.reach(j); lo < b.Lower || hi > b.Upper {
				return false
			}
		}
	}
	return true
}

// Free returns the number of free parameters.
func (d *Declared) Free() int {
	co, err := newCoordinates(d.frame, nil)
	if err != nil {
		return 0
	}
	return co.m
}

// Same reports whether both spaces come from one Bind and hold the same points.
func (d *Declared) Same(other *Declared) bool {
	return d.core.model == other.core.model && d.frame.within(other.frame) == nil && other.frame.within(d.frame) == nil
}

// ReferExact returns the model's own exact test of a comparison.
func (d *Declared) ReferExact(_ context.Context, c Comparison, p Pair) (t Test, err error) {
	r, ok := c.Restricted.(declaredSpace)
	if d.core.exact == nil || !ok {
		return Test{}, nil
	}
	ev := &evaluator{core: d.core}
	func() {
		defer ev.guard("Exact", nil)
		t, err = d.core.exact(r.declared(), d, p)
	}()
	if ev.err != nil {
		return Test{}, ev.err
	}
	return t, err
}

// BartlettFactor returns the model's own factor.
func (d *Declared) BartlettFactor(c Comparison, p Pair) (f float64, err error) {
	r, ok := c.Restricted.(declaredSpace)
	if d.core.factor == nil || !ok {
		return 0, fmt.Errorf("%w: the model gives none", ErrNoFactor)
	}
	ev := &evaluator{core: d.core}
	func() {
		defer ev.guard("BartlettFactor", nil)
		f, err = d.core.factor(r.declared(), d, p)
	}()
	if ev.err != nil {
		return 0, ev.err
	}
	return f, err
}

// PivotalAgainst reports what the model says of the law of λ.
func (d *Declared) PivotalAgainst(restricted Space) bool {
	r, ok := restricted.(declaredSpace)
	return ok && d.core.pivotal != nil && d.core.pivotal(r.declared(), d)
}
