package anova

import (
	"context"
	"fmt"
	"math"
	"slices"

	"subsume.example/glm"
	"subsume.example/lrt"
)

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
