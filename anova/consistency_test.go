package anova_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
)

// TestPartialIsEqualMeans: a partial row of a factor says what the equality of its
// equally averaged means says, by another route: three factors, unbalanced, a covariate, with
// all interactions and without those of three.
func TestPartialIsEqualMeans(t *testing.T) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(21, 5))
	var a, b, c []string
	var x, y []float64
	for i := range 70 {
		p, q, s := i%3, i/3%2, i/6%2
		if i >= 12 {
			p, q, s = r.IntN(3), r.IntN(2), r.IntN(2)
		}
		a, b, c = append(a, fmt.Sprint("a", p)), append(b, fmt.Sprint("b", q)), append(c, fmt.Sprint("c", s))
		x = append(x, r.NormFloat64())
		y = append(y, float64(p)+0.5*float64(q*s)+0.3*x[i]+r.NormFloat64())
	}
	d, err := glm.NewData(glm.Labels("a", a), glm.Labels("b", b), glm.Labels("c", c), glm.Numbers("x", x), glm.Numbers("y", y))
	if err != nil {
		t.Fatal(err)
	}
	for _, order := range []int{1, 2, 3} {
		cs, err := anova.Crossed(ctx, d, "y", []string{"a", "b", "c"}, &anova.Options{Decomposition: anova.Partial, Order: order, Covariates: []string{"x"}})
		tab := tabulate(t, cs, err)
		for _, f := range []string{"a", "b", "c"} {
			g := means(t, tab.Model(), nil, f)
			all := family(t, g, g.Pairs(), anova.Scheffe, 0.95).AllEqual()
			row, _ := tab.Row(f)
			if u, v := row.Test(), all.Test(); math.Abs(u.Statistic-v.Statistic) > 1e-10*v.Statistic || u.P != v.P && math.Abs(u.P-v.P) > 1e-9*v.P {
				t.Errorf("order %d, %s: partial F = %.15g, equal means F = %.15g", order, f, u.Statistic, v.Statistic)
			}
		}
	}
}

// TestSimultaneousLevel simulates four groups of very unequal sizes and one mean: no method
// may find a difference too often, and Tukey must stay close to its level.
func TestSimultaneousLevel(t *testing.T) {
	if os.Getenv("SUBSUME_LONG") == "" {
		t.Skip("SUBSUME_LONG=1 runs it")
	}
	ctx := context.Background()
	r := rand.New(rand.NewPCG(5, 9))
	var g []string
	for k, n := range []int{3, 5, 9, 20} {
		for range n {
			g = append(g, fmt.Sprint("g", k))
		}
	}
	wrong := map[anova.Method]float64{}
	const draws = 4000
	for range draws {
		y := make([]float64, len(g))
		for i := range y {
			y[i] = r.NormFloat64()
		}
		d, err := glm.NewData(glm.Labels("g", g), glm.Numbers("y", y))
		if err != nil {
			t.Fatal(err)
		}
		cs, err := anova.OneWay(ctx, d, "y", "g", nil)
		groups := means(t, tabulate(t, cs, err).Model(), nil, "g")
		for _, m := range []anova.Method{anova.Bonferroni, anova.Holm, anova.Scheffe, anova.Tukey} {
			for _, l := range family(t, groups, groups.Pairs(), m, 0.95).Lines() {
				if l.AdjustedP <= 0.05 {
					wrong[m] += 1. / draws
					break
				}
			}
		}
	}
	t.Log(wrong)
	for m, rate := range wrong {
		if rate > 0.06 {
			t.Errorf("%v: a false difference in %.3f of the families", m, rate)
		}
	}
	if wrong[anova.Tukey] < 0.035 {
		t.Errorf("Tukey and Kramer: %.3f is far below 0.05", wrong[anova.Tukey])
	}
}
