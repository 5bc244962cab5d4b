package dist_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/dist"
)

// TestDensityEnds holds the limits of the densities at the ends of the support.
func TestDensityEnds(t *testing.T) {
	for _, c := range []struct {
		law     fullLaw
		x, want float64
	}{
		{dist.F{D1: 1.5, D2: 3}, 0, inf}, {dist.F{D1: 2, D2: 3}, 0, 1}, {dist.F{D1: 2.5, D2: 3}, 0, 0}, {dist.F{D1: 2, D2: inf}, 0, 1},
		{dist.ChiSquared{K: 1}, 0, inf}, {dist.ChiSquared{K: 2}, 0, 0.5}, {dist.ChiSquared{K: 3}, 0, 0},
		{dist.Gamma{Shape: 0.5, Scale: 4}, 0, inf}, {dist.Gamma{Shape: 1, Scale: 4}, 0, 0.25}, {dist.Gamma{Shape: 2, Scale: 4}, 0, 0},
		{dist.Beta{A: 0.5, B: 3}, 0, inf}, {dist.Beta{A: 1, B: 3}, 0, 3}, {dist.Beta{A: 2, B: 3}, 0, 0},
		{dist.Beta{A: 3, B: 0.5}, 1, inf}, {dist.Beta{A: 3, B: 1}, 1, 3}, {dist.Beta{A: 3, B: 2}, 1, 0},
		{dist.F{D1: 3, D2: 3}, -1, 0}, {dist.Beta{A: 1, B: 1}, -0.5, 0}, {dist.Beta{A: 1, B: 1}, 1.5, 0},
		// Next to the ends the density is still its limit, without overflow on the way.
		{dist.F{D1: 2, D2: 3}, 5e-324, 1}, {dist.Beta{A: 1, B: 3}, 5e-324, 3}, {dist.ChiSquared{K: 2}, 5e-324, 0.5},
		{dist.Gamma{Shape: 1, Scale: 4}, 5e-324, 0.25},
	} {
		if got := c.law.Prob(c.x); !(got == c.want || math.Abs(got/c.want-1) < 1e-15) {
			t.Errorf("%v.Prob(%v) = %v, want %v", c.law, c.x, got, c.want)
		}
		l := math.Log(c.want)
		if got := c.law.LogProb(c.x); !(got == l || math.Abs(got-l) <= 1e-15*(1+math.Abs(l))) {
			t.Errorf("%v.LogProb(%v) = %v, want %v", c.law, c.x, got, l)
		}
	}
}

// TestMoments holds means and variances, the textbook's formulas by hand.
func TestMoments(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct {
		law            fullLaw
		mean, variance float64
	}{
		{dist.F{D1: 3, D2: 20}, 20.0 / 18, 2 * 400 * 21.0 / (3 * 18 * 18 * 16)},
		{dist.F{D1: 3, D2: 2}, inf, nan}, {dist.F{D1: 3, D2: 3}, 3, inf}, {dist.F{D1: 4, D2: inf}, 1, 0.5},
		{dist.ChiSquared{K: 7}, 7, 14}, {dist.Gamma{Shape: 3, Scale: 2}, 6, 12}, {dist.Beta{A: 2, B: 3}, 0.4, 0.04},
		{dist.StudentT{Nu: 10}, 0, 1.25}, {dist.StudentT{Nu: 1.5}, 0, inf}, {dist.StudentT{Nu: 1}, nan, nan}, {dist.StudentT{Nu: inf}, 0, 1},
	} {
		same := func(a, b float64) bool {
			return a == b || math.IsNaN(a) && math.IsNaN(b) || math.Abs(a-b) <= 1e-15*math.Abs(b)
		}
		if m, v := c.law.Mean(), c.law.Variance(); !same(m, c.mean) || !same(v, c.variance) {
			t.Errorf("%v: mean %v, variance %v, want %v, %v", c.law, m, v, c.mean, c.variance)
		}
	}
}

// TestSmallDegreesOfFreedomDraw: variates of tiny shape underflow to 0 or overflow, but never to NaN.
func TestSmallDegreesOfFreedomDraw(t *testing.T) {
	src := newSource()
	for _, law := range []fullLaw{dist.F{D1: 1e-3, D2: 1e-3}, dist.ChiSquared{K: 1e-3}, dist.StudentT{Nu: 1e-3}, dist.Beta{A: 1e-3, B: 1e-3}, dist.Gamma{Shape: 1e-3, Scale: 1}} {
		for range 2000 {
			if v := law.Rand(src); math.IsNaN(v) {
				t.Fatalf("%v: NaN drawn", law)
			}
		}
	}
}

func newSource() rand.Source { return rand.NewPCG(17, 4) }
