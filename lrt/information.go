package lrt

import (
	"context"
	"fmt"
	"math"
)

// Information is the fit of a space with its information criteria, and their
// distance to the best space of the same call.
type Information struct {
	Space              Space
	Fit                Fit
	AIC, BIC           float64
	AICAbove, BICAbove float64
}

// ByInformation fits spaces that need not be nested and returns their criteria
// of Akaike (1974) and Schwarz (1978), in the order given. It gives no p-value:
// none is known without nesting. The spaces must be bound to the same
// observations and maximise the same likelihood, with all its constants; a
// quasi-likelihood has no criterion.
func ByInformation(ctx context.Context, spaces ...Space) ([]Information, error) {
	fail := func(i int, err error) error {
		return &ComparisonError{Place: fmt.Sprintf("space %d", i+1), Err: err}
	}
	out := make([]Information, len(spaces))
	bestA, bestB := inf, inf
	for i, s := range spaces {
		if s == nil {
			return nil, fail(i, fmt.Errorf("%w: no space", ErrInvalid))
		}
		if err := spaces[0].Observations().Check(s.Observations()); err != nil {
			return nil, fail(i, err)
		}
		f, err := s.Maximize(ctx)
		if err != nil {
			return nil, fail(i, err)
		}
		switch {
		case f.Criterion.Kind == QuasiLikelihood:
			return nil, fail(i, fmt.Errorf("%w: a quasi-likelihood has no AIC or BIC", ErrDifferentCriterion))
		case !f.Criterion.Same(out[0].Fit.Criterion) && i > 0:
			return nil, fail(i, fmt.Errorf("%w: %v and %v", ErrDifferentCriterion, out[0].Fit.Criterion.Kind, f.Criterion.Kind))
		case i > 0 && f.N != out[0].Fit.N:
			return nil, fail(i, fmt.Errorf("%w: %d and %d observations", ErrDifferentObservations, out[0].Fit.N, f.N))
		case math.IsNaN(f.LogLikelihood):
			return nil, fail(i, fmt.Errorf("%w: log likelihood is NaN", ErrInvalid))
		}
		out[i] = Information{Space: s, Fit: f, AIC: f.AIC(), BIC: f.BIC()}
		bestA, bestB = math.Min(bestA, out[i].AIC), math.Min(bestB, out[i].BIC)
	}
	for i := range out {
		out[i].AICAbove, out[i].BICAbove = out[i].AIC-bestA, out[i].BIC-bestB
	}
	return out, nil
}
