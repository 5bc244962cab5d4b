package anova

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Design is a layout before there are data: the cells, the means that the effect
// worth finding would give them, the standard deviation of a unit, and how many
// units each cell gets. The same comparisons that Crossed makes for data are
// fitted to the expected means, which gives the noncentrality of each; so a
// plan and the analysis cannot disagree on what is tested.
//
// State an effect that would matter. Power at the effect estimated from the same data
// is a function of its p-value and tells nothing new; there is no function for it here.
type Design struct {
	// Factors are named once, in the order of Levels of the cells.
	Factors []string
	Cells   []DesignCell
	// SD is the standard deviation of a unit within its cell, the same in all cells.
	SD float64
	// Options say which question each row answers. Covariates and weights have no
	// place in a plan: what a covariate explains makes SD smaller.
	Options *Options
}

// DesignCell is a cell of a Design.
type DesignCell struct {
	Levels []string // of each factor
	Mean   float64  // expected
	// Units is the number of units in the cell; SampleSize takes it as the allocation.
	Units int
	// Cost of a unit; 0: 1.
	Cost float64
}

// OneWayDesign returns a design of groups named "1", "2" and so on, of the same
// number of units each.
func OneWayDesign(means []float64, units int, sd float64) Design {
	d := Design{Factors: []string{"group"}, SD: sd}
	for i, m := range means {
		d.Cells = append(d.Cells, DesignCell{Levels: []string{strconv.Itoa(i + 1)}, Mean: m, Units: units})
	}
	return d
}

// CrossedDesign returns a design of all combinations of levels, with their means
// in the order of the combinations, the last factor fastest, and the same number of
// units in each. The error wraps ErrDesign when there are not as many means.
func CrossedDesign(factors []string, levels [][]string, means []float64, units int, sd float64) (Design, error) {
	d := Design{Factors: slices.Clone(factors), SD: sd}
	total := 1
	for _, l := range levels {
		total *= len(l)
	}
	if len(levels) != len(factors) || len(means) != total {
		return d, &LayoutError{Err: fmt.Errorf("%w: %d factors, levels of %d, %d means for %d cells", ErrDesign, len(factors), len(levels), len(means), total)}
	}
	for c, m := range means {
		cell := DesignCell{Mean: m, Units: units, Levels: make([]string, len(levels))}
		for f := len(levels) - 1; f >= 0; f-- {
			cell.Levels[f] = levels[f][c%len(levels[f])]
			c /= len(levels[f])
		}
		d.Cells = append(d.Cells, cell)
	}
	return d, nil
}

// check refuses designs that cannot be planned.
func (d Design) check() error {
	fail := func(place, format string, args ...any) error {
		return &LayoutError{Place: place, Err: fmt.Errorf("%w: "+format, append([]any{ErrDesign}, args...)...)}
	}
	switch {
	case len(d.Factors) == 0 || len(d.Cells) == 0:
		return fail("", "%d factors and %d cells", len(d.Factors), len(d.Cells))
	case !(d.SD > 0) || math.IsInf(d.SD, 1):
		return fail("SD", "%g, want a positive number", d.SD)
	case d.Options != nil && (len(d.Options.Covariates) > 0 || d.Options.Model != nil):
		return fail("", "covariates and model options have no place in a plan")
	}
	seen := make(map[string]bool)
	for _, c := range d.Cells {
		name := strings.Join(c.Levels, " × ")
		switch {
		case len(c.Levels) != len(d.Factors):
			return fail(name, "%d levels for %d factors", len(c.Levels), len(d.Factors))
		case seen[name]:
			return fail(name, "cell given twice")
		case math.IsNaN(c.Mean) || math.IsInf(c.Mean, 0):
			return fail(name, "expected mean %g", c.Mean)
		case c.Units < 0:
			return fail(name, "%d units", c.Units)
		case c.Cost < 0 || math.IsNaN(c.Cost) || math.IsInf(c.Cost, 0):
			return fail(name, "cost %g", c.Cost)
		}
		seen[name] = true
	}
	return nil
}

// comparisons makes the layout on the expected means, cell i counting n[i] times.
func (d Design) comparisons(ctx context.Context, n []int) ([]lrt.Comparison, error) {
	mean, units := make([]float64, len(d.Cells)), make([]float64, len(d.Cells))
	label := make([][]string, len(d.Factors))
	for i, c := range d.Cells {
		mean[i], units[i] = c.Mean, float64(n[i])
		for f := range label {
			label[f] = append(label[f], c.Levels[f])
		}
	}
	expected, weight := d.fresh("expected"), d.fresh("units")
	cols := []glm.Column{glm.Numbers(expected, mean), glm.Numbers(weight, units)}
	for f, l := range label {
		cols = append(cols, glm.Labels(d.Factors[f], l))
	}
	data, err := glm.NewData(cols...)
	if err != nil {
		return nil, err
	}
	o := d.Options.filled()
	o.Model = &glm.Options{Weights: glm.Weights{Kind: glm.Frequency, Field: weight}}
	return Crossed(ctx, data, expected, d.Factors, &o)
}

// fresh returns a name that no factor has.
func (d Design) fresh(name string) string {
	for slices.Contains(d.Factors, name) {
		name += "_"
	}
	return name
}

func (d Design) units() []int {
	n := make([]int, len(d.Cells))
	for i, c := range d.Cells {
		n[i] = c.Units
	}
	return n
}

func (d Design) costs() []float64 {
	c := make([]float64, len(d.Cells))
	for i, cell := range d.Cells {
		if c[i] = cell.Cost; c[i] == 0 {
			c[i] = 1
		}
	}
	return c
}

// plan plans one row with n[i] units in cell i.
func (d Design) plan(ctx context.Context, row string, n []int) (lrt.Plan, error) {
	cs, err := d.comparisons(ctx, n)
	if err != nil {
		return lrt.Plan{}, err
	}
	for _, c := range cs {
		if c.Name == row {
			return c.Plan(ctx, d.SD*d.SD, nil)
		}
	}
	return lrt.Plan{}, d.noRow(row, cs)
}

func (d Design) noRow(row string, cs []lrt.Comparison) error {
	names := make([]string, len(cs))
	for i, c := range cs {
		names[i] = c.Name
	}
	return &LayoutError{Place: row, Err: fmt.Errorf("%w: no such row; there are %s", ErrDesign, strings.Join(names, ", "))}
}
