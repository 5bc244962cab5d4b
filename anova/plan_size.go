package anova

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	"subsume.example/lrt"
)

// SizeOptions steer SampleSize. nil and every zero field mean the default.
type SizeOptions struct {
	// Free lets cells leave the allocation, one unit at a time, where that is cheaper.
	Free bool
	// Least is the smallest number of units in each cell; 0: 1.
	Least int
	// Loss is the share of units expected to be lost; the design starts with as many
	// more, rounded up in each cell.
	Loss float64
	// Most is the largest total number of units; 0: ten million.
	Most int
}

// Size is the smallest design that reaches a power.
type Size struct {
	lrt.Size
	Row                string
	Alpha, TargetPower float64
	// Start is N with the allowance for loss.
	Start  []int
	Loss   float64
	design Design
}

// SampleSize returns the cheapest design, in multiples of the Units of the cells, in which
// the test of a row, of size alpha, has at least the given power; every cheaper neighbour
// was tried and falls short. With SizeOptions.Free the cells may leave the multiples.
//
// Errors are a *LayoutError wrapping ErrDesign, ErrUnreachable when no design
// within the limit has the power, and those of the context.
func (d Design) SampleSize(ctx context.Context, row string, alpha, power float64, o *SizeOptions) (Size, error) {
	if o == nil {
		o = &SizeOptions{}
	}
	s := Size{Row: row, Alpha: alpha, TargetPower: power, Loss: o.Loss, design: d}
	fail := func(place, format string, args ...any) (Size, error) {
		return s, &LayoutError{Place: place, Err: fmt.Errorf("%w: "+format, append([]any{ErrDesign}, args...)...)}
	}
	if err := d.check(); err != nil {
		return s, err
	}
	switch {
	case !(alpha > 0 && alpha < power && power < 1):
		return fail("", "alpha %g and power %g, want 0 < alpha < power < 1", alpha, power)
	case o.Least < 0:
		return fail("Least", "%d units", o.Least)
	case !(o.Loss >= 0 && o.Loss < 1):
		return fail("Loss", "%g, want 0 or more and below 1", o.Loss)
	}
	for _, c := range d.Cells {
		if c.Units == 0 {
			return fail(strings.Join(c.Levels, " × "), "the allocation needs at least 1 unit in a cell; leave the cell out instead")
		}
	}
	if cs, err := d.comparisons(ctx, d.units()); err != nil {
		return s, err
	} else if !slices.ContainsFunc(cs, func(c lrt.Comparison) bool { return c.Name == row }) {
		return s, d.noRow(row, cs)
	}
	// No size reaches a power when the row has no effect at all.
	many := d.units()
	for i := range many {
		many[i] *= 1000
	}
	p, err := d.plan(ctx, row, many)
	if err != nil {
		return s, err
	}
	if p.Noncentrality == 0 {
		return s, &LayoutError{Place: row, Err: fmt.Errorf("%w: the expected means show no effect in this row", ErrUnreachable)}
	}
	least := make([]int, len(d.Cells))
	for i := range least {
		least[i] = max(o.Least, 1)
	}
	s.Size, err = lrt.SizeSearch{Alpha: alpha, Power: power, Step: d.units(), Least: least, Free: o.Free, Cost: d.costs(), Most: o.Most,
		Plan: func(n []int) (lrt.Plan, error) { return d.plan(ctx, row, n) }}.Solve(ctx)
	if err != nil {
		return s, unreached(row, err)
	}
	for _, n := range s.N {
		s.Start = append(s.Start, int(math.Ceil(float64(n)/(1-o.Loss)-1e-9)))
	}
	return s, nil
}
