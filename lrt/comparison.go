package lrt

import (
	"context"
	"fmt"
)

// Comparison is the question as a value: is the restricted space S enough, or
// does the full space B, S ⊂ B, describe the data better than chance allows? A
// layout of an experiment is a function that returns Comparisons.
type Comparison struct {
	Name             string
	Restricted, Full Space

	// Error is the pair of linear spaces that estimates the error variance
	// of a mean comparison; nil means Full inside all rows.
	Error *ErrorPair

	// Effects declare what else may be in the data, for the certificate of an
	// exact F; nil means independent errors of one variance, with the smaller
	// error space as the fixed part.
	Effects *Effects
}

// ErrorPair is the denominator of an F: the squared projection onto Larger and
// off Smaller. Larger nil means all rows.
type ErrorPair struct{ Smaller, Larger Space }

// Effects state what may be there besides the tested part: the fixed space M1
// (nil: the smaller error space), its part under the null M0 (nil: all of M1
// that the numerator does not see, which is the hypothesis tested), and the
// random terms whose variance the null leaves free.
type Effects struct {
	Fixed, NullFixed Space
	Random           []RandomTerm
}

// RandomTerm is a random effect: one independent draw of a common variance for
// each column of Space.
type RandomTerm struct {
	Name  string
	Space Space
}

// Hypothesis says in words what is tested: that the data follow the restricted
// space, within the full one. Spaces that have a String method speak for themselves.
func (c Comparison) Hypothesis() string {
	return fmt.Sprintf("%v, against %v", describe(c.Restricted), describe(c.Full))
}

func describe(s Space) string {
	if v, ok := s.(fmt.Stringer); ok {
		return v.String()
	}
	return fmt.Sprintf("%T", s)
}

// Compare asks whether full describes the data better than restricted. It is
// Comparison{Restricted: restricted, Full: full}.Run(ctx, s).
func Compare(ctx context.Context, restricted, full Space, s *Settings) (Result, error) {
	return Comparison{Restricted: restricted, Full: full}.Run(ctx, s)
}

// Run checks that the comparison can be made, fits both spaces, and concludes.
// Errors are *ComparisonError and wrap the sentinel of the condition, the
// error of a fit, or that of the context.
func (c Comparison) Run(ctx context.Context, s *Settings) (Result, error) {
	p, err := c.Fit(ctx, s)
	if err != nil {
		return Result{}, err
	}
	return Conclude(ctx, c, p, s)
}

// Fit checks that the comparison can be made and fits both spaces, the part of
// Run that comes before any probability. Its errors are those of Run.
func (c Comparison) Fit(ctx context.Context, s *Settings) (Pair, error) {
	p, err := c.fit(ctx, s)
	if err != nil {
		return Pair{}, c.fail("", err)
	}
	return p, nil
}

func (c Comparison) fit(ctx context.Context, s *Settings) (Pair, error) {
	if err := s.validate(); err != nil {
		return Pair{}, err
	}
	if err := ctx.Err(); err != nil {
		return Pair{}, err
	}
	if err := c.guard(); err != nil {
		return Pair{}, err
	}
	if f, ok := c.Full.(PairFitter); ok {
		p, err := f.FitPair(ctx, c)
		if err != nil {
			return Pair{}, err
		}
		return p, checkPair(p)
	}
	return fitSeparately(ctx, c)
}

// Each returns the comparison with every space it names replaced by f of it.
// Guards, joint factorizations and redraws go through it, so that none of them
// can forget a space.
func (c Comparison) Each(f func(Space) (Space, error)) (Comparison, error) {
	one := func(s Space) (Space, error) {
		if s == nil {
			return nil, nil
		}
		return f(s)
	}
	var err error
	if c.Restricted, err = one(c.Restricted); err != nil {
		return c, c.fail("restricted", err)
	}
	if c.Full, err = one(c.Full); err != nil {
		return c, c.fail("full", err)
	}
	if c.Error != nil {
		e := *c.Error
		if e.Smaller, err = one(e.Smaller); err != nil {
			return c, c.fail("error", err)
		}
		if e.Larger, err = one(e.Larger); err != nil {
			return c, c.fail("error", err)
		}
		c.Error = &e
	}
	if c.Effects != nil {
		e := *c.Effects
		if e.Fixed, err = one(e.Fixed); err != nil {
			return c, c.fail("effects", err)
		}
		if e.NullFixed, err = one(e.NullFixed); err != nil {
			return c, c.fail("effects", err)
		}
		e.Random = append([]RandomTerm(nil), e.Random...)
		for i := range e.Random {
			if e.Random[i].Space, err = one(e.Random[i].Space); err != nil {
				return c, c.fail("random term "+e.Random[i].Name, err)
			}
		}
		c.Effects = &e
	}
	return c, nil
}

// fail wraps err unless it already is a ComparisonError.
func (c Comparison) fail(place string, err error) error {
	if e, ok := err.(*ComparisonError); ok {
		if e.Comparison == "" && c.Name != "" {
			return &ComparisonError{Comparison: c.Name, Place: e.Place, Err: e.Err}
		}
		return e
	}
	return &ComparisonError{Comparison: c.Name, Place: place, Err: err}
}
