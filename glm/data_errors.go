package glm

import (
	"errors"
	"fmt"
	"strings"
)

// The conditions of data that a caller may branch on with errors.Is. They reach
// the caller wrapped in a *ColumnError or, from a file, in a *CSVError.
var (
	// ErrEmpty: there are no columns or no rows.
	ErrEmpty = errors.New("no data")
	// ErrNoCompleteRows: every row has a missing value or was left out.
	ErrNoCompleteRows = errors.New("no row is left")
	// ErrLengths: the columns differ in length.
	ErrLengths = errors.New("columns differ in length")
	// ErrName: a column has no name.
	ErrName = errors.New("column has no name")
	// ErrDuplicateColumn: two columns share one name.
	ErrDuplicateColumn = errors.New("column name is used twice")
	// ErrUnknownColumn: no column has the name.
	ErrUnknownColumn = errors.New("no such column")
	// ErrNotFinite: a value is NaN, infinite or beyond the float64 range, and not declared missing.
	ErrNotFinite = errors.New("value is not finite and not declared missing")
	// ErrNotNumber: a text in a numeric column is no number.
	ErrNotNumber = errors.New("not a number and not declared missing")
	// ErrNotNumeric: a column of labels stands where numbers are needed.
	ErrNotNumeric = errors.New("column holds labels, not numbers")
	// ErrNotCategorical: a column of numbers stands where labels are needed.
	ErrNotCategorical = errors.New("column holds numbers, not labels")
	// ErrUnknownLevel: a label is not among the declared levels.
	ErrUnknownLevel = errors.New("label is not among the declared levels")
	// ErrLevels: the declared levels are not usable.
	ErrLevels = errors.New("levels must be distinct and not empty")
	// ErrMissing: a value is missing and the rows were to be complete.
	ErrMissing = errors.New("value is missing")
	// ErrColumn: a column was not made by one of the constructors.
	ErrColumn = errors.New("column was not made by a constructor of this package")
)

// ColumnError says which column of data in memory is at fault, where, and why.
type ColumnError struct {
	Column string // its name, "" where it has none
	Row    int    // row number from 0; −1: the column as a whole
	Text   string // the value at fault, as text; may be empty
	Err    error  // the cause
}

// Error returns a text such as `glm: column "depth" row 17: "n/a": not a number and not declared missing`.
func (e *ColumnError) Error() string {
	var b strings.Builder
	b.WriteString("glm: ")
	if e.Column != "" || e.Row >= 0 {
		fmt.Fprintf(&b, "column %q", e.Column)
		if e.Row >= 0 {
			fmt.Fprintf(&b, " row %d", e.Row)
		}
		b.WriteString(": ")
	}
	if e.Text != "" {
		fmt.Fprintf(&b, "%q: ", clip(e.Text))
	}
	b.WriteString(e.Err.Error())
	return b.String()
}

// Unwrap returns the cause.
func (e *ColumnError) Unwrap() error { return e.Err }

// clip shortens a text for a message.
func clip(s string) string {
	const most = 60
	if len(s) <= most {
		return s
	}
	cut := most
	for cut > 0 && s[cut]&0xC0 == 0x80 {
		cut--
	}
	return s[:cut] + "…"
}
