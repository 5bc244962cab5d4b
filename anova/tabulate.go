package anova

import (
	"context"
	"errors"
	"fmt"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Tabulate runs the comparisons and puts them into a table, in their order. All
// those of linear models share one factorization, made in one pass over the rows;
// each is concluded by lrt like any comparison. A comparison that fails is a row
// with an error; what is wrong with the data as a whole, and the end of the
// context, is an error of Tabulate. The spaces of all rows must rest on the same
// observations.
func Tabulate(ctx context.Context, comparisons []lrt.Comparison, s *lrt.Settings) (Table, error) {
	if len(comparisons) == 0 {
		return Table{}, &LayoutError{Err: fmt.Errorf("%w: no comparisons", ErrLayout)}
	}
	var t Table
	var linear []lrt.Comparison
	var place []int
	for i, c := range comparisons {
		if isLinear(c) {
			linear, place = append(linear, c), append(place, i)
		}
	}
	cs := append([]lrt.Comparison(nil), comparisons...)
	if m := largestModel(comparisons); m != nil {
		whole, err := wholeModel(ctx, m)
		if err != nil {
			return Table{}, err
		}
		joined, err := glm.Join(ctx, append(linear, whole)...)
		if err != nil {
			return Table{}, err
		}
		for i, k := range place {
			cs[k] = joined[i]
		}
		t.whole = run(ctx, joined[len(place)], withoutReferences(s))
	}
	for _, c := range cs {
		r := run(ctx, c, s)
		if err := ctx.Err(); err != nil {
			return Table{}, err
		}
		if errors.Is(r.err, lrt.ErrInvalid) && isSettings(r.err) {
			return Table{}, r.err
		}
		if err := explain(ctx, &r); err != nil {
			return Table{}, err
		}
		t.rows = append(t.rows, r)
	}
	t.level = 0.95
	if s != nil && s.Level != 0 {
		t.level = s.Level
	}
	return t, ctx.Err()
}

// withoutReferences spares the whole model what was asked for the rows: a simulation, say.
func withoutReferences(s *lrt.Settings) *lrt.Settings {
	if s == nil {
		return nil
	}
	c := *s
	c.References = nil
	return &c
}

// run is Comparison.Run that keeps the fitted pair of a comparison that cannot be concluded.
func run(ctx context.Context, c lrt.Comparison, s *lrt.Settings) Row {
	r := Row{comparison: c}
	if r.pair, r.err = c.Fit(ctx, s); r.err == nil {
		r.result, r.err = lrt.Conclude(ctx, c, r.pair, s)
	}
	return r
}

func isSettings(err error) bool {
	var c *lrt.ComparisonError
	return errors.As(err, &c) && c.Place == "settings"
}

// isLinear reports whether every space of the comparison is a linear model.
func isLinear(c lrt.Comparison) bool {
	linear := true
	_, _ = c.Each(func(s lrt.Space) (lrt.Space, error) {
		if _, ok := s.(*glm.Model); !ok {
			linear = false
		}
		return s, nil
	})
	return linear && c.Restricted != nil && c.Full != nil
}

// wholeModel is the comparison of the model whose residual is the error with the
// constant (or with nothing, where it holds no constant). It gives the totals.
func wholeModel(ctx context.Context, m *glm.Model) (lrt.Comparison, error) {
	var base []glm.Term
	if m.HasConstant() {
		base = []glm.Term{glm.Constant{}}
	}
	o := m.Options()
	none, err := glm.Normal(ctx, m.Source(), m.Response(), base, &o)
	if err != nil {
		return lrt.Comparison{}, err
	}
	return lrt.Comparison{Name: "all terms", Restricted: none, Full: m}, nil
}

// largestModel is the model whose residual is the error of the first row that
// has one; nil where none has.
func largestModel(cs []lrt.Comparison) *glm.Model {
	for _, c := range cs {
		s := c.Full
		if c.Error != nil {
			s = c.Error.Smaller
		}
		switch s := s.(type) {
		case *refused:
			return s.model
		case *glm.Model:
			if isLinear(c) {
				return s
			}
		}
	}
	return nil
}

// explain names the cells that a row of numerator rank 0 would need.
func explain(ctx context.Context, r *Row) error {
	if !errors.Is(r.err, lrt.ErrNothingTested) {
		return nil
	}
	m, ok := r.comparison.Full.(*glm.Model)
	if !ok {
		return nil
	}
	factors := m.Factors()
	if len(factors) == 0 {
		return nil
	}
	cells, err := CountCells(ctx, m.Source(), factors, m.Options().Weights)
	if errors.Is(err, ErrLayout) {
		return nil // too many cells to name them
	}
	if err != nil {
		return err
	}
	if empty := cells.Empty(); len(empty) > 0 {
		r.err = &lrt.ComparisonError{Comparison: r.Name(), Err: &notEstimable{&EmptyCellsError{Cells: empty}}}
	}
	return nil
}

// notEstimable is an EmptyCellsError that is lrt.ErrNothingTested too.
type notEstimable struct{ *EmptyCellsError }

func (e *notEstimable) Unwrap() []error { return []error{e.EmptyCellsError, lrt.ErrNothingTested} }
