package glm_test

import (
	"errors"
	"math"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

func ones(n int) []float64 {
	x := make([]float64, n)
	for i := range x {
		x[i] = 1
	}
	return x
}

// TestWorkspace: the route without allocations says what Compare and Fit say.
func TestWorkspace(t *testing.T) {
	for seed := range uint64(20) {
		p := field(seed, 30)
		d := p.data(t)
		x := [][]float64{ones(30), p.x, p.off, p.w}
		w, err := glm.NewWorkspace(30, 4)
		if err != nil {
			t.Fatal(err)
		}
		l, err := w.Compare(x, p.y, 2)
		if err != nil {
			t.Fatal(err)
		}
		full := model(t, d, nil, one, cx, glm.Covariate{Field: "off"}, glm.Covariate{Field: "w"})
		want := compare(t, model(t, d, nil, one, cx), full)
		f, pv, lp := l.F()
		if relative(f, want.Exact.Statistic) > 1e-14 || relative(pv, want.Exact.P) > 1e-12 || relative(lp, want.Exact.LogP) > 1e-12 {
			t.Errorf("seed %d: F = %.17g (p %g), want %.17g (p %g)", seed, f, pv, want.Exact.Statistic, want.Exact.P)
		}
		fit, err := full.Fit(t.Context(), nil)
		if err != nil {
			t.Fatal(err)
		}
		for i, c := range fit.Coefficients {
			if relative(w.Estimate[i], c.Estimate) > 1e-14 || relative(w.SE[i], c.SE) > 1e-14 {
				t.Errorf("seed %d: %s = %.17g ± %.17g, want %.17g ± %.17g", seed, c.Name, w.Estimate[i], w.SE[i], c.Estimate, c.SE)
			}
		}
		if n := testing.AllocsPerRun(100, func() {
			if l, err = w.Compare(x, p.y, 2); err != nil {
				t.Fatal(err)
			}
			f, pv, lp = l.F()
		}); n != 0 {
			t.Errorf("%g allocations", n)
		}
	}
	w, err := glm.NewWorkspace(4, 2)
	if err != nil {
		t.Fatal(err)
	}
	bad := []float64{1, 2, math.NaN(), 4}
	var ce *glm.ColumnError
	if _, err := w.Compare([][]float64{ones(4), bad}, ones(4), 1); !errors.As(err, &ce) || ce.Column != "column 1" || ce.Row != 2 {
		t.Errorf("NaN: %v", err)
	}
	if _, err := w.Compare([][]float64{ones(4)}, ones(4), 1); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("shape: %v", err)
	}
	l, err := w.Compare([][]float64{ones(4), ones(4)}, []float64{1, 2, 3, 4}, 1)
	if err != nil || l.RankB != 1 || !math.IsNaN(w.SE[1]) {
		t.Errorf("collinear: %+v %v %v", l, w.SE, err)
	}
	if _, err := glm.NewWorkspace(3, 3); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("no error df: %v", err)
	}
}
