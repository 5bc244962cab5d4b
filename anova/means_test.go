package anova_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

func means(t testing.TB, m *glm.Model, o *anova.MeansOptions, factors ...string) *anova.Groups {
	t.Helper()
	g, err := anova.Means(context.Background(), m, factors, o, nil)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func family(t testing.TB, g *anova.Groups, cs []anova.Contrast, m anova.Method, level float64) anova.Family {
	t.Helper()
	f, err := g.Test(context.Background(), cs, m, &lrt.Settings{Level: level})
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range f.Lines() {
		r, err := l.Row.Result()
		if err != nil {
			continue
		}
		// The comparison and the estimate are one test.
		if x := r.Exact.Statistic; math.Abs(x-l.Estimate.T*l.Estimate.T) > 1e-10*x+1e-18 {
			t.Errorf("%s: F = %.17g, t² = %.17g", l.Name, x, l.Estimate.T*l.Estimate.T)
		}
	}
	return f
}

func groupField(s string, order []string) string {
	for _, name := range order {
		if name != s {
			return name
		}
	}
	return ""
}

func TestPublishedMeans(t *testing.T) {
	ctx := context.Background()
	for _, id := range []string{"oneway-coagulation", "oneway-doughnut-fats", "oneway-ehandbook", "oneway-etch-rate", "oneway-tablets",
		"mc-ehandbook", "mc-etch-rate", "mc-package-unequal"} {
		s, d := load(t, id)
		group := groupField("y", s.Order)
		cs, err := anova.OneWay(ctx, d, "y", group, nil)
		tab := tabulate(t, cs, err)
		g := means(t, tab.Model(), nil, group)
		e, _ := tab.Error()
		list := g.List()
		// Lists of the files follow the sorted groups.
		slices.SortFunc(list, func(a, b anova.Group) int {
			x, err1 := strconv.ParseFloat(a.Name, 64)
			y, err2 := strconv.ParseFloat(b.Name, 64)
			if err1 == nil && err2 == nil {
				return int(x - y)
			}
			return strings.Compare(a.Name, b.Name)
		})
		for i, q := range list {
			against(t, s, "means", i, q.Raw.Mean, 1e-13)
			against(t, s, "means", i, q.Adjusted.Value, 1e-13)
			if s.Has("variances") {
				against(t, s, "variances", i, q.Raw.SD*q.Raw.SD, 1e-12)
			}
			if want := math.Sqrt(e.MeanSquare / q.N); math.Abs(q.Adjusted.SE-want) > 1e-12*want {
				t.Errorf("%s: SE of %s %g, want %g", id, q.Name, q.Adjusted.SE, want)
			}
			if want := q.Raw.SD / math.Sqrt(q.N); math.Abs(q.Raw.SE-want) > 1e-12*want {
				t.Errorf("%s: raw SE of %s %g, want %g", id, q.Name, q.Raw.SE, want)
			}
		}
	}
	s, d := load(t, "ancova-leprosy")
	cs, err := anova.OneWay(ctx, d, "y", "drug", &anova.Options{Covariates: []string{"pre"}})
	for i, q := range means(t, tabulate(t, cs, err).Model(), nil, "drug").List() {
		against(t, s, "adjusted_means", i, q.Adjusted.Value, 1e-12)
	}
}

// TestPublishedEffects: an effect of a factor of two levels is the mean at the
// high level less the mean at the low one, an interaction half the difference of effects.
func TestPublishedEffects(t *testing.T) {
	ctx := context.Background()
	for _, c := range []struct {
		id      string
		factors []string
	}{
		{"2k-filtration", []string{"A", "B", "C", "D"}},
		{"2k-pilot-plant", []string{"T", "C", "K"}},
		{"2k-reactant", []string{"A", "B"}},
	} {
		s, d := load(t, c.id)
		cs, err := anova.Crossed(ctx, d, "y", c.factors, nil)
		tab := tabulate(t, cs, err)
		g := means(t, tab.Model(), nil, c.factors...)
		var contrasts []anova.Contrast
		for _, name := range s.EffectNames {
			w := make([]float64, len(g.List()))
			for i, q := range g.List() {
				w[i] = 2 / float64(len(w))
				for k, f := range c.factors {
					high := q.Levels[k] == "1" || q.Levels[k] == "180" || q.Levels[k] == "40"
					if slices.Contains(strings.Split(name, "×"), f) && !high {
						w[i] = -w[i]
					}
				}
			}
			contrasts = append(contrasts, anova.Contrast{Name: name, Weights: w})
		}
		f := family(t, g, contrasts, anova.Unadjusted, 0.95)
		for i, l := range f.Lines() {
			against(t, s, "effects", i, l.Estimate.Value, 1e-12)
		}
	}
}

func TestPublishedComparisons(t *testing.T) {
	ctx := context.Background()
	for _, id := range []string{"mc-ehandbook", "mc-etch-rate", "mc-package-unequal"} {
		s, d := load(t, id)
		group := groupField("y", s.Order)
		cs, err := anova.OneWay(ctx, d, "y", group, nil)
		tab := tabulate(t, cs, err)
		g := means(t, tab.Model(), nil, group)
		f := family(t, g, g.Pairs(), anova.Bonferroni, 0.95)
		for i, l := range f.Lines() {
			against(t, s, "differences_second_minus_first", i, l.Estimate.Value, 1e-12)
		}
		f = family(t, g, g.Pairs(), anova.Tukey, 0.95)
		if f.Approximate() != (id == "mc-package-unequal") {
			t.Errorf("%s: approximate %v", id, f.Approximate())
		}
		for i, l := range f.Lines() {
			against(t, s, "tukey_half_widths", i, l.Upper-l.Estimate.Value, 1e-9)
			against(t, s, "tukey_lower", i, l.Lower, 1e-8)
			against(t, s, "tukey_upper", i, l.Upper, 1e-8)
			against(t, s, "tukey_adjusted_p", i, l.AdjustedP, 1e-9)
		}
		r, _ := tab.Row(group)
		if a, b := f.AllEqual().Test().Statistic, r.Test().Statistic; math.Abs(a-b) > 1e-12*b {
			t.Errorf("%s: all equal has F = %g, the table %g", id, a, b)
		}
		var extra struct {
			Scheffe [][]string `json:"scheffe_contrasts"`
		}
		if err := s.Decode(&extra); err != nil {
			t.Fatal(err)
		}
		if extra.Scheffe == nil {
			continue
		}
		level := 0.95
		if s.Has("scheffe_multiplier_0.10") {
			level = 0.90
		}
		var contrasts []anova.Contrast
		for i, text := range extra.Scheffe {
			c := anova.Contrast{Name: fmt.Sprint(i)}
			for _, x := range text {
				v, err := strconv.ParseFloat(x, 64)
				if err != nil {
					t.Fatal(err)
				}
				c.Weights = append(c.Weights, v)
			}
			contrasts = append(contrasts, c)
		}
		f = family(t, g, contrasts, anova.Scheffe, level)
		for i, l := range f.Lines() {
			against(t, s, "scheffe_estimates", i, l.Estimate.Value, 1e-12)
			against(t, s, "scheffe_se", i, l.Estimate.SE, 1e-12)
			against(t, s, "scheffe_half_widths", i, l.Upper-l.Estimate.Value, 1e-9)
			against(t, s, "scheffe_adjusted_p", i, l.AdjustedP, 1e-9)
			against(t, s, fmt.Sprintf("scheffe_multiplier_%.2f", 1-level), 0, (l.Upper-l.Lower)/2/l.Estimate.SE, 1e-9)
		}
	}
}

// TestMultiplicity: adjusted p by the definitions, raw p kept.
func TestMultiplicity(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(9, 45)
	cs, err := anova.Crossed(ctx, tr.data(t), "y", []string{"a", "b"}, nil)
	g := means(t, tabulate(t, cs, err).Model(), nil, "a", "b")
	pairs := g.Pairs()
	raw := family(t, g, pairs, anova.Unadjusted, 0.95)
	bon := family(t, g, pairs, anova.Bonferroni, 0.95)
	holm := family(t, g, pairs, anova.Holm, 0.95)
	sch := family(t, g, pairs, anova.Scheffe, 0.95)
	tuk := family(t, g, pairs, anova.Tukey, 0.95)
	m := float64(len(pairs))
	for i, l := range raw.Lines() {
		for _, f := range []anova.Family{bon, holm, sch, tuk} {
			x := f.Lines()[i]
			if x.P != l.P || x.Estimate != l.Estimate {
				t.Errorf("%v changed a raw result", f.Method())
			}
			if x.AdjustedP < x.P || x.Lower > l.Estimate.Lower || x.Upper < l.Estimate.Upper {
				t.Errorf("%v: %s: adjusted p %g below raw %g, or a narrower interval", f.Method(), l.Name, x.AdjustedP, x.P)
			}
		}
		b, h := bon.Lines()[i], holm.Lines()[i]
		if want := math.Min(1, m*l.P); math.Abs(b.AdjustedP-want) > 1e-13*want {
			t.Errorf("Bonferroni %g, want %g", b.AdjustedP, want)
		}
		if x := tuk.Lines()[i]; x.AdjustedP > sch.Lines()[i].AdjustedP || x.AdjustedP > b.AdjustedP*(1+1e-12) {
			t.Errorf("Tukey %g above Scheffé %g or Bonferroni %g", x.AdjustedP, sch.Lines()[i].AdjustedP, b.AdjustedP)
		}
		if h.AdjustedP > b.AdjustedP {
			t.Errorf("Holm %g above Bonferroni %g", h.AdjustedP, b.AdjustedP)
		}
		// An interval excludes the null value exactly where the adjusted p is below 1 − level.
		for _, f := range []anova.Family{bon, sch, tuk} {
			x := f.Lines()[i]
			if (x.AdjustedP < 0.05) != (x.Lower > 0 || x.Upper < 0) {
				t.Errorf("%v: %s: adjusted p %g and interval %g to %g disagree", f.Method(), x.Name, x.AdjustedP, x.Lower, x.Upper)
			}
		}
	}
	// The contrast with the largest F has the Scheffé p of the overall test.
	best := make([]float64, len(g.List()))
	grand, n := 0.0, 0.0
	for _, q := range g.List() {
		grand, n = grand+q.N*q.Raw.Mean, n+q.N
	}
	sum := 0.0
	for i, q := range g.List() {
		best[i] = q.N * (q.Raw.Mean - grand/n)
		sum += best[i]
	}
	best[0] -= sum
	f := family(t, g, []anova.Contrast{{Name: "best", Weights: best}}, anova.Scheffe, 0.95)
	if a, b := f.Lines()[0].AdjustedP, f.AllEqual().Test().P; math.Abs(a-b) > 1e-9*b {
		t.Errorf("largest contrast: p = %g, all equal %g", a, b)
	}
}

// TestMeansInvariance: coding, row order and constants added do not matter; a
// contrast does not see a large common mean.
func TestMeansInvariance(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(2, 40)
	base := func(tr trial) anova.Family {
		cs, err := anova.Crossed(ctx, tr.data(t), "y", []string{"a", "b"}, &anova.Options{Covariates: []string{"x"}})
		g := means(t, tabulate(t, cs, err).Model(), nil, "a")
		third := 1.0 / 3
		return family(t, g, append(g.Pairs(), anova.Contrast{Name: "thirds", Weights: []float64{third, third, -2 * third}}), anova.Scheffe, 0.95)
	}
	f := base(tr)
	shifted := tr
	shifted.y = slices.Clone(tr.y)
	for i := range shifted.y {
		shifted.y[i] = math.Round(tr.y[i]*1024)/1024 + 1<<30
	}
	rounded := tr
	rounded.y = slices.Clone(tr.y)
	for i := range rounded.y {
		rounded.y[i] = math.Round(tr.y[i]*1024) / 1024
	}
	a, b := base(rounded), base(shifted)
	for i, l := range a.Lines() {
		x := b.Lines()[i]
		if math.Abs(x.Estimate.Value-l.Estimate.Value) > 1e-11*math.Abs(l.Estimate.Value) || math.Abs(x.AdjustedP-l.AdjustedP) > 1e-9*l.AdjustedP {
			t.Errorf("%s: %g (p %g); with 2^30 added %g (p %g)", l.Name, l.Estimate.Value, l.AdjustedP, x.Estimate.Value, x.AdjustedP)
		}
	}
	if len(f.Lines()) != 4 || f.Dimension() != 2 {
		t.Errorf("%d lines of %g dimensions", len(f.Lines()), f.Dimension())
	}
}

func TestMeansOfEmptyCells(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(1, 36)
	d, err := tr.data(t).Where("a2 b1 left out", func(i int) bool { return tr.a[i] != "a2" || tr.b[i] != "b1" })
	if err != nil {
		t.Fatal(err)
	}
	cs, err := anova.Crossed(ctx, d, "y", []string{"a", "b"}, nil)
	full := tabulate(t, cs, err).Model()
	g := means(t, full, nil, "a")
	q, _ := g.Group("a2")
	if !errors.Is(q.Err, glm.ErrNotEstimable) || !math.IsNaN(q.Adjusted.Value) || math.IsNaN(q.Raw.Mean) {
		t.Errorf("a2 averaged over b with an empty cell: %+v", q)
	}
	f := family(t, g, g.Pairs(), anova.Bonferroni, 0.95)
	l, _ := f.Line("a2 − a0")
	if !errors.Is(l.Row.Err(), glm.ErrNotEstimable) {
		t.Errorf("a2 − a0: %v", l.Row.Err())
	}
	if l, _ = f.Line("a1 − a0"); l.Row.Err() != nil || math.Abs(l.AdjustedP-l.P) > 1e-15 {
		t.Errorf("a1 − a0 is the only contrast that counts: p %g, adjusted %g, %v", l.P, l.AdjustedP, l.Row.Err())
	}
	for _, s := range []string{g.String(), f.String()} {
		if !strings.Contains(s, "not estimable") || strings.Contains(s, "NaN") {
			t.Errorf("report:\n%s", s)
		}
	}
	// Without the interaction the cell's mean is known.
	cs, err = anova.Crossed(ctx, d, "y", []string{"a", "b"}, &anova.Options{Order: 1})
	for _, q := range means(t, tabulate(t, cs, err).Model(), nil, "a", "b").List() {
		if q.Err != nil {
			t.Errorf("%s: %v", q.Name, q.Err)
		}
	}
}

func TestObservedWeights(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(6, 31)
	cs, err := anova.Crossed(ctx, tr.data(t), "y", []string{"a", "b"}, nil)
	m := tabulate(t, cs, err).Model()
	cells := means(t, m, nil, "a", "b").List()
	nb := map[string]float64{}
	for _, q := range cells {
		nb[q.Levels[1]] += q.N
	}
	for i, g := range means(t, m, &anova.MeansOptions{Observed: true}, "a").List() {
		want, equal := 0.0, 0.0
		for _, q := range cells[2*i : 2*i+2] {
			want += q.Raw.Mean * nb[q.Levels[1]] / float64(len(tr.y))
			equal += q.Raw.Mean / 2
		}
		if math.Abs(g.Adjusted.Value-want) > 1e-12*want {
			t.Errorf("%s: %g, want %g", g.Name, g.Adjusted.Value, want)
		}
		if e := means(t, m, nil, "a").List()[i].Adjusted.Value; math.Abs(e-equal) > 1e-12*equal {
			t.Errorf("%s, equal weights: %g, want %g", g.Name, e, equal)
		}
	}
}

func TestMeansErrors(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(1, 30)
	d := tr.data(t)
	cs, err := anova.Crossed(ctx, d, "y", []string{"a", "b"}, &anova.Options{Covariates: []string{"x"}})
	m := tabulate(t, cs, err).Model()
	at := func(m *glm.Model, o *anova.MeansOptions, f ...string) error {
		_, err := anova.Means(ctx, m, f, o, nil)
		return err
	}
	g := means(t, m, nil, "a")
	test := func(cs ...anova.Contrast) error {
		_, err := g.Test(ctx, cs, anova.Bonferroni, nil)
		return err
	}
	_, control := g.AgainstControl("nobody")
	_, method := g.Test(ctx, g.Pairs(), 77, nil)
	_, tukey := g.Test(ctx, []anova.Contrast{{Name: "c", Weights: []float64{1, 1, -2}}}, anova.Tukey, nil)
	_, level := g.Test(ctx, g.Pairs(), anova.Holm, &lrt.Settings{Level: -1})
	for _, c := range []struct {
		name string
		err  error
		want error
	}{
		{"no model", at(nil, nil, "a"), anova.ErrLayout},
		{"no factor", at(m, nil), anova.ErrLayout},
		{"unknown factor", at(m, nil, "x"), anova.ErrLayout},
		{"twice", at(m, nil, "a", "a"), anova.ErrLayout},
		{"unknown covariate", at(m, &anova.MeansOptions{At: map[string]float64{"z": 1}}, "a"), anova.ErrLayout},
		{"covariate NaN", at(m, &anova.MeansOptions{At: map[string]float64{"x": math.NaN()}}, "a"), anova.ErrLayout},
		{"no contrasts", test(), anova.ErrFamily},
		{"length", test(anova.Contrast{Name: "c", Weights: []float64{1, -1}}), anova.ErrFamily},
		{"sum", test(anova.Contrast{Name: "c", Weights: []float64{1, -1, 1}}), anova.ErrFamily},
		{"zero", test(anova.Contrast{Name: "c", Weights: []float64{0, 0, 0}}), anova.ErrFamily},
		{"NaN", test(anova.Contrast{Name: "c", Weights: []float64{math.NaN(), 0, 0}}), anova.ErrFamily},
		{"null", test(anova.Contrast{Name: "c", Weights: []float64{1, -1, 0}, Null: math.Inf(1)}), anova.ErrFamily},
		{"name", test(anova.Contrast{Weights: []float64{1, -1, 0}}, anova.Contrast{Weights: []float64{1, 0, -1}}), anova.ErrFamily},
		{"control", control, anova.ErrFamily},
		{"Tukey of no pair", tukey, anova.ErrFamily},
		{"method", method, anova.ErrFamily},
		{"level", level, lrt.ErrInvalid},
	} {
		if !errors.Is(c.err, c.want) {
			t.Errorf("%s: %v, want %v", c.name, c.err, c.want)
		}
	}
}

func TestNullValue(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(5, 40)
	cs, err := anova.OneWay(ctx, tr.data(t), "y", "a", nil)
	g := means(t, tabulate(t, cs, err).Model(), nil, "a")
	p := g.Pairs()[0]
	plain := family(t, g, []anova.Contrast{p}, anova.Unadjusted, 0.95).Lines()[0]
	p.Null = plain.Estimate.Upper
	f := family(t, g, []anova.Contrast{p}, anova.Unadjusted, 0.95)
	if l := f.Lines()[0]; math.Abs(l.P-0.05) > 1e-10 {
		t.Errorf("at the end of the interval p = %.12g, want 0.05", l.P)
	}
	if s := f.String(); !strings.Contains(s, "null value") {
		t.Errorf("the null value is not shown:\n%s", s)
	}
}

// TestPrecisionWeights: weighted means by the formulas Σwy/Σw and √(Σw(y−m)²/(n−1)/Σw)
// (common practice, no source).
func TestPrecisionWeights(t *testing.T) {
	ctx := context.Background()
	y, w := []float64{3, 5, 4, 9, 8, 7.5}, []float64{1, 2, 0, 4, 0.5, 1}
	d, err := glm.NewData(glm.Labels("g", []string{"a", "a", "a", "b", "b", "b"}), glm.Numbers("y", y), glm.Numbers("w", w))
	if err != nil {
		t.Fatal(err)
	}
	o := &anova.Options{Model: &glm.Options{Weights: glm.Weights{Kind: glm.Precision, Field: "w"}}}
	cs, err := anova.OneWay(ctx, d, "y", "g", o)
	tab := tabulate(t, cs, err)
	for k, q := range means(t, tab.Model(), nil, "g").List() {
		sw, swy, n := 0.0, 0.0, 0.0
		for i := 3 * k; i < 3*k+3; i++ {
			if w[i] > 0 {
				sw, swy, n = sw+w[i], swy+w[i]*y[i], n+1
			}
		}
		m := swy / sw
		ss := 0.0
		for i := 3 * k; i < 3*k+3; i++ {
			ss += w[i] * (y[i] - m) * (y[i] - m)
		}
		se := math.Sqrt(ss / (n - 1) / sw)
		if q.N != n || math.Abs(q.Raw.Mean-m) > 1e-14*m || math.Abs(q.Raw.SE-se) > 1e-13*se || math.Abs(q.Adjusted.Value-m) > 1e-14*m {
			t.Errorf("%s: %+v, want n %g, mean %g, SE %g", q.Name, q, n, m, se)
		}
	}
	if e, _ := tab.Error(); e.DF != 3 {
		t.Errorf("error df %g: the row of weight 0 counts", e.DF)
	}
}

// TestScheffeAcrossSets: groups that cannot be compared one by one do not stop the family.
func TestScheffeAcrossSets(t *testing.T) {
	ctx := context.Background()
	d, err := glm.NewData(glm.Labels("a", []string{"1", "1", "2", "2", "3", "3", "4", "4"}),
		glm.Labels("b", []string{"p", "p", "p", "p", "q", "q", "q", "q"}),
		glm.Numbers("y", []float64{1, 2, 4, 5, 9, 7, 3, 1}))
	if err != nil {
		t.Fatal(err)
	}
	cs, err := anova.Crossed(ctx, d, "y", []string{"a", "b"}, &anova.Options{Order: 1})
	g := means(t, tabulate(t, cs, err).Model(), nil, "a")
	f := family(t, g, g.Pairs(), anova.Scheffe, 0.95)
	if f.Dimension() != 2 {
		t.Errorf("dimension %g, want 2: levels 1, 2 and 3, 4 of a can be compared, not across b", f.Dimension())
	}
	for _, l := range f.Lines() {
		within := l.Name == "2 − 1" || l.Name == "4 − 3"
		if (l.Row.Err() == nil) != within {
			t.Errorf("%s: %v", l.Name, l.Row.Err())
		}
		if within && !(l.AdjustedP > l.P) {
			t.Errorf("%s: p %g, adjusted %g", l.Name, l.P, l.AdjustedP)
		}
	}
}
