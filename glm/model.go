package glm

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"sync"

	"subsume.example/lrt"
)

// WeightKind tells the kinds of weights apart: they mean different things.
type WeightKind uint8

// The kinds of weights.
const (
	NoWeights WeightKind = iota
	// Frequency: the row stands for w equal observations; whole numbers, n = Σw.
	Frequency
	// Precision: the row's variance is σ²/w; n counts the rows with w > 0.
	Precision
)

// String names the kind.
func (k WeightKind) String() string {
	switch k {
	case NoWeights:
		return "none"
	case Frequency:
		return "frequency"
	case Precision:
		return "precision"
	}
	return fmt.Sprintf("weights %d", uint8(k))
}

// Weights name a numeric field and say what it means. Sampling weights (the
// inverse of a chance of selection) are neither kind: with them neither n nor the
// likelihood is that of the sample, so that no comparison of this package holds.
type Weights struct {
	Kind  WeightKind
	Field string
}

// Options of a model. nil and every zero field mean the default.
type Options struct {
	// Weights of the rows; the zero value: none.
	Weights Weights
	// Offset names a numeric field added to the mean with coefficient 1; "": none.
	Offset string
	// KnownVariance is the error variance where it is known; 0: estimated.
	KnownVariance float64
	// RankTolerance is the part of a column, relative to its norm, below which
	// it counts as spanned by earlier ones; 0: 100·p·2⁻⁵², p the number of columns.
	RankTolerance float64
	// Workers is the largest number of goroutines; 0: GOMAXPROCS. The bits of
	// results do not depend on it.
	Workers int
}

// Model is a normal linear model bound to a source: independent normal errors of
// one variance about a mean that is a linear function of the columns of its
// terms. It is an lrt.Space. A Model is immutable and safe for concurrent use;
// it holds no fit and no design matrix.
type Model struct {
	src      Source
	response string
	cols     []*bound
	opt      Options
	obs      lrt.Observations
	at       places
	index    *nameIndex
	eqs      []lrt.Equation // restrictions on the coefficients
	joint    *joint         // where it is a view on a joint factorization
}

// places are the positions in the schema of what is not a column: −1 for none.
type places struct{ response, weights, offset int }

// bound is a term with its columns.
type bound struct {
	name string
	Columns
}

var (
	_ lrt.PairFitter   = (*Model)(nil)
	_ lrt.Nester       = (*Model)(nil)
	_ lrt.Restrictable = (*Model)(nil)
)

// Normal binds a normal linear model for the named response to a source. Terms
// are taken in the order given: what earlier terms span is set aside from later
// ones. No terms at all are a model whose mean is the offset, or zero.
//
// Errors are *ColumnError for a field that is missing, of the wrong type, or has
// a value at fault, and *TermError for a term.
func Normal(ctx context.Context, src Source, response string, terms []Term, o *Options) (*Model, error) {
	m := &Model{src: src, response: response, at: places{-1, -1, -1}}
	if o != nil {
		m.opt = *o
	}
	if d, ok := src.(*Data); src == nil || ok && d == nil {
		return nil, &ColumnError{Row: -1, Err: ErrEmpty}
	}
	var err error
	if m.at.response, err = findNumeric(src, response); err != nil {
		return nil, err
	}
	m.obs = src.Observations(response)
	if err := m.checkOptions(); err != nil {
		return nil, err
	}
	return m.With(ctx, terms...)
}

func (m *Model) checkOptions() error {
	o := m.opt
	switch {
	case o.KnownVariance < 0 || math.IsNaN(o.KnownVariance) || math.IsInf(o.KnownVariance, 0):
		return fmt.Errorf("glm: %w: known variance %g, want positive, or 0 for unknown", ErrOption, o.KnownVariance)
	case o.RankTolerance < 0 || o.RankTolerance >= 1 || math.IsNaN(o.RankTolerance):
		return fmt.Errorf("glm: %w: rank tolerance %g, want 0 to 1", ErrOption, o.RankTolerance)
	case o.Workers < 0:
		return fmt.Errorf("glm: %w: %d workers", ErrOption, o.Workers)
	case o.Weights.Kind > Precision || (o.Weights.Kind == NoWeights) != (o.Weights.Field == ""):
		return fmt.Errorf("glm: %w: weights need a field and a kind, Frequency or Precision", ErrOption)
	}
	var err error
	if o.Weights.Field != "" {
		if m.at.weights, err = findNumeric(m.src, o.Weights.Field); err != nil {
			return err
		}
		m.obs.Weights = m.src.Observations(o.Weights.Field).Response
	}
	if o.Offset != "" {
		if m.at.offset, err = findNumeric(m.src, o.Offset); err != nil {
			return err
		}
	}
	return nil
}

// With returns the model with terms added at the end. Terms it already has are
// not bound again.
func (m *Model) With(ctx context.Context, terms ...Term) (*Model, error) {
	w := *m
	w.joint, w.eqs, w.index = nil, nil, new(nameIndex)
	w.cols = append([]*bound(nil), m.cols...)
	for i, t := range terms {
		if t == nil {
			return nil, &TermError{Term: fmt.Sprintf("number %d", i+1), Err: fmt.Errorf("%w: nil", ErrTerm)}
		}
		b, err := bind(ctx, t, m.src)
		if err != nil {
			return nil, err
		}
		if slices.Contains(b.fields, m.response) && !b.FromResponse {
			return nil, &TermError{Term: b.name, Err: fmt.Errorf("%w: it reads the response %q, which would explain itself (Columns.FromResponse marks a term that means to)", ErrTerm, m.response)}
		}
		if w.find(b) < 0 {
			w.cols = append(w.cols, b)
		}
	}
	return &w, nil
}

// bind makes the columns of a term for a source.
func bind(ctx context.Context, t Term, src Source) (*bound, error) {
	b := new(bound)
	err := b.guarded(func() (err error) {
		b.name = t.Name()
		b.Columns, err = t.Bind(ctx, src)
		return err
	})
	if b.name == "" {
		b.name = fmt.Sprintf("%T", t)
	}
	if err != nil {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		return nil, b.blame(err)
	}
	if err := b.check(); err != nil {
		return nil, err
	}
	f, ok := t.(Fielder)
	if !ok || b.fields != nil {
		return b, nil
	}
	// A user's term that says what it reads.
	b.fields = append([]string{}, f.Fields()...)
	for _, name := range b.fields {
		_, field, err := findField(src, name)
		if err != nil {
			return nil, err
		}
		if field.Numeric() {
			b.numeric = append(b.numeric, name)
		}
	}
	return b, nil
}

// blame names the term in an error that names no place.
func (b *bound) blame(err error) error {
	switch err.(type) {
	case *ColumnError, *TermError:
		return err
	}
	return &TermError{Term: b.name, Err: err}
}

// Without returns the model without the terms of the given names, which it must
// have, each once: where two terms share a name, Normal makes the smaller model.
func (m *Model) Without(names ...string) (*Model, error) {
	w := *m
	w.joint, w.eqs, w.index = nil, nil, new(nameIndex)
	w.cols = nil
	gone := make(map[string]bool)
	for _, b := range m.cols {
		drop := false
		for _, n := range names {
			if b.name != n {
				continue
			}
			if gone[n] && !drop {
				return nil, &TermError{Term: n, Err: fmt.Errorf("%w: the model has two terms of this name; name the terms of the smaller model to Normal", ErrTerm)}
			}
			drop, gone[n] = true, true
		}
		if !drop {
			w.cols = append(w.cols, b)
		}
	}
	for _, n := range names {
		if !gone[n] {
			return nil, &TermError{Term: n, Err: fmt.Errorf("%w: the model has no such term; it has %s", ErrTerm, strings.Join(m.Terms(), ", "))}
		}
	}
	return &w, nil
}

// check refuses columns that a user's term could get wrong.
func (b *bound) check() error {
	switch {
	case len(b.Names) == 0:
		return &TermError{Term: b.name, Err: fmt.Errorf("%w: no columns", ErrTerm)}
	case (b.Fill == nil) == (b.Index == nil):
		return &TermError{Term: b.name, Err: fmt.Errorf("%w: want one of Fill and Index", ErrTerm)}
	case b.Value != nil && b.Index == nil:
		return &TermError{Term: b.name, Err: fmt.Errorf("%w: Value without Index", ErrTerm)}
	}
	return nil
}

// same reports whether two bound terms are the same columns.
func (b *bound) same(c *bound) bool { return b == c || b.Key != "" && b.Key == c.Key }

// find returns the position of the columns of b in the model, −1.
func (m *Model) find(b *bound) int {
	for i, c := range m.cols {
		if c.same(b) {
			return i
		}
	}
	return -1
}

// Observations returns the identity of the rows, the response and the weights.
func (m *Model) Observations() lrt.Observations { return m.obs }

// Source returns what the model is bound to.
func (m *Model) Source() Source { return m.src }

// Response returns the name of the response.
func (m *Model) Response() string { return m.response }

// Options returns the options the model was made with.
func (m *Model) Options() Options { return m.opt }

// Terms returns the names of the terms in order.
func (m *Model) Terms() []string {
	names := make([]string, len(m.cols))
	for i, b := range m.cols {
		names[i] = b.name
	}
	return names
}

// Coefficients returns the names of all columns, term by term, each term's in
// the order people expect.
func (m *Model) Coefficients() []string {
	var names []string
	for _, b := range m.cols {
		for i := range b.Names {
			names = append(names, b.Names[b.shown(i)])
		}
	}
	return names
}

// shown returns the column that people expect at place i.
func (b *bound) shown(i int) int {
	if b.display == nil {
		return i
	}
	return b.display[i]
}

// String says what the model is, in words.
func (m *Model) String() string {
	var b strings.Builder
	b.WriteString(m.response)
	b.WriteString(" by ")
	if len(m.cols) == 0 {
		b.WriteString("nothing")
	}
	b.WriteString(strings.Join(m.Terms(), " + "))
	if m.opt.Offset != "" {
		b.WriteString(", offset " + m.opt.Offset)
	}
	for i, e := range m.eqs {
		if i == 0 {
			b.WriteString(", where ")
		} else {
			b.WriteString(" and ")
		}
		b.WriteString(equationText(e))
	}
	return b.String()
}

func equationText(e lrt.Equation) string {
	var b strings.Builder
	for i, n := range e.Names {
		c := e.Coef[i]
		switch {
		case i == 0 && c == 1:
		case i == 0 && c == -1:
			b.WriteString("−")
		case i == 0:
			fmt.Fprintf(&b, "%g·", c)
		case c == 1:
			b.WriteString(" + ")
		case c == -1:
			b.WriteString(" − ")
		case c < 0:
			fmt.Fprintf(&b, " − %g·", -c)
		default:
			fmt.Fprintf(&b, " + %g·", c)
		}
		b.WriteString("[" + n + "]")
	}
	fmt.Fprintf(&b, " = %g", e.Value)
	return b.String()
}

// Restrict returns the part of the model on which linear equations between
// coefficients hold, the coefficients as a fit shows them: beside a constant that
// comes before it a factor's are differences from its reference level (in models
// with products of factors state differences of levels or cells). An equation must
// be about fitted values; the fit says ErrNotEstimable otherwise. Bounds and maps are not linear spaces: they are refused
// with an error wrapping lrt.ErrNotRestrictable.
func (m *Model) Restrict(rs ...lrt.Restriction) (lrt.Space, error) {
	w := *m
	w.eqs = append([]lrt.Equation(nil), m.eqs...)
	for _, r := range rs {
		if len(r.Bounds) > 0 || r.Via != nil {
			return nil, fmt.Errorf("glm: %w: only linear equations leave a linear space", lrt.ErrNotRestrictable)
		}
		for _, e := range r.Equations {
			if err := m.checkEquation(e); err != nil {
				return nil, err
			}
			w.eqs = append(w.eqs, e)
		}
	}
	return &w, nil
}

func (m *Model) checkEquation(e lrt.Equation) error {
	if len(e.Names) == 0 || len(e.Names) != len(e.Coef) {
		return fmt.Errorf("glm: %w: equation with %d names and %d coefficients", lrt.ErrInvalid, len(e.Names), len(e.Coef))
	}
	if math.IsNaN(e.Value) || math.IsInf(e.Value, 0) {
		return fmt.Errorf("glm: %w: equation %s", lrt.ErrInvalid, equationText(e))
	}
	for i, n := range e.Names {
		if m.ambiguous(n) {
			return &CoefficientError{Name: n, Err: ErrAmbiguous}
		}
		if _, _, ok := m.coefficient(n); !ok {
			return m.unknown(n)
		}
		if math.IsNaN(e.Coef[i]) || math.IsInf(e.Coef[i], 0) {
			return fmt.Errorf("glm: %w: equation %s", lrt.ErrInvalid, equationText(e))
		}
	}
	return nil
}

// nameIndex finds columns by name; it is made when first asked for.
type nameIndex struct {
	once  sync.Once
	place map[string]columnPlace
}

// columnPlace is where a name stands, and in how many columns.
type columnPlace struct{ term, column, count int }

func (m *Model) lookup(name string) columnPlace {
	m.index.once.Do(func() {
		m.index.place = make(map[string]columnPlace)
		for t, b := range m.cols {
			for c, n := range b.Names {
				p := m.index.place[n]
				if p.count == 0 {
					p.term, p.column = t, c
				}
				p.count++
				m.index.place[n] = p
			}
		}
	})
	return m.index.place[name]
}

// coefficient finds a column by name: the term's number and the column's.
func (m *Model) coefficient(name string) (term, column int, ok bool) {
	p := m.lookup(name)
	return p.term, p.column, p.count > 0
}

// ambiguous reports whether several columns have the name.
func (m *Model) ambiguous(name string) bool { return m.lookup(name).count > 1 }

// unknown is the error of a name that no coefficient has; it lists those there are.
func (m *Model) unknown(name string) error {
	names := m.Coefficients()
	for i := range min(len(names), 10) { // list names no more
		names[i] = strconv.Quote(clip(names[i]))
	}
	return &CoefficientError{Name: name, Err: fmt.Errorf("%w; there are %s", ErrUnknownCoefficient, list(names))}
}

// CoefficientError says which coefficient is at fault, and why.
type CoefficientError struct {
	Name string
	Err  error
}

// Error returns `glm: coefficient "NAME": CAUSE`.
func (e *CoefficientError) Error() string {
	return `glm: coefficient "` + e.Name + `": ` + e.Err.Error()
}

// Unwrap returns the cause.
func (e *CoefficientError) Unwrap() error { return e.Err }
