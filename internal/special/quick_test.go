package special

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"subsume.example/internal/dd"
)

func logUniform(r *rand.Rand, lo, hi float64) float64 {
	return math.Exp(math.Log(lo) + r.Float64()*math.Log(hi/lo))
}

// sampleSize is 30 000, or 10^6 with SUBSUME_LONG=1.
func sampleSize() int {
	if os.Getenv("SUBSUME_LONG") == "1" {
		return 1000000
	}
	return 30000
}

// shape draws a shape parameter of the quick path, often whole or half.
func shape(r *rand.Rand) float64 {
	if r.IntN(3) == 0 {
		return float64(1+r.IntN(80)) / 2
	}
	return logUniform(r, 1e-3, quickMax)
}

// relDiff returns |a - b| / b of two tails reported on the same side, else of the smaller's
// side.
func relDiff(a Scaled, aUpper bool, b Scaled, bUpper bool) float64 {
	x, y := a.DD(), b.DD()
	if aUpper != bUpper {
		x = x.Neg().AddF(1)
	}
	d := x.Sub(y)
	return math.Abs(d.Hi / math.Min(math.Abs(y.Hi), 1))
}

// TestQuickGamma compares the quick path with the full one at random points, and counts
// how often it answers.
func TestQuickGamma(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 9))
	worst, answered, n := 0.0, 0, sampleSize()
	for range n {
		a := shape(r)
		if r.IntN(5) == 0 {
			a = logUniform(r, 1000, 1e12)
		}
		x := a + math.Sqrt(a)*6*r.NormFloat64()
		if x <= 0 || r.IntN(3) == 0 {
			x = logUniform(r, 1e-8, 600)
		}
		X := dd.From(x)
		q, qu, ok := quickGammaTail(a, X)
		if !ok {
			continue
		}
		answered++
		// The full path, with a low part so small that nothing changes but the branch.
		f, fu := GammaTail(dd.DD{Hi: a, Lo: 1e-300}, X)
		if e := relDiff(q, qu, f, fu); !(e < 1.5e-15) {
			t.Errorf("a = %v, x = %v: quick %v (%v), full %v (%v), relative difference %.2g", a, x, q.Float64(), qu, f.Float64(), fu, e)
		} else {
			worst = max(worst, e)
		}
	}
	t.Logf("%d of %d answered, worst difference %.2g", answered, n, worst)
	if answered < n*8/10 {
		t.Errorf("the quick path answered %d of %d", answered, n)
	}
}

// TestQuickBeta does the same for the beta law.
func TestQuickBeta(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 9))
	worst, answered, n := 0.0, 0, sampleSize()
	for range n {
		a, b := shape(r), shape(r)
		switch r.IntN(4) {
		case 0:
			a = logUniform(r, 1000, 1e12)
		case 1:
			b = logUniform(r, 1000, 1e12)
		case 2:
			a, b = logUniform(r, 1000, 1e12), logUniform(r, 1000, 1e12)
		}
		s := a + b
		x := a/s + 6*r.NormFloat64()*math.Sqrt(a*b/s/s/(s+1))
		if x <= 0 || x >= 1 || r.IntN(3) == 0 {
			x = logUniform(r, 1e-8, 1)
			if r.IntN(2) == 0 {
				x = 1 - x
			}
		}
		if x >= 1 {
			continue
		}
		X, Y := dd.From(x), dd.Sum(1, -x)
		q, qu, ok := quickBetaTail(a, b, X, Y)
		if !ok {
			continue
		}
		answered++
		f, fu := BetaTail(dd.DD{Hi: a, Lo: 1e-300}, dd.From(b), X, Y)
		// The quick path works in plain double at its ends: 1.6e-15 is the worst of 10⁶ points.
		if e := relDiff(q, qu, f, fu); !(e < 2e-15) {
			t.Errorf("a = %v, b = %v, x = %v: quick %v (%v), full %v (%v), relative difference %.2g", a, b, x, q.Float64(), qu, f.Float64(), fu, e)
		} else {
			worst = max(worst, e)
		}
	}
	t.Logf("%d of %d answered, worst difference %.2g", answered, n, worst)
	if answered < n*6/10 {
		t.Errorf("the quick path answered %d of %d", answered, n)
	}
}
