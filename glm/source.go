package glm

import (
	"context"
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
