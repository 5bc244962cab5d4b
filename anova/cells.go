package anova

import (
	"context"
	"fmt"
	"strings"

	"subsume.example/glm"
)

// Cells are the combinations of the levels of some factors, with the number of
// rows in each.
type Cells struct {
	Factors []string
	Levels  [][]string // of each factor, in order
	// Count is the number of observations by cell, the last factor fastest: rows,
	// or the sum of frequency weights, rows of weight 0 not counted.
	Count []float64

	names   [][]string // of the columns of each factor, in the order of Levels
	columns []glm.Columns
}

// CountCells passes over the rows and counts them by cell. A numeric field
// serves as a factor too, its distinct values being the levels. Rows with a
// missing level are an error: count the rows that the models use.
func CountCells(ctx context.Context, src glm.Source, factors []string, w glm.Weights) (*Cells, error) {
	c, err := bindCells(ctx, src, factors)
	if err != nil {
		return nil, err
	}
	return c, c.pass(ctx, src, w, nil)
}

// bindCells finds the levels of the factors.
func bindCells(ctx context.Context, src glm.Source, factors []string) (*Cells, error) {
	c := &Cells{Factors: append([]string(nil), factors...)}
	total := 1
	for _, f := range factors {
		cols, err := glm.Factor{Field: f}.Bind(ctx, src)
		if err != nil {
			return nil, err
		}
		n := len(cols.Names)
		names, levels := make([]string, n), make([]string, n)
		for i, s := range cols.Names {
			names[(i+1)%n] = s
			levels[(i+1)%n] = strings.TrimPrefix(s, f+"=")
		}
		c.names, c.Levels, c.columns = append(c.names, names), append(c.Levels, levels), append(c.columns, cols)
		total *= n
		if total > maxCells {
			return nil, &LayoutError{Place: f, Err: errTooManyCells}
		}
	}
	c.Count = make([]float64, total)
	return c, nil
}

// maxCells bounds the number of cells that are listed one by one.
const maxCells = 1 << 20

var errTooManyCells = fmt.Errorf("%w: more than %d cells", ErrLayout, maxCells)

// index returns the level of each factor in a cell.
func (c *Cells) index(cell int) []int {
	at := make([]int, len(c.Factors))
	for f := len(at) - 1; f >= 0; f-- {
		at[f] = cell % len(c.Levels[f])
		cell /= len(c.Levels[f])
	}
	return at
}

// Name returns the name of a cell, "A=1 × B=2".
func (c *Cells) Name(cell int) string {
	parts := make([]string, len(c.Factors))
	for f, l := range c.index(cell) {
		parts[f] = c.names[f][l]
	}
	return strings.Join(parts, " × ")
}

// Empty returns the names of the cells without observations.
func (c *Cells) Empty() []string {
	var names []string
	for i, n := range c.Count {
		if n == 0 {
			names = append(names, c.Name(i))
		}
	}
	return names
}
