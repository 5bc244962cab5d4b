package dist

import (
	"math"
	"testing"
)

// TestNoncentralFUnlimited: denominator degrees of freedom beyond any meaning give the
// law with known variance, not a number above 1.
func TestNoncentralFUnlimited(t *testing.T) {
	limit := NoncentralF{D1: 2, D2: math.Inf(1), Lambda: 5}
	for _, d2 := range []float64{1e30, 1e100, 1e150, 1e200, math.MaxFloat64} {
		f := NoncentralF{D1: 2, D2: d2, Lambda: 5}
		for _, x := range []float64{0.01, 1, 3, 40} {
			for _, v := range [][2]float64{{f.CDF(x), limit.CDF(x)}, {f.Survival(x), limit.Survival(x)}, {f.Prob(x), limit.Prob(x)}} {
				if math.Abs(v[0]-v[1]) > 4e-16*v[1] {
					t.Errorf("%v at %g: %g, want %g", f, x, v[0], v[1])
				}
			}
		}
		if got, want := f.UpperQuantile(0.3), limit.UpperQuantile(0.3); math.Abs(got-want) > 4e-16*want {
			t.Errorf("%v: quantile %g, want %g", f, got, want)
		}
	}
}
