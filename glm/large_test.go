package glm_test

import (
	"context"
	"iter"
	"math"
	"math/rand/v2"
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

// TestLargeRestricted: beyond the columns that a fit takes in order, two levels made
// equal are one level, for estimates, rows, predictions and comparisons.
func TestLargeRestricted(t *testing.T) {
	ctx := context.Background()
	const n, levels = 2600, 650
	r := rand.New(rand.NewPCG(5, 5))
	y, x, off := make([]float64, n), make([]float64, n), make([]float64, n)
	g, merged := make([]int, n), make([]int, n)
	for i := range y {
		g[i] = i % levels
		if merged[i] = g[i]; g[i] == 6 {
			merged[i] = 5
		}
		x[i], off[i] = r.NormFloat64(), r.NormFloat64()
		y[i] = 0.5*x[i] + off[i] + 0.01*float64(g[i]%7) + r.NormFloat64()
	}
	d, err := glm.NewData(glm.Numbers("y", y), glm.Numbers("x", x), glm.Numbers("off", off), glm.Levels("g", g), glm.Levels("merged", merged))
	if err != nil {
		t.Fatal(err)
	}
	o := &glm.Options{Offset: "off"}
	full := model(t, d, o, one, glm.Factor{Field: "g"}, glm.Powers{Field: "x", Degree: 2})
	s, err := full.Restrict(lrt.Equate("g=5", "g=6"))
	if err != nil {
		t.Fatal(err)
	}
	small := model(t, d, o, one, glm.Factor{Field: "merged"}, glm.Powers{Field: "x", Degree: 2})
	a, b := fitted(t, s.(*glm.Model)), fitted(t, small)
	if a.Rank != b.Rank || relative(a.RSS, b.RSS) > 1e-12 || relative(a.RSquared, b.RSquared) > 1e-12 {
		t.Errorf("rank %d RSS %.15g R² %g, want %d %.15g %g", a.Rank, a.RSS, a.RSquared, b.Rank, b.RSS, b.RSquared)
	}
	for _, name := range []string{"constant", "x", "x^2"} {
		p, _ := a.Coefficient(name)
		q, _ := b.Coefficient(name)
		if relative(p.Estimate, q.Estimate) > 1e-10 || relative(p.SE, q.SE) > 1e-10 {
			t.Errorf("%s: %g ± %g, want %g ± %g", name, p.Estimate, p.SE, q.Estimate, q.SE)
		}
	}
	next, stop := iter.Pull2(b.Each(ctx))
	defer stop()
	for p, err := range a.Each(ctx) {
		if err != nil {
			t.Fatal(err)
		}
		q, _, _ := next()
		if math.Abs(p.Leverage-q.Leverage) > 1e-11 || math.Abs(p.Residual-q.Residual) > 1e-11 || math.Abs(p.Studentized-q.Studentized) > 1e-9 {
			t.Fatalf("%+v, want %+v", p, q)
		}
		if p.Row == 700 {
			break
		}
	}
	v, w := compare(t, s, full), compare(t, small, full)
	if relative(v.Exact.Statistic, w.Exact.Statistic) > 1e-10 || v.Pair.DF != 1 || w.Pair.DF != 1 {
		t.Errorf("F = %.15g on %g by restriction, %.15g on %g by levels", v.Exact.Statistic, v.Pair.DF, w.Exact.Statistic, w.Pair.DF)
	}
	rows, err := glm.NewData(glm.Levels("g", []int{6, 600}), glm.Levels("merged", []int{5, 600}), glm.Numbers("x", []float64{0.1, -0.2}), glm.Numbers("off", []float64{0, 1}))
	if err != nil {
		t.Fatal(err)
	}
	ps, _ := predict(t, a, rows)
	qs, _ := predict(t, b, rows)
	for i := range ps {
		if math.Abs(ps[i].Value-qs[i].Value) > 1e-11 || relative(ps[i].SE, qs[i].SE) > 1e-10 {
			t.Errorf("prediction %+v, want %+v", ps[i], qs[i])
		}
	}
}
