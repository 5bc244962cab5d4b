package lrt

import (
	"context"
	"fmt"
	"math/rand/v2"
)

// Space is a model bound to its data: a set of parameter values over which a
// likelihood can be maximised. It is all that a comparison needs; what more a
// space can do it says by the optional interfaces of this package.
// Implementations must be safe for concurrent use.
type Space interface {
	// Observations returns the identity of the data the space is bound to.
	Observations() Observations
	// Maximize fits the space.
	Maximize(ctx context.Context) (Fit, error)
}

// CriterionKind says what a fit maximised.
type CriterionKind uint8

// The criteria.
const (
	Likelihood          CriterionKind = iota // the full likelihood with all constants
	ResidualLikelihood                       // the likelihood of residuals from one fixed space
	QuasiLikelihood                          // a quasi-likelihood: no λ exists
	PenalisedLikelihood                      // a likelihood times one penalty
)

// String names the kind.
func (k CriterionKind) String() string {
	switch k {
	case Likelihood:
		return "likelihood"
	case ResidualLikelihood:
		return "residual likelihood"
	case QuasiLikelihood:
		return "quasi-likelihood"
	case PenalisedLikelihood:
		return "penalised likelihood"
	}
	return fmt.Sprintf("criterion %d", uint8(k))
}

// Criterion is what a fit maximised. Two fits are compared only under equal
// criteria: the same kind, and Within the same content (the fixed space of a
// residual likelihood, the penalty of a penalised one).
type Criterion struct {
	Kind   CriterionKind
	Within ID
}

// Same reports whether both criteria are the same.
func (c Criterion) Same(d Criterion) bool { return c.Kind == d.Kind && c.Within.Same(d.Within) }

// Warning has a stable code for programs and a sentence for people.
type Warning struct{ Code, Text string }

// Fit is the outcome of maximising over a space.
type Fit struct {
	N   int // number of observations
	Dim int // free parameters, variance and shapes included

	// LogLikelihood is the maximum, with every constant.
	LogLikelihood float64
	// Deviance is the residual sum of squares of a normal linear space, the
	// deviance of a generalized linear one, NaN where the notion does not apply.
	Deviance float64
	// Estimate holds root coordinates of a declared model; nil elsewhere.
	Estimate []float64
	// Dropped counts the rows left out before the fit because a value was missing.
	Dropped int
	// Criterion is what was maximised.
	Criterion Criterion
	// Warnings are what a reader of the fit should know.
	Warnings []Warning

	detail *detail // of a declared space
}

// AIC returns −2 log L + 2 Dim (Akaike 1974).
func (f Fit) AIC() float64 { return -2*f.LogLikelihood + 2*float64(f.Dim) }

// BIC returns −2 log L + Dim log N (Schwarz 1978).
func (f Fit) BIC() float64 { return -2*f.LogLikelihood + float64(f.Dim)*logInt(f.N) }

// PairFitter is implemented by spaces that fit a whole comparison at once, as
// linear spaces do on one joint factorization. The receiver is c.Full.
type PairFitter interface {
	Space
	FitPair(ctx context.Context, c Comparison) (Pair, error)
}

// Restrictable is implemented by spaces that take restrictions; callers use
// the function Restrict.
type Restrictable interface {
	Space
	Restrict(rs ...Restriction) (Space, error)
}

// Nester is implemented by spaces that can prove their nesting: NestedIn
// returns nil when the receiver lies inside larger, else an error that wraps
// ErrNotNested and names the column or parameter that breaks it.
type Nester interface {
	NestedIn(larger Space) error
}

// Improver is implemented by spaces that can be fitted from a given point. A
// comparison uses it to start the full fit from the restricted estimate.
type Improver interface {
	MaximizeFrom(ctx context.Context, start Fit) (Fit, error)
}

// ExactReferrer is implemented by a full space that knows the exact null law
// of a comparison. ReferExact returns a Test of kind None when it does not.
type ExactReferrer interface {
	ReferExact(ctx context.Context, c Comparison, p Pair) (Test, error)
}

// Simulator is implemented by a full space that can redraw its data: Redraw
// returns the comparison on data drawn at the given fit of the restricted space.
type Simulator interface {
	Redraw(ctx context.Context, at Fit, src rand.Source, c Comparison) (Comparison, error)
}

// Companion is implemented by a full space that offers the score and the Wald
// test beside the likelihood ratio.
type Companion interface {
	ScoreWald(ctx context.Context, c Comparison, p Pair) (score, wald Test, err error)
}

// Degrees is implemented by a restricted space that knows the degrees of
// freedom of its restriction inside larger, where they are not the difference
// of dimensions (the rank of a Jacobian, 0 for a cone).
type Degrees interface {
	DegreesWithin(larger Space) (df float64, ok bool)
}

// Restrict returns the part of s on which all the restrictions hold, or an
// error wrapping ErrNotRestrictable.
func Restrict(s Space, rs ...Restriction) (Space, error) {
	r, ok := s.(Restrictable)
	if !ok {
		return nil, fmt.Errorf("lrt: %w: %T", ErrNotRestrictable, s)
	}
	return r.Restrict(rs...)
}
