package anova

import (
	"errors"
	"fmt"
	"strings"

	"subsume.example/glm"
)

// The conditions that a caller may branch on with errors.Is. Those of glm and
// lrt come through as they are.
var (
	// ErrLayout: a layout cannot be made of what was given.
	ErrLayout = errors.New("layout not usable")
	// ErrEmptyCells: a hypothesis on equally weighted cell means touches cells
	// that no row has. It comes with an *EmptyCellsError.
	ErrEmptyCells = errors.New("hypothesis touches empty cells")
	// ErrNotARow: a row has no result of the kind asked for.
	ErrNotARow = errors.New("row has no such result")
	// ErrFamily: a set of contrasts is not usable.
	ErrFamily = errors.New("family of contrasts not usable")
	// ErrDesign: a design to be planned is not usable.
	ErrDesign = errors.New("design not usable")
	// ErrUnreachable: no design on the grid reaches the power asked for.
	ErrUnreachable = errors.New("power is not reached")
)

// LayoutError says what of a layout is at fault, and why.
type LayoutError struct {
	Place string // the factor, covariate or term
	Err   error
}

// Error returns `anova: PLACE: CAUSE`.
func (e *LayoutError) Error() string {
	if e.Place == "" {
		return "anova: " + e.Err.Error()
	}
	return fmt.Sprintf("anova: %q: %v", e.Place, e.Err)
}

// Unwrap returns the cause.
func (e *LayoutError) Unwrap() error { return e.Err }

// EmptyCellsError names the cells that a row needs and no row of the data has.
// errors.Is finds ErrEmptyCells and glm.ErrNotEstimable in it.
type EmptyCellsError struct {
	Cells []string
	// Partial tells a refused hypothesis on equally weighted cell means from a
	// row of which nothing is left to test.
	Partial bool
}

// Error returns "not estimable: cells A=1 × B=2, … are empty" and what to do.
func (e *EmptyCellsError) Error() string {
	s := "not estimable: cells " + listed(e.Cells) + " are empty"
	if len(e.Cells) == 1 {
		s = "not estimable: cell " + e.Cells[0] + " is empty"
	}
	if e.Partial {
		return s + ", and the hypothesis weights all cells equally; Hierarchical tests what the filled cells hold"
	}
	return s
}

// Unwrap returns the conditions met.
func (e *EmptyCellsError) Unwrap() []error {
	if e.Partial {
		return []error{ErrEmptyCells, glm.ErrNotEstimable}
	}
	return []error{glm.ErrNotEstimable}
}

// listed names at most a dozen things.
func listed(names []string) string {
	const most = 12
	if len(names) > most {
		return strings.Join(names[:most], ", ") + fmt.Sprintf(" and %d more", len(names)-most)
	}
	return strings.Join(names, ", ")
}
