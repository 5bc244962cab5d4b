package glm_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"subsume.example/glm"
)

// order returns the plot with its rows in another order.
func (p plot) order(at []int) plot {
	var q plot
	for _, i := range at {
		q.y, q.x, q.off, q.w = append(q.y, p.y[i]), append(q.x, p.x[i]), append(q.off, p.off[i]), append(q.w, p.w[i])
		q.a, q.b = append(q.a, p.a[i]), append(q.b, p.b[i])
	}
	return q
}

// TestRowsInAnyOrder: permuted rows give the same estimates to the last digits, and each row its own residual.
func TestRowsInAnyOrder(t *testing.T) {
	ctx := context.Background()
	terms := []glm.Term{one, glm.Powers{Field: "x", Degree: 3}, fa, glm.Cross{fa, fb}, glm.Cross{fb, glm.Covariate{Field: "off"}}}
	for seed := range uint64(5) {
		p := field(60+seed, 70)
		at := rand.New(rand.NewPCG(seed, 1)).Perm(70)
		f, g := fitted(t, model(t, p.data(t), nil, terms...)), fitted(t, model(t, p.order(at).data(t), nil, terms...))
		for i, c := range f.Coefficients {
			if d := g.Coefficients[i]; d.Name != c.Name || relative(d.Estimate, c.Estimate) > 1e-13 || relative(d.SE, c.SE) > 1e-13 {
				t.Errorf("%s: %g ± %g, permuted %g ± %g", c.Name, c.Estimate, c.SE, d.Estimate, d.SE)
			}
		}
		rows := make([]glm.RowFit, 70)
		for r, err := range f.Each(ctx) {
			if err != nil {
				t.Fatal(err)
			}
			rows[r.Row] = r
		}
		for r, err := range g.Each(ctx) {
			if err != nil {
				t.Fatal(err)
			}
			if w := rows[at[r.Row]]; math.Abs(r.Residual-w.Residual) > 1e-12 || math.Abs(r.Leverage-w.Leverage) > 1e-12 || math.Abs(r.Studentized-w.Studentized) > 1e-10 {
				t.Errorf("row %d: %+v, want %+v", r.Row, r, w)
			}
		}
	}
}

// TestOriginOfCovariates: moving covariates and response changes the constant only.
func TestOriginOfCovariates(t *testing.T) {
	for _, move := range []float64{3, 1 << 20, 1 << 30} {
		p := field(70, 50)
		for i := range p.x { // so that moving is exact
			p.x[i], p.y[i] = math.Round(p.x[i]*64)/64, math.Round(p.y[i]*64)/64
		}
		terms := []glm.Term{one, cx, fa, glm.Cross{fa, cx}}
		f := fitted(t, model(t, p.data(t), nil, terms...))
		q := p
		q.x, q.y = slices.Clone(p.x), slices.Clone(p.y)
		for i := range q.x {
			q.x[i], q.y[i] = q.x[i]+move, q.y[i]-move
		}
		g := fitted(t, model(t, q.data(t), nil, terms...))
		if relative(g.RSS, f.RSS) > 1e-13 || relative(g.TotalSS, f.TotalSS) > 1e-13 || g.Rank != f.Rank {
			t.Errorf("moved by %g: RSS %.15g, want %.15g; rank %d", move, g.RSS, f.RSS, g.Rank)
		}
		for _, w := range [][]glm.Weight{{{Name: "a=q × x", Coef: 1}, {Name: "a=p × x", Coef: -1}}, {{Name: "x", Coef: 1}, {Name: "a=r × x", Coef: 1}}} {
			a, err := f.Combination(w...)
			if err != nil {
				t.Fatal(err)
			}
			b, err := g.Combination(w...)
			if err != nil {
				t.Fatal(err)
			}
			if relative(b.Value, a.Value) > 1e-12 || relative(b.SE, a.SE) > 1e-12 || relative(b.P, a.P) > 1e-10 {
				t.Errorf("moved by %g: %v = %+v, want %+v", move, w, b, a)
			}
		}
	}
}

// TestDuplicatesMerged: rows that repeat are one row with a frequency, for every number of the fit.
func TestDuplicatesMerged(t *testing.T) {
	ctx := context.Background()
	terms := []glm.Term{one, fa, glm.Powers{Field: "x", Degree: 2}, glm.Cross{fb, cx}}
	p := field(80, 40)
	var long []int
	for i, w := range p.w {
		for range int(w) {
			long = append(long, i)
		}
	}
	f := fitted(t, model(t, p.data(t), &glm.Options{Weights: glm.Weights{Kind: glm.Frequency, Field: "w"}}, terms...))
	g := fitted(t, model(t, p.order(long).data(t), nil, terms...))
	if f.N != g.N || f.Rank != g.Rank || f.DFError != g.DFError || relative(f.RSS, g.RSS) > 1e-13 || relative(f.TotalSS, g.TotalSS) > 1e-13 || relative(f.LogLikelihood, g.LogLikelihood) > 1e-13 {
		t.Errorf("weighted %d %d %.15g %.15g, repeated %d %d %.15g %.15g", f.N, f.Rank, f.RSS, f.LogLikelihood, g.N, g.Rank, g.RSS, g.LogLikelihood)
	}
	for i, c := range f.Coefficients {
		if d := g.Coefficients[i]; relative(c.Estimate, d.Estimate) > 1e-12 || relative(c.SE, d.SE) > 1e-12 {
			t.Errorf("%s: %g ± %g weighted, %g ± %g repeated", c.Name, c.Estimate, c.SE, d.Estimate, d.SE)
		}
	}
	of := make(map[int]glm.RowFit)
	for r, err := range f.Each(ctx) {
		if err != nil {
			t.Fatal(err)
		}
		of[r.Row] = r
	}
	for r, err := range g.Each(ctx) {
		if err != nil {
			t.Fatal(err)
		}
		if w := of[long[r.Row]]; math.Abs(w.Leverage-r.Leverage) > 1e-12 || math.Abs(w.Standardized-r.Standardized) > 1e-11 || math.Abs(w.Studentized-r.Studentized) > 1e-10 {
			t.Errorf("row %d: repeated %+v, weighted %+v", r.Row, r, w)
		}
	}
}

// TestScaleOfWeights: precision weights matter by their ratios.
func TestScaleOfWeights(t *testing.T) {
	p := field(81, 40)
	o := &glm.Options{Weights: glm.Weights{Kind: glm.Precision, Field: "w"}}
	f := fitted(t, model(t, p.data(t), o, one, cx, fa))
	for _, k := range []int{-300, -20, 7, 300} {
		q := p
		q.w = make([]float64, len(p.w))
		for i, w := range p.w {
			q.w[i] = math.Ldexp(w, k)
		}
		g := fitted(t, model(t, q.data(t), o, one, cx, fa))
		if g.RSquared != f.RSquared || math.Abs(g.LogLikelihood-f.LogLikelihood) > 1e-10*math.Abs(f.LogLikelihood) {
			t.Errorf("weights times 2^%d: R² %g, want %g; log likelihood %.15g, want %.15g", k, g.RSquared, f.RSquared, g.LogLikelihood, f.LogLikelihood)
		}
		for i, c := range f.Coefficients {
			if d := g.Coefficients[i]; d.Estimate != c.Estimate || !c.Aliased && relative(d.SE, c.SE) > 1e-14 {
				t.Errorf("weights times 2^%d: %s = %g ± %g, want %g ± %g", k, c.Name, d.Estimate, d.SE, c.Estimate, c.SE)
			}
		}
	}
	q := p
	q.w = slices.Clone(p.w)
	q.w[7] = 1e-200
	_, err := model(t, q.data(t), o, one).Fit(context.Background(), nil)
	var ce *glm.ColumnError
	if !errors.Is(err, glm.ErrWeight) || !errors.As(err, &ce) || ce.Column != "w" || ce.Row != 7 {
		t.Errorf("tiny weight: %v", err)
	}
}

func (badTerm) Name() string { return "bad" }
