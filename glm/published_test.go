package glm_test

import (
	"context"
	"math"
	"strings"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// publishedRows are rows of published analyses with an error term of their own. The
// sources are named in the files of internal/published/data; F and p there are recomputed
// from the data to 17 digits.
var publishedRows = []struct {
	set, row      string // F_row and p_row
	s, b, e0, e1  string
	fixed, random string
}{
	{"splitplot-oats", "variety", "1 block", "1 block variety", "1 block variety", "block:variety", "1 variety nitrogen variety:nitrogen", "block block:variety"},
	{"splitplot-oats", "nitrogen", "block:variety", "block:variety nitrogen", "block:variety variety:nitrogen", "", "1 variety nitrogen variety:nitrogen", "block block:variety"},
	{"splitplot-oats", "variety×nitrogen", "block:variety nitrogen", "block:variety variety:nitrogen", "", "", "1 variety nitrogen variety:nitrogen", "block block:variety"},
	{"splitplot-oats", "block", "1 variety", "1 block variety", "1 block variety", "block:variety", "1 variety nitrogen variety:nitrogen", "block:variety"},
	{"nested-purity", "supplier", "1", "1 supplier", "1 supplier", "supplier:batch", "1 supplier", "supplier:batch"},
	{"nested-purity", "batch_in_supplier", "1 supplier", "supplier:batch", "", "", "1 supplier", ""},
	{"repeated-two-factors", "noise", "1 subject", "1 subject noise", "1 subject noise", "subject:noise", "1 noise angle noise:angle", "subject subject:noise subject:angle"},
	{"repeated-two-factors", "angle", "1 subject", "1 subject angle", "1 subject angle", "subject:angle", "1 noise angle noise:angle", "subject subject:noise subject:angle"},
	{"repeated-two-factors", "noise×angle", "subject:noise subject:angle", "subject:noise subject:angle noise:angle", "", "", "1 noise angle noise:angle", "subject subject:noise subject:angle"},
	{"repeated-drugs", "drug", "1 person", "1 person drug", "", "", "1 drug", "person"},
	{"latin-propellant", "formulation", "1 batch operator", "1 batch operator formulation", "", "", "1 formulation", "batch operator"},
	{"latin-propellant", "batch", "1 operator formulation", "1 batch operator formulation", "", "", "1 formulation", "operator"},
	{"blocks-penicillin", "treatment", "1 blend", "1 blend treatment", "", "", "1 treatment", "blend"},
	{"bibd-catalyst", "catalyst_adjusted", "1 batch", "1 batch catalyst", "", "", "1 catalyst", "batch"},
	{"random-dyestuff", "", "1", "1 batch", "", "", "1", ""},
	{"random-looms", "", "1", "1 batch", "", "", "1", ""},
}

func TestPublishedErrorTerms(t *testing.T) {
	ctx := context.Background()
	for _, row := range publishedRows {
		t.Run(row.set+"/"+row.row, func(t *testing.T) {
			set, d := load(t, row.set, true)
			m := func(s string) *glm.Model { return model(t, d, nil, terms(s)...) }
			c := lrt.Comparison{Name: row.row, Restricted: m(row.s), Full: m(row.b)}
			if row.e0 != "" {
				c.Error = &lrt.ErrorPair{Smaller: m(row.e0)}
				if row.e1 != "" {
					c.Error.Larger = m(row.e1)
				}
			}
			c.Effects = &lrt.Effects{Fixed: m(row.fixed)}
			for f := range strings.FieldsSeq(row.random) {
				c.Effects.Random = append(c.Effects.Random, lrt.RandomTerm{Name: f, Space: m(f)})
			}
			r, err := c.Run(ctx, nil)
			if err != nil {
				t.Fatal(err)
			}
			f, p := "F_"+row.row, "p_"+row.row
			if row.row == "" {
				f, p = "F", "F_p_value"
			}
			if !set.Has(f) {
				t.Fatalf("no %s", f)
			}
			if e := relative(r.Exact.Statistic, set.Exact(f, 0)); e > 1e-13 {
				t.Errorf("F = %.17g, want %.17g", r.Exact.Statistic, set.Exact(f, 0))
			}
			if e := relative(r.Exact.P, set.Exact(p, 0)); set.Has(p) && e > 1e-12 {
				t.Errorf("p = %.17g, want %.17g", r.Exact.P, set.Exact(p, 0))
			}
			if !r.Pair.Certificate.Exact {
				t.Errorf("not certified: %+v", r.Pair.Certificate)
			}
			// λ of the stratum and F are one number.
			d1, d2 := r.Pair.Linear.DF()
			want := r.Pair.Linear.M * math.Log1p(r.Exact.Statistic*d1/d2)
			if relative(r.Statistic, want) > 1e-14 {
				t.Errorf("−2 log λ = %.17g, want %.17g (%s)", r.Statistic, want, r.Stratum())
			}
		})
	}
}

// TestAllSubsets: the residual sums of squares of all sixteen models of the Hald
// data, each fitted alone and each as a view on one factorization.
func TestAllSubsets(t *testing.T) {
	ctx := context.Background()
	set, d := load(t, "regression-hald", true)
	x := []glm.Term{glm.Covariate{Field: "x1"}, glm.Covariate{Field: "x2"}, glm.Covariate{Field: "x3"}, glm.Covariate{Field: "x4"}}
	full := model(t, d, nil, append([]glm.Term{one}, x...)...)
	var cs []lrt.Comparison
	var names []string
	for k := range 15 {
		name, ts := "rss_", []glm.Term{one}
		for i := range x {
			if k>>i&1 == 1 {
				name, ts = name+string(rune('1'+i)), append(ts, x[i])
			}
		}
		if k == 0 {
			name = "rss_mean"
		}
		m := model(t, d, nil, ts...)
		fit, err := m.Fit(ctx, nil)
		if err != nil {
			t.Fatal(err)
		}
		if e := relative(fit.RSS, set.Exact(name, 0)); e > 1e-13 {
			t.Errorf("%s = %.17g, want %.17g", name, fit.RSS, set.Exact(name, 0))
		}
		names = append(names, name)
		cs = append(cs, lrt.Comparison{Name: name, Restricted: m, Full: full})
	}
	cs, err := glm.Join(ctx, cs...)
	if err != nil {
		t.Fatal(err)
	}
	rss := set.Exact("rss_1234", 0)
	for i, c := range cs {
		r, err := c.Run(ctx, nil)
		if err != nil {
			t.Fatal(err)
		}
		l := r.Pair.Linear
		if got := math.Ldexp(l.Denominator, 2*l.Scale); relative(got, rss) > 1e-13 {
			t.Errorf("%s: error %.17g, want %.17g", names[i], got, rss)
		}
		if got, want := math.Ldexp(l.Numerator, 2*l.Scale), set.Exact(names[i], 0)-rss; relative(got, want) > 1e-12 {
			t.Errorf("%s: numerator %.17g, want %.17g", names[i], got, want)
		}
		if relative(r.Pair.Restricted.Deviance, set.Exact(names[i], 0)) > 1e-13 {
			t.Errorf("%s: restricted residual %.17g", names[i], r.Pair.Restricted.Deviance)
		}
		if names[i] == "rss_12" {
			if relative(r.Exact.Statistic, set.Exact("F_drop_x3_x4", 0)) > 1e-13 || relative(r.Exact.P, set.Exact("p_drop_x3_x4", 0)) > 1e-12 {
				t.Errorf("F without x3 and x4 = %.17g, p = %.17g", r.Exact.Statistic, r.Exact.P)
			}
		}
	}
	fit, err := full.Fit(ctx, nil)
	if err != nil {
		t.Fatal(err)
	}
	for i, c := range fit.Coefficients {
		if relative(c.Estimate, set.Exact("coefficients", i)) > 1e-13 || relative(c.SE, set.Exact("standard_errors", i)) > 1e-13 {
			t.Errorf("%s = %.17g ± %.17g", c.Name, c.Estimate, c.SE)
		}
	}
}

// TestFourSetsOneFit: Anscombe's four sets, fitted alike and unlike.
func TestFourSetsOneFit(t *testing.T) {
	ctx := context.Background()
	set, d := load(t, "regression-quartet", true)
	for k := range 4 {
		y, x := "y"+string(rune('1'+k)), "x123"
		if k == 3 {
			x = "x4"
		}
		i := y[1:]
		m, err := glm.Normal(ctx, d, y, []glm.Term{one, glm.Covariate{Field: x}}, nil)
		if err != nil {
			t.Fatal(err)
		}
		fit, err := m.Fit(ctx, nil)
		if err != nil {
			t.Fatal(err)
		}
		for name, got := range map[string]float64{
			"se_slope_" + i: fit.Coefficients[1].SE, "r_squared_" + i: fit.RSquared, "ss_residual_" + i: fit.RSS,
			"F_" + i: fit.Coefficients[1].T * fit.Coefficients[1].T, "ss_regression_" + i: fit.TotalSS - fit.RSS} {
			if relative(got, set.Exact(name, 0)) > 1e-13 {
				t.Errorf("%s = %.17g, want %.17g", name, got, set.Exact(name, 0))
			}
		}
		for c := range 2 {
			if got := fit.Coefficients[c].Estimate; relative(got, set.Exact("coefficients_"+i, c)) > 1e-13 {
				t.Errorf("set %s coefficient %d = %.17g", i, c, got)
			}
		}
		byHand(t, fit, set.Numbers(x), set.Numbers(y))
	}
}

// byHand holds what Each says against the formulas of a straight line: leverage
// 1/n + (x−x̄)²/Sxx, standardized residual r = e/(s√(1−h)), and studentized
// r√((ν−1)/(ν−r²)) (Cook and Weisberg, Residuals and Influence in Regression, 1982, chapter 2).
func byHand(t *testing.T, fit *glm.Fit, x, y []float64) {
	t.Helper()
	n := float64(len(x))
	var mx, my, sxx, sxy float64
	for i := range x {
		mx, my = mx+x[i]/n, my+y[i]/n
	}
	for i := range x {
		sxx += (x[i] - mx) * (x[i] - mx)
		sxy += (x[i] - mx) * (y[i] - my)
	}
	slope := sxy / sxx
	var rss float64
	for i := range x {
		e := y[i] - my - slope*(x[i]-mx)
		rss += e * e
	}
	nu := n - 2
	rows := 0
	for r, err := range fit.Each(context.Background()) {
		if err != nil {
			t.Fatal(err)
		}
		i := r.Row
		if i != rows {
			t.Fatalf("row %d in place %d", i, rows)
		}
		rows++
		h := 1/n + (x[i]-mx)*(x[i]-mx)/sxx
		fitted := my + slope*(x[i]-mx)
		e := y[i] - fitted
		if math.Abs(r.Leverage-h) > 1e-13 || math.Abs(r.Fitted-fitted) > 1e-12 || math.Abs(r.Residual-e) > 1e-12 || r.Response != y[i] || r.Weight != 1 {
			t.Errorf("row %d: %+v, want leverage %g fitted %g residual %g", i, r, h, fitted, e)
		}
		if h > 1-1e-9 {
			if !math.IsNaN(r.Standardized) || !math.IsNaN(r.Studentized) {
				t.Errorf("row %d of leverage 1: %+v", i, r)
			}
			continue
		}
		std := e / math.Sqrt(rss/nu*(1-h))
		stud := std * math.Sqrt((nu-1)/(nu-std*std))
		if math.Abs(r.Standardized-std) > 1e-11 || relative(r.Studentized, stud) > 1e-8 {
			t.Errorf("row %d: standardized %g studentized %g, want %g and %g", i, r.Standardized, r.Studentized, std, stud)
		}
	}
	if rows != len(x) {
		t.Errorf("%d rows of %d", rows, len(x))
	}
}
