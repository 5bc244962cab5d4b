package anova

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"subsume.example/lrt"
)

// Row is a line of a table: a comparison and what came of it. It can be made
// only by running the comparison, so that a table and a comparison cannot
// disagree. A comparison that cannot be tested is a row as well, with its error.
type Row struct {
	comparison lrt.Comparison
	pair       lrt.Pair
	result     lrt.Result
	err        error
}

// Name returns the name of the comparison.
func (r Row) Name() string { return r.comparison.Name }

// Comparison returns the question. Running it again, alone, gives the same
// answer: its spaces are views on the factorization of the table.
func (r Row) Comparison() lrt.Comparison { return r.comparison }

// Result returns the answer, and the error where there is none.
func (r Row) Result() (lrt.Result, error) { return r.result, r.err }

// Err returns why the row could not be tested, nil when it was.
func (r Row) Err() error { return r.err }

// linear reports whether the row is a mean comparison of linear spaces.
func (r Row) linear() bool { return r.pair.Linear.M > 0 }

// fitted reports whether the row has a sum of squares with degrees of freedom, which it
// may without being tested: where no degrees of freedom are left for error.
func (r Row) fitted() bool {
	return r.linear() && r.pair.Linear.RankB > r.pair.Linear.RankS
}

// SS returns the sum of squares between the two spaces in squared units of the
// response; NaN where nothing is between them or they are not linear. It is +Inf or 0
// where it leaves the floating-point range, which comes with a warning.
func (r Row) SS() float64 {
	if !r.fitted() {
		return math.NaN()
	}
	return math.Ldexp(r.pair.Linear.Numerator, 2*r.pair.Linear.Scale)
}

// DF returns the degrees of freedom of the row and those of its error: ranks for
// linear spaces. Without an error term the latter is NaN.
func (r Row) DF() (d1, d2 float64) {
	switch {
	case r.linear() && r.pair.Linear.Known > 0:
		d1, _ = r.pair.Linear.DF()
		return d1, math.NaN()
	case r.linear():
		return r.pair.Linear.DF()
	case r.err != nil:
		return math.NaN(), math.NaN()
	}
	return r.pair.DF, math.NaN()
}

// MeanSquare returns SS over its degrees of freedom.
func (r Row) MeanSquare() float64 {
	d1, _ := r.DF()
	if !r.fitted() {
		return math.NaN()
	}
	return math.Ldexp(r.pair.Linear.Numerator/d1, 2*r.pair.Linear.Scale)
}

// ErrorMeanSquare returns the mean square that the row is judged against: the
// known variance where there is one.
func (r Row) ErrorMeanSquare() float64 {
	if !r.linear() {
		return math.NaN()
	}
	l := r.pair.Linear
	if l.Known > 0 {
		return l.Known
	}
	_, d2 := l.DF()
	return math.Ldexp(l.Denominator/d2, 2*l.Scale)
}

// Test returns the recommended test of the row; the zero Test where it could not
// be tested.
func (r Row) Test() lrt.Test {
	if r.err != nil {
		return lrt.Test{Statistic: math.NaN(), P: math.NaN(), LogP: math.NaN(), Why: r.err.Error()}
	}
	return r.result.Test()
}

// Hypothesis returns the null in words: equations between coefficients where
// the restricted space is the full one with equations, else the two spaces.
func (r Row) Hypothesis() string {
	restricted, full := r.Spaces()
	if eqs, ok := equations(restricted, full); ok {
		return eqs
	}
	return restricted + ", against " + full
}

// equations returns what the name of a restricted space adds to that of the full one.
func equations(restricted, full string) (string, bool) {
	for _, sep := range []string{", where ", " and "} {
		if eqs, ok := strings.CutPrefix(restricted, full+sep); ok {
			return eqs, true
		}
	}
	return "", false
}

// Spaces names the restricted and the full space.
func (r Row) Spaces() (restricted, full string) {
	return spaceName(r.comparison.Restricted), spaceName(r.comparison.Full)
}

// ErrorSpace names the space whose residual is the error of the row, "" where the row
// has none. A pair is written "A within B".
func (r Row) ErrorSpace() string {
	switch {
	case r.linear() && r.pair.Linear.Known > 0, !isLinear(r.comparison):
		return ""
	case r.comparison.Error == nil:
		return spaceName(r.comparison.Full)
	case r.comparison.Error.Larger != nil:
		return spaceName(r.comparison.Error.Smaller) + " within " + spaceName(r.comparison.Error.Larger)
	}
	return spaceName(r.comparison.Error.Smaller)
}

func spaceName(s lrt.Space) string {
	switch s := s.(type) {
	case nil:
		return ""
	case *refused:
		return s.model.String()
	case interface{ String() string }:
		return s.String()
	}
	return "unnamed space"
}

// String states the row in a sentence: what was compared, the test with its
// degrees of freedom, and what it is worth.
func (r Row) String() string {
	if r.err != nil {
		return r.Name() + ": " + r.note()
	}
	t := r.Test()
	s := r.Name() + ": "
	switch d1, d2 := r.DF(); {
	case t.Name == "F":
		s += fmt.Sprintf("F(%s, %s) = %s", plain(d1), plain(d2), Number(t.Statistic))
	case t.Law != nil:
		s += fmt.Sprintf("%s = %s on %s", t.Name, Number(t.Statistic), t.Law)
	default:
		s += fmt.Sprintf("%s = %s", t.Name, Number(t.Statistic))
	}
	return s + ", " + lrt.FormatP(t.P, t.LogP) + " (" + t.Kind.String() + "); " + r.Hypothesis()
}

// note says in a few words what a reader of the row must know.
func (r Row) note() string {
	if r.err == nil {
		if r.result.Recommended != lrt.Exact {
			return r.result.Test().Why
		}
		return ""
	}
	err := r.err
	var c *lrt.ComparisonError
	for errors.As(err, &c) {
		err = c.Err
	}
	switch {
	case errors.Is(err, lrt.ErrNoErrorDF):
		return "not tested: " + lrt.ErrNoErrorDF.Error()
	case errors.Is(err, lrt.ErrNoVariation):
		return "not tested: " + lrt.ErrNoVariation.Error()
	}
	return strings.TrimPrefix(err.Error(), "glm: ")
}
