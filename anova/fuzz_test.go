package anova_test

import (
	"context"
	"math"
	"strings"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// FuzzLayout builds small layouts, balanced or not, with empty cells, constant
// responses and huge or tiny values, and asks everything of them: nothing may
// panic, no text may show NaN, and a row that was tested has a p-value.
func FuzzLayout(f *testing.F) {
	f.Add([]byte{0, 1, 2, 10, 1, 0, 2, 20, 2, 1, 3, 30, 0, 0, 9, 40, 1, 1, 8, 50, 2, 0, 1, 60}, uint8(0), int16(0))
	f.Add([]byte{0, 0, 1, 1, 0, 0, 1, 1, 1, 0, 1, 1}, uint8(2), int16(1000))
	f.Add([]byte{0, 0, 1, 1, 1, 1, 5, 9}, uint8(1), int16(-1000))
	f.Add([]byte{0, 0, 7, 3}, uint8(2), int16(0))
	f.Fuzz(func(t *testing.T, b []byte, how uint8, scale int16) {
		if len(b) < 4 || len(b) > 160 || scale < -1010 || scale > 1010 {
			return
		}
		var a, c []string
		var x, y []float64
		for i := 0; i+4 <= len(b); i += 4 {
			a, c = append(a, string(rune('a'+b[i]%4))), append(c, string(rune('p'+b[i+1]%3)))
			x = append(x, float64(int8(b[i+2])))
			y = append(y, math.Ldexp(float64(int8(b[i+3])), int(scale)))
		}
		d, err := glm.NewData(glm.Labels("a", a), glm.Labels("c", c), glm.Numbers("x", x), glm.Numbers("y", y))
		if err != nil {
			t.Fatal(err)
		}
		ctx := context.Background()
		o := &anova.Options{Decomposition: anova.Decomposition(how % 3), Order: int(how/3) % 3}
		if how&64 != 0 {
			o.Covariates = []string{"x"}
		}
		cs, err := anova.Crossed(ctx, d, "y", []string{"a", "c"}, o)
		if err != nil {
			t.Fatal(err)
		}
		tab, err := anova.Tabulate(ctx, cs, nil)
		if err != nil {
			t.Skip(err) // values beyond the range, named by a typed error
		}
		for _, r := range tab.Rows() {
			p := r.Test().P
			if r.Err() == nil && !(p >= 0 && p <= 1) {
				t.Errorf("%s: p = %g", r.Name(), p)
			}
			if p == 0 && r.Err() == nil {
				if res, _ := r.Result(); !res.HasWarning("nil-residual") && res.LogP() > -700 {
					t.Errorf("%s: p = 0 without a reason", r.Name())
				}
			}
		}
		reports := []anova.Report{tab.Report(), tab.Effects()}
		if tab.Model() != nil {
			g, err := anova.Means(ctx, tab.Model(), []string{"a"}, nil, nil)
			if err != nil {
				t.Fatal(err)
			}
			reports = append(reports, g.Report())
			if pairs := g.Pairs(); len(pairs) > 0 {
				fam, err := g.Test(ctx, pairs, anova.Method(how%5), &lrt.Settings{})
				if err != nil {
					t.Fatal(err)
				}
				reports = append(reports, fam.Report())
			}
			rec, err := anova.NewRecord(ctx, tab, d, anova.Declaration{}, nil, reports...)
			if err != nil {
				t.Fatal(err)
			}
			if _, err := rec.CanonicalJSON(); err != nil {
				t.Fatal(err)
			}
		}
		for _, r := range reports {
			var w strings.Builder
			for _, write := range []func() error{func() error { return r.WriteText(&w) }, func() error { return r.WriteMarkdown(&w) },
				func() error { return r.WriteCSV(&w) }, func() error { return r.WriteJSON(&w) }} {
				if err := write(); err != nil {
					t.Fatal(err)
				}
			}
			if strings.Contains(w.String(), "NaN") {
				t.Errorf("NaN in\n%s", w.String())
			}
		}
	})
}
