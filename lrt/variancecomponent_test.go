package lrt

import (
	"errors"
	"math"
	"testing"

	"subsume.example/dist"
)

// In a balanced one-way layout λ rises with F, so that the exact p of λ is the
// tail of F wherever λ < 1; the share of λ = 1 is P(F ≤ k/(k−1)).
func TestVarianceComponentAgainstF(t *testing.T) {
	const k, m = 5, 4
	law, err := OneWayVariance([]int{m, m, m, m, m}, false)
	if err != nil {
		t.Fatal(err)
	}
	law.Draws = 4000
	r := draw(3)
	seen := 0
	for seed := range uint64(12) {
		y := make([]float64, k*m)
		for g := range k {
			b := 0.8 * r.NormFloat64()
			for i := range m {
				y[g*m+i] = b + r.NormFloat64()
			}
		}
		full := mustBind(t, randomGroups(k, m), y, k*m)
		small := mustRestrict(t, full, Fix("between", 0))
		res, err := Compare(bg, small, full, &Settings{Seed: seed, References: []Reference{law}})
		if err != nil {
			t.Fatal(err)
		}
		var ssb, ssw, grand float64
		for _, v := range y {
			grand += v / (k * m)
		}
		for g := range k {
			mean := sum(y[g*m:g*m+m]) / m
			ssb += m * (mean - grand) * (mean - grand)
			for _, v := range y[g*m : g*m+m] {
				ssw += (v - mean) * (v - mean)
			}
		}
		got := res.Others[0]
		if res.Statistic < 1e-6 {
			if got.P != 1 {
				t.Errorf("p = %g at λ = 1", got.P)
			}
			continue
		}
		seen++
		want := dist.F{D1: k - 1, D2: k * (m - 1)}.Survival(ssb / (k - 1) / (ssw / (k * (m - 1))))
		if want < got.Simulation.Lower-0.01 || want > got.Simulation.Upper+0.01 {
			t.Errorf("seed %d: p = %g (%g to %g), by F %g", seed, got.P, got.Simulation.Lower, got.Simulation.Upper, want)
		}
		if res.Recommended != Simulated {
			t.Errorf("recommended %v", res.Recommended)
		}
	}
	if seen < 5 {
		t.Errorf("only %d data sets off the boundary", seen)
	}
	// 5 % size of the mixture for 3 groups of 5: 1.8 % by maximum likelihood, 3.4 % by
	// the residual likelihood (measured before, to a tenth of a percent).
	for _, c := range []struct {
		residual bool
		want     float64
	}{{false, 0.018}, {true, 0.034}} {
		law, err := OneWayVariance([]int{5, 5, 5}, c.residual)
		if err != nil {
			t.Fatal(err)
		}
		const n = 8000
		hit := 0
		for i := range n {
			if law.statistic(drawSource(9, i)) > 2.705543454 {
				hit++
			}
		}
		if got := float64(hit) / n; math.Abs(got-c.want) > 4*math.Sqrt(c.want/n)+0.0006 {
			t.Errorf("residual %v: size of the mixture %.4f, want %.3f", c.residual, got, c.want)
		}
	}
}

// The general constructor finds the eigenvalues of the one-way layout.
func TestVarianceComponentColumns(t *testing.T) {
	sizes := []int{2, 3, 5}
	want, err := OneWayVariance(sizes, true)
	if err != nil {
		t.Fatal(err)
	}
	ones := make([]float64, 10)
	var z [][]float64
	row := 0
	for _, s := range sizes {
		c := make([]float64, 10)
		for range s {
			c[row], ones[row] = 1, 1
			row++
		}
		z = append(z, c)
	}
	got, err := NewVarianceComponent([][]float64{ones, ones}, z, true)
	if err != nil {
		t.Fatal(err)
	}
	if got.P != 1 || got.N != 10 || len(got.Mu) != 2 || len(want.Mu) != 2 {
		t.Fatalf("%+v, want %+v", got, want)
	}
	for i := range got.Mu {
		near(t, "mu", got.Mu[i], want.Mu[i], 1e-12)
	}
	for _, f := range []func() error{
		func() error { _, err := OneWayVariance([]int{1, 1}, false); return err },
		func() error { _, err := OneWayVariance([]int{3}, false); return err },
		func() error { _, err := OneWayVariance([]int{3, 0}, false); return err },
		func() error { _, err := NewVarianceComponent(nil, nil, false); return err },
		func() error { _, err := NewVarianceComponent([][]float64{ones}, [][]float64{{1}}, false); return err },
		func() error { _, err := NewVarianceComponent([][]float64{ones}, [][]float64{ones}, false); return err },
		func() error {
			_, err := got.Refer(bg, Comparison{}, Pair{Full: Fit{N: 9}}, nil)
			return err
		},
	} {
		if err := f(); !errors.Is(err, ErrInvalid) {
			t.Errorf("%v", err)
		}
	}
}
