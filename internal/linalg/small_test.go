package linalg

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestSmall: the route for small problems against the reference, one problem after
// another in the same memory.
func TestSmall(t *testing.T) {
	const p = 5
	s := NewSmall(p)
	for seed := range uint64(40) {
		r := rand.New(rand.NewPCG(seed, 9))
		n := 6 + r.IntN(20)
		x := make([][]float64, p)
		for j := range x {
			x[j] = make([]float64, n)
			e := r.IntN(200) - 100
			for i := range x[j] {
				x[j][i] = math.Ldexp(float64(r.IntN(64)-20), e)
			}
		}
		if seed%3 == 0 { // a column that others span
			for i := range n {
				x[3][i] = math.Ldexp(x[1][i], 7)
			}
		}
		if seed%7 == 0 { // and one of zeros
			clear(x[2])
		}
		y := make([]float64, n)
		for i := range y {
			y[i] = r.NormFloat64()
		}
		s.Factor(x, y, 1e-12)
		q := dense(y, x...)
		ref := q.factor(all(p), 1e-12)
		if s.Rank != len(ref.kept) {
			t.Fatalf("seed %d: rank %d, want %d", seed, s.Rank, len(ref.kept))
		}
		left, coord := ref.project(ref.cols[p])
		if e := math.Abs(s.RSS - plain(q.inner(left, left))); e > 1e-15*s.YY {
			t.Errorf("seed %d: RSS off by %g", seed, e)
		}
		beta, diag, want := make([]float64, p), make([]float64, p), ref.solve(ref.cols[p])
		s.Solve(beta)
		s.Diagonal(diag)
		at := 0
		for j := range p {
			kept := at < len(ref.kept) && ref.kept[at] == j
			if s.Kept[j] != kept {
				t.Errorf("seed %d: column %d kept: %v", seed, j, s.Kept[j])
			}
			if e := math.Abs(beta[j] - plain(want[j])); e > 1e-14*math.Abs(plain(want[j])) {
				t.Errorf("seed %d: coefficient %d = %g, want %g", seed, j, beta[j], plain(want[j]))
			}
			if !kept {
				if !math.IsNaN(diag[j]) || beta[j] != 0 {
					t.Errorf("seed %d: column %d set aside has %g, %g", seed, j, beta[j], diag[j])
				}
				continue
			}
			if got, w := s.Between(j, j+1), plain(times(coord[at], coord[at])); math.Abs(got-w) > 1e-14*s.YY {
				t.Errorf("seed %d: column %d adds %g, want %g", seed, j, got, w)
			}
			at++
		}
		// (XᵀX)⁻¹ by solving for the unit vectors of the kept columns.
		f := NewFactor(q.gram(BlockRows), []int{0}, Settings{Tol: 1e-12})
		for j := range p {
			if !s.Kept[j] {
				continue
			}
			c := f.g.NewVec()
			c.hi[j] = 1
			h, _, _ := f.Half(c)
			if w := h.Dot(h).Float64(); math.Abs(diag[j]-w) > 1e-13*w {
				t.Errorf("seed %d: diagonal %d = %g, want %g", seed, j, diag[j], w)
			}
		}
	}
}

// TestSubspaces: spans, complements and the identities of a certificate in
// coordinates, on a design where they can be written down: k groups of m.
func TestSubspaces(t *testing.T) {
	const k, m = 4, 3
	p := &problem{n: k * m, rhs: 1, groups: []Group{{Dense: 1}, {Levels: k}, {Levels: k * m}}}
	one, y := make([]float64, k*m), make([]float64, k*m)
	a, rows := make([]int32, k*m), make([]int32, k*m)
	for i := range one {
		one[i], y[i], a[i], rows[i] = 1, float64(i*i%7), int32(i/m), int32(i)
	}
	p.hi, p.lo = [][]float64{one, y}, [][]float64{make([]float64, k*m), make([]float64, k*m)}
	p.index, p.vhi, p.vlo = [][]int32{a, rows}, make([][]float64, 2), make([][]float64, 2)
	f := NewFactor(p.gram(BlockRows), all(3), Settings{Tol: testTol})
	co, ok := f.Coordinate()
	if !ok || co.Whole().Dim() != k*m {
		t.Fatal("no coordinates")
	}
	mean, groups := co.Span([]int{0}, testTol), co.Span([]int{0, 1}, testTol)
	between, within := groups.Minus(mean), co.Whole().Minus(groups)
	if mean.Dim() != 1 || groups.Dim() != k || between.Dim() != k-1 || within.Dim() != k*m-k {
		t.Errorf("dimensions %d %d %d %d", mean.Dim(), groups.Dim(), between.Dim(), within.Dim())
	}
	if o := between.Overlap(within); o > 1e-14 {
		t.Errorf("between and within overlap by %g", o)
	}
	zs := co.Columns(1)
	if c, r := between.Spread(zs); math.Abs(c-m) > 1e-14 || r > 1e-14 {
		t.Errorf("between groups ZZᵀ is %g (off %g), want %d", c, r, m)
	}
	if c, r := within.Spread(zs); math.Abs(c) > 1e-14 || r > 1e-14 || within.Size(zs) > 1e-14 {
		t.Errorf("within groups ZZᵀ is %g (off %g), want 0", c, r)
	}
	if x := between.Cross(within, zs); x > 1e-14 {
		t.Errorf("across %g", x)
	}
	// A column of another length: not even.
	zs[0][1] += 0.5
	if _, r := between.Spread(zs); r < 1e-3 {
		t.Error("an uneven ZZᵀ passes")
	}
}
