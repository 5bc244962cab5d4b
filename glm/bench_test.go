package glm_test

import (
	"context"
	"fmt"
	"math/rand/v2"
	"runtime"
	"runtime/metrics"
	"slices"
	"sync/atomic"
	"testing"
	"time"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// regression is n rows of p−1 normal covariates and a response.
func regression(n, p int) (y []float64, x [][]float64) {
	r := rand.New(rand.NewPCG(uint64(n), uint64(p)))
	y = make([]float64, n)
	x = make([][]float64, p-1)
	for j := range x {
		x[j] = make([]float64, n)
		for i := range n {
			x[j][i] = r.NormFloat64()
			y[i] += x[j][i] / float64(j+1)
		}
	}
	for i := range n {
		y[i] += r.NormFloat64()
	}
	return y, x
}

// regressionModels binds the constant, and all columns.
func regressionModels(b *testing.B, n, p int) (restricted, full *glm.Model) {
	y, x := regression(n, p)
	cols := []glm.Column{glm.SharedNumbers("y", y)}
	terms := []glm.Term{glm.Constant{}}
	for j := range x {
		name := fmt.Sprintf("x%d", j+1)
		cols = append(cols, glm.SharedNumbers(name, x[j]))
		terms = append(terms, glm.Covariate{Field: name})
	}
	d, err := glm.NewData(cols...)
	if err != nil {
		b.Fatal(err)
	}
	return model(b, d, nil, glm.Constant{}), model(b, d, nil, terms...)
}

// gonumQR is the plain route: a dense design, mat.QR, SolveTo.
func gonumQR(b *testing.B, n, p int) func() {
	y, x := regression(n, p)
	a := mat.NewDense(n, p, nil)
	for i := range n {
		a.Set(i, 0, 1)
		for j := range x {
			a.Set(i, j+1, x[j][i])
		}
	}
	v := mat.NewVecDense(n, y)
	return func() {
		var qr mat.QR
		qr.Factorize(a)
		var beta mat.VecDense
		if err := qr.SolveVecTo(&beta, false, v); err != nil {
			b.Fatal(err)
		}
	}
}

// race times an operation and its peer in turn, 15 rounds of n runs each, and
// reports the ratio of the medians: below 1 the operation is faster.
func race(b *testing.B, name string, n int, own, peer func()) {
	b.StopTimer()
	var t [2][]float64
	for range 15 {
		for i, f := range []func(){own, peer} {
			start := time.Now()
			for range n {
				f()
			}
			t[i] = append(t[i], float64(time.Since(start)))
		}
	}
	slices.Sort(t[0])
	slices.Sort(t[1])
	b.ReportMetric(t[0][7]/t[1][7], name)
}

func BenchmarkSmallCompare(b *testing.B) {
	restricted, full := regressionModels(b, 30, 4)
	ctx := context.Background()
	run := func() {
		if _, err := lrt.Compare(ctx, restricted, full, nil); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportAllocs()
	for b.Loop() {
		run()
	}
	race(b, "x-gonum", 1000, run, gonumQR(b, 30, 4))
}

// BenchmarkSmallFit is the workspace route: estimates, standard errors, F and p.
func BenchmarkSmallFit(b *testing.B) {
	y, x := regression(30, 4)
	x = append([][]float64{ones(30)}, x...)
	w, err := glm.NewWorkspace(30, 4)
	if err != nil {
		b.Fatal(err)
	}
	run := func() {
		l, err := w.Compare(x, y, 1)
		if err != nil {
			b.Fatal(err)
		}
		l.F()
	}
	b.ReportAllocs()
	for b.Loop() {
		run()
	}
	race(b, "x-gonum", 2000, run, gonumQR(b, 30, 4))
}

func BenchmarkLinear(b *testing.B) {
	for _, s := range []struct{ n, p int }{{1000, 10}, {100000, 20}} {
		b.Run(fmt.Sprintf("n=%d/p=%d", s.n, s.p), func(b *testing.B) {
			restricted, full := regressionModels(b, s.n, s.p)
			ctx := context.Background()
			run := func() {
				if _, err := lrt.Compare(ctx, restricted, full, nil); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportAllocs()
			for b.Loop() {
				run()
			}
			race(b, "x-gonum", max(1, 10000/s.n), run, gonumQR(b, s.n, s.p))
		})
	}
}

func BenchmarkOneWay(b *testing.B) {
	for _, s := range []struct{ n, k int }{{10000, 1000}, {1000000, 5}, {1000000, 1000}} {
		b.Run(fmt.Sprintf("n=%d/k=%d", s.n, s.k), func(b *testing.B) {
			r := rand.New(rand.NewPCG(1, 2))
			y, g := make([]float64, s.n), make([]int, s.n)
			for i := range y {
				g[i] = r.IntN(s.k)
				y[i] = r.NormFloat64() + float64(g[i])
			}
			d, err := glm.NewData(glm.SharedNumbers("y", y), glm.Levels("g", g))
			if err != nil {
				b.Fatal(err)
			}
			restricted := model(b, d, nil, glm.Constant{})
			full := model(b, d, nil, glm.Constant{}, glm.Factor{Field: "g"})
			ctx := context.Background()
			run := func() {
				if _, err := lrt.Compare(ctx, restricted, full, nil); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportAllocs()
			for b.Loop() {
				run()
			}
			groups := make([][]float64, s.k)
			for i := range y {
				groups[g[i]] = append(groups[g[i]], y[i])
			}
			race(b, "x-gonum-MeanVariance", 1, run, func() {
				for _, v := range groups {
					stat.MeanVariance(v, nil)
				}
			})
			if s.k == 5 || s.n == 10000 { // a dense design and mat.QR, once
				a := mat.NewDense(s.n, s.k, nil)
				for i := range y {
					a.Set(i, g[i], 1)
				}
				t := time.Now()
				run()
				own := time.Since(t)
				t = time.Now()
				var qr mat.QR
				qr.Factorize(a)
				var beta mat.VecDense
				if err := qr.SolveVecTo(&beta, false, mat.NewVecDense(s.n, y)); err != nil {
					b.Fatal(err)
				}
				b.ReportMetric(float64(own)/float64(time.Since(t)), "x-gonum-QR")
			}
		})
	}
}

// BenchmarkTwoFactors compares 1 + A with 1 + A + B, 1,000 levels each, over
// 10⁶ generated rows that are never all in memory, and prints the peak heap.
func BenchmarkTwoFactors(b *testing.B) {
	src := &generated{rows: 1000000, levels: 1000}
	ctx := context.Background()
	var peak uint64
	for b.Loop() {
		runtime.GC()
		stop := watchHeap(&peak)
		restricted := model(b, src, nil, glm.Constant{}, glm.Factor{Field: "a"})
		full := model(b, src, nil, glm.Constant{}, glm.Factor{Field: "a"}, glm.Factor{Field: "b"})
		if _, err := lrt.Compare(ctx, restricted, full, nil); err != nil {
			b.Fatal(err)
		}
		if _, err := full.Fit(ctx, nil); err != nil {
			b.Fatal(err)
		}
		stop()
	}
	b.ReportMetric(float64(peak)/(1<<20), "peak-MiB")
}

// watchHeap samples the live heap until the returned function is called.
func watchHeap(peak *uint64) (stop func()) {
	s := []metrics.Sample{{Name: "/memory/classes/heap/objects:bytes"}}
	metrics.Read(s)
	base := s[0].Value.Uint64()
	var done atomic.Bool
	ended := make(chan struct{})
	go func() {
		defer close(ended)
		for !done.Load() {
			metrics.Read(s)
			if v := s[0].Value.Uint64(); v > base && v-base > *peak {
				*peak = v - base
			}
			time.Sleep(time.Millisecond)
		}
	}()
	return func() { done.Store(true); <-ended }
}
