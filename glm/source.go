package glm

import (
	"context"
	"errors"
	"fmt"
	"iter"

	"subsume.example/lrt"
)

// Field is one column of a source: numeric when Levels is nil, else
// categorical with the levels in their order.
type Field struct {
	Name   string
	Levels []string
}

// Numeric reports whether the field holds numbers.
func (f Field) Numeric() bool { return f.Levels == nil }

// Window is a block of consecutive rows of a source, by field of its schema. It
// is valid until the next one is asked for and must not be written to.
type Window struct {
	// First is the number of the first row, from 0; Rows is how many there are.
	First, Rows int
	// Hi[f][i] + Lo[f][i] is the value of numeric field f in row First+i: the
	// nearest float64 and what it leaves of a decimal with more digits. Lo[f] is
	// nil when every float64 is the value itself; Hi[f] is nil for a categorical
	// field. A missing value is NaN.
	Hi, Lo [][]float64
	// Index[f][i] is the level of categorical field f, −1 where it is missing;
	// Index[f] is nil for a numeric field.
	Index [][]int32
}

// Source delivers rows in windows, in the same order each time. A
// source must be safe for concurrent use; each call of Windows is a pass of its own.
type Source interface {
	// Schema lists the fields. The names differ from each other.
	Schema() []Field
	// Observations returns the identity of the rows with the named response;
	// weights are added by the model.
	Observations(response string) lrt.Observations
	// Windows passes over the rows once. It stops at the first error.
	Windows(ctx context.Context) iter.Seq2[Window, error]
}

// Sliced is implemented by a source that can deliver any block of rows without
// a pass, so that workers can share one.
type Sliced interface {
	Source
	// Len returns the number of rows.
	Len() int
	// Slice sets w to rows first to first+rows−1, reusing its slices of slices.
	Slice(w *Window, first, rows int)
}

// ErrSource: a source breaks its contract: a window that does not fit the schema, or
// rows that do not follow each other.
var ErrSource = errors.New("source breaks its contract")

// windows passes over a source. A window that does not fit would be read as other
// data, so that those of sources not of this package are looked at first.
func windows(ctx context.Context, src Source) iter.Seq2[Window, error] {
	if d, ok := src.(*Data); ok {
		return d.Windows(ctx)
	}
	return func(yield func(Window, error) bool) {
		fields := src.Schema()
		pass := src.Windows(ctx)
		if pass == nil {
			yield(Window{}, fmt.Errorf("glm: %w: Windows returns nil", ErrSource))
			return
		}
		next := 0
		for w, err := range pass {
			if err == nil {
				err = checkWindow(fields, &w, next)
			}
			if err != nil {
				yield(Window{}, err)
				return
			}
			next += w.Rows
			if !yield(w, nil) {
				return
			}
		}
	}
}

// slice asks a source for a block of rows and looks at what it delivers.
func slice(src Sliced, w *Window, first, rows int) error {
	src.Slice(w, first, rows)
	if _, ok := src.(*Data); ok {
		return nil
	}
	if w.Rows != rows {
		return fmt.Errorf("glm: %w: %d rows where %d were asked for", ErrSource, w.Rows, rows)
	}
	return checkWindow(src.Schema(), w, first)
}

// checkWindow returns a *ColumnError wrapping ErrSource where a window does not hold what
// the schema says, from row first on.
func checkWindow(fields []Field, w *Window, first int) error {
	switch {
	case w.First != first || w.Rows < 0:
		return fmt.Errorf("glm: %w: a window of %d rows from row %d where row %d comes next", ErrSource, w.Rows, w.First, first)
	case w.Rows == 0:
		return nil
	}
	for i, f := range fields {
		fault := func(what string, n int) error {
			return &ColumnError{Column: f.Name, Row: first, Err: fmt.Errorf("%w: a window of %d rows has %d %s", ErrSource, w.Rows, n, what)}
		}
		if f.Numeric() {
			if n := lengthAt(w.Hi, i); n != w.Rows {
				return fault("values", n)
			}
			if n := lengthAt(w.Lo, i); n != w.Rows && n != 0 {
				return fault("low parts", n)
			}
			continue
		}
		if n := lengthAt(w.Index, i); n != w.Rows {
			return fault("levels", n)
		}
		for r, l := range w.Index[i] {
			if l < -1 || int(l) >= len(f.Levels) {
				return &ColumnError{Column: f.Name, Row: first + r, Err: fmt.Errorf("%w: level number %d of %d", ErrSource, l, len(f.Levels))}
			}
		}
	}
	return nil
}

// lengthAt returns the length of slice i of xs, 0 where there is none.
func lengthAt[T any](xs [][]T, i int) int {
	if i >= len(xs) {
		return 0
	}
	return len(xs[i])
}
