package lrt

import (
	"math"
	"testing"

	"subsume.example/dist"
)

// Ratio of two variances, n = 4 and 20, ratio 3.5: by both tails of equal λ
// p = 0.241, by equal tails 0.071 (computed independently with mpmath; the
// degrees of freedom of the variances are 3 and 19).
func TestBothTailsVarianceRatio(t *testing.T) {
	n1, n2 := 4.0, 20.0
	law := dist.F{D1: n1 - 1, D2: n2 - 1}
	logLambda := func(x float64) float64 {
		w := (n1 - 1) * x / (n2 - 1) // ratio of sums of squares
		return 0.5*n1*math.Log(w/(1+w)*(n1+n2)/n1) + 0.5*n2*math.Log((n1+n2)/n2/(1+w))
	}
	p, logP := BothTails(law, logLambda, 3.5)
	if math.Abs(p-0.241) > 5e-4 || math.Abs(logP-math.Log(p)) > 1e-12 {
		t.Errorf("p = %g, log p = %g, want 0.241", p, logP)
	}
	if q := 2 * law.Survival(3.5); math.Abs(q-0.071) > 5e-4 {
		t.Errorf("equal tails %g, want 0.071", q)
	}
	for _, x := range []float64{0, math.Inf(1)} {
		if p, _ := BothTails(law, logLambda, x); p != 0 {
			t.Errorf("at %g: p = %g", x, p)
		}
	}
	for _, x := range []float64{-1, math.NaN()} {
		if p, _ := BothTails(law, logLambda, x); !math.IsNaN(p) {
			t.Errorf("at %g: p = %g", x, p)
		}
	}
	// At the top of λ nothing is more extreme.
	top := topBetween(logLambda, 0.1, 10)
	if p, _ := BothTails(law, logLambda, top); math.Abs(p-1) > 1e-6 {
		t.Errorf("at the top p = %g", p)
	}
}
