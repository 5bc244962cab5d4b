package glm

import (
	"fmt"
	"math"
	"slices"
	"strconv"

	"subsume.example/internal/decimal"
)

// Column is one named column on its way into NewData. Its constructors are
// Numbers, SharedNumbers, NumberPairs, Integers, Decimals, Labels and Levels;
// the methods, which return a changed copy, say which values are missing and in
// which order the levels stand. Nothing is checked before NewData.
//
// Missing values are always declared: by MissingNumbers for numbers (NaN
// included), by MissingTexts for decimals and labels, by MissingRows for any
// kind. A NaN that is not declared missing is an error.
type Column struct {
	name    string
	kind    columnKind
	shared  bool
	hi, lo  []float64
	text    []string
	index   []int32
	levels  []string // of index
	n       int
	err     error // found by the constructor
	numbers []float64
	texts   []string
	rows    []bool
	hasRows bool
	order   []string
	ordered bool
}

type columnKind uint8

const (
	numberColumn columnKind = iota + 1
	decimalColumn
	labelColumn
	levelColumn
)

// Numbers returns a numeric column of a copy of values.
func Numbers(name string, values []float64) Column {
	return Column{name: name, kind: numberColumn, hi: values, n: len(values)}
}

// SharedNumbers is Numbers without the copy, for large data: the caller must
// not write to values any more, since fits, identities and comparisons rest on them. (They
// are copied all the same when MissingNumbers has to replace a value.)
func SharedNumbers(name string, values []float64) Column {
	return Column{name: name, kind: numberColumn, shared: true, hi: values, n: len(values)}
}

// NumberPairs returns a numeric column of the values hi[i] + lo[i], each an
// unevaluated sum with |lo| at most half a unit in the last place of hi, as
// double-double arithmetic leaves it. Both slices are copied.
func NumberPairs(name string, hi, lo []float64) Column {
	c := Column{name: name, kind: numberColumn, hi: hi, lo: lo, n: len(hi)}
	if len(hi) != len(lo) {
		c.err = fmt.Errorf("%w: %d high and %d low parts", ErrLengths, len(hi), len(lo))
	}
	return c
}

// Integers returns a numeric column of whole numbers. Those beyond ±2^53 keep
// every digit.
func Integers[T ~int | ~int8 | ~int16 | ~int32 | ~int64 | ~uint | ~uint8 | ~uint16 | ~uint32 | ~uint64](name string, values []T) Column {
	c := Column{name: name, kind: numberColumn, shared: true, hi: make([]float64, len(values)), n: len(values)}
	for i, v := range values {
		x := float64(v)
		c.hi[i] = x
		if math.Abs(x) < 1<<53 {
			continue
		}
		if c.lo == nil {
			c.lo = make([]float64, len(values))
		}
		c.lo[i] = wholeRemainder(v, x)
	}
	return c
}

// wholeRemainder returns v − x, x the float64 nearest to the whole number v.
func wholeRemainder[T ~int | ~int8 | ~int16 | ~int32 | ~int64 | ~uint | ~uint8 | ~uint16 | ~uint32 | ~uint64](v T, x float64) float64 {
	if v < 0 {
		if x <= -(1 << 63) {
			return float64(int64(v) + math.MaxInt64 + 1)
		}
		return float64(int64(v) - int64(x))
	}
	if x >= 1<<64 {
		return -float64(math.MaxUint64 - uint64(v) + 1)
	}
	return float64(int64(uint64(v) - uint64(x)))
}

// Decimals returns a numeric column of decimal texts such as "-12.50" or
// "1.5e-3" (decimal point, no spaces, no separators of thousands). Each becomes
// the nearest float64 and the nearest float64 to what that leaves, so that
// about 32 significant digits are kept: data that share 13 leading digits lose nothing.
func Decimals(name string, texts []string) Column {
	return Column{name: name, kind: decimalColumn, text: texts, n: len(texts)}
}

// Labels returns a categorical column. The levels stand in the order of their first
// appearance, unless Order states another. An empty label is an error
// where it is not declared missing.
func Labels(name string, labels []string) Column {
	return Column{name: name, kind: labelColumn, text: labels, n: len(labels)}
}

// Levels returns a categorical column of values of any comparable type; a
// level is named by fmt.Sprint, and two different values with one name are an
// error. The levels stand in the order of their first appearance, unless Order
// states another.
func Levels[T comparable](name string, values []T) Column {
	c := Column{name: name, kind: levelColumn, index: make([]int32, len(values)), n: len(values)}
	seen := make(map[T]int32)
	named := make(map[string]bool)
	for i, v := range values {
		k, ok := seen[v]
		if !ok {
			k = int32(len(c.levels))
			text := fmt.Sprint(v)
			if v != v {
				c.err = &ColumnError{name, i, text, ErrNotFinite}
				return c
			}
			if named[text] {
				c.err = &ColumnError{name, i, text, fmt.Errorf("%w: two different values are written the same", ErrLevels)}
				return c
			}
			seen[v], named[text] = k, true
			c.levels = append(c.levels, text)
		}
		c.index[i] = k
	}
	return c
}

// Name returns the name of the column.
func (c Column) Name() string { return c.name }

// MissingNumbers declares values of a numeric column that stand for "missing";
// NaN may be one of them.
func (c Column) MissingNumbers(values ...float64) Column {
	c.numbers = slices.Concat(c.numbers, values)
	return c
}

// MissingTexts declares texts that stand for "missing" in a column of decimals
// or labels, the empty one by "".
func (c Column) MissingTexts(texts ...string) Column {
	c.texts = slices.Concat(c.texts, texts)
	return c
}

// MissingRows declares the rows whose mark is true missing, whatever they hold.
// There must be one mark for each row.
func (c Column) MissingRows(marks []bool) Column {
	c.rows, c.hasRows = marks, true
	return c
}

// Order declares the levels of a categorical column and their order. A label
// that is not among them is an error; a level without rows is kept.
func (c Column) Order(levels ...string) Column {
	c.order, c.ordered = slices.Clone(levels), true
	return c
}

// missing reports whether row i is marked.
func (c *Column) missing(i int) bool { return c.hasRows && c.rows[i] }

// fail returns the error of row i.
func (c *Column) fail(i int, text string, err error) error {
	return &ColumnError{c.name, i, text, err}
}

// build checks the column and returns it as it is kept.
func (c Column) build() (column, error) {
	if c.err != nil {
		if e, ok := c.err.(*ColumnError); ok {
			return column{}, e
		}
		return column{}, c.fail(-1, "", c.err)
	}
	if c.hasRows && len(c.rows) != c.n {
		return column{}, c.fail(-1, "", fmt.Errorf("%w: %d marks of missing rows for %d rows", ErrLengths, len(c.rows), c.n))
	}
	var k column
	var err error
	switch c.kind {
	case numberColumn:
		k, err = c.buildNumbers()
	case decimalColumn:
		k, err = c.buildDecimals()
	case labelColumn:
		k, err = c.buildLabels()
	case levelColumn:
		k, err = c.buildLevels()
	default:
		err = c.fail(-1, "", ErrColumn)
	}
	if err != nil {
		return column{}, err
	}
	k.field.Name = c.name
	return k, nil
}

func (c *Column) buildNumbers() (column, error) {
	if c.ordered || len(c.texts) > 0 {
		return column{}, c.fail(-1, "", ErrNotCategorical)
	}
	k := column{hi: c.hi, lo: c.lo}
	owned := c.shared && c.lo != nil // made by Integers
	if !c.shared {
		k.hi, k.lo, owned = slices.Clone(c.hi), slices.Clone(c.lo), true
	}
	nan := math.NaN()
	for i, x := range k.hi {
		low := 0.0
		if k.lo != nil {
			low = k.lo[i]
		}
		if c.missing(i) || len(c.numbers) > 0 && c.stands(x, low) {
			if !math.IsNaN(x) || low != 0 {
				if !owned {
					k.hi, owned = slices.Clone(k.hi), true
				}
				k.hi[i] = nan
				if k.lo != nil {
					k.lo[i] = 0
				}
			}
			continue
		}
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return column{}, c.fail(i, fmt.Sprint(x), ErrNotFinite)
		}
		if low != 0 && x+low != x || low != low {
			return column{}, c.fail(i, fmt.Sprintf("%g + %g", x, low), fmt.Errorf("%w: the low part must be within half a unit in the last place of the high one", ErrNotNumber))
		}
	}
	k.seal()
	return k, nil
}

// stands reports whether x + low is declared to stand for "missing": −99.9 does
// as the float64 and as the decimal.
func (c *Column) stands(x, low float64) bool {
	for _, v := range c.numbers {
		if math.IsNaN(v) && math.IsNaN(x) {
			return true
		}
		if v != x {
			continue
		}
		if low == 0 {
			return true
		}
		if _, rest, _ := decimal.ParseString(strconv.FormatFloat(v, 'g', -1, 64)); rest == low {
			return true
		}
	}
	return false
}

func (c *Column) buildDecimals() (column, error) {
	if c.ordered {
		return column{}, c.fail(-1, "", ErrNotCategorical)
	}
	k := column{hi: make([]float64, c.n), lo: make([]float64, c.n)}
	nan := math.NaN()
	var buf []byte
	for i, s := range c.text {
		if c.missing(i) || slices.Contains(c.texts, s) {
			k.hi[i] = nan
			continue
		}
		buf = append(buf[:0], s...)
		hi, lo, status := decimal.Parse(buf, '.')
		switch status {
		case decimal.NotNumber:
			return column{}, c.fail(i, s, ErrNotNumber)
		case decimal.NotFinite:
			return column{}, c.fail(i, s, ErrNotFinite)
		}
		if len(c.numbers) > 0 && c.stands(hi, lo) {
			hi, lo = nan, 0
		}
		k.hi[i], k.lo[i] = hi, lo
	}
	k.seal()
	return k, nil
}

func (c *Column) buildLabels() (column, error) {
	if len(c.numbers) > 0 {
		return column{}, c.fail(-1, "", ErrNotNumeric)
	}
	levels, place, err := c.declared()
	if err != nil {
		return column{}, err
	}
	k := column{index: make([]int32, c.n), declared: c.ordered}
	for i, s := range c.text {
		if c.missing(i) || slices.Contains(c.texts, s) {
			k.index[i] = -1
			continue
		}
		if s == "" {
			return column{}, c.fail(i, "", fmt.Errorf("%w: empty label, declare it missing by MissingTexts(\"\")", ErrMissing))
		}
		at, ok := place[s]
		if !ok {
			if c.ordered {
				return column{}, c.fail(i, s, ErrUnknownLevel)
			}
			at = int32(len(levels))
			place[s] = at
			levels = append(levels, s)
		}
		k.index[i] = at
	}
	k.field.Levels = levels
	k.seal()
	return k, nil
}

// declared returns the declared levels and where each stands; none to begin
// with where no order was declared.
func (c *Column) declared() ([]string, map[string]int32, error) {
	place := make(map[string]int32, len(c.order))
	if !c.ordered {
		return []string{}, place, nil
	}
	for i, s := range c.order {
		if _, twice := place[s]; twice || s == "" {
			return nil, nil, c.fail(-1, s, ErrLevels)
		}
		place[s] = int32(i)
	}
	if len(c.order) == 0 {
		return nil, nil, c.fail(-1, "", ErrLevels)
	}
	return c.order, place, nil
}

func (c *Column) buildLevels() (column, error) {
	text := make([]string, c.n)
	for i, at := range c.index {
		text[i] = c.levels[at]
	}
	d := *c
	d.kind, d.text = labelColumn, text
	return d.buildLabels()
}
