package anova

import (
	"context"
	"fmt"
	"iter"
	"slices"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// survey is what one pass over the rows of a model tells: its cells, a value
// that stands for each level, and the means of its covariates.
type survey struct {
	model *glm.Model
	cells *Cells
	// level[f][l] is the value of factor f at level l, as the source writes it.
	level [][]cellValue
	// covariates and their means over the observations; the offset is one of them.
	covariates []string
	mean       []float64
	n          float64
}

// cellValue is a value of a field, as a number or as a level.
type cellValue struct {
	hi, lo float64
	index  int32
	seen   bool
}

func fieldAt(src glm.Source, name string) int {
	for i, f := range src.Schema() {
		if f.Name == name {
			return i
		}
	}
	return -1
}

// takeSurvey passes over the rows of the model once.
func takeSurvey(ctx context.Context, m *glm.Model) (*survey, error) {
	if o := m.Opaque(); len(o) > 0 {
		return nil, &LayoutError{Place: o[0], Err: fmt.Errorf("%w: which fields the term reads is not known, so that its means cannot be asked for", ErrLayout)}
	}
	src := m.Source()
	cells, err := bindCells(ctx, src, m.Factors())
	if err != nil {
		return nil, err
	}
	s := &survey{model: m, cells: cells, covariates: m.Covariates(), level: make([][]cellValue, len(cells.Factors))}
	if o := m.Options().Offset; o != "" && !slices.Contains(s.covariates, o) {
		s.covariates = append(s.covariates, o)
	}
	at := make([]int, len(cells.Factors))
	for f, name := range cells.Factors {
		at[f] = fieldAt(src, name)
		s.level[f] = make([]cellValue, len(cells.Levels[f]))
		for l := range s.level[f] { // a level without rows still has its number
			s.level[f][l].index = int32(l)
		}
	}
	x := make([]int, len(s.covariates))
	for i, c := range s.covariates {
		x[i] = fieldAt(src, c)
	}
	shift, sum := make([]float64, len(x)), make([]float64, len(x))
	first := true
	err = cells.pass(ctx, src, m.Options().Weights, func(w glm.Window, row int, weight, count float64, level []int) {
		for f, l := range level {
			v := &s.level[f][l]
			if v.seen {
				continue
			}
			*v = cellValue{seen: true, index: -1}
			if w.Hi[at[f]] != nil {
				v.hi = w.Hi[at[f]][row]
				if w.Lo != nil && w.Lo[at[f]] != nil {
					v.lo = w.Lo[at[f]][row]
				}
			} else {
				v.index = w.Index[at[f]][row]
			}
		}
		for i, f := range x {
			if first {
				shift[i] = w.Hi[f][row]
			}
			sum[i] += weight * (w.Hi[f][row] - shift[i])
		}
		first = false
		s.n += weight
	})
	if err != nil {
		return nil, err
	}
	for i := range x {
		s.mean = append(s.mean, shift[i]+sum[i]/s.n)
	}
	return s, nil
}

// pass counts the observations by cell and calls visit for every row with its
// weight, the observations it counts for (none at weight 0), and its levels.
func (c *Cells) pass(ctx context.Context, src glm.Source, w glm.Weights, visit func(win glm.Window, row int, weight, count float64, level []int)) error {
	at := -1
	if w.Kind != glm.NoWeights {
		at = fieldAt(src, w.Field)
	}
	columns := make([][]int32, len(c.columns))
	level := make([]int, len(c.columns))
	for win, err := range src.Windows(ctx) {
		if err != nil {
			return err
		}
		for f := range c.columns {
			columns[f] = append(columns[f][:0], make([]int32, win.Rows)...)
			if err := c.columns[f].Index(win, columns[f]); err != nil {
				return err
			}
		}
		for i := range win.Rows {
			weight, count := 1.0, 1.0
			if at >= 0 {
				if weight = win.Hi[at][i]; !(weight > 0) {
					weight, count = 0, 0
				} else if w.Kind == glm.Frequency {
					count = weight
				}
			}
			cell := 0
			for f := range columns {
				n := len(c.Levels[f])
				// The first level stands last among the columns of a factor.
				level[f] = (int(columns[f][i]) + 1) % n
				cell = cell*n + level[f]
			}
			c.Count[cell] += count
			if visit != nil {
				visit(win, i, weight, count, level)
			}
		}
	}
	return nil
}

// grid is a source of made-up rows under the schema of another.
type grid struct {
	schema []glm.Field
	rows   int
	window glm.Window
}

// newGrid returns rows rows, all fields zero or missing.
func newGrid(src glm.Source, rows int) *grid {
	g := &grid{schema: src.Schema(), rows: rows}
	k := len(g.schema)
	g.window = glm.Window{Rows: rows, Hi: make([][]float64, k), Lo: make([][]float64, k), Index: make([][]int32, k)}
	for i, f := range g.schema {
		if f.Numeric() {
			g.window.Hi[i], g.window.Lo[i] = make([]float64, rows), make([]float64, rows)
		} else {
			g.window.Index[i] = make([]int32, rows)
			for r := range rows {
				g.window.Index[i][r] = -1
			}
		}
	}
	return g
}

func (g *grid) set(field, row int, v cellValue) {
	if g.window.Hi[field] != nil {
		g.window.Hi[field][row], g.window.Lo[field][row] = v.hi, v.lo
		return
	}
	g.window.Index[field][row] = v.index
}

// Schema is that of the source the grid was made for.
func (g *grid) Schema() []glm.Field { return g.schema }

// Observations are nobody's: the rows are made up.
func (g *grid) Observations(string) lrt.Observations {
	id := lrt.NewID(nil)
	return lrt.Observations{Rows: id, Response: id}
}

// Windows delivers all rows in one window.
func (g *grid) Windows(ctx context.Context) iter.Seq2[glm.Window, error] {
	return func(yield func(glm.Window, error) bool) { yield(g.window, ctx.Err()) }
}
