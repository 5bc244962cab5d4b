package glm_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
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

// seasons is a user's own term: a yearly wave in a numeric field.
type seasons struct{ Field string }

func (s seasons) Name() string { return "seasons of " + s.Field }

func (s seasons) Bind(_ context.Context, src glm.Source) (glm.Columns, error) {
	at := slices.IndexFunc(src.Schema(), func(f glm.Field) bool { return f.Name == s.Field && f.Numeric() })
	if at < 0 {
		return glm.Columns{}, &glm.TermError{Term: s.Name(), Err: glm.ErrUnknownColumn}
	}
	return glm.Columns{
		Names: []string{"cos " + s.Field, "sin " + s.Field},
		Key:   "seasons " + s.Field,
		Fill: func(w glm.Window, hi, lo [][]float64) error {
			for i, x := range w.Hi[at][:w.Rows] {
				hi[1][i], hi[0][i] = math.Sincos(2 * math.Pi * x)
				lo[0][i], lo[1][i] = 0, 0
			}
			return nil
		},
	}, nil
}

// Fields says what the term reads, so that new rows need nothing else.
func (s seasons) Fields() []string { return []string{s.Field} }

// TestOwnTerm: a user's columns are fitted as the same columns handed in ready made, in
// any cut of the rows, and bound again to new rows.
func TestOwnTerm(t *testing.T) {
	p := field(83, 1300)
	cos, sin := make([]float64, len(p.x)), make([]float64, len(p.x))
	for i, x := range p.x {
		sin[i], cos[i] = math.Sincos(2 * math.Pi * x)
	}
	d, err := p.data(t).With(glm.Numbers("c", cos), glm.Numbers("s", sin))
	if err != nil {
		t.Fatal(err)
	}
	f := fitted(t, model(t, d, nil, one, seasons{"x"}, fa))
	g := fitted(t, model(t, streamed{d}, nil, one, glm.Covariate{Field: "c"}, glm.Covariate{Field: "s"}, fa))
	if relative(f.RSS, g.RSS) > 1e-13 || f.Rank != g.Rank || f.Coefficients[1].Name != "cos x" || relative(f.Coefficients[1].Estimate, g.Coefficients[1].Estimate) > 1e-11 {
		t.Errorf("RSS %g, want %g; %+v", f.RSS, g.RSS, f.Coefficients[1])
	}
	ps, _ := predict(t, f, newData(t, glm.Labels("a", []string{"q"}), glm.Numbers("x", []float64{0.25})))
	e, err := f.Combination(glm.Weight{Name: "constant", Coef: 1}, glm.Weight{Name: "sin x", Coef: 1}, glm.Weight{Name: "a=q", Coef: 1})
	if err != nil || math.Abs(ps[0].Value-e.Value) > 1e-12 {
		t.Errorf("%g, want %g (%v)", ps[0].Value, e.Value, err)
	}
}

// badTerm breaks one rule at a time.
type badTerm struct {
	what string
}

func (badTerm) Name() string { return "bad" }

func (b badTerm) Bind(context.Context, glm.Source) (glm.Columns, error) {
	fill := func(w glm.Window, hi, lo [][]float64) error {
		for i := range w.Rows {
			switch hi[0][i], lo[0][i] = 1, 0; b.what {
			case "NaN":
				hi[0][i] = math.NaN()
			case "Inf":
				hi[0][i] = math.Inf(1)
			case "error":
				return errors.New("no tide table")
			}
		}
		return nil
	}
	index := func(w glm.Window, column []int32) error {
		for i := range w.Rows {
			column[i] = 7
		}
		return nil
	}
	switch b.what {
	case "bind":
		return glm.Columns{}, errors.New("no tide table")
	case "no names":
		return glm.Columns{Fill: fill}, nil
	case "both":
		return glm.Columns{Names: []string{"c"}, Fill: fill, Index: index}, nil
	case "neither":
		return glm.Columns{Names: []string{"c"}}, nil
	case "value alone":
		return glm.Columns{Names: []string{"c"}, Fill: fill, Value: func(glm.Window, []float64, []float64) error { return nil }}, nil
	case "index":
		return glm.Columns{Names: []string{"c", "d"}, Index: index}, nil
	}
	return glm.Columns{Names: []string{"c"}, Fill: fill}, nil
}

// TestBadTerms: what a user's term does wrong is a typed error that names it.
func TestBadTerms(t *testing.T) {
	ctx := context.Background()
	d := field(84, 10).data(t)
	for _, what := range []string{"bind", "no names", "both", "neither", "value alone", "index", "error", "NaN", "Inf"} {
		m, err := glm.Normal(ctx, d, "y", []glm.Term{one, badTerm{what}}, nil)
		if err == nil {
			_, err = m.Fit(ctx, nil)
		}
		var te *glm.TermError
		var ce *glm.ColumnError
		if !(errors.As(err, &te) && te.Term == "bad" || errors.As(err, &ce) && ce.Column == "c") {
			t.Errorf("%s: %v", what, err)
		}
		if testing.Verbose() {
			fmt.Println(what+":", err)
		}
	}
}

// TestTwoTermsOfOneName: Without does not guess which of two terms is meant.
func TestTwoTermsOfOneName(t *testing.T) {
	p := field(85, 20)
	for i := range p.x {
		p.x[i] = math.Round(p.x[i])
	}
	m := model(t, p.data(t), nil, one, cx, glm.Factor{Field: "x"})
	if _, err := m.Without("x"); !errors.Is(err, glm.ErrTerm) {
		t.Errorf("%v", err)
	}
	if w, err := m.Without("constant"); err != nil || len(w.Terms()) != 2 {
		t.Errorf("%v", err)
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
		{[]lrt.Restriction{lrt.Fix("a=q", 1)}, glm.ErrNotEstimable},
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

// TestConstantField: a field of one value is one with the constant: the later of
// them is set aside, and called collinear, not empty.
func TestConstantField(t *testing.T) {
	p := field(89, 30)
	five, moved := make([]float64, 30), make([]float64, 30)
	for i := range five {
		five[i], moved[i] = 5, p.x[i]+3
	}
	for i := range moved {
		moved[i] = math.Round(p.x[i]*64)/64 + 1000
		p.x[i] = moved[i] - 3
	}
	d, err := p.data(t).With(glm.Numbers("five", five), glm.Numbers("moved", moved))
	if err != nil {
		t.Fatal(err)
	}
	c5, cm := glm.Covariate{Field: "five"}, glm.Covariate{Field: "moved"}
	for _, c := range []struct {
		terms []glm.Term
		aside string
	}{
		{[]glm.Term{one, c5, cx}, "five"},
		{[]glm.Term{c5, one, cx}, "constant"},
		{[]glm.Term{cx, c5, one}, "constant"},
		{[]glm.Term{one, cx, cm}, "moved"},
		{[]glm.Term{cx, cm, one}, "constant"},
		{[]glm.Term{cx, one, cm}, "moved"},
		{[]glm.Term{glm.Powers{Field: "x", Degree: 2}, c5, one}, "constant"},
	} {
		f := fitted(t, model(t, d, nil, c.terms...))
		mean := fitted(t, model(t, d, nil, one))
		if relative(f.TotalSS, mean.RSS) > 1e-12 || !(f.RSquared > 0 && f.RSquared < 1) {
			t.Errorf("%s: total %g, want %g; R² %g", f.Model, f.TotalSS, mean.RSS, f.RSquared)
		}
		var aside []string
		for _, co := range f.Coefficients {
			if co.Aliased {
				aside = append(aside, co.Name)
			}
		}
		if !slices.Equal(aside, []string{c.aside}) || hasCode(f.Warnings, "empty") || hasCode(f.Warnings, "collinear") != (c.aside != "constant") {
			t.Errorf("%s: %v set aside, want %s; warnings %v", f.Model, aside, c.aside, f.Warnings)
		}
	}
}
