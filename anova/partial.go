package anova

import (
	"context"
	"fmt"
	"math"
	"strings"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// partial restricts the largest model by the hypothesis of each set of factors.
func partial(ctx context.Context, largest *glm.Model, factors []string, sets [][]int, opt *Options) ([]lrt.Comparison, error) {
	var cs []lrt.Comparison
	for _, c := range opt.Covariates {
		restricted, err := largest.Without(c)
		if err != nil {
			return nil, err
		}
		cs = append(cs, lrt.Comparison{Name: c, Restricted: restricted, Full: largest})
	}
	var w glm.Weights
	if opt.Model != nil {
		w = opt.Model.Weights
	}
	cells, err := CountCells(ctx, largest.Source(), factors, w)
	if err != nil {
		return nil, err
	}
	seen := make(map[string]bool)
	for _, name := range largest.Coefficients() {
		if seen[name] {
			return nil, &LayoutError{Place: name, Err: fmt.Errorf("%w: two columns of the model have this name; rename a level or a factor", ErrLayout)}
		}
		seen[name] = true
	}
	empty := cells.Empty()
	columns := cellColumns(largest, cells)
	for _, s := range sets {
		c := lrt.Comparison{Name: cross(factors, s).Name(), Full: largest}
		if len(empty) > 0 {
			// An effect compares all levels of its factors over all others, so that
			// every cell is in one of its equations.
			r := &refused{largest, &EmptyCellsError{Cells: empty, Partial: true}}
			c.Restricted, c.Full = r, r
			cs = append(cs, c)
			continue
		}
		if c.Restricted, err = largest.Restrict(lrt.Equations(hypothesis(cells, columns, s)...)); err != nil {
			return nil, err
		}
		cs = append(cs, c)
	}
	return cs, nil
}

// cellColumns returns, for each cell, the coefficients that its mean is the sum of.
func cellColumns(m *glm.Model, cells *Cells) [][]string {
	constant := m.TermOf("constant") != ""
	out := make([][]string, len(cells.Count))
	for i := range out {
		at := cells.index(i)
		if constant {
			out[i] = append(out[i], "constant")
		}
		for _, s := range subsets(len(at), len(at)) {
			parts := make([]string, len(s))
			for k, f := range s {
				parts[k] = cells.names[f][at[f]]
			}
			if name := strings.Join(parts, " × "); m.TermOf(name) != "" {
				out[i] = append(out[i], name)
			}
		}
	}
	return out
}

// hypothesis returns the equations Cμ = 0 of the effect of a set of factors: for each
// choice of one level beyond the first of each factor in the set, the first level
// less that one, crossed over the set and summed over the other factors.
func hypothesis(cells *Cells, columns [][]string, set []int) []lrt.Equation {
	levels := make([]int, len(set))
	for i := range levels {
		if levels[i] = 1; len(cells.Levels[set[i]]) < 2 {
			return nil // one level: no effect
		}
	}
	var eqs []lrt.Equation
	for {
		eqs = append(eqs, contrastOfCells(cells, columns, set, levels))
		i := len(set) - 1
		for ; i >= 0; i-- {
			if levels[i]++; levels[i] < len(cells.Levels[set[i]]) {
				break
			}
			levels[i] = 1
		}
		if i < 0 {
			return eqs
		}
	}
}

func contrastOfCells(cells *Cells, columns [][]string, set, levels []int) lrt.Equation {
	var e lrt.Equation
	place := map[string]int{}
	for cell := range cells.Count {
		at := cells.index(cell)
		w := 1.0
		for i, f := range set {
			switch at[f] {
			case 0:
			case levels[i]:
				w = -w
			default:
				w = 0
			}
		}
		if w == 0 {
			continue
		}
		for _, name := range columns[cell] {
			k, ok := place[name]
			if !ok {
				k = len(e.Names)
				place[name] = k
				e.Names, e.Coef = append(e.Names, name), append(e.Coef, 0)
			}
			e.Coef[k] += w
		}
	}
	// Coefficients of terms that the contrast does not see cancel; what all others
	// have in common is taken out.
	var out lrt.Equation
	common := 0.0
	for k, c := range e.Coef {
		if c != 0 {
			out.Names, out.Coef = append(out.Names, e.Names[k]), append(out.Coef, c)
			common = divisor(common, math.Abs(c))
		}
	}
	for k := range out.Coef {
		out.Coef[k] /= common
	}
	return out
}

// divisor returns the greatest common divisor of two whole numbers.
func divisor(a, b float64) float64 {
	for b != 0 {
		a, b = b, math.Mod(a, b)
	}
	return a
}

// refused stands for a hypothesis that cannot be imposed; running its
// comparison returns the reason.
type refused struct {
	model *glm.Model
	why   error
}

func (r *refused) Observations() lrt.Observations            { return r.model.Observations() }
func (r *refused) Maximize(context.Context) (lrt.Fit, error) { return lrt.Fit{}, r.why }
func (r *refused) FitPair(context.Context, lrt.Comparison) (lrt.Pair, error) {
	return lrt.Pair{}, r.why
}

var _ lrt.PairFitter = (*refused)(nil)
