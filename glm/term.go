package glm

import (
	"context"
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"

	"subsume.example/internal/dd"
)

// Term is a part of a model: it names fields of a source and holds no data. Bind
// turns it into Columns for a schema, with a pass over the rows where it needs one.
type Term interface {
	// Name is how tables and messages call the term.
	Name() string
	// Bind returns the columns of the term for any window of the source's schema.
	Bind(ctx context.Context, src Source) (Columns, error)
}

// Columns are the bound form of a term. They work on any window of the schema
// they were bound to: the rows of a fit, a part of a file, new rows to
// predict. They must be safe for concurrent use. A term delivers either dense
// columns (Fill) or one non-zero a row (Index, and Value where it is not 1).
type Columns struct {
	// Names of the columns, in their order.
	Names []string
	// Key identifies the content: two Columns with one key that is not empty,
	// bound to the same rows, are the same columns. Terms of this package have keys.
	Key string
	// FromResponse marks columns made from the response: a test of them is exact
	// by a named theorem only.
	FromResponse bool

	// Fill writes the dense columns of a window: column j of row i is hi[j][i] + lo[j][i].
	Fill func(w Window, hi, lo [][]float64) error
	// Index writes the number of the column that is not zero in each row, −1 for none.
	Index func(w Window, column []int32) error
	// Value writes the value of that column; nil means 1.
	Value func(w Window, hi, lo []float64) error

	field     int      // of a plain covariate: its position in the schema, plus 1
	fields    []string // fields the columns are made from
	numeric   []string // those of them whose range matters to a prediction
	powers    *powers  // conditioned basis of a polynomial
	partition bool     // an index that is never −1, without a value
	factors   []levelSet
	display   []int // order in which people expect the columns; nil: as they are
}

// levelSet is a factor of an index: its field and levels, the first last.
type levelSet struct {
	field  string
	levels []string
}

// findField returns the position of a field in the schema.
func findField(src Source, name string) (int, Field, error) {
	var names []string
	for i, f := range src.Schema() {
		if f.Name == name {
			return i, f, nil
		}
		names = append(names, strconv.Quote(f.Name))
	}
	return 0, Field{}, &ColumnError{Column: name, Row: -1, Err: fmt.Errorf("%w; there are %s", ErrUnknownColumn, strings.Join(names, ", "))}
}

// findNumeric is findField for a field that must hold numbers.
func findNumeric(src Source, name string) (int, error) {
	i, f, err := findField(src, name)
	if err == nil && !f.Numeric() {
		err = &ColumnError{Column: name, Row: -1, Err: ErrNotNumeric}
		if d, ok := src.(*Data); ok {
			_, err = d.numeric(name) // which knows where the first text stands in the file
		}
	}
	return i, err
}

// Constant is the column of ones: the common mean, or the intercept.
type Constant struct{}

// Name returns "constant".
func (Constant) Name() string { return "constant" }

// Bind returns the column of ones.
func (Constant) Bind(context.Context, Source) (Columns, error) {
	return Columns{
		Names: []string{"constant"}, Key: "constant",
		Fill: func(w Window, hi, lo [][]float64) error {
			for i := range w.Rows {
				hi[0][i], lo[0][i] = 1, 0
			}
			return nil
		},
	}, nil
}

// Covariate is a numeric field as one column.
type Covariate struct{ Field string }

// Name returns the name of the field.
func (c Covariate) Name() string { return c.Field }

// Bind returns the field as a column; it must be numeric.
func (c Covariate) Bind(_ context.Context, src Source) (Columns, error) {
	f, err := findNumeric(src, c.Field)
	if err != nil {
		return Columns{}, err
	}
	return Columns{
		Names: []string{c.Field}, Key: "covariate " + strconv.Quote(c.Field),
		Fill: func(w Window, hi, lo [][]float64) error {
			copyField(w, f, hi[0], lo[0])
			return nil
		},
		field: f + 1, fields: []string{c.Field}, numeric: []string{c.Field},
	}, nil
}

func copyField(w Window, f int, hi, lo []float64) {
	copy(hi[:w.Rows], w.Hi[f])
	if w.Lo != nil && w.Lo[f] != nil {
		copy(lo[:w.Rows], w.Lo[f])
	} else {
		clear(lo[:w.Rows])
	}
}

// Factor has one column for each level of a field: 1 where the row has the
// level. A numeric field serves too, its distinct values being the levels in
// ascending order. The first level, or the one named by Reference, comes
// last among the columns, so that it is the one set aside when the model has a
// constant: the other coefficients are then differences from it. Combinations and
// restrictions name both sides of a difference, lrt.Equate("oven=west", "oven=east"),
// so that they mean the same whichever level is set aside.
type Factor struct {
	Field     string
	Reference string // level to compare with; "": the first
}

// Name returns the name of the field.
func (f Factor) Name() string { return f.Field }

// Bind returns the index of the level's column. A numeric field costs a pass.
func (f Factor) Bind(ctx context.Context, src Source) (Columns, error) {
	p, err := f.bind(ctx, src)
	if err != nil {
		return Columns{}, err
	}
	return crossed([]part{p}), nil
}

// part is one factor of a product: an index of levels, or a number.
type part struct {
	name  string
	key   string
	field string
	// Index: levels in the order of the columns.
	levels []string
	index  func(w Window, to []int32) error
	first  int // column of the first level in the order people expect
	// Number.
	number func(w Window, hi, lo []float64)
}

func (f Factor) bind(ctx context.Context, src Source) (part, error) {
	at, field, err := findField(src, f.Field)
	if err != nil {
		return part{}, err
	}
	levels := field.Levels
	var codes map[dd.DD]int32
	if field.Numeric() {
		if levels, codes, err = distinct(ctx, src, at, field); err != nil {
			return part{}, err
		}
	}
	if len(levels) == 0 {
		return part{}, &ColumnError{Column: f.Field, Row: -1, Err: ErrEmpty}
	}
	ref := 0
	if f.Reference != "" {
		if ref = indexOf(levels, f.Reference); ref < 0 {
			return part{}, &ColumnError{Column: f.Field, Row: -1, Text: f.Reference, Err: ErrUnknownLevel}
		}
	}
	// Column of each level: the reference last, the others in order.
	column := make([]int32, len(levels))
	named := make([]string, len(levels))
	next := int32(0)
	for l := range levels {
		if l == ref {
			column[l] = int32(len(levels) - 1)
		} else {
			column[l] = next
			next++
		}
		named[column[l]] = levels[l]
	}
	p := part{name: f.Field, field: f.Field, levels: named, first: ref,
		key: "factor " + strconv.Quote(f.Field) + " from " + strconv.Quote(levels[ref])}
	if codes != nil {
		p.index = func(w Window, to []int32) error {
			for i := range w.Rows {
				l, ok := codes[numberAt(w, at, i)]
				if !ok {
					return &ColumnError{Column: f.Field, Row: w.First + i, Text: formatNumber(numberAt(w, at, i)), Err: ErrUnknownLevel}
				}
				to[i] = column[l]
			}
			return nil
		}
		return p, nil
	}
	p.index = func(w Window, to []int32) error {
		for i, l := range w.Index[at][:w.Rows] {
			switch {
			case l < 0:
				return &ColumnError{Column: f.Field, Row: w.First + i, Err: errMissingRow}
			case int(l) >= len(column):
				return &ColumnError{Column: f.Field, Row: w.First + i, Text: fmt.Sprintf("level %d", l), Err: ErrUnknownLevel}
			}
			to[i] = column[l]
		}
		return nil
	}
	return p, nil
}

func indexOf(s []string, x string) int {
	for i, v := range s {
		if v == x {
			return i
		}
	}
	return -1
}

func numberAt(w Window, f, i int) dd.DD {
	x := dd.DD{Hi: w.Hi[f][i]}
	if w.Lo != nil && w.Lo[f] != nil {
		x.Lo = w.Lo[f][i]
	}
	if x.Hi == 0 {
		x.Hi = 0 // −0 is 0
	}
	return x
}

func formatNumber(x dd.DD) string { return strconv.FormatFloat(x.Hi, 'g', -1, 64) }

// maxLevels is how many distinct values a numeric field may have as a factor.
const maxLevels = 1 << 20

// distinct lists the distinct values of a numeric field in ascending order.
func distinct(ctx context.Context, src Source, at int, field Field) ([]string, map[dd.DD]int32, error) {
	codes := make(map[dd.DD]int32)
	var values []dd.DD
	for w, err := range windows(ctx, src) {
		if err != nil {
			return nil, nil, err
		}
		for i := range w.Rows {
			x := numberAt(w, at, i)
			if math.IsNaN(x.Hi) {
				return nil, nil, &ColumnError{Column: field.Name, Row: w.First + i, Err: errMissingRow}
			}
			if _, ok := codes[x]; !ok {
				if len(values) == maxLevels {
					return nil, nil, &ColumnError{Column: field.Name, Row: w.First + i, Err: fmt.Errorf("%w: more than %d distinct numbers as levels of a factor", ErrLevels, maxLevels)}
				}
				codes[x] = 0
				values = append(values, x)
			}
		}
	}
	sort.Slice(values, func(i, j int) bool { return values[i].Cmp(values[j]) < 0 })
	names := make([]string, len(values))
	for i, x := range values {
		codes[x] = int32(i)
		names[i] = formatNumber(x)
	}
	return names, codes, nil
}

// errMissingRow tells what to do about a missing value.
var errMissingRow = fmt.Errorf("%w: fit on the rows complete in all columns used (Data.Complete)", ErrMissing)

// Cross is the product of terms: the cells of two or more factors, a covariate
// with a slope of its own at each level of a factor, the product of covariates.
// Its parts must be Factor or Covariate values.
type Cross []Term

// Name joins the names of the parts with " × ".
func (c Cross) Name() string {
	names := make([]string, len(c))
	for i, t := range c {
		if names[i] = "nil"; t != nil {
			names[i] = t.Name()
		}
	}
	return strings.Join(names, " × ")
}

// maxCells is the largest number of cells of a Cross.
const maxCells = 1 << 24

// Bind returns one column for each cell of the factors, holding 1 or the
// product of the covariates.
func (c Cross) Bind(ctx context.Context, src Source) (Columns, error) {
	if len(c) == 0 {
		return Columns{}, &TermError{Term: "Cross", Err: fmt.Errorf("%w: no parts", ErrTerm)}
	}
	parts := make([]part, len(c))
	cells := 1
	for i, t := range c {
		var err error
		switch t := t.(type) {
		case Factor:
			parts[i], err = t.bind(ctx, src)
			if err == nil && len(parts[i].levels) > 0 {
				if cells > maxCells/len(parts[i].levels) {
					return Columns{}, &TermError{Term: c.Name(), Err: fmt.Errorf("%w: more than %d cells", ErrTerm, maxCells)}
				}
				cells *= len(parts[i].levels)
			}
		case Covariate:
			var f int
			f, err = findNumeric(src, t.Field)
			parts[i] = part{name: t.Field, field: t.Field, key: "covariate " + strconv.Quote(t.Field),
				number: func(w Window, hi, lo []float64) { copyField(w, f, hi, lo) }}
		default:
			err = &TermError{Term: c.Name(), Err: fmt.Errorf("%w: part %d (%T) is neither a Factor nor a Covariate", ErrTerm, i+1, t)}
		}
		if err != nil {
			return Columns{}, err
		}
	}
	return crossed(parts), nil
}

// crossed makes the columns of a product.
func crossed(parts []part) Columns {
	var factors, numbers []part
	var keys, names []string
	var c Columns
	for _, p := range parts {
		keys = append(keys, p.key)
		names = append(names, p.name)
		c.fields = append(c.fields, p.field)
		if p.levels != nil {
			factors = append(factors, p)
			c.factors = append(c.factors, levelSet{p.field, p.levels})
		} else {
			numbers = append(numbers, p)
			c.numeric = append(c.numeric, p.field)
		}
	}
	c.Key = strings.Join(keys, " × ")
	if len(factors) == 0 {
		c.Names = []string{strings.Join(names, " × ")}
		c.Fill = func(w Window, hi, lo [][]float64) error {
			product(numbers, w, hi[0], lo[0])
			return nil
		}
		return c
	}
	c.Names, c.display = cellNames(factors, numbers)
	c.Index = func(w Window, to []int32) error { return cellIndex(factors, w, to) }
	if len(numbers) > 0 {
		c.Value = func(w Window, hi, lo []float64) error {
			product(numbers, w, hi, lo)
			return nil
		}
	}
	c.partition = len(numbers) == 0
	return c
}

func cellIndex(factors []part, w Window, to []int32) error {
	if err := factors[0].index(w, to); err != nil {
		return err
	}
	if len(factors) == 1 {
		return nil
	}
	next := make([]int32, w.Rows)
	for _, p := range factors[1:] {
		if err := p.index(w, next); err != nil {
			return err
		}
		n := int32(len(p.levels))
		for i, l := range next {
			to[i] = to[i]*n + l
		}
	}
	return nil
}

// product multiplies numbers in double-double.
func product(numbers []part, w Window, hi, lo []float64) {
	numbers[0].number(w, hi, lo)
	if len(numbers) == 1 {
		return
	}
	b := make([]float64, 2*w.Rows)
	nh, nl := b[:w.Rows], b[w.Rows:]
	for _, p := range numbers[1:] {
		p.number(w, nh, nl)
		for i := range w.Rows {
			x := dd.DD{Hi: hi[i], Lo: lo[i]}.Mul(dd.DD{Hi: nh[i], Lo: nl[i]})
			hi[i], lo[i] = x.Hi, x.Lo
		}
	}
}

// cellNames names the columns of a product and gives the order people expect:
// levels in order, the last factor fastest.
func cellNames(factors, numbers []part) (names []string, display []int) {
	names = []string{""}
	display = []int{0}
	for i, p := range factors {
		var ns []string
		for _, a := range names {
			for _, l := range p.levels {
				s := p.name + "=" + l
				if i > 0 {
					s = a + " × " + s
				}
				ns = append(ns, s)
			}
		}
		names = ns
		n := len(p.levels)
		var ds []int
		for _, d := range display {
			for l := range n {
				// Level number l in the order people expect stands at this column.
				col := l
				switch {
				case l == p.first:
					col = n - 1
				case l > p.first:
					col = l - 1
				}
				ds = append(ds, d*n+col)
			}
		}
		display = ds
	}
	for _, p := range numbers {
		for i := range names {
			names[i] += " × " + p.name
		}
	}
	return names, display
}
