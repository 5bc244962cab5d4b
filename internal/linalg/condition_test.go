package linalg

import (
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/internal/dd"
)

// TestPivotedRank: a triangle whose pivots in order all look sound while its
// columns nearly depend (Kahan 1966, also Higham 2002, section 8.3).
func TestPivotedRank(t *testing.T) {
	const n = 60
	c := math.Cos(1.1)
	s := math.Sin(1.1)
	cols := make([][]float64, n)
	for j := range cols {
		cols[j] = make([]float64, n)
		for i := range j + 1 {
			x := math.Pow(s, float64(i))
			if i < j {
				x *= -c
			}
			cols[j][i] = x
		}
	}
	p := dense(make([]float64, n), cols...)
	tol := 1e-9
	f := NewFactor(p.gram(BlockRows), []int{0}, Settings{Tol: tol})
	if f.Rank != n {
		t.Skipf("rank %d in order", f.Rank)
	}
	r, ok := f.PivotedRank(tol)
	if !ok || r > n {
		t.Fatalf("pivoted rank %d %v", r, ok)
	}
	// Well conditioned: not worth a look.
	q := shape{n: 20, dense: []int{4}}.random(rand.New(rand.NewPCG(1, 1)))
	if _, ok := NewFactor(q.gram(BlockRows), []int{0}, Settings{Tol: 1e-12}).PivotedRank(1e-12); ok {
		t.Error("a sound triangle was looked at twice")
	}
}

// TestIllConditioned: powers of a covariate far from zero, down to in-order pivots of
// 5e-11, followed by exact combinations of them. The combinations are
// recognised: nothing lies between the pivots and what rounding leaves of them.
// (Degree 12 about 5 has a pivot of 4e-13, which is what rounding may leave.)
func TestIllConditioned(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 2))
	const n = 60
	for _, centre := range []float64{0, 1, 2, 3, 5} {
		for _, degree := range []int{4, 6, 8, 10, 12} {
			if centre == 5 && degree == 12 {
				continue
			}
			var cols [][]float64
			for k := range degree + 1 {
				c := make([]float64, n)
				for i := range c {
					c[i] = math.Pow(centre+float64(i)/n*2-1, float64(k))
				}
				cols = append(cols, c)
			}
			p := dense(make([]float64, n), cols...)
			for range 3 {
				hi, lo, co := make([]float64, n), make([]float64, n), make([]float64, degree+1)
				for k := range co {
					co[k] = math.Round(r.NormFloat64() * 8)
				}
				for i := range hi {
					s := zero()
					for k := range co {
						s = plus(s, times(num(co[k]), num(cols[k][i])))
					}
					hi[i] = plain(s)
					lo[i] = plain(minus(s, num(hi[i])))
				}
				last := len(p.hi) - 1
				p.hi = append(p.hi[:last:last], hi, p.hi[last])
				p.lo = append(p.lo[:last:last], lo, p.lo[last])
				p.groups[0].Dense++
			}
			tol := 100 * float64(degree+4) * 0x1p-52
			f := NewFactor(p.gram(BlockRows), []int{0}, Settings{Tol: tol})
			if f.Rank != degree+1 || f.LargestAside > tol/10 {
				t.Errorf("centre %g degree %d: rank %d, smallest kept %.3g, largest aside %.3g, tolerance %.3g", centre, degree, f.Rank, f.SmallestKept, f.LargestAside, tol)
			}
		}
	}
}

// TestConditioning: coefficients of ready-made powers with smallest pivot 9e-9
// lose κ² of 10³²: a factorization in plain double precision loses κ of 10¹⁶,
// which here is 10⁻⁶.
func TestConditioning(t *testing.T) {
	const n = 50
	var cols [][]float64
	for k := range 8 {
		c := make([]float64, n)
		for i := range c {
			c[i] = math.Pow(3+float64(i)/n, float64(k))
		}
		cols = append(cols, c)
	}
	y := make([]float64, n)
	for i := range y {
		y[i] = math.Sin(float64(i))
	}
	p := dense(y, cols...)
	f := NewFactor(p.gram(BlockRows), []int{0}, Settings{Tol: 1e-13})
	ref := p.factor(all(8), 1e-13)
	if f.Rank != len(ref.kept) {
		t.Fatalf("rank %d, want %d", f.Rank, len(ref.kept))
	}
	b, want := f.Solve(0), ref.solve(ref.cols[8])
	for c := range want {
		if e := apart(b.At(c), want[c], math.Abs(plain(want[c]))); e > 1e-11 {
			t.Errorf("coefficient %d off by %g (smallest pivot %g)", c, e, f.SmallestKept)
		}
	}
}

// TestHardlyDetermined: columns that are combinations of others with
// coefficients of 10¹¹ are set aside although rounding leaves 10⁻⁵ of them, and the
// rank never passes the number of rows.
func TestHardlyDetermined(t *testing.T) {
	r := rand.New(rand.NewPCG(12, 2))
	for trial := range 50 {
		const n = 9
		one, x, y := make([]float64, n), make([]float64, n), make([]float64, n)
		for i := range n {
			one[i], x[i], y[i] = 1, 1e12+float64(r.IntN(100)), r.NormFloat64()
		}
		cols := [][]float64{x, one}
		for k := range 12 { // more columns than rows, all of whole numbers
			c := make([]float64, n)
			for i := range c {
				switch k % 3 {
				case 0:
					c[i] = float64(r.IntN(2))
				case 1:
					c[i] = x[i] * float64(r.IntN(2))
				default:
					c[i] = float64(r.IntN(5))
				}
			}
			cols = append(cols, c)
		}
		p := dense(y, cols...)
		p.w = make([]float64, n)
		rows := 0
		for i := range p.w {
			p.w[i] = float64(r.IntN(3))
			if p.w[i] > 0 {
				rows++
			}
		}
		f := NewFactor(p.gram(BlockRows), []int{0}, Settings{Tol: 1e-12})
		if f.Rank > rows {
			t.Errorf("trial %d: rank %d of %d rows", trial, f.Rank, rows)
		}
		// The mean of each row is still a function of the fitted values.
		cs := p.columns()
		for i := range n {
			if p.w[i] == 0 {
				continue
			}
			c := f.g.NewVec()
			for k := range cols {
				c.Set(k, dd.From(plain(cs[k][i])))
			}
			if _, bad, _ := f.Half(c); bad > 1e-6 {
				t.Errorf("trial %d row %d: violation %g", trial, i, bad)
			}
		}
	}
}
