package dist_test

import (
	"fmt"
	"math"
	"testing"
	"time"

	"subsume.example/dist"

	"gonum.org/v1/gonum/stat/distuv"
)

var (
	sink  float64
	point = 0.1
	power = -3.3
)

// besideMachine reports the times of math.Erfc(0.1) and math.Exp(-3.3) beside a figure, measured just
// before it, so that it can be re-based on another machine.
func besideMachine(b *testing.B) {
	nanoseconds := func(f func(float64) float64, x float64) float64 {
		const n = 20000
		start := time.Now()
		for range n {
			sink = f(x)
		}
		return float64(time.Since(start).Nanoseconds()) / n
	}
	erfc, exp := nanoseconds(math.Erfc, point), nanoseconds(math.Exp, power)
	b.Cleanup(func() {
		b.ReportMetric(erfc, "erfc-ns")
		b.ReportMetric(exp, "exp-ns")
	})
	b.ReportAllocs()
}

// BenchmarkTail times upper tails at the 5 % point, the centre (0.6) and far out (1e-20), and the
// lower tail at the same points, with gonum's where it has the law.
func BenchmarkTail(b *testing.B) {
	cases := []struct {
		name string
		law  dist.Law
		peer interface{ Survival(float64) float64 }
	}{
		{"ChiSquared(5)", dist.ChiSquared{K: 5}, distuv.ChiSquared{K: 5}},
		{"ChiSquared(4)", dist.ChiSquared{K: 4}, distuv.ChiSquared{K: 4}},
		{"ChiSquared(1)", dist.ChiSquared{K: 1}, distuv.ChiSquared{K: 1}},
		{"ChiSquared(4.7)", dist.ChiSquared{K: 4.7}, distuv.ChiSquared{K: 4.7}},
		{"ChiSquared(99.5)", dist.ChiSquared{K: 99.5}, distuv.ChiSquared{K: 99.5}},
		{"ChiSquared(1e6)", dist.ChiSquared{K: 1e6}, distuv.ChiSquared{K: 1e6}},
		{"F(3,20)", dist.F{D1: 3, D2: 20}, distuv.F{D1: 3, D2: 20}},
		{"F(4,27)", dist.F{D1: 4, D2: 27}, distuv.F{D1: 4, D2: 27}},
		{"F(3,21)", dist.F{D1: 3, D2: 21}, distuv.F{D1: 3, D2: 21}},
		{"F(3.3,17.6)", dist.F{D1: 3.3, D2: 17.6}, distuv.F{D1: 3.3, D2: 17.6}},
		{"F(40,200)", dist.F{D1: 40, D2: 200}, distuv.F{D1: 40, D2: 200}},
		{"StudentT(12)", dist.StudentT{Nu: 12}, distuv.StudentsT{Sigma: 1, Nu: 12}},
		{"StudentT(7.4)", dist.StudentT{Nu: 7.4}, distuv.StudentsT{Sigma: 1, Nu: 7.4}},
	}
	for _, c := range cases {
		for _, at := range []struct {
			name string
			q    float64
		}{{"5%", 0.05}, {"centre", 0.6}, {"far", 1e-20}} {
			x := c.law.UpperQuantile(at.q)
			b.Run(c.name+"/"+at.name+"/upper", func(b *testing.B) {
				besideMachine(b)
				switch law := c.law.(type) {
				case dist.F:
					for b.Loop() {
						sink = law.Survival(x)
					}
				case dist.ChiSquared:
					for b.Loop() {
						sink = law.Survival(x)
					}
				case dist.StudentT:
					for b.Loop() {
						sink = law.Survival(x)
					}
				}
			})
			b.Run(c.name+"/"+at.name+"/gonum", func(b *testing.B) {
				besideMachine(b)
				for b.Loop() {
					sink = c.peer.Survival(x)
				}
			})
		}
	}
}

// BenchmarkQuantile times quantiles.
func BenchmarkQuantile(b *testing.B) {
	for _, law := range []dist.Law{dist.ChiSquared{K: 5}, dist.ChiSquared{K: 4.7}, dist.F{D1: 3, D2: 20}, dist.F{D1: 3.3, D2: 17.6}, dist.StudentT{Nu: 12}} {
		for _, q := range []float64{0.05, 1e-20} {
			b.Run(fmt.Sprintf("%v/%g", law, q), func(b *testing.B) {
				besideMachine(b)
				for b.Loop() {
					sink = law.UpperQuantile(q)
				}
			})
		}
	}
}
