package glm

import (
	"fmt"
	"slices"

	"subsume.example/lrt"
)

// Account says what became of the rows on their way from the source to the
// data: nothing is left out without an entry.
type Account struct {
	Source  string // name of the source; "" where it has none
	Read    int    // rows read
	Used    int    // rows left
	Dropped []Drop // by column and reason, in the order in which they were left out
	Emptied []EmptiedLevel
}

// Drop is a set of rows left out for one reason.
type Drop struct {
	Column string // the column at fault; "" where the reason is about the row
	Reason string // "missing", or the reason given to Where
	Rows   []int  // numbers of the rows in the source, from 0
	Lines  []int  // their lines in the file; nil where there is none
}

// EmptiedLevel is a level that went out with its last row.
type EmptiedLevel struct{ Column, Level string }

// add records row i of d.
func (drop *Drop) add(d *Data, i int) {
	drop.Rows = append(drop.Rows, d.Row(i))
	if d.first > 0 {
		drop.Lines = append(drop.Lines, d.Line(i))
	}
}

// Left returns the number of rows left out.
func (a Account) Left() int { return a.Read - a.Used }

// clone copies what a later step would append to.
func (a Account) clone() Account {
	a.Dropped, a.Emptied = slices.Clone(a.Dropped), slices.Clone(a.Emptied)
	return a
}

// Account returns what became of the rows that were read.
func (d *Data) Account() Account { return d.account.clone() }

// Row returns the number in the source, from 0, of row i: they differ when rows
// were left out.
func (d *Data) Row(i int) int {
	if d.origin == nil {
		return i
	}
	return int(d.origin[i])
}

// Line returns the line of the file, from 1, on which row i begins; 0 when the
// data come from no file.
func (d *Data) Line(i int) int {
	row := d.Row(i)
	switch {
	case d.first == 0:
		return 0
	case d.lines == nil:
		return d.first + row
	}
	return int(d.lines[row])
}

// Complete returns the rows that have a value in every named column; with no
// names, in every column. The new data have an identity of their own, unless no
// row is left out, and their Account says how many rows went, for which
// column (a row with several missing values counts for the first of them). A level
// left without rows goes too, unless the levels were declared. Compare models
// over the rows complete in all the columns of both.
//
// Errors are *ColumnError and wrap ErrUnknownColumn or ErrNoCompleteRows.
func (d *Data) Complete(columns ...string) (*Data, error) {
	if len(columns) == 0 {
		for _, f := range d.schema {
			columns = append(columns, f.Name)
		}
	}
	var keep []bool
	var drops []Drop
	for _, name := range columns {
		c, err := d.find(name)
		if err != nil {
			return nil, err
		}
		if c.missing == 0 {
			continue
		}
		if keep == nil {
			keep = slices.Repeat([]bool{true}, d.n)
		}
		drop := Drop{Column: name, Reason: "missing"}
		for i := range d.n {
			if keep[i] && c.isMissing(i) {
				keep[i] = false
				drop.add(d, i)
			}
		}
		if drop.Rows != nil {
			drops = append(drops, drop)
		}
	}
	return d.keep(keep, drops)
}

// isMissing reports whether row i has no value.
func (k *column) isMissing(i int) bool {
	if k.index != nil {
		return k.index[i] < 0
	}
	return k.hi[i] != k.hi[i]
}

// Where returns the rows for which keep is true and records the others in the
// Account under the reason. The identity and the levels behave as in Complete.
// Leaving rows out after seeing their residuals calls for both answers, with and without
// them, in the report.
//
// Errors are *ColumnError and wrap ErrNoCompleteRows.
func (d *Data) Where(reason string, keep func(row int) bool) (*Data, error) {
	marks := make([]bool, d.n)
	drop := Drop{Reason: reason}
	for i := range marks {
		if marks[i] = keep(i); !marks[i] {
			drop.add(d, i)
		}
	}
	if drop.Rows == nil {
		return d, nil
	}
	return d.keep(marks, []Drop{drop})
}

// keep returns the marked rows; drops say why the others went.
func (d *Data) keep(marks []bool, drops []Drop) (*Data, error) {
	if len(drops) == 0 {
		return d, nil
	}
	n := 0
	for _, m := range marks {
		if m {
			n++
		}
	}
	if n == 0 {
		return nil, noneLeft(d.n, drops)
	}
	e := &Data{schema: slices.Clone(d.schema), columns: make([]column, len(d.columns)), place: d.place,
		n: n, account: d.account.clone(), lines: d.lines, first: d.first, origin: make([]int32, 0, n)}
	for i, m := range marks {
		if m {
			e.origin = append(e.origin, int32(d.Row(i)))
		}
	}
	e.account.Used = n
	e.account.Dropped = append(e.account.Dropped, drops...)
	for j := range d.columns {
		c := &d.columns[j]
		k := column{field: c.field, declared: c.declared, note: c.note}
		k.hi, k.lo, k.index = pick(c.hi, marks, n), pick(c.lo, marks, n), pick(c.index, marks, n)
		if k.index != nil && !k.declared {
			for _, level := range k.prune() {
				e.account.Emptied = append(e.account.Emptied, EmptiedLevel{k.field.Name, level})
			}
		}
		k.seal()
		e.columns[j], e.schema[j] = k, k.field
	}
	e.rows = lrt.NewID(e.write)
	return e, nil
}

// noneLeft is the error of leaving out every row.
func noneLeft(n int, drops []Drop) error {
	name, what := drops[0].Column, ""
	for i, d := range drops {
		if i > 0 {
			what += ", "
		}
		what += fmt.Sprintf("%d %s", len(d.Rows), d.Reason)
		if d.Column != "" {
			what += fmt.Sprintf(" in %q", d.Column)
		}
	}
	return &ColumnError{name, -1, "", fmt.Errorf("%w of %d: %s", ErrNoCompleteRows, n, what)}
}

// pick copies the marked n of the values; nil stays nil.
func pick[T any](values []T, marks []bool, n int) []T {
	if values == nil {
		return nil
	}
	out := make([]T, 0, n)
	for i, m := range marks {
		if m {
			out = append(out, values[i])
		}
	}
	return out
}

// prune takes out the levels without rows, keeping the order of the rest, and returns them.
func (k *column) prune() []string {
	used := make([]bool, len(k.field.Levels))
	for _, v := range k.index {
		if v >= 0 {
			used[v] = true
		}
	}
	if !slices.Contains(used, false) {
		return nil
	}
	to := make([]int32, len(used))
	levels := []string{}
	var gone []string
	for i, u := range used {
		if !u {
			gone = append(gone, k.field.Levels[i])
			continue
		}
		to[i] = int32(len(levels))
		levels = append(levels, k.field.Levels[i])
	}
	for i, v := range k.index {
		if v >= 0 {
			k.index[i] = to[v]
		}
	}
	k.field.Levels = levels
	return gone
}
