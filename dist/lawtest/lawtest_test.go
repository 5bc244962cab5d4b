package lawtest_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/dist"
	"subsume.example/dist/lawtest"
)

// twisted changes one method of a good law, which its check must notice.
type twisted struct {
	dist.F
	what string
}

func (w twisted) CDF(x float64) float64 {
	v := w.F.CDF(x)
	switch {
	case w.what == "sum" && v > 0 && v < 1:
		return v * (1 + 1e-12)
	case w.what == "monotone" && x > 2 && x < 3:
		return v / 2
	}
	return v
}

func (w twisted) Survival(x float64) float64 {
	v := w.F.Survival(x)
	switch {
	case w.what == "extremes":
		if v < 1e-16 {
			return 0
		}
	case w.what == "range" && x > 2:
		return math.NaN()
	}
	return v
}

func (w twisted) LogSurvival(x float64) float64 {
	v := w.F.LogSurvival(x)
	if w.what == "logs" && v < 0 && !math.IsInf(v, 0) {
		return v - 1e-9
	}
	return v
}

func (w twisted) Prob(x float64) float64 {
	v := w.F.Prob(x)
	if w.what == "density" {
		return v * 1.00001
	}
	return v
}

func (w twisted) LogProb(x float64) float64 {
	if w.what == "density" {
		return w.F.LogProb(x) + math.Log(1.00001)
	}
	return w.F.LogProb(x)
}

func (w twisted) Quantile(p float64) float64 {
	if w.what == "inverse" {
		return w.F.Quantile(p) * (1 + 1e-9)
	}
	return w.F.Quantile(p)
}

func (w twisted) UpperQuantile(q float64) float64 {
	if w.what == "ends" && q == 0 {
		return math.MaxFloat64
	}
	return w.F.UpperQuantile(q)
}

func (w twisted) Mean() float64 {
	if w.what == "moments" {
		return w.F.Mean() * 1.2
	}
	return w.F.Mean()
}

func (w twisted) Rand(src rand.Source) float64 {
	if w.what == "variates" {
		return w.F.Rand(src) * 1.1
	}
	return w.F.Rand(src)
}

func (w twisted) Validate() error {
	if w.what == "valid" {
		return nil
	}
	return w.F.Validate()
}

// TestNotices breaks a law in one way after the other.
func TestNotices(t *testing.T) {
	good := dist.F{D1: 3, D2: 20}
	if p := lawtest.Problems(twisted{F: good}, nil); p != nil {
		t.Fatalf("an untouched law has problems: %v", p)
	}
	for _, what := range []string{"valid", "ends", "range", "sum", "logs", "monotone", "inverse", "extremes", "density", "moments", "variates"} {
		var s *lawtest.Settings
		if what == "valid" {
			s = &lawtest.Settings{Invalid: []lawtest.Law{twisted{dist.F{D1: -1, D2: 1}, "valid"}}}
		}
		found := false
		for _, p := range lawtest.Problems(twisted{good, what}, s) {
			found = found || p.Check == what
		}
		if !found {
			t.Errorf("a law broken in %q was not noticed", what)
		}
	}
}

// TestUniformity holds the statistics of a tiny sample worked by hand: for u = 0.5, √n D = 0.5 and A² = -1 + 2 log 2.
func TestUniformity(t *testing.T) {
	ks, ad := lawtest.Uniformity([]float64{0.5})
	if ks != 0.5 || math.Abs(ad-(2*math.Ln2-1)) > 1e-15 {
		t.Errorf("Uniformity(0.5) = %v, %v", ks, ad)
	}
}
