package glm_test

import (
	"context"
	"math"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// TestLargeFactors: the route that eliminates a large factor gives what the
// route in the order of the terms gives.
func TestLargeFactors(t *testing.T) {
	ctx := context.Background()
	small := &generated{rows: 6000, levels: 290} // 581 columns: in order
	large := &generated{rows: 6000, levels: 310} // 621 columns: eliminated
	for _, src := range []*generated{small, large} {
		full := model(t, src, nil, one, fa, fb)
		fit, err := full.Fit(ctx, nil)
		if err != nil {
			t.Fatal(err)
		}
		l := src.levels
		if fit.Rank != 2*l-1 {
			t.Errorf("%d levels: rank %d, want %d", l, fit.Rank, 2*l-1)
		}
		for _, name := range []string{"a=0", "b=0"} {
			if c, _ := fit.Coefficient(name); !c.Aliased {
				t.Errorf("%d levels: %s is not the reference: %+v", l, name, c)
			}
		}
		// A coefficient is a difference of levels, however it was found.
		c, err := fit.Coefficient("b=7")
		if err != nil {
			t.Fatal(err)
		}
		d, err := fit.Combination(glm.Weight{Name: "b=7", Coef: 1}, glm.Weight{Name: "b=0", Coef: -1})
		if err != nil {
			t.Fatal(err)
		}
		if relative(c.Estimate, d.Value) > 1e-12 || relative(c.SE, d.SE) > 1e-12 {
			t.Errorf("%d levels: b=7 is %g ± %g, by difference %g ± %g", l, c.Estimate, c.SE, d.Value, d.SE)
		}
		// F of one contrast is t².
		s, err := full.Restrict(lrt.Equate("b=7", "b=0"))
		if err != nil {
			t.Fatal(err)
		}
		if r := compare(t, s, full); relative(r.Exact.Statistic, c.T*c.T) > 1e-11 {
			t.Errorf("%d levels: F = %g, t² = %g", l, r.Exact.Statistic, c.T*c.T)
		}
		// The comparison agrees with the residual sums of squares of the two fits.
		without, err := full.Without("b")
		if err != nil {
			t.Fatal(err)
		}
		r := compare(t, without, full)
		f0, err := without.Fit(ctx, nil)
		if err != nil {
			t.Fatal(err)
		}
		ss := math.Ldexp(r.Pair.Linear.Numerator, 2*r.Pair.Linear.Scale)
		if relative(ss, f0.RSS-fit.RSS) > 1e-10 {
			t.Errorf("%d levels: SS %g, by difference %g", l, ss, f0.RSS-fit.RSS)
		}
		var sum float64
		for row, err := range fit.Each(ctx) {
			if err != nil {
				t.Fatal(err)
			}
			sum += row.Residual * row.Residual
			if row.Row == 600 {
				break
			}
		}
		if !(sum > 0) {
			t.Error("no residuals")
		}
	}
}

// TestAllRowsOfATable: a chain on one factorization is the comparisons one by one, in one pass.
func TestJoinOnePass(t *testing.T) {
	ctx := context.Background()
	src := &generated{rows: 3000, levels: 12}
	m := []lrt.Space{model(t, src, nil, one), model(t, src, nil, one, fa), model(t, src, nil, one, fa, fb), model(t, src, nil, one, fa, fb, glm.Cross{fa, fb})}
	before := src.passes
	cs, err := glm.Join(ctx, lrt.Steps(m, true)...)
	if err != nil {
		t.Fatal(err)
	}
	var got []lrt.Result
	for _, c := range cs {
		r, err := c.Run(ctx, nil)
		if err != nil {
			t.Fatal(err)
		}
		got = append(got, r)
	}
	if n := src.passes - before; n != 1 {
		t.Errorf("%d passes for a table, want 1", n)
	}
	alone, err := lrt.Chain(ctx, m, true, nil)
	if err != nil {
		t.Fatal(err)
	}
	for i := range got {
		if relative(got[i].Exact.Statistic, alone[i].Exact.Statistic) > 1e-13 {
			t.Errorf("row %d: F = %g joined, %g alone", i, got[i].Exact.Statistic, alone[i].Exact.Statistic)
		}
	}
}
