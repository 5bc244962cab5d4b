package lrt

import (
	"context"
	"errors"
	"math"
	"testing"
	"time"
)

// FuzzDeclared fits a likelihood with holes, steps and cliffs: a fit ends in
// time, never panics, and never returns a log likelihood that it cannot defend.
func FuzzDeclared(f *testing.F) {
	f.Add(0.0, 1.0, 1.0, uint8(0))
	f.Add(1e8, 1e-3, -2.0, uint8(1))
	f.Add(-3.0, 1e300, 0.5, uint8(2))
	f.Add(2.0, 1e-300, 3.0, uint8(3))
	f.Add(5.0, 7.0, 1e5, uint8(4))
	f.Add(5.0, 7.0, 1e5, uint8(5))
	f.Fuzz(func(t *testing.T, centre, width, skew float64, kind uint8) {
		m := Model[int]{
			Params: []Param{Real("a"), Positive("b")},
			Budget: 5000,
			LogLikelihood: func(_ int, th []float64) float64 {
				z := (th[0] - centre) / width
				switch kind % 6 {
				case 1:
					if z < -1 {
						return math.NaN()
					}
				case 2:
					return -math.Abs(z) - math.Abs(math.Log(th[1])-skew)
				case 3:
					return math.Floor(-z*z) - (th[1]-skew)*(th[1]-skew)
				case 4:
					return skew * z
				case 5:
					return math.Sin(z) - math.Pow(math.Log(th[1]), 4)
				}
				return -z*z - math.Log1p(z*z*skew*skew) - math.Pow(math.Log(th[1])-skew, 2)
			},
		}
		s, err := Bind(m, Observe(0, 5))
		if err != nil {
			t.Fatal(err)
		}
		ctx, cancel := context.WithTimeout(context.Background(), 10*time.Second)
		defer cancel()
		fit, err := s.Maximize(ctx)
		if errors.Is(err, context.DeadlineExceeded) {
			t.Fatal("no end")
		}
		if err != nil {
			var me *ModelError
			if !errors.As(err, &me) {
				t.Fatalf("%T: %v", err, err)
			}
			return
		}
		if got := m.LogLikelihood(0, fit.Estimate); math.Abs(got-fit.LogLikelihood) > 1e-9*(1+math.Abs(got)) {
			t.Fatalf("log likelihood %g at the estimate %v, reported %g", got, fit.Estimate, fit.LogLikelihood)
		}
		if _, err := s.Estimates(ctx, fit); err != nil && errors.Is(err, context.DeadlineExceeded) {
			t.Fatal("no end of standard errors")
		}
	})
}
