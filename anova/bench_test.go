package anova_test

import (
	"context"
	"fmt"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"subsume.example/anova"
	"subsume.example/glm"
)

// crossedData is a layout of two factors with n rows.
func crossedData(b *testing.B, n, levels int) (*glm.Data, []int, []int, []float64) {
	b.Helper()
	r := rand.New(rand.NewPCG(1, 2))
	names := make([]string, levels)
	for i := range names {
		names[i] = fmt.Sprintf("level %d", i)
	}
	f, g, y := make([]int, n), make([]int, n), make([]float64, n)
	lf, lg := make([]string, n), make([]string, n)
	for i := range n {
		f[i], g[i] = r.IntN(levels), r.IntN(levels)
		if i < levels*levels {
			f[i], g[i] = i%levels, i/levels
		}
		lf[i], lg[i] = names[f[i]], names[g[i]]
		y[i] = float64(f[i]) + 0.1*float64(g[i]) + r.NormFloat64()
	}
	d, err := glm.NewData(glm.Labels("f", lf).Order(names...), glm.Labels("g", lg).Order(names...), glm.Numbers("y", y))
	if err != nil {
		b.Fatal(err)
	}
	return d, f, g, y
}

// BenchmarkTable makes the table of two crossed factors; peer: gonum's QR of
// each of the four models, dense, which gives the sums of squares only.
func BenchmarkTable(b *testing.B) {
	ctx := context.Background()
	for _, size := range []struct{ n, levels int }{{36, 3}, {1000, 5}, {100000, 5}} {
		d, f, g, y := crossedData(b, size.n, size.levels)
		for _, dec := range []anova.Decomposition{anova.Sequential, anova.Partial} {
			b.Run(fmt.Sprintf("n=%d/%v", size.n, dec), func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					cs, err := anova.Crossed(ctx, d, "y", []string{"f", "g"}, &anova.Options{Decomposition: dec})
					if err != nil {
						b.Fatal(err)
					}
					if _, err := anova.Tabulate(ctx, cs, nil); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
		if size.n > 10000 {
			continue // the dense cells alone are 25 columns of 10⁵ rows, four times
		}
		b.Run(fmt.Sprintf("n=%d/gonum", size.n), func(b *testing.B) {
			b.ReportAllocs()
			k := size.levels
			for b.Loop() {
				for _, columns := range []int{1, k, 2*k - 1, k * k} {
					x := mat.NewDense(size.n, columns, nil)
					for i := range size.n {
						x.Set(i, 0, 1)
						if columns == k*k {
							x.Set(i, 0, 0)
							x.Set(i, f[i]*k+g[i], 1)
							continue
						}
						if columns > 1 && f[i] > 0 {
							x.Set(i, f[i], 1)
						}
						if columns > k && g[i] > 0 {
							x.Set(i, k-1+g[i], 1)
						}
					}
					var qr mat.QR
					qr.Factorize(x)
					var beta mat.VecDense
					if err := qr.SolveVecTo(&beta, false, mat.NewVecDense(size.n, y)); err != nil {
						b.Fatal(err)
					}
				}
			}
		})
	}
}

// BenchmarkPairs tests all pairs of groups, each a comparison.
func BenchmarkPairs(b *testing.B) {
	ctx := context.Background()
	for _, k := range []int{5, 20, 60} {
		d, _, _, _ := crossedData(b, 20*k+k*k, k)
		cs, err := anova.OneWay(ctx, d, "y", "f", nil)
		tab := tabulate(b, cs, err)
		groups := means(b, tab.Model(), nil, "f")
		b.Run(fmt.Sprintf("groups=%d", k), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := groups.Test(ctx, groups.Pairs(), anova.Holm, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkSampleSize searches the size of a one-way design.
func BenchmarkSampleSize(b *testing.B) {
	ctx := context.Background()
	d := anova.OneWayDesign([]float64{0, 0.2, 0.4, 0.6}, 1, 1)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := d.SampleSize(ctx, "group", 0.05, 0.9, nil); err != nil {
			b.Fatal(err)
		}
	}
}
