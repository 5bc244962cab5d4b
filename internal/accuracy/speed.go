package accuracy

import (
	"flag"
	"fmt"
	"math"
	"sort"
	"testing"
	"time"

	"subsume.example/dist"

	"gonum.org/v1/gonum/stat/distuv"
)

// Speed is one function to be timed at some points.
type Speed struct {
	Name   string
	F      func(x float64) float64
	Peer   func(x float64) float64 // gonum's function of the same value, nil if it has none
	Points []SpeedPoint
}

// SpeedPoint is an argument with a name and a goal in nanoseconds on a machine where
// math.Exp(-3.3) takes 5.3 ns; 0 means no goal.
type SpeedPoint struct {
	Name string
	X    float64
	Goal float64
}

type survival interface{ Survival(float64) float64 }

// upper times a law's upper tail at its 5 % point, at the tail 0.6 and at the tail 1e-20.
func upper(law dist.Law, peer survival, goal float64) Speed {
	s := Speed{Name: law.String() + " upper tail", F: law.Survival, Points: []SpeedPoint{
		{"5 %", law.UpperQuantile(0.05), goal}, {"centre", law.UpperQuantile(0.6), goal}, {"far", law.UpperQuantile(1e-20), goal},
	}}
	if peer != nil {
		s.Peer = peer.Survival
	}
	return s
}

// quantile times the upper quantile at 0.05 and 1e-20.
func quantile(law dist.Law, goal float64) Speed {
	return Speed{Name: law.String() + " quantile", F: law.UpperQuantile, Points: []SpeedPoint{{"0.05", 0.05, goal}, {"1e-20", 1e-20, goal}}}
}

// Speeds lists what is timed.
func Speeds() []Speed {
	power := dist.NoncentralF{D1: 3, D2: 20, Lambda: 5}
	return []Speed{
		upper(dist.ChiSquared{K: 5}, distuv.ChiSquared{K: 5}, 80),
		upper(dist.ChiSquared{K: 4.7}, distuv.ChiSquared{K: 4.7}, 150),
		upper(dist.ChiSquared{K: 1000}, distuv.ChiSquared{K: 1000}, 0),
		upper(dist.ChiSquared{K: 1e8}, distuv.ChiSquared{K: 1e8}, 0),
		upper(dist.F{D1: 3, D2: 20}, distuv.F{D1: 3, D2: 20}, 120),
		upper(dist.F{D1: 3.3, D2: 17.6}, distuv.F{D1: 3.3, D2: 17.6}, 250),
		upper(dist.F{D1: 40, D2: 200}, distuv.F{D1: 40, D2: 200}, 0),
		upper(dist.F{D1: 2, D2: 1e8}, distuv.F{D1: 2, D2: 1e8}, 0),
		upper(dist.StudentT{Nu: 12}, distuv.StudentsT{Sigma: 1, Nu: 12}, 0),
		upper(dist.NoncentralChiSquared{K: 3, Lambda: 5}, nil, 300),
		upper(power, nil, 800),
		upper(dist.NoncentralT{Nu: 12, Delta: 1}, nil, 0),
		upper(dist.StudentizedRange{K: 5, Nu: 20}, nil, 60000),
		upper(dist.MaximumModulus{K: 5, Nu: 20}, nil, 0),
		quantile(dist.ChiSquared{K: 5}, 0),
		quantile(dist.F{D1: 3, D2: 20}, 0),
		quantile(dist.F{D1: 3.3, D2: 17.6}, 0),
		quantile(dist.StudentT{Nu: 12}, 0),
		quantile(power, 9000),
		quantile(dist.StudentizedRange{K: 5, Nu: 20}, 500000),
	}
}

// Nanoseconds returns the time of f(x), measured for about the given number of milliseconds.
func Nanoseconds(f func(float64) float64, x float64, milliseconds int) float64 {
	if flag.Lookup("test.benchtime") == nil {
		testing.Init()
	}
	if err := flag.Set("test.benchtime", fmt.Sprintf("%dms", milliseconds)); err != nil {
		return math.NaN()
	}
	best := math.Inf(1)
	for range 3 {
		r := testing.Benchmark(func(b *testing.B) {
			for b.Loop() {
				f(x)
			}
		})
		best = min(best, float64(r.T.Nanoseconds())/float64(r.N))
	}
	return best
}

// RowTimes returns the times of one upper tail on each row of a table, in nanoseconds, ascending, and the
// slowest row: of each the best of three batches of eight calls.
func RowTimes(t Table, rows []Row) (ns []float64, slowest Row) {
	worst := -1.0
	for _, r := range rows {
		d := t.New(r.P)
		best := math.Inf(1)
		for range 3 {
			start := time.Now()
			for range 8 {
				d.Survival(r.X)
			}
			best = min(best, float64(time.Since(start).Nanoseconds())/8)
		}
		if best > worst {
			worst, slowest = best, r
		}
		ns = append(ns, best)
	}
	sort.Float64s(ns)
	return ns, slowest
}
