package anova

import (
	"context"
	"math"

	"subsume.example/lrt"
)

// adjust accounts for the family.
func (f *Family) adjust(ctx context.Context) error {
	var p []lrt.Result
	var at []int
	for i, l := range f.lines {
		if l.Row.err == nil {
			p, at = append(p, l.Row.result), append(at, i)
		}
	}
	m := float64(len(at))
	half := math.NaN()
	var adjusted, logs []float64
	var err error
	switch f.method {
	case Bonferroni, Holm:
		a := lrt.Bonferroni
		if f.method == Holm {
			a = lrt.Holm
		}
		half = f.groups.fit.Critical(1 - (1-f.level)/m)
		adjusted, logs, err = lrt.AdjustResults(a, p)
	case Scheffe:
		half = scheffeCritical(f.dimension, f.errorDF(), f.level)
		for _, r := range p {
			t, e := lrt.Scheffe{Dimension: f.dimension}.Refer(ctx, r.Comparison, r.Pair, nil)
			if e != nil {
				return e
			}
			adjusted, logs = append(adjusted, t.P), append(logs, t.LogP)
		}
	case Tukey:
		r := lrt.Pairs{Groups: f.groups.filled(), Balanced: f.groups.balanced()}
		f.approximate = !r.Balanced
		half = r.Critical(f.errorDF(), 1-f.level)
		for _, x := range p {
			t, e := r.Refer(ctx, x.Comparison, x.Pair, nil)
			if e != nil {
				return e
			}
			adjusted, logs = append(adjusted, t.P), append(logs, t.LogP)
		}
	case Unadjusted:
		half = f.groups.fit.Critical(f.level)
		for _, r := range p {
			adjusted, logs = append(adjusted, r.P()), append(logs, r.LogP())
		}
	}
	if err != nil {
		return err
	}
	for k, i := range at {
		l := &f.lines[i]
		l.AdjustedP, l.AdjustedLogP = adjusted[k], logs[k]
		l.Lower, l.Upper = l.Estimate.Value-half*l.Estimate.SE, l.Estimate.Value+half*l.Estimate.SE
	}
	return nil
}

// filled returns the number of groups with observations.
func (g *Groups) filled() int {
	n := 0
	for _, q := range g.list {
		if q.N > 0 {
			n++
		}
	}
	return n
}

// balanced reports whether all differences of two groups have one variance, which is what the
// studentized range needs to be exact.
func (g *Groups) balanced() bool {
	low, high := math.Inf(1), 0.0
	w := make([]float64, len(g.list))
	for i := range g.list {
		if g.list[i].N == 0 {
			continue
		}
		for k := range i {
			if g.list[k].N == 0 {
				continue
			}
			w[i], w[k] = 1, -1
			e, err := g.rows.Estimate(g.over(w))
			w[i], w[k] = 0, 0
			if err != nil {
				return false
			}
			low, high = math.Min(low, e.SE), math.Max(high, e.SE)
		}
	}
	return high-low <= 1e-9*high
}

// Approximate reports that the method accounts for the family approximately only.
func (f Family) Approximate() bool { return f.approximate }

// errorDF returns the degrees of freedom of the error, +Inf where the variance is known.
func (f *Family) errorDF() float64 {
	if f.groups.model.Options().KnownVariance > 0 {
		return math.Inf(1)
	}
	return float64(f.groups.fit.DFError)
}
