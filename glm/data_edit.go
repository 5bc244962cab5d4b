package glm

import (
	"cmp"
	"fmt"
	"slices"

	"subsume.example/internal/decimal"
)

// With returns the data with further columns, one value for each row. The rows
// keep their identity: a model with a new column and one without it rest on
// the same observations. The errors are those of NewData.
func (d *Data) With(columns ...Column) (*Data, error) {
	all := slices.Clone(d.columns)
	for _, c := range columns {
		if c.n != d.n {
			return nil, &ColumnError{c.name, -1, "", fmt.Errorf("%w: %d rows where the data have %d", ErrLengths, c.n, d.n)}
		}
		k, err := c.build()
		if err != nil {
			return nil, err
		}
		all = append(all, k)
	}
	return d.replace(all)
}

// replace returns the same rows with other columns.
func (d *Data) replace(columns []column) (*Data, error) {
	e, err := assemble(columns, d.n)
	if err != nil {
		return nil, err
	}
	e.rows, e.account, e.origin, e.lines, e.first = d.rows, d.account, d.origin, d.lines, d.first
	return e, nil
}

// Categorical returns the data with the named numeric columns as categorical
// ones: each distinct number is a level, in ascending order, named by its shortest decimal.
// A column that is categorical already stays as it is. The rows keep their
// identity. It serves integer codes that name groups.
//
// Errors are *ColumnError and wrap ErrUnknownColumn.
func (d *Data) Categorical(columns ...string) (*Data, error) {
	all := slices.Clone(d.columns)
	for _, name := range columns {
		if _, err := d.find(name); err != nil {
			return nil, err
		}
		at := d.place[name]
		if all[at].index == nil {
			all[at] = all[at].asLevels()
		}
	}
	return d.replace(all)
}

// asLevels returns a numeric column as a categorical one.
func (k column) asLevels() column {
	type pair struct{ hi, lo float64 }
	value := func(i int) pair {
		p := pair{hi: k.hi[i] + 0}
		if k.lo != nil {
			p.lo = k.lo[i]
		}
		return p
	}
	place := make(map[pair]int32)
	for i := range k.hi {
		if !k.isMissing(i) {
			place[value(i)] = 0
		}
	}
	distinct := make([]pair, 0, len(place))
	for p := range place {
		distinct = append(distinct, p)
	}
	slices.SortFunc(distinct, func(a, b pair) int {
		return cmp.Or(cmp.Compare(a.hi, b.hi), cmp.Compare(a.lo, b.lo))
	})
	out := column{field: Field{Name: k.field.Name, Levels: make([]string, len(distinct))}, index: make([]int32, len(k.hi)), declared: k.declared}
	for i, p := range distinct {
		place[p] = int32(i)
		out.field.Levels[i] = decimal.Text(p.hi, p.lo)
	}
	for i := range k.hi {
		if out.index[i] = -1; !k.isMissing(i) {
			out.index[i] = place[value(i)]
		}
	}
	out.seal()
	return out
}

// Values returns a copy of the numbers of a column, NaN where one is missing;
// digits beyond float64 stay behind. Errors are *ColumnError and wrap
// ErrUnknownColumn or ErrNotNumeric.
func (d *Data) Values(name string) ([]float64, error) {
	c, err := d.numeric(name)
	if err != nil {
		return nil, err
	}
	return slices.Clone(c.hi), nil
}

// Pairs returns copies of the high and low parts of the numbers of a column; low
// is nil when it is zero throughout. The errors are those of Values.
func (d *Data) Pairs(name string) (high, low []float64, err error) {
	c, err := d.numeric(name)
	if err != nil {
		return nil, nil, err
	}
	return slices.Clone(c.hi), slices.Clone(c.lo), nil
}

// LevelIndex returns a copy of the level numbers of a categorical column, −1 where one
// is missing, and its levels. Errors are *ColumnError and wrap ErrUnknownColumn
// or ErrNotCategorical.
func (d *Data) LevelIndex(name string) (index []int32, levels []string, err error) {
	c, err := d.find(name)
	if err != nil {
		return nil, nil, err
	}
	if c.index == nil {
		return nil, nil, &ColumnError{name, -1, "", fmt.Errorf("%w: turn it into levels by Categorical", ErrNotCategorical)}
	}
	return slices.Clone(c.index), slices.Clone(c.field.Levels), nil
}

// Missing returns the number of missing values of a column, 0 when there is no
// such column.
func (d *Data) Missing(name string) int {
	if i, ok := d.place[name]; ok {
		return d.columns[i].missing
	}
	return 0
}

// numeric returns the numeric column of the name. The error of a column of
// labels read from a file says where its first text stands that is no number.
func (d *Data) numeric(name string) (*column, error) {
	c, err := d.find(name)
	if err != nil {
		return nil, err
	}
	if c.index == nil {
		return c, nil
	}
	if c.note != nil {
		return nil, &ColumnError{name, -1, "", fmt.Errorf("%w: %w", ErrNotNumeric, c.note)}
	}
	return nil, &ColumnError{name, -1, "", ErrNotNumeric}
}
