package glm

import "errors"

// The conditions of models that a caller may branch on with errors.Is.
var (
	// ErrTerm: a term is not usable as given.
	ErrTerm = errors.New("term not usable")
	// ErrOption: an option is outside its range.
	ErrOption = errors.New("option not usable")
	// ErrWeight: a weight is negative, or a frequency weight is no whole number.
	ErrWeight = errors.New("weight not usable")
	// ErrNotEstimable: a linear function of the coefficients is not a function of the fitted values.
	ErrNotEstimable = errors.New("not estimable from these data")
	// ErrAmbiguous: several columns have the name.
	ErrAmbiguous = errors.New("several columns of the model have this name")
	// ErrUnknownCoefficient: the model has no coefficient of the name.
	ErrUnknownCoefficient = errors.New("no such coefficient")
	// ErrContradiction: restrictions cannot hold together.
	ErrContradiction = errors.New("restrictions contradict each other")
	// ErrOverflow: the cross-products leave the floating-point range.
	ErrOverflow = errors.New("values leave the floating-point range")
)

// TermError says which term of a model is at fault, and why.
type TermError struct {
	Term string
	Err  error
}

// Error returns `glm: term "NAME": CAUSE`.
func (e *TermError) Error() string { return `glm: term "` + e.Term + `": ` + e.Err.Error() }

// Unwrap returns the cause.
func (e *TermError) Unwrap() error { return e.Err }
