package anova_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// trial is an unbalanced layout of two factors and a covariate.
type trial struct {
	a, b []string
	x, y []float64
}

func newTrial(seed uint64, n int) trial {
	r := rand.New(rand.NewPCG(seed, 1))
	var t trial
	for i := range n {
		a, b := i%3, r.IntN(2)
		if i < 6 {
			b = i / 3 // all cells filled
		}
		t.a, t.b = append(t.a, fmt.Sprint("a", a)), append(t.b, fmt.Sprint("b", b))
		x := r.NormFloat64()
		t.x = append(t.x, x)
		t.y = append(t.y, 10+float64(a)-0.5*float64(b)+0.3*float64(a*b)+0.4*x+r.NormFloat64())
	}
	return t
}

func (tr trial) data(t testing.TB) *glm.Data {
	t.Helper()
	d, err := glm.NewData(glm.Labels("a", tr.a), glm.Labels("b", tr.b), glm.Numbers("x", tr.x), glm.Numbers("y", tr.y))
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func (tr trial) table(t testing.TB, o *anova.Options) anova.Table {
	t.Helper()
	cs, err := anova.Crossed(context.Background(), tr.data(t), "y", []string{"a", "b"}, o)
	return tabulate(t, cs, err)
}

// sameTests compares the tests of two tables row by row.
func sameTests(t *testing.T, what string, a, b anova.Table, tolerance float64) {
	t.Helper()
	for i, r := range a.Rows() {
		s := b.Rows()[i]
		x, y := r.Test(), s.Test()
		if r.Name() != s.Name() || math.Abs(x.Statistic-y.Statistic) > tolerance*math.Abs(x.Statistic) || math.Abs(x.P-y.P) > 10*tolerance*x.P {
			t.Errorf("%s: %s: F = %.17g, p = %.17g; before %.17g, %.17g", what, r.Name(), y.Statistic, y.P, x.Statistic, x.P)
		}
	}
}

func TestInvariance(t *testing.T) {
	for _, dec := range []anova.Decomposition{anova.Sequential, anova.Hierarchical, anova.Partial} {
		o := &anova.Options{Decomposition: dec, Covariates: []string{"x"}}
		for seed := range uint64(5) {
			tr := newTrial(seed, 40)
			base := tr.table(t, o)

			order := rand.New(rand.NewPCG(seed, 2)).Perm(len(tr.y))
			var p trial
			for _, i := range order {
				p.a, p.b, p.x, p.y = append(p.a, tr.a[i]), append(p.b, tr.b[i]), append(p.x, tr.x[i]), append(p.y, tr.y[i])
			}
			sameTests(t, fmt.Sprint(dec, " rows in another order"), base, p.table(t, o), 1e-12)

			for _, k := range []float64{1e-290, 3, 1e290} {
				s := tr
				s.y = slices.Clone(tr.y)
				for i := range s.y {
					s.y[i] *= k
				}
				sameTests(t, fmt.Sprint(dec, " response times ", k), base, s.table(t, o), 1e-12)
			}
			s := tr
			s.y = slices.Clone(tr.y)
			for i := range s.y {
				s.y[i] += 1024
			}
			sameTests(t, fmt.Sprint(dec, " response plus 1024"), base, s.table(t, o), 1e-10)

			// Names and order of levels are coding only.
			c := tr
			c.a = slices.Clone(tr.a)
			for i := range c.a {
				c.a[i] = map[string]string{"a0": "z", "a1": "k", "a2": "c"}[tr.a[i]]
			}
			d, err := glm.NewData(glm.Labels("a", c.a).Order("c", "k", "z"), glm.Labels("b", c.b), glm.Numbers("x", c.x), glm.Numbers("y", c.y))
			if err != nil {
				t.Fatal(err)
			}
			cs, err := anova.Crossed(context.Background(), d, "y", []string{"a", "b"}, o)
			sameTests(t, fmt.Sprint(dec, " other coding"), base, tabulate(t, cs, err), 1e-12)
		}
	}
}

// TestAdditive: the sequential sums of squares add up, and without interactions
// partial, hierarchical and last-in-sequence are one question.
func TestAdditive(t *testing.T) {
	for seed := range uint64(10) {
		tr := newTrial(seed, 30)
		seq := tr.table(t, nil)
		w, ok := seq.Whole()
		if !ok {
			t.Fatal("no whole row")
		}
		sum := 0.0
		for _, r := range seq.Rows() {
			sum += r.SS()
		}
		if math.Abs(sum-w.SS()) > 1e-12*w.SS() {
			t.Errorf("seed %d: rows add up to %.17g, the model has %.17g", seed, sum, w.SS())
		}
		hier := tr.table(t, &anova.Options{Order: 1, Decomposition: anova.Hierarchical})
		part := tr.table(t, &anova.Options{Order: 1, Decomposition: anova.Partial})
		sameTests(t, "partial beside hierarchical", hier, part, 1e-11)
		full := tr.table(t, &anova.Options{Decomposition: anova.Partial})
		a, b := full.Rows()[2].Test(), seq.Rows()[2].Test()
		if math.Abs(a.Statistic-b.Statistic) > 1e-11*b.Statistic {
			t.Errorf("seed %d: interaction partial %g, sequential %g", seed, a.Statistic, b.Statistic)
		}
	}
}

// TestPartialByMeans: with one covariate-free cell layout the partial hypothesis of a factor of two
// levels is a contrast of unweighted cell means, whose sum of squares the
// textbooks give as c²/Σ(w²/n) (common practice, no source).
func TestPartialByMeans(t *testing.T) {
	tr := newTrial(3, 33)
	sum, n := map[string]float64{}, map[string]float64{}
	for i, y := range tr.y {
		k := tr.a[i] + tr.b[i]
		sum[k] += y
		n[k]++
	}
	c, v := 0.0, 0.0
	for k, s := range sum {
		w := 1.0
		if strings.HasSuffix(k, "b1") {
			w = -1
		}
		c += w * s / n[k]
		v += 1 / n[k]
	}
	tab := tr.table(t, &anova.Options{Decomposition: anova.Partial})
	r, _ := tab.Row("b")
	if want := c * c / v; math.Abs(r.SS()-want) > 1e-11*want {
		t.Errorf("SS = %.17g, from cell means %.17g", r.SS(), want)
	}
}

func TestEmptyCell(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(1, 36)
	d, err := tr.data(t).Where("a2 b1 left out", func(i int) bool { return tr.a[i] != "a2" || tr.b[i] != "b1" })
	if err != nil {
		t.Fatal(err)
	}
	cs, err := anova.Crossed(ctx, d, "y", []string{"a", "b"}, &anova.Options{Decomposition: anova.Hierarchical})
	tab := tabulate(t, cs, err)
	r, _ := tab.Row("a × b")
	if d1, _ := r.DF(); r.Err() != nil || d1 != 1 {
		t.Errorf("interaction of 3 × 2 with one empty cell: %g degrees of freedom, want 1 (5 filled cells less the rank 4 of a + b); %v", d1, r.Err())
	}
	cs, err = anova.Crossed(ctx, d, "y", []string{"a", "b"}, &anova.Options{Decomposition: anova.Partial})
	tab = tabulate(t, cs, err)
	for _, r := range tab.Rows() {
		var e *anova.EmptyCellsError
		if !errors.As(r.Err(), &e) || !errors.Is(r.Err(), anova.ErrEmptyCells) || !errors.Is(r.Err(), glm.ErrNotEstimable) || !slices.Equal(e.Cells, []string{"a=a2 × b=b1"}) {
			t.Errorf("%s: %v", r.Name(), r.Err())
		}
		if _, err := r.Comparison().Run(ctx, nil); !errors.Is(err, anova.ErrEmptyCells) {
			t.Errorf("%s run again: %v", r.Name(), err)
		}
	}
	if s := tab.String(); !strings.Contains(s, "a=a2 × b=b1") || strings.Contains(s, "NaN") {
		t.Errorf("the table does not name the cell:\n%s", s)
	}
}

// TestConfounded: two factors whose cells lie on a diagonal leave nothing of the second.
func TestConfounded(t *testing.T) {
	d, err := glm.NewData(
		glm.Labels("a", []string{"1", "1", "2", "2", "3", "3"}),
		glm.Labels("b", []string{"p", "p", "q", "q", "r", "r"}),
		glm.Numbers("y", []float64{1, 2, 4, 5, 9, 7}))
	if err != nil {
		t.Fatal(err)
	}
	cs, err := anova.Crossed(context.Background(), d, "y", []string{"a", "b"}, nil)
	tab := tabulate(t, cs, err)
	r, _ := tab.Row("b")
	var e *anova.EmptyCellsError
	if !errors.Is(r.Err(), lrt.ErrNothingTested) || !errors.As(r.Err(), &e) || len(e.Cells) != 6 {
		t.Errorf("confounded factor: %v", r.Err())
	}
	if s := tab.String(); !strings.Contains(s, "not estimable") {
		t.Errorf("table:\n%s", s)
	}
	if a, _ := tab.Row("a"); a.Err() != nil {
		t.Error(a.Err())
	}
}

func TestEdges(t *testing.T) {
	ctx := context.Background()
	data := func(y []float64, g ...string) *glm.Data {
		d, err := glm.NewData(glm.Labels("g", g), glm.Numbers("y", y))
		if err != nil {
			t.Fatal(err)
		}
		return d
	}
	for _, c := range []struct {
		name string
		d    *glm.Data
		want error
		text string
	}{
		{"constant response", data([]float64{5, 5, 5, 5}, "a", "a", "b", "b"), lrt.ErrNoVariation, "nothing varies"},
		{"constant response that float64 rounds", data([]float64{0.1, 0.1, 0.1, 0.1}, "a", "a", "b", "b"), lrt.ErrNoVariation, "nothing varies"},
		{"a row in each group", data([]float64{1, 2, 4}, "a", "b", "c"), lrt.ErrNoErrorDF, "no error df"},
		{"one group", data([]float64{1, 2, 4}, "a", "a", "a"), lrt.ErrNothingTested, "nothing to test"},
		{"one row", data([]float64{1}, "a"), lrt.ErrNothingTested, "nothing to test"},
		{"perfect fit", data([]float64{1, 1, 2, 2}, "a", "a", "b", "b"), nil, "0 (perfect fit)"},
	} {
		for _, dec := range []anova.Decomposition{anova.Sequential, anova.Hierarchical, anova.Partial} {
			cs, err := anova.OneWay(ctx, c.d, "y", "g", &anova.Options{Decomposition: dec})
			tab := tabulate(t, cs, err)
			r := tab.Rows()[0]
			if !errors.Is(r.Err(), c.want) {
				t.Errorf("%s, %v: %v, want %v", c.name, dec, r.Err(), c.want)
			}
			s := tab.String()
			if !strings.Contains(s, c.text) || strings.Contains(s, "NaN") || strings.Contains(s, "0.000\n") {
				t.Errorf("%s, %v:\n%s", c.name, dec, s)
			}
			var b strings.Builder
			if err := tab.WriteJSON(&b); err != nil {
				t.Errorf("%s: %v", c.name, err)
			}
		}
	}
}

func TestLayoutErrors(t *testing.T) {
	ctx := context.Background()
	d := newTrial(1, 20).data(t)
	crossed := func(o *anova.Options, f ...string) error {
		_, err := anova.Crossed(ctx, d, "y", f, o)
		return err
	}
	terms := func(o *anova.Options, ts ...glm.Term) error {
		_, err := anova.Terms(ctx, d, "y", ts, o)
		return err
	}
	var col *glm.ColumnError
	for _, c := range []struct {
		name string
		err  error
		want error
	}{
		{"no factors", crossed(nil), anova.ErrLayout},
		{"twice", crossed(nil, "a", "a"), anova.ErrLayout},
		{"covariate and factor", crossed(&anova.Options{Covariates: []string{"a"}}, "a"), anova.ErrLayout},
		{"order", crossed(&anova.Options{Order: 3}, "a", "b"), anova.ErrLayout},
		{"negative order", crossed(&anova.Options{Order: -1}, "a", "b"), anova.ErrLayout},
		{"decomposition", crossed(&anova.Options{Decomposition: 9}, "a"), anova.ErrLayout},
		{"unknown factor", crossed(nil, "nosuch"), glm.ErrUnknownColumn},
		{"unknown factor, partial", crossed(&anova.Options{Decomposition: anova.Partial}, "a", "nosuch"), glm.ErrUnknownColumn},
		{"covariate of labels", crossed(&anova.Options{Covariates: []string{"b"}}, "a"), glm.ErrNotNumeric},
		{"no terms", terms(nil), anova.ErrLayout},
		{"nil term", terms(nil, nil), anova.ErrLayout},
		{"constant only", terms(nil, glm.Constant{}), anova.ErrLayout},
		{"partial terms", terms(&anova.Options{Decomposition: anova.Partial}, glm.Factor{Field: "a"}), anova.ErrLayout},
	} {
		if !errors.Is(c.err, c.want) {
			t.Errorf("%s: %v, want %v", c.name, c.err, c.want)
		}
	}
	if err := crossed(nil, "nosuch"); !errors.As(err, &col) || col.Column != "nosuch" {
		t.Errorf("unknown factor: %v", err)
	}
	if _, err := anova.Tabulate(ctx, nil, nil); !errors.Is(err, anova.ErrLayout) {
		t.Errorf("no comparisons: %v", err)
	}
	cs, err := anova.OneWay(ctx, d, "y", "a", nil)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := anova.Tabulate(ctx, cs, &lrt.Settings{Level: 2}); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("level 2: %v", err)
	}
	gone, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := anova.Tabulate(gone, cs, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// Rows on other observations cannot stand in one table.
	other, err := anova.OneWay(ctx, newTrial(2, 20).data(t), "y", "a", nil)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := anova.Tabulate(ctx, append(cs, other...), nil); !errors.Is(err, lrt.ErrDifferentObservations) {
		t.Errorf("two data sets: %v", err)
	}
}

// TestRowsKeepErrors: a comparison that is at fault is a row, and the others stand.
func TestRowsKeepErrors(t *testing.T) {
	ctx := context.Background()
	d := newTrial(1, 30).data(t)
	cs, err := anova.Crossed(ctx, d, "y", []string{"a", "b"}, nil)
	if err != nil {
		t.Fatal(err)
	}
	swapped := lrt.Comparison{Name: "swapped", Restricted: cs[1].Full, Full: cs[1].Restricted, Error: cs[1].Error}
	tab, err := anova.Tabulate(ctx, append(cs, swapped, lrt.Comparison{Name: "nothing"}), nil)
	if err != nil {
		t.Fatal(err)
	}
	if r, _ := tab.Row("swapped"); !errors.Is(r.Err(), lrt.ErrNotNested) {
		t.Errorf("swapped: %v", r.Err())
	}
	if r, _ := tab.Row("nothing"); !errors.Is(r.Err(), lrt.ErrInvalid) {
		t.Errorf("nothing: %v", r.Err())
	}
	if r, _ := tab.Row("a"); r.Err() != nil {
		t.Error(r.Err())
	}
	if s := tab.String(); !strings.Contains(s, "not tested") {
		t.Errorf("table:\n%s", s)
	}
}

func TestWeightsAndOffsets(t *testing.T) {
	ctx := context.Background()
	// A frequency weight of 2 is the row twice.
	tr := newTrial(4, 24)
	w := make([]float64, len(tr.y))
	var twice trial
	for i := range w {
		w[i] = float64(i % 3)
		for range i % 3 {
			twice.a, twice.b, twice.x, twice.y = append(twice.a, tr.a[i]), append(twice.b, tr.b[i]), append(twice.x, tr.x[i]), append(twice.y, tr.y[i])
		}
	}
	d, err := tr.data(t).With(glm.Numbers("w", w))
	if err != nil {
		t.Fatal(err)
	}
	o := &anova.Options{Decomposition: anova.Partial, Order: 1, Model: &glm.Options{Weights: glm.Weights{Kind: glm.Frequency, Field: "w"}}}
	cs, err := anova.Crossed(ctx, d, "y", []string{"b"}, o)
	weighted := tabulate(t, cs, err)
	cs, err = anova.Crossed(ctx, twice.data(t), "y", []string{"b"}, &anova.Options{Decomposition: anova.Partial})
	plain := tabulate(t, cs, err)
	sameTests(t, "frequency weights", plain, weighted, 1e-12)
	a, _ := weighted.Total()
	b, _ := plain.Total()
	if math.Abs(a.SS-b.SS) > 1e-12*b.SS || a.DF != b.DF {
		t.Errorf("totals %v and %v", a, b)
	}
	// Regression through the origin has its total about zero.
	cs, err = anova.Terms(ctx, d, "y", []glm.Term{glm.Covariate{Field: "x"}}, &anova.Options{NoConstant: true})
	origin := tabulate(t, cs, err)
	sum := 0.0
	for _, y := range tr.y {
		sum += y * y
	}
	if l, _ := origin.Total(); math.Abs(l.SS-sum) > 1e-12*sum || l.DF != float64(len(tr.y)) {
		t.Errorf("total about zero %v, want %g", l, sum)
	}
}

// TestMixedRows: a comparison of declared models stands in a table beside those
// of linear ones; it has no sum of squares, and the table no common error.
func TestMixedRows(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(1, 30)
	d := tr.data(t)
	cs, err := anova.OneWay(ctx, d, "y", "a", nil)
	if err != nil {
		t.Fatal(err)
	}
	counts := []float64{12, 9, 21}
	sample := lrt.Observe(counts, len(counts))
	full, err := lrt.Bind(lrt.Model[[]float64]{Name: "rates",
		Params: []lrt.Param{{Name: "r1", Upper: math.Inf(1)}, {Name: "r2", Upper: math.Inf(1)}, {Name: "r3", Upper: math.Inf(1)}},
		LogLikelihood: func(x, r []float64) float64 {
			l := 0.0
			for i := range x {
				l += x[i]*math.Log(r[i]) - r[i]
			}
			return l
		},
		Start: func(x []float64) []float64 { return []float64{x[0], x[1], x[2]} },
	}, sample)
	if err != nil {
		t.Fatal(err)
	}
	equal, err := lrt.Restrict(full, lrt.Equate("r1", "r2", "r3"))
	if err != nil {
		t.Fatal(err)
	}
	tab, err := anova.Tabulate(ctx, append(cs, lrt.Comparison{Name: "rates", Restricted: equal, Full: full}), nil)
	if err != nil {
		t.Fatal(err)
	}
	r, _ := tab.Row("rates")
	// Σ 2 x log(x/mean), the likelihood ratio of equal Poisson rates (common practice, no source).
	want := 0.0
	for _, x := range counts {
		want += 2 * x * math.Log(x/14)
	}
	if got := r.Test().Statistic; r.Err() != nil || math.Abs(got-want) > 1e-8*want || !math.IsNaN(r.SS()) {
		t.Errorf("rates: %v, −2 log λ = %g, want %g; SS %g", r.Err(), got, want, r.SS())
	}
	if d1, _ := r.DF(); d1 != 2 {
		t.Errorf("%g degrees of freedom", d1)
	}
	if _, ok := tab.Error(); ok {
		t.Error("rows of two kinds have no common error")
	}
	for _, s := range []string{tab.String(), r.String()} {
		if !strings.Contains(s, "χ²") || strings.Contains(s, "NaN") {
			t.Errorf("%s", s)
		}
	}
	if _, err := r.Effect(0); !errors.Is(err, anova.ErrNotARow) {
		t.Errorf("effect size of a likelihood comparison: %v", err)
	}
	if want := "a: F(2, 27) = 10.1508, p = 0.0005159 (exact); y by constant, against y by constant + a"; tab.Rows()[0].String() != want {
		t.Errorf("%s, want %s", tab.Rows()[0], want)
	}
}
