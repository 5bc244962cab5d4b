package glm_test

import (
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// TestDisplayed: a coefficient is restricted and combined as the fit shows it,
// whatever comparison it is part of and however large the factor.
func TestDisplayed(t *testing.T) {
	large := &generated{rows: 4000, levels: 310}
	for _, c := range []struct {
		name  string
		full  *glm.Model
		names []string
	}{
		{"two factors", model(t, field(61, 60).data(t), nil, one, cx, fa, fb), []string{"constant", "x", "a=q", "a=r", "b=block 2", "b=block 4"}},
		{"reference named", model(t, field(62, 60).data(t), nil, one, glm.Factor{Field: "a", Reference: "r"}, cx), []string{"constant", "a=p", "a=q"}},
		{"without a constant", model(t, field(63, 60).data(t), nil, fa, fb), []string{"a=p", "a=r"}},
		{"large factors", model(t, large, nil, one, fa, fb), []string{"a=7", "b=300"}},
	} {
		fit, err := c.full.Fit(t.Context(), nil)
		if err != nil {
			t.Fatal(err)
		}
		for _, name := range c.names {
			co, err := fit.Coefficient(name)
			if err != nil {
				t.Fatal(err)
			}
			e, err := fit.Combination(glm.Weight{Name: name, Coef: 1})
			if c.name == "without a constant" && err != nil {
				continue // a level of one factor among two is no function of the fitted values
			}
			if err != nil || relative(e.Value, co.Estimate) > 1e-10 || relative(e.SE, co.SE) > 1e-10 {
				t.Errorf("%s: %s is %g ± %g, combined %g ± %g, %v", c.name, name, co.Estimate, co.SE, e.Value, e.SE, err)
			}
			s, err := c.full.Restrict(lrt.Fix(name, 0.3))
			if err != nil {
				t.Fatal(err)
			}
			tt := (co.Estimate - 0.3) / co.SE
			if r := compare(t, s, c.full); relative(r.Exact.Statistic, tt*tt) > 1e-9 {
				t.Errorf("%s: %s = 0.3: F = %g, t² = %g", c.name, name, r.Exact.Statistic, tt*tt)
			}
		}
	}
}
