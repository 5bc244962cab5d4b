package anova_test

import (
	"context"
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/internal/published"
	"subsume.example/lrt"
)

// load makes data of a published set; its file names the source.
func load(t testing.TB, id string) (*published.Set, *glm.Data) {
	t.Helper()
	s, err := published.Load(id)
	if err != nil {
		t.Fatal(err)
	}
	var cols []glm.Column
	for _, name := range s.Order {
		if s.ColumnTypes[name] == "label" {
			cols = append(cols, glm.Labels(name, s.Texts(name)))
		} else {
			cols = append(cols, glm.Decimals(name, s.Texts(name)))
		}
	}
	d, err := glm.NewData(cols...)
	if err != nil {
		t.Fatal(err)
	}
	return s, d
}

// against compares a figure with the value recomputed from the data within the
// tolerance, and, rounded to as many digits, with the value printed in the source.
func against(t *testing.T, s *published.Set, name string, i int, got, tolerance float64) {
	t.Helper()
	if !s.Has(name) {
		t.Fatalf("%s: nothing is expected of %s", s.ID, name)
	}
	e := s.Expected[name]
	want := s.Exact(name, i)
	scale := math.Abs(want)
	if want == 0 {
		scale = 100 // the sets have responses of about that size
	}
	if !(math.Abs(got-want) <= tolerance*scale) {
		t.Errorf("%s: %s = %.17g, want %s (relative error %.2g)", s.ID, name, got, e.Exact[i], math.Abs(got-want)/scale)
	}
	if i >= len(e.Published) || e.Published[i] == "null" || e.Published[i] == "" {
		return
	}
	text := e.Published[i]
	places := 0
	if dot := strings.IndexByte(text, '.'); dot >= 0 {
		places = len(text) - dot - 1
	}
	// A half may be rounded either way.
	print, _ := strconv.ParseFloat(text, 64)
	if unit := math.Pow(10, -float64(places)); math.Abs(got-print) > unit*(0.5+1e-9) {
		t.Errorf("%s: %s = %.17g, printed as %s in the source", s.ID, name, got, text)
	}
}

func tolerance(t *testing.T, s *published.Set) float64 {
	x, err := strconv.ParseFloat(s.Tolerance, 64)
	if err != nil {
		t.Fatalf("%s: tolerance %q", s.ID, s.Tolerance)
	}
	return x
}

// row checks a row of a table under the names of a set: "ss_"+name and so on,
// those that the set has.
func row(t *testing.T, s *published.Set, tab anova.Table, name, prefix, as string) {
	t.Helper()
	r, ok := tab.Row(name)
	if !ok {
		t.Fatalf("%s: no row %q", s.ID, name)
	}
	tol := tolerance(t, s)
	d1, _ := r.DF()
	for _, c := range []struct {
		key string
		x   float64
		tol float64
	}{{"df_", d1, 0}, {"ss_", r.SS(), tol}, {"ms_", r.MeanSquare(), tol}, {"F_", r.Test().Statistic, tol}, {"p_", r.Test().P, 10 * tol}} {
		key := prefix + c.key + as
		if c.key == "df_" {
			key = c.key + as
		}
		if s.Has(key) {
			against(t, s, key, 0, c.x, c.tol)
		}
	}
}

// totals checks the error and total lines.
func totals(t *testing.T, s *published.Set, tab anova.Table) {
	t.Helper()
	tol := tolerance(t, s)
	e, _ := tab.Error()
	l, _ := tab.Total()
	for _, c := range []struct {
		key string
		x   float64
	}{{"df_error", e.DF}, {"ss_error", e.SS}, {"ms_error", e.MeanSquare}, {"ss_total", l.SS}} {
		if s.Has(c.key) {
			against(t, s, c.key, 0, c.x, tol)
		}
	}
}

func tabulate(t testing.TB, cs []lrt.Comparison, err error) anova.Table {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
	tab, err := anova.Tabulate(context.Background(), cs, nil)
	if err != nil {
		t.Fatal(err)
	}
	return tab
}

func TestPublishedOneWay(t *testing.T) {
	ctx := context.Background()
	ids := append(published.Names("oneway-"), "mc-ehandbook", "mc-etch-rate", "mc-package-unequal")
	for _, id := range ids {
		t.Run(id, func(t *testing.T) {
			s, d := load(t, id)
			var group string
			for _, name := range s.Order {
				if name != s.Roles["response"] {
					group = name
				}
			}
			for _, dec := range []anova.Decomposition{anova.Sequential, anova.Hierarchical, anova.Partial} {
				cs, err := anova.OneWay(ctx, d, s.Roles["response"], group, &anova.Options{Decomposition: dec})
				tab := tabulate(t, cs, err)
				tol := tolerance(t, s)
				r, _ := tab.Row(group)
				e, _ := tab.Error()
				l, _ := tab.Total()
				d1, d2 := r.DF()
				against(t, s, "df_between", 0, d1, 0)
				against(t, s, "df_within", 0, d2, 0)
				against(t, s, "ss_between", 0, r.SS(), tol)
				against(t, s, "ss_within", 0, e.SS, tol)
				against(t, s, "ss_total", 0, l.SS, tol)
				against(t, s, "ms_between", 0, r.MeanSquare(), tol)
				against(t, s, "ms_within", 0, e.MeanSquare, tol)
				against(t, s, "F", 0, r.Test().Statistic, tol)
				against(t, s, "F_p_value", 0, r.Test().P, 10*tol)
			}
		})
	}
}

// TestCertifiedOneWay: NIST Statistical Reference Datasets, one-way: from decimal text
// the table keeps at least 13 digits, also where 13 leading digits of all values agree.
func TestCertifiedOneWay(t *testing.T) {
	ctx := context.Background()
	for _, id := range []string{"nist-sirstv", "nist-smls01", "nist-smls02", "nist-smls03", "nist-smls04", "nist-smls06", "nist-smls07", "nist-smls08", "nist-smls09"} {
		s, d := load(t, id)
		group := groupField("y", s.Order)
		for _, dec := range []anova.Decomposition{anova.Sequential, anova.Partial} {
			cs, err := anova.OneWay(ctx, d, "y", group, &anova.Options{Decomposition: dec})
			tab := tabulate(t, cs, err)
			r, _ := tab.Row(group)
			e, _ := tab.Error()
			for _, c := range []struct {
				name string
				got  float64
			}{{"ss_between", r.SS()}, {"ss_within", e.SS}, {"F", r.Test().Statistic}, {"residual_sd", math.Sqrt(e.MeanSquare)}, {"r_squared", tab.RSquared()}} {
				if digits := published.Digits(c.got, s.Exact(c.name, 0), 1); !(digits >= 13) {
					t.Errorf("%s, %v: %s = %.17g, certified %.17g: %.1f digits", id, dec, c.name, c.got, s.Exact(c.name, 0), digits)
				}
			}
		}
	}
}

func TestPublishedFactorial(t *testing.T) {
	ctx := context.Background()
	for _, c := range []struct {
		id      string
		factors []string
	}{
		{"factorial-battery", []string{"material", "temperature"}},
		{"factorial-bottling", []string{"A", "B", "C"}},
		{"factorial-poisons", []string{"poison", "treatment"}},
		{"2k-filtration", []string{"A", "B", "C", "D"}},
		{"2k-pilot-plant", []string{"T", "C", "K"}},
		{"2k-reactant", []string{"A", "B"}},
	} {
		for _, dec := range []anova.Decomposition{anova.Sequential, anova.Hierarchical, anova.Partial} {
			t.Run(fmt.Sprint(c.id, "/", dec), func(t *testing.T) {
				s, d := load(t, c.id)
				cs, err := anova.Crossed(ctx, d, "y", c.factors, &anova.Options{Decomposition: dec})
				tab := tabulate(t, cs, err)
				for _, r := range tab.Rows() {
					row(t, s, tab, r.Name(), "", strings.ReplaceAll(r.Name(), " × ", "×"))
				}
				if len(tab.Rows()) != 1<<len(c.factors)-1 {
					t.Errorf("%d rows", len(tab.Rows()))
				}
				totals(t, s, tab)
			})
		}
	}
}

func TestPublishedUnbalanced(t *testing.T) {
	ctx := context.Background()
	s, d := load(t, "unbalanced-growth-hormone")
	for _, c := range []struct {
		dec     anova.Decomposition
		prefix  string
		factors []string
	}{
		{anova.Sequential, "sequential_", []string{"gender", "bone"}},
		{anova.Sequential, "sequential_other_order_", []string{"bone", "gender"}},
		{anova.Hierarchical, "hierarchical_", []string{"gender", "bone"}},
		{anova.Partial, "partial_", []string{"gender", "bone"}},
	} {
		t.Run(c.prefix, func(t *testing.T) {
			cs, err := anova.Crossed(ctx, d, "y", c.factors, &anova.Options{Decomposition: c.dec})
			tab := tabulate(t, cs, err)
			row(t, s, tab, "gender", c.prefix, "gender")
			row(t, s, tab, "bone", c.prefix, "bone")
			if c.factors[0] == "gender" {
				row(t, s, tab, "gender × bone", c.prefix, "gender×bone")
			}
			totals(t, s, tab)
			if w, ok := tab.Whole(); !ok {
				t.Error("no whole row")
			} else {
				against(t, s, "ss_model", 0, w.SS(), tolerance(t, s))
			}
		})
	}
}

func factors(names ...string) []glm.Term {
	var ts []glm.Term
	for _, n := range names {
		ts = append(ts, glm.Factor{Field: n})
	}
	return ts
}

func TestPublishedBlocks(t *testing.T) {
	ctx := context.Background()
	for _, c := range []struct {
		id    string
		names []string
	}{
		{"blocks-penicillin", []string{"blend", "treatment"}},
		{"blocks-vascular-graft", []string{"batch", "psi"}},
		{"latin-propellant", []string{"batch", "operator", "formulation"}},
	} {
		for _, dec := range []anova.Decomposition{anova.Sequential, anova.Hierarchical} {
			t.Run(fmt.Sprint(c.id, "/", dec), func(t *testing.T) {
				s, d := load(t, c.id)
				cs, err := anova.Terms(ctx, d, "y", factors(c.names...), &anova.Options{Decomposition: dec})
				tab := tabulate(t, cs, err)
				for _, n := range c.names {
					row(t, s, tab, n, "", n)
				}
				totals(t, s, tab)
			})
		}
	}
	t.Run("bibd-catalyst", func(t *testing.T) {
		s, d := load(t, "bibd-catalyst")
		cs, err := anova.Terms(ctx, d, "y", factors("batch", "catalyst"), nil)
		tab := tabulate(t, cs, err)
		row(t, s, tab, "batch", "", "batch_unadjusted")
		row(t, s, tab, "catalyst", "", "catalyst_adjusted")
		totals(t, s, tab)
		cs, err = anova.Terms(ctx, d, "y", factors("catalyst", "batch"), nil)
		tab = tabulate(t, cs, err)
		row(t, s, tab, "batch", "", "batch_adjusted")
		row(t, s, tab, "catalyst", "", "catalyst_unadjusted")
	})
}

func TestPublishedCovariance(t *testing.T) {
	ctx := context.Background()
	s, d := load(t, "ancova-leprosy")
	cs, err := anova.OneWay(ctx, d, "y", "drug", &anova.Options{Covariates: []string{"pre"}, Decomposition: anova.Hierarchical})
	tab := tabulate(t, cs, err)
	row(t, s, tab, "drug", "", "treatment")
	row(t, s, tab, "pre", "", "slope")
	tol := tolerance(t, s)
	r, _ := tab.Row("drug")
	against(t, s, "ss_treatment_adjusted", 0, r.SS(), tol)
	totals(t, s, tab)

	cs, err = anova.OneWay(ctx, d, "y", "drug", &anova.Options{Covariates: []string{"pre"}, Decomposition: anova.Partial})
	row(t, s, tabulate(t, cs, err), "drug", "", "treatment")

	cs, err = anova.Terms(ctx, d, "y", []glm.Term{glm.Covariate{Field: "pre"}, glm.Factor{Field: "drug"},
		glm.Cross{glm.Factor{Field: "drug"}, glm.Covariate{Field: "pre"}}}, nil)
	row(t, s, tabulate(t, cs, err), "drug × pre", "", "equal_slopes")
}

func TestPublishedRegression(t *testing.T) {
	ctx := context.Background()
	t.Run("lackoffit-bank", func(t *testing.T) {
		s, d := load(t, "lackoffit-bank")
		cs, err := anova.Terms(ctx, d, "y", []glm.Term{glm.Covariate{Field: "x"}, glm.Factor{Field: "x"}}, nil)
		tab := tabulate(t, cs, err)
		row(t, s, tab, "x", "", "regression")
		row(t, s, tab, "x as levels", "", "lack_of_fit")
		e, _ := tab.Error()
		against(t, s, "ss_pure_error", 0, e.SS, 1e-12)
		against(t, s, "df_pure_error", 0, e.DF, 0)
		totals(t, s, tab)
	})
	t.Run("regression-hald", func(t *testing.T) {
		s, d := load(t, "regression-hald")
		for name := range s.Expected {
			which, ok := strings.CutPrefix(name, "rss_")
			if !ok || which == "mean" {
				continue
			}
			var terms []glm.Term
			for _, c := range which {
				terms = append(terms, glm.Covariate{Field: "x" + string(c)})
			}
			cs, err := anova.Terms(ctx, d, "y", terms, nil)
			tab := tabulate(t, cs, err)
			e, _ := tab.Error()
			against(t, s, name, 0, e.SS, 1e-12)
			l, _ := tab.Total()
			against(t, s, "rss_mean", 0, l.SS, 1e-12)
		}
	})
	t.Run("regression-quartet", func(t *testing.T) {
		s, d := load(t, "regression-quartet")
		for i, x := range []string{"x123", "x123", "x123", "x4"} {
			k := fmt.Sprint(i + 1)
			cs, err := anova.Terms(ctx, d, "y"+k, []glm.Term{glm.Covariate{Field: x}}, nil)
			tab := tabulate(t, cs, err)
			r, _ := tab.Row(x)
			e, _ := tab.Error()
			against(t, s, "ss_regression_"+k, 0, r.SS(), 1e-12)
			against(t, s, "ss_residual_"+k, 0, e.SS, 1e-12)
			against(t, s, "F_"+k, 0, r.Test().Statistic, 1e-12)
			against(t, s, "r_squared_"+k, 0, tab.RSquared(), 1e-12)
		}
	})
}

// TestPublishedStrata runs tables whose rows have errors of their own.
func TestPublishedStrata(t *testing.T) {
	ctx := context.Background()
	model := func(d *glm.Data, terms ...glm.Term) *glm.Model {
		m, err := glm.Normal(ctx, d, "y", append([]glm.Term{glm.Constant{}}, terms...), nil)
		if err != nil {
			t.Fatal(err)
		}
		return m
	}
	t.Run("nested-purity", func(t *testing.T) {
		s, d := load(t, "nested-purity")
		supplier := glm.Factor{Field: "supplier"}
		batch := glm.Cross{supplier, glm.Factor{Field: "batch"}}
		mean, a, b := model(d), model(d, supplier), model(d, supplier, batch)
		tab := tabulate(t, []lrt.Comparison{
			{Name: "supplier", Restricted: mean, Full: a, Error: &lrt.ErrorPair{Smaller: a, Larger: b}},
			{Name: "batch in supplier", Restricted: a, Full: b},
		}, nil)
		row(t, s, tab, "supplier", "", "supplier")
		row(t, s, tab, "batch in supplier", "", "batch_in_supplier")
		if _, ok := tab.Error(); ok {
			t.Error("rows with two errors have no common error line")
		}
		r, _ := tab.Row("batch in supplier")
		against(t, s, "ms_error", 0, r.ErrorMeanSquare(), 1e-12)
	})
	t.Run("splitplot-oats", func(t *testing.T) {
		s, d := load(t, "splitplot-oats")
		block, variety, nitrogen := glm.Factor{Field: "block"}, glm.Factor{Field: "variety"}, glm.Factor{Field: "nitrogen"}
		plot := glm.Cross{block, variety}
		none, r, ra, w := model(d), model(d, block), model(d, block, variety), model(d, block, variety, plot)
		wb := model(d, block, variety, plot, nitrogen)
		wab := model(d, block, variety, plot, nitrogen, glm.Cross{variety, nitrogen})
		whole := &lrt.ErrorPair{Smaller: ra, Larger: w}
		tab := tabulate(t, []lrt.Comparison{
			{Name: "block", Restricted: none, Full: r, Error: whole},
			{Name: "variety", Restricted: r, Full: ra, Error: whole},
			{Name: "nitrogen", Restricted: w, Full: wb, Error: &lrt.ErrorPair{Smaller: wab}},
			{Name: "variety × nitrogen", Restricted: wb, Full: wab},
		}, nil)
		for _, n := range []string{"block", "variety", "nitrogen", "variety × nitrogen"} {
			row(t, s, tab, n, "", strings.ReplaceAll(n, " × ", "×"))
		}
		v, _ := tab.Row("variety")
		n, _ := tab.Row("nitrogen")
		against(t, s, "ms_whole_plot_error", 0, v.ErrorMeanSquare(), 1e-12)
		against(t, s, "ms_subplot_error", 0, n.ErrorMeanSquare(), 1e-12)
		_, d2 := v.DF()
		against(t, s, "df_whole_plot_error", 0, d2, 0)
		if x, err := v.Result(); err != nil || x.Stratum() == "" || x.Recommended != lrt.Exact {
			t.Errorf("variety: %v, %v", x, err)
		}
	})
}
