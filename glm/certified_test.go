package glm_test

import (
	"fmt"
	"math"
	"math/big"
	"strings"
	"testing"

	"subsume.example/glm"
	"subsume.example/internal/certified"
	"subsume.example/internal/published"
)

// load makes data of a published set.
func load(t testing.TB, id string, decimals bool) (*published.Set, *glm.Data) {
	t.Helper()
	s, err := published.Load(id)
	if err != nil {
		t.Fatal(err)
	}
	d, err := certified.Data(s, decimals)
	if err != nil {
		t.Fatal(err)
	}
	return s, d
}

// TestCertified: every regression and one-way set of the NIST Statistical
// Reference Datasets reaches the digits that its inputs hold.
func TestCertified(t *testing.T) {
	rows, err := certified.Run(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range rows {
		for _, f := range r.Figures {
			if !(f.Digits >= f.Limit) {
				t.Errorf("%s, decimals %v: %s to %.1f digits, want %.1f", r.Set, r.Decimals, f.Name, f.Digits, f.Limit)
			}
		}
		if perfect := r.Set == "nist-wampler1" || r.Set == "nist-wampler2"; perfect != r.Perfect {
			t.Errorf("%s, decimals %v: perfect fit said %v, want %v", r.Set, r.Decimals, r.Perfect, perfect)
		}
	}
}

// TestCertifiedDetails: p-values, R², degrees of freedom and log likelihood of the same sets.
func TestCertifiedDetails(t *testing.T) {
	ctx := t.Context()
	s, d := load(t, "nist-longley", true)
	terms := []glm.Term{glm.Constant{}}
	for i := range 6 {
		terms = append(terms, glm.Covariate{Field: fmt.Sprintf("x%d", i+1)})
	}
	full := model(t, d, nil, terms...)
	fit, err := full.Fit(ctx, nil)
	if err != nil {
		t.Fatal(err)
	}
	r := compare(t, model(t, d, nil, glm.Constant{}), full)
	for _, c := range []struct {
		what       string
		got, exact float64
	}{
		{"p of F", r.Exact.P, s.Exact("F_p_value", 0)},
		{"R²", fit.RSquared, s.Exact("r_squared", 0)},
		{"RSS", fit.RSS, s.Exact("ss_residual", 0)},
		{"error df", float64(fit.DFError), s.Exact("df_residual", 0)},
	} {
		if dg := published.Digits(c.got, c.exact, 1); dg < 13 {
			t.Errorf("%s = %.17g, certified %.17g: %.1f digits", c.what, c.got, c.exact, dg)
		}
	}
}

// TestReadyMadePowers: columns of powers rounded to float64 are of full rank
// and reach what exact arithmetic on the rounded columns gives (NIST Filip: 7.6
// digits of coefficients, 9.6 of the residual SD).
func TestReadyMadePowers(t *testing.T) {
	ctx := t.Context()
	s, _ := load(t, "nist-filip", false)
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
