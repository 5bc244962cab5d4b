package glm_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// TestRestrictedRows: leverage under a restriction is that of the smaller model.
func TestRestrictedRows(t *testing.T) {
	ctx := context.Background()
	d := field(82, 30).data(t)
	r, err := model(t, d, nil, one, cx, fa).Restrict(lrt.Equate("a=p", "a=q", "a=r"))
	if err != nil {
		t.Fatal(err)
	}
	f, g := fitted(t, r.(*glm.Model)), fitted(t, model(t, d, nil, one, cx))
	var want []glm.RowFit
	for r, err := range g.Each(ctx) {
		if err != nil {
			t.Fatal(err)
		}
		want = append(want, r)
	}
	for r, err := range f.Each(ctx) {
		if err != nil {
			t.Fatal(err)
		}
		if w := want[r.Row]; math.Abs(r.Leverage-w.Leverage) > 1e-13 || math.Abs(r.Fitted-w.Fitted) > 1e-12 || math.Abs(r.Studentized-w.Studentized) > 1e-11 {
			t.Errorf("%+v, want %+v", r, w)
		}
	}
	if f.Rank != 2 || relative(f.RSS, g.RSS) > 1e-13 {
		t.Errorf("rank %d, RSS %g; want 2 and %g", f.Rank, f.RSS, g.RSS)
	}
}

// TestFixedByRestriction: what restrictions fix has no error and no test.
func TestFixedByRestriction(t *testing.T) {
	s, err := model(t, field(86, 40).data(t), nil, one, cx, fa).Restrict(lrt.Fix("x", 0.25), lrt.Equate("a=p", "a=q"))
	if err != nil {
		t.Fatal(err)
	}
	f := fitted(t, s.(*glm.Model))
	x, err := f.Coefficient("x")
	if err != nil || math.Abs(x.Estimate-0.25) > 1e-15 || x.SE != 0 || !math.IsNaN(x.T) || !math.IsNaN(x.P) || x.Lower != x.Estimate {
		t.Errorf("%+v", x)
	}
	e, err := f.Combination(glm.Weight{Name: "x", Coef: 2}, glm.Weight{Name: "a=p", Coef: 1}, glm.Weight{Name: "a=q", Coef: -1})
	if err != nil || math.Abs(e.Value-0.5) > 1e-14 || e.SE != 0 {
		t.Errorf("%+v %v", e, err)
	}
}

// TestRandomRestrictions: linear equations between coefficients are the model on
// columns that obey them.
func TestRandomRestrictions(t *testing.T) {
	ctx := context.Background()
	for seed := range uint64(20) {
		r := rand.New(rand.NewPCG(seed, 3))
		const n = 25
		cols := []glm.Column{}
		x := make([][]float64, 4)
		y := make([]float64, n)
		for i := range y {
			y[i] = 5 + r.NormFloat64()
		}
		for k := range x {
			x[k] = make([]float64, n)
			for i := range x[k] {
				x[k][i] = float64(r.IntN(20))
			}
			cols = append(cols, glm.Numbers(fmt.Sprint("x", k), x[k]))
		}
		// b0·c0 + b1·c1 + b2·c2 = v: b2 = (v − b0 c0 − b1 c1)/c2.
		c0, c1, c2, v := float64(r.IntN(5)-2), float64(r.IntN(5)-2), float64(1+r.IntN(2)), float64(r.IntN(7)-3)
		u0, u1, off := make([]float64, n), make([]float64, n), make([]float64, n)
		for i := range y {
			u0[i], u1[i], off[i] = x[0][i]-c0/c2*x[2][i], x[1][i]-c1/c2*x[2][i], v/c2*x[2][i]
		}
		d := newData(t, append(cols, glm.Numbers("y", y), glm.Numbers("u0", u0), glm.Numbers("u1", u1), glm.Numbers("off", off))...)
		cov := func(name string) glm.Term { return glm.Covariate{Field: name} }
		full := model(t, d, nil, one, cov("x0"), cov("x1"), cov("x2"), cov("x3"))
		s, err := full.Restrict(lrt.Equations(lrt.Equation{Names: []string{"x0", "x1", "x2"}, Coef: []float64{c0, c1, c2}, Value: v}))
		if err != nil {
			t.Fatal(err)
		}
		f := fitted(t, s.(*glm.Model))
		g := fitted(t, model(t, d, &glm.Options{Offset: "off"}, one, cov("u0"), cov("u1"), cov("x3")))
		if f.Rank != g.Rank || relative(f.RSS, g.RSS) > 1e-12 {
			t.Errorf("seed %d: rank %d RSS %.15g, want %d %.15g", seed, f.Rank, f.RSS, g.Rank, g.RSS)
		}
		for i, name := range []string{"x0", "x1"} {
			a, _ := f.Coefficient(name)
			b := g.Coefficients[i+1]
			if math.Abs(a.Estimate-b.Estimate) > 1e-12 || relative(a.SE, b.SE) > 1e-10 {
				t.Errorf("seed %d: %s = %g ± %g, want %g ± %g", seed, name, a.Estimate, a.SE, b.Estimate, b.SE)
			}
		}
		a := compare(t, s, full)
		b, err := lrt.Compare(ctx, model(t, d, &glm.Options{Offset: "off"}, one, cov("u0"), cov("u1"), cov("x3")), full, nil)
		if err != nil {
			t.Fatal(err)
		}
		if relative(a.Exact.Statistic, b.Exact.Statistic) > 1e-11 || a.Pair.DF != 1 || b.Pair.DF != 1 {
			t.Errorf("seed %d: F %.15g by equation, %.15g by offset", seed, a.Exact.Statistic, b.Exact.Statistic)
		}
	}
}

// TestNestedRestrictions: whether restrictions imply each other is decided by what they
// say, not by how: 0.1 and 0.1 imply equality, 0.1 and 0.2 a sum of 0.3.
func TestNestedRestrictions(t *testing.T) {
	p := field(87, 40)
	for i := range p.y {
		p.y[i] += 1e6
	}
	full := model(t, p.data(t), nil, one, cx, glm.Covariate{Field: "off"}, fa, fb)
	restrict := func(m *glm.Model, rs ...lrt.Restriction) *glm.Model {
		t.Helper()
		s, err := m.Restrict(rs...)
		if err != nil {
			t.Fatal(err)
		}
		return s.(*glm.Model)
	}
	sum := func(v float64, names ...string) lrt.Restriction {
		e := lrt.Equation{Value: v}
		for _, n := range names {
			e.Names, e.Coef = append(e.Names, n), append(e.Coef, 1)
		}
		return lrt.Equations(e)
	}
	for _, c := range []struct {
		name   string
		s, b   *glm.Model
		nested bool
	}{
		{"both 0.1, equal", restrict(full, lrt.Fix("x", 0.1), lrt.Fix("off", 0.1)), restrict(full, lrt.Equate("x", "off")), true},
		{"0.1 and 0.2, sum 0.3", restrict(full, lrt.Fix("x", 0.1), lrt.Fix("off", 0.2)), restrict(full, sum(0.3, "x", "off")), true},
		{"0.1 and 0.2, sum 0.4", restrict(full, lrt.Fix("x", 0.1), lrt.Fix("off", 0.2)), restrict(full, sum(0.4, "x", "off")), false},
		{"0.1 and 0.2, equal", restrict(full, lrt.Fix("x", 0.1), lrt.Fix("off", 0.2)), restrict(full, lrt.Equate("x", "off")), false},
		{"1e-20 and 2e-20, equal", restrict(full, lrt.Fix("x", 1e-20), lrt.Fix("off", 2e-20)), restrict(full, lrt.Equate("x", "off")), false},
		{"all levels, two levels", restrict(full, lrt.Equate("a=p", "a=q", "a=r")), restrict(full, lrt.Equate("a=q", "a=r")), true},
		{"other order", restrict(full, lrt.Equate("a=r", "a=p"), lrt.Equate("a=q", "a=r")), restrict(full, lrt.Equate("a=p", "a=q")), true},
		{"without a term, its slope 0", model(t, full.Source(), nil, one, fa, fb), restrict(full, lrt.Fix("x", 0)), true},
		{"without a term, its slope 1", model(t, full.Source(), nil, one, fa, fb), restrict(full, lrt.Fix("x", 1)), false},
		{"said twice", restrict(full, lrt.Fix("x", 0.1), lrt.Fix("x", 0.1), lrt.Equate("a=p", "a=q")), restrict(full, lrt.Fix("x", 0.1)), true},
	} {
		if err := c.s.NestedIn(c.b); (err == nil) != c.nested {
			t.Errorf("%s: %v", c.name, err)
		}
	}
}

// TestContradictions: equations that cannot hold together are refused at any scale.
func TestContradictions(t *testing.T) {
	full := model(t, field(88, 30).data(t), nil, one, cx, glm.Covariate{Field: "off"}, fa)
	for _, c := range []struct {
		rs   []lrt.Restriction
		want error
	}{
		{[]lrt.Restriction{lrt.Fix("x", 1e-20), lrt.Fix("x", 2e-20)}, glm.ErrContradiction},
		{[]lrt.Restriction{lrt.Fix("x", 0.1), lrt.Fix("off", 0.2), lrt.Equate("x", "off")}, glm.ErrContradiction},
		{[]lrt.Restriction{lrt.Fix("x", 0.1), lrt.Fix("off", 0.1), lrt.Equate("x", "off")}, nil},
		{[]lrt.Restriction{lrt.Fix("x", 0), lrt.Fix("off", 0), lrt.Equate("x", "off")}, nil},
		{[]lrt.Restriction{lrt.Fix("x", 1e20), lrt.Fix("x", 1e20)}, nil},
		{[]lrt.Restriction{lrt.Equate("a=p", "a=q"), lrt.Equate("a=q", "a=r"), lrt.Equate("a=p", "a=r")}, nil},
		{[]lrt.Restriction{lrt.Fix("a=q", 1)}, nil}, // its difference from the reference
		{[]lrt.Restriction{lrt.Fix("a=p", 1)}, glm.ErrNotEstimable},
	} {
		s, err := full.Restrict(c.rs...)
		if err != nil {
			t.Fatal(err)
		}
		if _, err = s.(*glm.Model).Fit(context.Background(), nil); !errors.Is(err, c.want) {
			t.Errorf("%v: %v, want %v", s, err, c.want)
		}
	}
}
