package glm

import (
	"context"
	"iter"
	"math"

	"subsume.example/lrt"
)

// adapted shows new rows under the schema a model was bound to.
type adapted struct {
	src    Source
	schema []Field
	from   []int     // field of src, −1: absent and not needed
	level  [][]int32 // level of the schema by level of src, −1: unknown
}

// adapt finds the fields of the fit in a new source.
func (f *Fit) adapt(rows Source) (*adapted, error) {
	if d, ok := rows.(*Data); rows == nil || ok && d == nil {
		return nil, &ColumnError{Row: -1, Err: ErrEmpty}
	}
	a := &adapted{src: rows, schema: f.j.src.Schema()}
	needed := make(map[string]bool)
	for _, b := range f.Model.cols {
		if b.fields == nil && b.Key != "constant" { // a user's term may read any field
			for _, s := range a.schema {
				needed[s.Name] = s.Name != f.Model.response
			}
		}
		for _, n := range b.fields {
			needed[n] = true
		}
	}
	if o := f.Model.opt.Offset; o != "" {
		needed[o] = true
	}
	there := rows.Schema()
	for _, s := range a.schema {
		at := -1
		for i, t := range there {
			if t.Name == s.Name {
				at = i
			}
		}
		var levels []int32
		switch {
		case !needed[s.Name]:
			at = -1
		case at < 0:
			return nil, &ColumnError{Column: s.Name, Row: -1, Err: ErrUnknownColumn}
		case s.Numeric() && !there[at].Numeric():
			return nil, &ColumnError{Column: s.Name, Row: -1, Err: ErrNotNumeric}
		case !s.Numeric() && there[at].Numeric():
			return nil, &ColumnError{Column: s.Name, Row: -1, Err: ErrNotCategorical}
		case !s.Numeric():
			for _, l := range there[at].Levels {
				levels = append(levels, int32(indexOf(s.Levels, l)))
			}
		}
		a.from, a.level = append(a.from, at), append(a.level, levels)
	}
	return a, nil
}

// Schema is that of the fit.
func (a *adapted) Schema() []Field { return a.schema }

// Observations are those of the new rows.
func (a *adapted) Observations(response string) lrt.Observations { return a.src.Observations(response) }

// Windows shows each window under the schema of the fit.
func (a *adapted) Windows(ctx context.Context) iter.Seq2[Window, error] {
	return func(yield func(Window, error) bool) {
		k := len(a.schema)
		for w, err := range windows(ctx, a.src) {
			if err != nil {
				yield(Window{}, err)
				return
			}
			v := Window{First: w.First, Rows: w.Rows, Hi: make([][]float64, k), Lo: make([][]float64, k), Index: make([][]int32, k)}
			for i, s := range a.schema {
				at := a.from[i]
				switch {
				case at < 0 && s.Numeric():
					v.Hi[i] = make([]float64, w.Rows)
				case at < 0:
					v.Index[i] = make([]int32, w.Rows)
				case s.Numeric():
					v.Hi[i] = w.Hi[at]
					if w.Lo != nil {
						v.Lo[i] = w.Lo[at]
					}
				default:
					v.Index[i] = make([]int32, w.Rows)
					for r, l := range w.Index[at][:w.Rows] {
						if l >= 0 {
							if v.Index[i][r] = a.level[i][l]; v.Index[i][r] < 0 {
								name := a.src.Schema()[at].Levels[l]
								yield(Window{}, &ColumnError{Column: s.Name, Row: w.First + r, Text: name, Err: ErrUnknownLevel})
								return
							}
							continue
						}
						v.Index[i][r] = -1
					}
				}
			}
			if !yield(v, nil) {
				return
			}
		}
	}
}

// span is the range of a numeric field in the rows of a fit.
type span struct {
	name         string
	field        int
	lower, upper float64
}

// ranges passes over the rows of the fit and finds the range of each numeric field it uses.
func (f *Fit) ranges(ctx context.Context) ([]span, error) {
	var spans []span
	seen := make(map[string]bool)
	for _, b := range f.Model.cols {
		for _, n := range b.numeric {
			if seen[n] {
				continue
			}
			seen[n] = true
			at, err := findNumeric(f.j.src, n)
			if err != nil {
				return nil, err
			}
			spans = append(spans, span{n, at, math.Inf(1), math.Inf(-1)})
		}
	}
	if len(spans) == 0 {
		return nil, nil
	}
	for w, err := range windows(ctx, f.j.src) {
		if err != nil {
			return nil, err
		}
		for i := range spans {
			s := &spans[i]
			for _, x := range w.Hi[s.field][:w.Rows] {
				s.lower, s.upper = math.Min(s.lower, x), math.Max(s.upper, x)
			}
		}
	}
	return spans, nil
}
