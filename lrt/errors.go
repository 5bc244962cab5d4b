package lrt

import "errors"

// The conditions a caller may branch on with errors.Is. They reach the caller
// wrapped in a *ComparisonError that names the comparison and the space.
var (
	// ErrNotNested: the restricted space is not inside the full one.
	ErrNotNested = errors.New("restricted space is not inside the full space")
	// ErrNothingTested: the full space adds no dimension to the restricted one.
	ErrNothingTested = errors.New("full space adds nothing to the restricted space")
	// ErrDifferentObservations: the spaces are bound to different rows, response or weights.
	ErrDifferentObservations = errors.New("spaces are bound to different observations")
	// ErrDifferentCriterion: the fits maximise different criteria.
	ErrDifferentCriterion = errors.New("fits maximise different criteria")
	// ErrNoErrorDF: no degrees of freedom are left to estimate the error variance.
	ErrNoErrorDF = errors.New("no degrees of freedom left for error")
	// ErrNoVariation: numerator and denominator are both nil (a constant response, say).
	ErrNoVariation = errors.New("nothing varies: numerator and error are both nil")
	// ErrFullWorse: the full fit stays below the restricted one.
	ErrFullWorse = errors.New("full fit has a lower likelihood than the restricted fit")
	// ErrNotConverged: a maximisation stopped before reaching a maximum.
	ErrNotConverged = errors.New("maximisation did not converge")
	// ErrUnbounded: the likelihood has no maximum.
	ErrUnbounded = errors.New("likelihood is unbounded")
	// ErrInvalid: an argument or a value returned by a space is outside its range.
	ErrInvalid = errors.New("invalid argument")
	// ErrNotRestrictable: the space does not take restrictions.
	ErrNotRestrictable = errors.New("space does not take restrictions")
)

// ComparisonError says which comparison failed, at which of its spaces, and why.
type ComparisonError struct {
	Comparison string // its name, "" when it has none
	Place      string // "restricted", "full", "error", "effects", or what was being computed
	Err        error
}

// Error returns the text "lrt: NAME: PLACE: CAUSE".
func (e *ComparisonError) Error() string {
	s := "lrt: "
	if e.Comparison != "" {
		s += e.Comparison + ": "
	}
	if e.Place != "" {
		s += e.Place + ": "
	}
	return s + e.Err.Error()
}

// Unwrap returns the cause.
func (e *ComparisonError) Unwrap() error { return e.Err }
