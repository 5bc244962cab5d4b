package lrt

import (
	"errors"
	"math"
	"testing"

	"subsume.example/dist"
)

// Power of the exact test of two exponential means, against the F law: under
// the alternative the ratio of means is the ratio of parameters times F.
func TestSimulatePower(t *testing.T) {
	full, err := ExponentialMeans(Exposure{[]float64{12, 9}, []float64{1, 1}}, true)
	if err != nil {
		t.Fatal(err)
	}
	c := Comparison{Restricted: mustRestrict(t, full, Equate("mean[1]", "mean[2]")), Full: full}
	law := dist.F{D1: 24, D2: 18}
	logLambda := func(x float64) float64 {
		w := 12 * x / (12*x + 9)
		return 12*math.Log(w*21/12) + 9*math.Log((1-w)*21/9)
	}
	p := func(x float64) float64 { v, _ := BothTails(law, logLambda, x); return v }
	// Critical ratios on both sides, by bisection on p = 0.05.
	solve := func(a, b float64) float64 {
		for range 100 {
			m := math.Sqrt(a * b)
			if (p(m) > 0.05) == (p(a) > 0.05) {
				a = m
			} else {
				b = m
			}
		}
		return a
	}
	lo, hi := solve(0.01, 1), solve(100, 1)
	const ratio = 3
	want := law.CDF(lo/ratio) + law.Survival(hi/ratio)
	got, err := c.SimulatePower(bg, []float64{ratio, 1}, 0.05, 4000, &Settings{Seed: 4})
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(got.Power-want) > 4*got.StdErr || got.Failed > 0 {
		t.Errorf("%+v, want %.4f", got, want)
	}
	again, err := c.SimulatePower(bg, []float64{ratio, 1}, 0.05, 4000, &Settings{Seed: 4, Workers: 1})
	if err != nil || again != got {
		t.Errorf("%+v and %+v, %v", got, again, err)
	}
	for _, bad := range []struct {
		alpha float64
		draws int
		at    []float64
	}{{0, 10, []float64{1, 1}}, {0.05, -1, []float64{1, 1}}, {0.05, 10, []float64{1}}} {
		if _, err := c.SimulatePower(bg, bad.at, bad.alpha, bad.draws, nil); !errors.Is(err, ErrInvalid) {
			t.Errorf("%+v: %v", bad, err)
		}
	}
}
