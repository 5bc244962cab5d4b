package lrt_test

import (
	"context"
	"errors"
	"math"
	"testing"

	"subsume.example/lrt"
)

// TestScales: a declared model finds one answer in any units, and where its
// curvature leaves the floating-point range says so instead of answering.
func TestScales(t *testing.T) {
	base := []float64{1.2, 0.7, 2.1, 1.9, 0.4, 1.5, 2.2, 0.9, 1.1, 1.4}
	model := lrt.Model[[]float64]{
		Name:   "normal",
		Params: []lrt.Param{lrt.Real("mean"), lrt.Positive("sd")},
		LogLikelihood: func(d []float64, th []float64) (s float64) {
			for _, v := range d {
				z := (v - th[0]) / th[1]
				s -= 0.5*z*z + math.Log(th[1]) + 0.5*math.Log(2*math.Pi)
			}
			return s
		},
	}
	// −2 log λ = n log(Σx²/Σ(x−x̄)²), the closed form.
	var sum, sq float64
	for _, v := range base {
		sum, sq = sum+v, sq+v*v
	}
	n := float64(len(base))
	want := n * math.Log(sq/(sq-sum*sum/n))
	for _, k := range []float64{1, 1e-8, 1e8, 1e-30, 1e30, 1e-100, 1e-160, 1e-300} {
		x := make([]float64, len(base))
		for i := range x {
			x[i] = base[i] * k
		}
		full, err := lrt.Bind(model, lrt.Observe(x, len(x)))
		if err != nil {
			t.Fatal(err)
		}
		zero, err := full.Restrict(lrt.Fix("mean", 0))
		if err != nil {
			t.Fatal(err)
		}
		r, err := lrt.Compare(context.Background(), zero, full, nil)
		if k < 1e-150 {
			if !errors.Is(err, lrt.ErrNotConverged) {
				t.Errorf("units of %g: −2 log λ = %g, error %v", k, r.Statistic, err)
			}
			continue
		}
		if err != nil || math.Abs(r.Statistic-want) > 1e-8 {
			t.Errorf("units of %g: −2 log λ = %.12g, want %.12g, error %v", k, r.Statistic, want, err)
		}
	}
}
