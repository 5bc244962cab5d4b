package anova

import (
	"context"
	"fmt"
	"math"
	"slices"

	"subsume.example/lrt"
)

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
