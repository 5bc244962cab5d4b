package anova_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"strings"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// TestEffectLimits: noncentralities at which F has probability 0.05 and 0.95 of
// exceeding the one seen, found with SciPy's noncentral F (12 digits) for published tables.
func TestEffectLimits(t *testing.T) {
	ctx := context.Background()
	for _, c := range []struct {
		id, row      string
		factors      []string
		order        int
		lower, upper float64
	}{
		{"oneway-etch-rate", "power", []string{"power"}, 1, 91.14979116301255, 338.34237511014095},
		{"factorial-battery", "material", []string{"material", "temperature"}, 2, 3.535843380899922, 32.643891539987436},
		{"factorial-battery", "material × temperature", []string{"material", "temperature"}, 2, 1.3071610011838741, 27.723692385561215},
		{"blocks-penicillin", "treatment", []string{"blend", "treatment"}, 1, 0, 10.666670742709574},
	} {
		_, d := load(t, c.id)
		cs, err := anova.Crossed(ctx, d, "y", c.factors, &anova.Options{Order: c.order, Decomposition: anova.Hierarchical})
		tab := tabulate(t, cs, err)
		r, _ := tab.Row(c.row)
		e, err := r.Effect(0.95)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(e.LambdaLower-c.lower) > 1e-9*c.lower || math.Abs(e.LambdaUpper-c.upper) > 1e-9*c.upper {
			t.Errorf("%s %s: λ from %.14g to %.14g, want %.14g to %.14g", c.id, c.row, e.LambdaLower, e.LambdaUpper, c.lower, c.upper)
		}
		d1, d2 := r.DF()
		f := r.Test().Statistic
		line, _ := tab.Error()
		if want := r.SS() / (r.SS() + line.SS); math.Abs(e.PartialShare-want) > 1e-13 {
			t.Errorf("%s: partial η² %g, want %g", c.row, e.PartialShare, want)
		}
		// ε² by mean squares (Kelley 1935): (SS − d1·MSE)/(SS + SSE).
		if want := (r.SS() - d1*line.MeanSquare) / (r.SS() + line.SS); math.Abs(e.Epsilon-want) > 1e-13 {
			t.Errorf("%s: ε² %g, want %g", c.row, e.Epsilon, want)
		}
		if e.ZeroLower != (r.Test().P > 0.05) || e.Level != 0.9 || e.Lower > e.PartialShare || e.Upper < e.Epsilon || e.Lower != e.LambdaLower/(e.LambdaLower+e.N) {
			t.Errorf("%s: %+v with p = %g", c.row, e, r.Test().P)
		}
		if want := math.Sqrt(d1 * f / d2); e.CohenF != want {
			t.Errorf("f = %g, want %g", e.CohenF, want)
		}
		// All rows, or the stratum of row and error.
		res, _ := r.Result()
		if e.N != res.Pair.Linear.M || e.Of != res.Stratum() {
			t.Errorf("%s: N = %g (%s), λ is over %s", c.row, e.N, e.Of, res.Stratum())
		}
	}
}

func TestEffectRefusals(t *testing.T) {
	ctx := context.Background()
	d := newTrial(1, 30).data(t)
	known := func(v float64) anova.Row {
		cs, err := anova.OneWay(ctx, d, "y", "a", &anova.Options{Model: &glm.Options{KnownVariance: v}})
		return tabulate(t, cs, err).Rows()[0]
	}
	if _, err := known(1).Effect(0); !errors.Is(err, anova.ErrNotARow) {
		t.Errorf("known variance: %v", err)
	}
	if _, err := known(0).Effect(0.4); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("level 0.4: %v", err)
	}
	if _, err := (anova.Row{}).Effect(0); !errors.Is(err, anova.ErrNotARow) {
		t.Errorf("no row: %v", err)
	}
	// A perfect fit has all of the variance and no interval.
	p, err := glm.NewData(glm.Labels("g", []string{"a", "a", "b", "b"}), glm.Numbers("y", []float64{1, 1, 2, 2}))
	if err != nil {
		t.Fatal(err)
	}
	cs, err := anova.OneWay(ctx, p, "y", "g", nil)
	tab := tabulate(t, cs, err)
	e, err := tab.Rows()[0].Effect(0)
	if err != nil || e.PartialShare != 1 || !math.IsNaN(e.Lower) {
		t.Errorf("perfect fit: %+v, %v", e, err)
	}
	var b strings.Builder
	if err := tab.Effects().WriteJSON(&b); err != nil || strings.Contains(b.String(), "NaN") {
		t.Errorf("%v\n%s", err, b.String())
	}
}

// TestStandardized: etch rate at 220 and 160 W (Montgomery, 6th ed., Table 3-1): t = 155.8/√(333.7·2/5) on 16
// degrees of freedom; limits with SciPy's noncentral t (12 digits), J(16) with mpmath.
func TestStandardized(t *testing.T) {
	ctx := context.Background()
	_, d := load(t, "oneway-etch-rate")
	cs, err := anova.OneWay(ctx, d, "y", "power", nil)
	g := means(t, tabulate(t, cs, err).Model(), nil, "power")
	l, ok := family(t, g, g.Pairs(), anova.Bonferroni, 0.95).Line("220 − 160")
	if !ok {
		t.Fatal("no such contrast")
	}
	s, err := l.Standardized(0.95)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"value", s.Value, 8.52882787987277}, {"corrected", s.Corrected, 8.52882787987277 * 0.95225383480435212636},
		{"lower", s.Lower, 5.330191843395174}, {"upper", s.Upper, 11.685457997497613}, {"SD", s.SD, math.Sqrt(333.7)}, {"df", s.DF, 16},
	} {
		if math.Abs(c.got-c.want) > 1e-10*c.want {
			t.Errorf("%s = %.14g, want %.14g", c.name, c.got, c.want)
		}
	}
	if _, err := l.Standardized(1.5); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("level 1.5: %v", err)
	}
}

// TestEffectCoverage simulates a stated effect: the interval of level 0.90 must
// hold the true share at that rate (4000 draws, so ±0.5 %).
func TestEffectCoverage(t *testing.T) {
	if os.Getenv("SUBSUME_LONG") == "" {
		t.Skip("SUBSUME_LONG=1 runs it")
	}
	ctx := context.Background()
	r := rand.New(rand.NewPCG(11, 3))
	mean := []float64{0, 0.4, 0.9}
	var g []string
	lambda, grand := 0.0, (0+0.4+0.9)/3
	for i := range 30 {
		g = append(g, string(rune('a'+i%3)))
		lambda += (mean[i%3] - grand) * (mean[i%3] - grand)
	}
	inside := 0
	const draws = 4000
	for range draws {
		y := make([]float64, 30)
		for i := range y {
			y[i] = mean[i%3] + r.NormFloat64()
		}
		d, err := glm.NewData(glm.Labels("g", g), glm.Numbers("y", y))
		if err != nil {
			t.Fatal(err)
		}
		cs, err := anova.OneWay(ctx, d, "y", "g", nil)
		e, err := tabulate(t, cs, err).Rows()[0].Effect(0.95)
		if err != nil {
			t.Fatal(err)
		}
		if share := lambda / (lambda + 30); e.Lower <= share && share <= e.Upper {
			inside++
		}
	}
	if rate := float64(inside) / draws; math.Abs(rate-0.9) > 0.015 {
		t.Errorf("the interval of level 0.90 held the share in %.3f of draws", rate)
	}
}
