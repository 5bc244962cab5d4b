package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"
)

// TestFarScales: a parameter that starts at 0 says nothing of its unit. Data in pascal
// or in molecules are compared as the same data in units near one, without a Start.
func TestFarScales(t *testing.T) {
	near := []float64{1.1, 2.3, 1.9, 3.3, 4.1, 2.8, 0.4, 0.9}
	compareAt := func(scale float64) Result {
		y := make([]float64, len(near))
		for i, v := range near {
			y[i] = v * scale
		}
		full, err := Bind(Model[[]float64]{
			Params: []Param{Real("mean"), Positive("sd")},
			LogLikelihood: func(y, th []float64) (l float64) {
				for _, v := range y {
					z := (v - th[0]) / th[1]
					l -= 0.5*z*z + math.Log(th[1])
				}
				return l
			},
		}, Observe(y, len(y)))
		if err != nil {
			t.Fatal(err)
		}
		zero, err := full.Restrict(Fix("mean", 0))
		if err != nil {
			t.Fatal(err)
		}
		r, err := Compare(context.Background(), zero, full, nil)
		if err != nil {
			t.Fatalf("scale %g: %v", scale, err)
		}
		return r
	}
	// n log(Σy²/Σ(y − ȳ)²)
	var s, q float64
	for _, v := range near {
		s, q = s+v, q+v*v
	}
	n := float64(len(near))
	want := n * math.Log(q/(q-s*s/n))
	for _, scale := range []float64{1e-120, 1e-20, 1e-8, 1, 1e8, 1e10, 1e12, 1e15, 1e20, 1e30} {
		if r := compareAt(scale); math.Abs(r.Statistic-want) > 1e-8 || r.ChiSquared.Kind != Asymptotic || r.Pair.DF != 1 {
			t.Errorf("scale %g: −2 log λ = %.12g (%v, %g df), want %.12g", scale, r.Statistic, r.ChiSquared.Kind, r.Pair.DF, want)
		}
	}
}

// TestProgressPanics: a panic of the caller's own function does not end the program.
func TestProgressPanics(t *testing.T) {
	s := &Settings{Workers: 2, Progress: func(done, _ int) {
		if done == 5 {
			panic("bar is full")
		}
	}}
	err := drawn(context.Background(), s, 20, func(context.Context, int) (float64, error) { return 0, nil }, func(int, float64) bool { return true })
	if !errors.Is(err, ErrPanic) {
		t.Errorf("Progress: %v", err)
	}
	err = drawn(context.Background(), nil, 20, func(_ context.Context, i int) (float64, error) {
		panic(fmt.Sprint("draw ", i))
	}, func(int, float64) bool { return true })
	if !errors.Is(err, ErrPanic) {
		t.Errorf("draw: %v", err)
	}
}

// TestGammaWithoutEnd: a shape of its own for one value, or for equal ones, has no
// largest likelihood; a shape shared with other values has.
func TestGammaWithoutEnd(t *testing.T) {
	for _, s := range []Samples{{{1}, {2, 3, 4}}, {{2, 2, 2}, {1, 3, 4}}} {
		full, err := GammaSamples(s)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := full.Maximize(context.Background()); !errors.Is(err, ErrUnbounded) {
			t.Errorf("%v: %v, want ErrUnbounded", s, err)
		}
		shared, err := full.Restrict(Equate("shape[1]", "shape[2]"))
		if err != nil {
			t.Fatal(err)
		}
		if _, err := shared.Maximize(context.Background()); err != nil {
			t.Errorf("%v, one shape: %v", s, err)
		}
	}
}
