package glm_test

import (
	"context"
	"errors"
	"math"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// TestRowMeans: the mean of a row is its prediction, and a difference of two
// has the F of the comparison that sets it to its null value.
func TestRowMeans(t *testing.T) {
	ctx := context.Background()
	p := field(3, 60)
	d := p.data(t)
	for _, o := range []*glm.Options{nil, {Offset: "off"}, {Weights: glm.Weights{Kind: glm.Frequency, Field: "w"}}, {KnownVariance: 2}} {
		m := model(t, d, o, glm.Constant{}, glm.Factor{Field: "a"}, glm.Factor{Field: "b"}, glm.Powers{Field: "x", Degree: 3},
			glm.Cross{glm.Factor{Field: "a"}, glm.Covariate{Field: "x"}})
		fit, err := m.Fit(ctx, nil)
		if err != nil {
			t.Fatal(err)
		}
		rows, err := glm.NewData(glm.Numbers("x", []float64{0.5, -1, 0.5}), glm.Numbers("off", []float64{0.25, 1, -2}),
			glm.Labels("a", []string{"p", "r", "q"}), glm.Labels("b", []string{"block 2", "block 2", "block 4"}))
		if err != nil {
			t.Fatal(err)
		}
		means, err := fit.RowMeans(ctx, rows)
		if err != nil {
			t.Fatal(err)
		}
		pred, _, err := fit.Predict(ctx, rows)
		if err != nil {
			t.Fatal(err)
		}
		for i, q := range pred {
			w := make([]float64, 3)
			w[i] = 1
			e, err := means.Estimate(w)
			if err != nil {
				t.Fatal(err)
			}
			for _, v := range [][2]float64{{e.Value, q.Value}, {e.SE, q.SE}, {e.Lower, q.Lower}, {e.Upper, q.Upper}} {
				if math.Abs(v[0]-v[1]) > 1e-12*math.Abs(v[1]) {
					t.Errorf("row %d: %+v, predicted %+v", i, e, q)
				}
			}
			if half := fit.Critical(0.95) * e.SE; math.Abs(e.Upper-e.Value-half) > 1e-12*half {
				t.Errorf("Critical(0.95) gives half width %g, the interval has %g", half, e.Upper-e.Value)
			}
		}
		w := []float64{1, -1, 0}
		e, err := means.Estimate(w)
		if err != nil {
			t.Fatal(err)
		}
		va, _ := means.Covariance([]float64{1, 0, 0}, []float64{1, 0, 0})
		vb, _ := means.Covariance([]float64{0, 1, 0}, []float64{0, 1, 0})
		c, err := means.Covariance([]float64{1, 0, 0}, []float64{0, 1, 0})
		if err != nil || math.Abs(va+vb-2*c-e.SE*e.SE) > 1e-12*va {
			t.Errorf("variance of a difference %g, from covariances %g (%v)", e.SE*e.SE, va+vb-2*c, err)
		}
		for _, value := range []float64{0, 1.5} {
			eq, err := means.Equation(w, value)
			if err != nil {
				t.Fatal(err)
			}
			r, err := m.Restrict(lrt.Equations(eq))
			if err != nil {
				t.Fatal(err)
			}
			x := (e.Value - value) / e.SE
			if f := compare(t, r, m).Exact.Statistic; math.Abs(f-x*x) > 1e-10*f {
				t.Errorf("options %+v, value %g: F = %.15g, t² = %.15g", o, value, f, x*x)
			}
		}
	}
}

func TestRowMeansErrors(t *testing.T) {
	ctx := context.Background()
	d := field(3, 40).data(t)
	fit, err := model(t, d, nil, glm.Constant{}, glm.Factor{Field: "a"}).Fit(ctx, nil)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := fit.RowMeans(ctx, nil); !errors.Is(err, glm.ErrEmpty) {
		t.Errorf("no rows: %v", err)
	}
	other, err := glm.NewData(glm.Labels("a", []string{"p", "z"}))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := fit.RowMeans(ctx, other); !errors.Is(err, glm.ErrUnknownLevel) {
		t.Errorf("unknown level: %v", err)
	}
	rows, err := glm.NewData(glm.Labels("a", []string{"p", "q"}))
	if err != nil {
		t.Fatal(err)
	}
	m, err := fit.RowMeans(ctx, rows)
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range [][]float64{nil, {1}, {math.NaN(), 0}, {math.Inf(1), 0}} {
		if _, err := m.Estimate(w); !errors.Is(err, lrt.ErrInvalid) {
			t.Errorf("weights %v: %v", w, err)
		}
	}
	if _, err := m.Equation([]float64{0, 0}, 1); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("zero function: %v", err)
	}
	for _, level := range []float64{0, 1, math.NaN(), -1} {
		if x := fit.Critical(level); !math.IsNaN(x) {
			t.Errorf("Critical(%g) = %g", level, x)
		}
	}
}
