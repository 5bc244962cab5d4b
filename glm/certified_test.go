package glm_test

import (
	"context"
	"fmt"
	"math"
	"math/big"
	"strings"
	"testing"

	"subsume.example/glm"
	"subsume.example/internal/published"
	"subsume.example/lrt"
)

// certified lists the NIST Statistical Reference Datasets with the digits (log
// relative error) that inputs rounded to float64 allow, less half a digit, as
// the file of each set states; from decimal text at least 13 in each.
var certified = []struct {
	id              string
	terms           []glm.Term
	coef, se, sd, f float64
}{
	{"norris", []glm.Term{glm.Constant{}, glm.Covariate{Field: "x"}}, 13.6, 13.4, 13.5, 13.2},
	{"noint1", []glm.Term{glm.Covariate{Field: "x"}}, 14.2, 14.5, 14.5, 14.5},
	{"noint2", []glm.Term{glm.Covariate{Field: "x"}}, 14.5, 14.4, 14.5, 14.5},
	{"filip", []glm.Term{glm.Constant{}, glm.Powers{Field: "x", Degree: 10}}, 13.5, 14.3, 14.3, 14.3},
	{"longley", covariates(6), 14.1, 14.4, 14.5, 14.5},
	{"wampler1", []glm.Term{glm.Constant{}, glm.Powers{Field: "x", Degree: 5}}, 14.5, 14.5, 14.5, 0},
	{"wampler2", []glm.Term{glm.Constant{}, glm.Powers{Field: "x", Degree: 5}}, 12.7, 14.5, 14.5, 0},
	{"wampler3", []glm.Term{glm.Constant{}, glm.Powers{Field: "x", Degree: 5}}, 14.5, 14.0, 14.3, 14.5},
	{"wampler5", []glm.Term{glm.Constant{}, glm.Powers{Field: "x", Degree: 5}}, 14.5, 14.0, 14.3, 14.5},
}

func covariates(k int) []glm.Term {
	terms := []glm.Term{glm.Constant{}}
	for i := 1; i <= k; i++ {
		terms = append(terms, glm.Covariate{Field: fmt.Sprintf("x%d", i)})
	}
	return terms
}

// load makes data of a published set; decimals keep their digits or are rounded to float64.
func load(t testing.TB, id string, decimals bool) (*published.Set, *glm.Data) {
	t.Helper()
	s, err := published.Load(id)
	if err != nil {
		t.Fatal(err)
	}
	var cols []glm.Column
	for _, name := range s.Order {
		switch {
		case s.ColumnTypes[name] == "label":
			cols = append(cols, glm.Labels(name, s.Texts(name)))
		case decimals:
			cols = append(cols, glm.Decimals(name, s.Texts(name)))
		default:
			cols = append(cols, glm.Numbers(name, s.Numbers(name)))
		}
	}
	d, err := glm.NewData(cols...)
	if err != nil {
		t.Fatal(err)
	}
	return s, d
}

func TestCertifiedRegressions(t *testing.T) {
	ctx := context.Background()
	for _, c := range certified {
		for _, decimals := range []bool{false, true} {
			t.Run(fmt.Sprintf("%s/decimals=%v", c.id, decimals), func(t *testing.T) {
				s, d := load(t, "nist-"+c.id, decimals)
				full, err := glm.Normal(ctx, d, "y", c.terms, nil)
				if err != nil {
					t.Fatal(err)
				}
				fit, err := full.Fit(ctx, nil)
				if err != nil {
					t.Fatal(err)
				}
				var base []glm.Term
				if c.terms[0] == (glm.Term)(glm.Constant{}) {
					base = c.terms[:1]
				}
				restricted, err := glm.Normal(ctx, d, "y", base, nil)
				if err != nil {
					t.Fatal(err)
				}
				r, err := lrt.Compare(ctx, restricted, full, nil)
				if err != nil {
					t.Fatal(err)
				}
				want := func(limit float64) float64 {
					if decimals {
						return math.Max(limit, 13)
					}
					return limit
				}
				check := func(what string, got, exact, scale, limit float64) {
					t.Helper()
					if dg := published.Digits(got, exact, scale); !(dg >= want(limit)) {
						t.Errorf("%s = %.17g, certified %.17g: %.1f digits, want %.1f", what, got, exact, dg, want(limit))
					}
				}
				for i, co := range fit.Coefficients {
					check(co.Name, co.Estimate, s.Exact("coefficients", i), 1, c.coef)
					check("SE of "+co.Name, co.SE, s.Exact("standard_errors", i), 1, c.se)
				}
				check("residual SD", fit.SD, s.Exact("residual_sd", 0), 1, c.sd)
				check("RSS", fit.RSS, s.Exact("ss_residual", 0), 1, c.sd-0.5)
				if s.Has("r_squared") {
					check("R²", fit.RSquared, s.Exact("r_squared", 0), 1, math.Min(c.sd, 13))
				}
				if c.f > 0 {
					check("F", r.Exact.Statistic, s.Exact("F", 0), 1, c.f)
					check("p of F", r.Exact.P, s.Exact("F_p_value", 0), 1, 12)
				} else if !math.IsInf(r.Exact.Statistic, 1) || r.Exact.P != 0 || !math.IsInf(r.LogLambda, -1) || !r.HasWarning("nil-residual") {
					t.Errorf("perfect fit: F = %g, p = %g, log λ = %g, warnings %v", r.Exact.Statistic, r.Exact.P, r.LogLambda, r.Warnings)
				}
				if fit.DFError != int(s.Exact("df_residual", 0)) {
					t.Errorf("error df = %d, certified %g", fit.DFError, s.Exact("df_residual", 0))
				}
			})
		}
	}
}

// oneway lists the NIST one-way sets: digits of SD, F, SS between and SS within from float64.
var oneway = []struct {
	id              string
	sd, f, ssb, ssw float64
}{
	{"sirstv", 12.9, 12.6, 13.5, 12.6},
	{"smls01", 14.5, 14.5, 14.5, 14.5},
	{"smls02", 14.5, 14.5, 14.5, 14.5},
	{"smls03", 14.5, 14.5, 14.5, 14.5},
	{"smls04", 10.1, 9.9, 9.6, 9.8},
	{"smls06", 10.1, 9.7, 9.4, 9.8},
	{"smls07", 4.1, 3.9, 3.5, 3.8},
	{"smls08", 4.1, 3.7, 3.4, 3.8},
	{"smls09", 4.1, 3.7, 3.4, 3.8},
}

func TestCertifiedOneWay(t *testing.T) {
	ctx := context.Background()
	for _, c := range oneway {
		for _, decimals := range []bool{false, true} {
			t.Run(fmt.Sprintf("%s/decimals=%v", c.id, decimals), func(t *testing.T) {
				s, d := load(t, "nist-"+c.id, decimals)
				group := s.Order[0]
				if group == "y" {
					group = s.Order[1]
				}
				full, err := glm.Normal(ctx, d, "y", []glm.Term{glm.Constant{}, glm.Factor{Field: group}}, nil)
				if err != nil {
					t.Fatal(err)
				}
				restricted, err := full.Without(group)
				if err != nil {
					t.Fatal(err)
				}
				fit, err := full.Fit(ctx, nil)
				if err != nil {
					t.Fatal(err)
				}
				r, err := lrt.Compare(ctx, restricted, full, nil)
				if err != nil {
					t.Fatal(err)
				}
				check := func(what string, got, exact, limit float64) {
					t.Helper()
					if decimals {
						limit = math.Max(limit, 13)
					}
					if dg := published.Digits(got, exact, 1); !(dg >= limit) {
						t.Errorf("%s = %.17g, certified %.17g: %.1f digits, want %.1f", what, got, exact, dg, limit)
					}
				}
				l := r.Pair.Linear
				check("SS between", math.Ldexp(l.Numerator, 2*l.Scale), s.Exact("ss_between", 0), c.ssb)
				check("SS within", fit.RSS, s.Exact("ss_within", 0), c.ssw)
				check("SD", fit.SD, s.Exact("residual_sd", 0), c.sd)
				check("F", r.Exact.Statistic, s.Exact("F", 0), c.f)
				check("R²", fit.RSquared, s.Exact("r_squared", 0), math.Min(c.ssb, c.ssw))
			})
		}
	}
}

// TestReadyMadePowers: columns of powers rounded to float64 are of full rank
// and reach what exact arithmetic on the rounded columns gives (NIST Filip: 7.6
// digits of coefficients, 9.6 of the residual SD).
func TestReadyMadePowers(t *testing.T) {
	ctx := context.Background()
	s, d := load(t, "nist-filip", false)
	x := s.Numbers("x")
	cols := []glm.Column{glm.Numbers("y", s.Numbers("y"))}
	terms := []glm.Term{glm.Constant{}}
	for k := 1; k <= 10; k++ {
		v := make([]float64, len(x))
		for i := range x {
			v[i] = power(x[i], k)
		}
		cols = append(cols, glm.Numbers(fmt.Sprintf("x%d", k), v))
		terms = append(terms, glm.Covariate{Field: fmt.Sprintf("x%d", k)})
	}
	d, err := glm.NewData(cols...)
	if err != nil {
		t.Fatal(err)
	}
	m, err := glm.Normal(ctx, d, "y", terms, nil)
	if err != nil {
		t.Fatal(err)
	}
	fit, err := m.Fit(ctx, nil)
	if err != nil {
		t.Fatal(err)
	}
	if fit.Rank != 11 {
		t.Fatalf("rank %d, want 11 (smallest pivot kept %g, tolerance %g)", fit.Rank, fit.SmallestKept, fit.Tolerance)
	}
	worst := 15.0
	for i, c := range fit.Coefficients {
		worst = math.Min(worst, published.Digits(c.Estimate, s.Exact("coefficients", i), 1))
	}
	if worst < 7.1 {
		t.Errorf("coefficients: %.1f digits, want 7.1", worst)
	}
	if dg := published.Digits(fit.SD, s.Exact("residual_sd", 0), 1); dg < 9.1 {
		t.Errorf("SD: %.1f digits, want 9.1", dg)
	}
	if strings.Contains(fmt.Sprint(fit.Warnings), "collinear") {
		t.Errorf("warnings %v", fit.Warnings)
	}
}

// power returns x^k rounded once.
func power(x float64, k int) float64 {
	p := new(big.Float).SetPrec(600).SetInt64(1)
	for range k {
		p.Mul(p, new(big.Float).SetPrec(600).SetFloat64(x))
	}
	f, _ := p.Float64()
	return f
}
