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

// PlannedRow is the plan of a comparison of a design.
type PlannedRow struct {
	Name string
	// D1 and D2 are the degrees of freedom.
	D1, D2 float64
	// Plan holds the noncentrality ‖(P_B − P_S)μ‖²/SD² and the laws of F without
	// and with the effect.
	Plan lrt.Plan
	// Power is the probability of p ≤ alpha.
	Power float64
	// Err says why the row cannot be tested in this design.
	Err error
}

// Power is what a design with its units can find. It is made by Design.Power.
type Power struct {
	design Design
	alpha  float64
	rows   []PlannedRow
}

// Power plans each comparison of the design with the units it has, for tests of
// size alpha. A row that cannot be tested has an error. The error of Power is a *LayoutError
// wrapping ErrDesign.
func (d Design) Power(ctx context.Context, alpha float64) (Power, error) {
	p := Power{design: d, alpha: alpha}
	if err := d.check(); err != nil {
		return p, err
	}
	if !(alpha > 0 && alpha < 1) {
		return p, &LayoutError{Place: "alpha", Err: fmt.Errorf("%w: %g, want above 0 and below 1", ErrDesign, alpha)}
	}
	cs, err := d.comparisons(ctx, d.units())
	if err != nil {
		return p, err
	}
	if p.rows, err = d.rows(ctx, cs, alpha); err != nil {
		return p, err
	}
	return p, nil
}

func (d Design) rows(ctx context.Context, cs []lrt.Comparison, alpha float64) ([]PlannedRow, error) {
	rows := make([]PlannedRow, len(cs))
	for i, c := range cs {
		r := PlannedRow{Name: c.Name, D1: math.NaN(), D2: math.NaN(), Power: math.NaN()}
		pair, err := c.Fit(ctx, nil)
		if err == nil {
			r.D1, r.D2 = pair.Linear.DF()
			r.Plan, err = lrt.PlanPair(c, pair, d.SD*d.SD)
		}
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		if r.Err = err; err == nil {
			r.Power = r.Plan.Power(alpha)
		}
		rows[i] = r
	}
	return rows, nil
}

// Rows returns the planned comparisons in order.
func (p Power) Rows() []PlannedRow { return slices.Clone(p.rows) }

// Row returns the planned comparison of a name.
func (p Power) Row(name string) (PlannedRow, bool) {
	for _, r := range p.rows {
		if r.Name == name {
			return r, true
		}
	}
	return PlannedRow{}, false
}

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

// Detectable is the smallest effect of the planned shape that a design finds with
// the power asked for.
type Detectable struct {
	Row          string
	Alpha, Power float64
	// Scale is by how much the planned effect of the row has to be multiplied.
	Scale float64
	// Difference is the range over the cells of what the row then adds to the
	// restricted model, in units of the response: for a factor with as many units in
	// every cell, the difference of its largest and smallest mean.
	Difference float64
	// Noncentrality is λ at that effect, D1 and D2 the degrees of freedom.
	Noncentrality, D1, D2 float64
}

// Detectable returns the smallest effect, of the shape of the expected means, that
// the design finds in a row with the given power at size alpha. Errors are a
// *LayoutError wrapping ErrDesign, also when the expected means show no effect in the
// row, so that it has no shape.
func (d Design) Detectable(ctx context.Context, row string, alpha, power float64) (Detectable, error) {
	out := Detectable{Row: row, Alpha: alpha, Power: power}
	if err := d.check(); err != nil {
		return out, err
	}
	cs, err := d.comparisons(ctx, d.units())
	if err != nil {
		return out, err
	}
	at := slices.IndexFunc(cs, func(c lrt.Comparison) bool { return c.Name == row })
	if at < 0 {
		return out, d.noRow(row, cs)
	}
	pair, err := cs[at].Fit(ctx, nil)
	if err != nil {
		return out, err
	}
	out.D1, out.D2 = pair.Linear.DF()
	p, err := lrt.PlanPair(cs[at], pair, d.SD*d.SD)
	if err != nil {
		return out, err
	}
	if p.Noncentrality == 0 {
		return out, &LayoutError{Place: row, Err: fmt.Errorf("%w: the expected means show no effect in this row, so that it has no shape to scale", ErrDesign)}
	}
	if out.Noncentrality, err = p.Detectable(alpha, power); err != nil {
		return out, &LayoutError{Place: row, Err: fmt.Errorf("%w: %w", ErrDesign, err)}
	}
	out.Scale = math.Sqrt(out.Noncentrality / p.Noncentrality)
	span, err := effectRange(ctx, cs[at])
	if err != nil {
		return out, err
	}
	out.Difference = out.Scale * span
	return out, nil
}

// effectRange returns the range over the cells of what the full space adds to
// the restricted one.
func effectRange(ctx context.Context, c lrt.Comparison) (float64, error) {
	var fitted [2][]float64
	for i, s := range []lrt.Space{c.Restricted, c.Full} {
		m, ok := s.(*glm.Model)
		if !ok {
			return math.NaN(), &LayoutError{Place: c.Name, Err: fmt.Errorf("%w: no linear model", ErrDesign)}
		}
		f, err := m.Fit(ctx, nil)
		if err != nil {
			return math.NaN(), err
		}
		for r, err := range f.Each(ctx) {
			if err != nil {
				return math.NaN(), err
			}
			fitted[i] = append(fitted[i], r.Fitted)
		}
	}
	low, high := math.Inf(1), math.Inf(-1)
	for i := range fitted[0] {
		x := fitted[1][i] - fitted[0][i]
		low, high = math.Min(low, x), math.Max(high, x)
	}
	return high - low, nil
}
