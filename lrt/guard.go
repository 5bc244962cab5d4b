package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
	"reflect"
)

// guard checks what can be known before any fit: spaces present, and all of
// them bound to the same observations.
func (c Comparison) guard() error {
	if noSpace(c.Restricted) {
		return &ComparisonError{c.Name, "restricted", fmt.Errorf("%w: no space", ErrInvalid)}
	}
	if noSpace(c.Full) {
		return &ComparisonError{c.Name, "full", fmt.Errorf("%w: no space", ErrInvalid)}
	}
	if c.Error != nil && noSpace(c.Error.Smaller) {
		return &ComparisonError{c.Name, "error", fmt.Errorf("%w: error pair without its smaller space", ErrInvalid)}
	}
	base := c.Restricted.Observations()
	if err := base.Check(c.Full.Observations()); err != nil {
		return &ComparisonError{c.Name, "full", err}
	}
	if c.Error == nil && c.Effects == nil {
		return nil
	}
	_, err := c.Each(func(s Space) (Space, error) {
		if noSpace(s) {
			return nil, fmt.Errorf("%w: no space", ErrInvalid)
		}
		return s, base.Check(s.Observations())
	})
	return err
}

// noSpace reports whether there is no space, a nil pointer included.
func noSpace(s Space) bool {
	if s == nil {
		return true
	}
	v := reflect.ValueOf(s)
	return v.Kind() == reflect.Pointer && v.IsNil()
}

// fitSeparately fits two spaces that know nothing of each other.
func fitSeparately(ctx context.Context, c Comparison) (Pair, error) {
	var p Pair
	if c.Error != nil {
		return p, &ComparisonError{c.Name, "error", fmt.Errorf("%w: error pairs need linear spaces", ErrInvalid)}
	}
	p.Warnings = lostInterfaces(c)
	if n, ok := c.Restricted.(Nester); ok {
		switch err := n.NestedIn(c.Full); {
		case err == nil:
			p.Nesting = "proved by the restricted space"
		case errors.Is(err, ErrNestingUnknown):
			p.Warnings = append(p.Warnings, notChecked(err))
		default:
			return p, &ComparisonError{c.Name, "restricted", err}
		}
	} else {
		p.Warnings = append(p.Warnings, notChecked(nil))
	}
	var err error
	if p.Restricted, err = c.Restricted.Maximize(ctx); err != nil {
		return p, &ComparisonError{c.Name, "restricted", err}
	}
	if p.Full, err = c.Full.Maximize(ctx); err != nil {
		return p, &ComparisonError{c.Name, "full", err}
	}
	if im, ok := c.Full.(Improver); ok && !math.IsNaN(p.Restricted.LogLikelihood) {
		better, err := im.MaximizeFrom(ctx, p.Restricted)
		switch {
		case ctx.Err() != nil:
			return p, ctx.Err()
		case err == nil && better.LogLikelihood > p.Full.LogLikelihood:
			p.Full = better
		}
	}
	p.DF = float64(p.Full.Dim - p.Restricted.Dim)
	if d, ok := c.Restricted.(Degrees); ok {
		if df, ok := d.DegreesWithin(c.Full); ok {
			p.DF = df
		}
	}
	return p, checkPair(p)
}

// checkPair holds what must be true of any two fits before they are compared.
func checkPair(p Pair) error {
	if p.Restricted.N != p.Full.N {
		return fmt.Errorf("%w: %d and %d observations", ErrDifferentObservations, p.Restricted.N, p.Full.N)
	}
	if !p.Restricted.Criterion.Same(p.Full.Criterion) {
		return fmt.Errorf("%w: %v and %v", ErrDifferentCriterion, p.Restricted.Criterion.Kind, p.Full.Criterion.Kind)
	}
	if p.Linear.M > 0 {
		return nil
	}
	r, f := p.Restricted.LogLikelihood, p.Full.LogLikelihood
	if math.IsNaN(r) || math.IsNaN(f) || math.IsInf(r, 1) || math.IsInf(f, 0) {
		return fmt.Errorf("%w: log likelihoods %g (restricted) and %g (full)", ErrInvalid, r, f)
	}
	if r-f > likelihoodSlack(r, f) {
		return fmt.Errorf("%w: %.17g below %.17g", ErrFullWorse, f, r)
	}
	return nil
}

// likelihoodSlack is the difference of two log likelihoods that rounding alone
// explains: sums of n terms carry a few hundred units in the last place.
func likelihoodSlack(r, f float64) float64 {
	return 1e-9 + 1e-11*math.Max(math.Abs(r), math.Abs(f))
}
