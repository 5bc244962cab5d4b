package glm

import (
	"context"
	"fmt"
	"iter"
	"math"
	"slices"

	"subsume.example/lrt"
)

// windowRows is the number of rows of a window of Data.
const windowRows = 4096

// Data is an immutable set of rows in memory: the Source that most models are
// bound to. It is made by NewData from columns, or by ReadCSV from a file, and has
// an identity: models bound to one Data are known at once to rest on
// the same observations, models on two Data of equal content by a digest of it.
// Data is safe for concurrent use.
type Data struct {
	schema  []Field
	columns []column
	place   map[string]int
	n       int
	rows    lrt.ID
	account Account
	origin  []int32 // row number in the source; nil: the same
	lines   []int32 // line of the file by row number in the source; nil: see firstLine
	first   int     // line of source row 0 where the lines are consecutive; 0: not from a file
}

// column is one column as it is kept, with what a fit asks of it first.
type column struct {
	field    Field
	hi, lo   []float64 // lo nil: all zero
	index    []int32
	declared bool    // the levels were declared, so that one without rows is kept
	missing  int     // number of missing values
	maxAbs   float64 // largest |x| of the numbers that are there
	note     error   // of a file's column of labels: the first text that is no number
	id       lrt.ID
}

// seal drops a low part that is zero throughout, takes the summary and gives the identity.
func (k *column) seal() {
	k.missing, k.maxAbs = 0, 0
	if k.index != nil {
		for _, v := range k.index {
			if v < 0 {
				k.missing++
			}
		}
	} else {
		for _, x := range k.hi {
			switch a := math.Abs(x); {
			case a > k.maxAbs:
				k.maxAbs = a
			case a != a:
				k.missing++
			}
		}
		if k.lo != nil && !slices.ContainsFunc(k.lo, func(x float64) bool { return x != 0 }) {
			k.lo = nil
		}
	}
	k.identify()
}

// identify gives the column an identity of its content.
func (k *column) identify() {
	c := *k
	k.id = lrt.NewID(c.write)
}

// NewData returns the rows of the columns. All columns must have the same number
// of rows, at least one, and different names. Errors are *ColumnError and wrap
// ErrEmpty, ErrName, ErrDuplicateColumn, ErrLengths, ErrNotFinite, ErrNotNumber,
// ErrUnknownLevel, ErrLevels, ErrMissing or ErrColumn.
func NewData(columns ...Column) (*Data, error) {
	if len(columns) == 0 {
		return nil, &ColumnError{Row: -1, Err: fmt.Errorf("%w: no columns", ErrEmpty)}
	}
	kept := make([]column, len(columns))
	for _, c := range columns {
		if c.n != columns[0].n {
			return nil, &ColumnError{c.name, -1, "", fmt.Errorf("%w: %d rows where column %q has %d", ErrLengths, c.n, columns[0].name, columns[0].n)}
		}
	}
	for i, c := range columns {
		k, err := c.build()
		if err != nil {
			return nil, err
		}
		kept[i] = k
	}
	d, err := assemble(kept, columns[0].n)
	if err != nil {
		return nil, err
	}
	d.rows = lrt.NewID(d.write)
	d.account = Account{Read: d.n, Used: d.n}
	return d, nil
}

// assemble puts sealed columns of n rows together; the caller adds identity and account.
func assemble(columns []column, n int) (*Data, error) {
	if n > math.MaxInt32 {
		return nil, &ColumnError{"", -1, "", fmt.Errorf("%w of %d rows", ErrTooLarge, math.MaxInt32)}
	}
	d := &Data{columns: columns, n: n, schema: make([]Field, len(columns)), place: make(map[string]int, len(columns))}
	for i := range columns {
		f := columns[i].field
		if f.Name == "" {
			return nil, &ColumnError{"", -1, "", fmt.Errorf("%w: column %d of %d", ErrName, i+1, len(columns))}
		}
		if _, twice := d.place[f.Name]; twice {
			return nil, &ColumnError{f.Name, -1, "", ErrDuplicateColumn}
		}
		d.place[f.Name] = i
		d.schema[i] = f
	}
	if n == 0 {
		return nil, &ColumnError{columns[0].field.Name, -1, "", fmt.Errorf("%w: no rows", ErrEmpty)}
	}
	return d, nil
}

// find returns the column of the name, or an error that wraps ErrUnknownColumn
// and lists the names there are.
func (d *Data) find(name string) (*column, error) {
	i, ok := d.place[name]
	if !ok {
		return nil, &ColumnError{name, -1, "", fmt.Errorf("%w; there are %s", ErrUnknownColumn, d.names())}
	}
	return &d.columns[i], nil
}

// names lists the columns for a message.
func (d *Data) names() string {
	names := make([]string, len(d.schema))
	for i, f := range d.schema {
		names[i] = f.Name
	}
	return quoteNames(names)
}

// quoteNames lists the first names for a message.
func quoteNames(names []string) string {
	const most = 12
	s := ""
	for i, name := range names {
		if i == most {
			return s + fmt.Sprintf(" and %d more", len(names)-most)
		}
		if i > 0 {
			s += ", "
		}
		s += fmt.Sprintf("%q", clip(name))
	}
	return s
}

// Schema lists the columns in their order. The slice is a copy; the levels
// within must not be changed.
func (d *Data) Schema() []Field { return slices.Clone(d.schema) }

// Field returns the field of the name and whether there is one.
func (d *Data) Field(name string) (Field, bool) {
	i, ok := d.place[name]
	if !ok {
		return Field{}, false
	}
	return d.schema[i], true
}

// Len returns the number of rows.
func (d *Data) Len() int { return d.n }

// Observations returns the identity of the rows and of the named column; the
// latter is the zero ID when there is no such column.
func (d *Data) Observations(response string) lrt.Observations {
	o := lrt.Observations{Rows: d.rows}
	if i, ok := d.place[response]; ok {
		o.Response = d.columns[i].id
	}
	return o
}

// Slice sets w to the rows first to first+rows−1 without copying or, once w has
// been used, allocating. The rows must be within 0 and Len.
func (d *Data) Slice(w *Window, first, rows int) {
	k := len(d.columns)
	if cap(w.Hi) < k || cap(w.Lo) < k || cap(w.Index) < k {
		w.Hi, w.Lo, w.Index = make([][]float64, k), make([][]float64, k), make([][]int32, k)
	}
	w.First, w.Rows = first, rows
	w.Hi, w.Lo, w.Index = w.Hi[:k], w.Lo[:k], w.Index[:k]
	last := first + rows
	for i := range d.columns {
		c := &d.columns[i]
		w.Hi[i], w.Lo[i], w.Index[i] = nil, nil, nil
		if c.index != nil {
			w.Index[i] = c.index[first:last:last]
			continue
		}
		w.Hi[i] = c.hi[first:last:last]
		if c.lo != nil {
			w.Lo[i] = c.lo[first:last:last]
		}
	}
}

// Windows passes over the rows in windows of 4096, which show the data itself:
// nothing is copied. It ends with the error of the context when that is done.
func (d *Data) Windows(ctx context.Context) iter.Seq2[Window, error] {
	return func(yield func(Window, error) bool) {
		var w Window
		for first := 0; first < d.n; first += windowRows {
			if err := ctx.Err(); err != nil {
				yield(Window{}, err)
				return
			}
			d.Slice(&w, first, min(windowRows, d.n-first))
			if !yield(w, nil) {
				return
			}
		}
	}
}

var (
	_ Sliced = (*Data)(nil)
	_ Source = (*Data)(nil)
)
