package dist_test

import (
	"fmt"
	"testing"

	"subsume.example/dist"
)

// BenchmarkNoncentral times upper tails, densities and quantiles at the 5 % point, the centre
// and the far tail.
func BenchmarkNoncentral(b *testing.B) {
	laws := []interface {
		dist.Law
		Prob(float64) float64
	}{
		dist.NoncentralChiSquared{K: 3, Lambda: 5},
		dist.NoncentralChiSquared{K: 4.7, Lambda: 500},
		dist.NoncentralChiSquared{K: 100, Lambda: 1e6},
		dist.NoncentralF{D1: 3, D2: 20, Lambda: 5},
		dist.NoncentralF{D1: 3.3, D2: 17.6, Lambda: 30},
		dist.NoncentralF{D1: 10, D2: 1000, Lambda: 1e4},
		dist.NoncentralT{Nu: 10, Delta: 1},
		dist.NoncentralT{Nu: 17.6, Delta: 5},
		dist.NoncentralT{Nu: 1e4, Delta: -30},
	}
	for _, l := range laws {
		for _, p := range []struct {
			name string
			q    float64
		}{{"5%", 0.05}, {"centre", 0.5}, {"far", 1e-100}} {
			x := l.UpperQuantile(p.q)
			b.Run(fmt.Sprintf("%v/tail/%s", l, p.name), func(b *testing.B) {
				besideMachine(b)
				for b.Loop() {
					sink = l.Survival(x)
				}
			})
		}
		x := l.UpperQuantile(0.05)
		b.Run(fmt.Sprintf("%v/density/5%%", l), func(b *testing.B) {
			besideMachine(b)
			for b.Loop() {
				sink = l.Prob(x)
			}
		})
		b.Run(fmt.Sprintf("%v/quantile/5%%", l), func(b *testing.B) {
			besideMachine(b)
			for b.Loop() {
				sink = l.UpperQuantile(0.05)
			}
		})
	}
	b.Run("NoncentralityF(3, 20)", func(b *testing.B) {
		besideMachine(b)
		for b.Loop() {
			sink, _ = dist.NoncentralityF(3, 20, 3.1, 0.8)
		}
	})
}
