package linalg

import (
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/internal/dd"
)

// dense makes a problem of one dense group from columns and a response.
func dense(y []float64, cols ...[]float64) *problem {
	p := &problem{n: len(y), rhs: 1, groups: []Group{{Dense: len(cols)}}}
	p.hi = append(append(p.hi, cols...), y)
	for range p.hi {
		p.lo = append(p.lo, make([]float64, p.n))
	}
	return p
}

// TestTolerance: a column is set aside when what is left of it is at most the
// tolerance, to a relative 10⁻³ of the tolerance, whatever its scale.
func TestTolerance(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	const n = 40
	one, x, e, y := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range n {
		one[i], x[i], y[i] = 1, float64(r.IntN(16)), r.NormFloat64()
		e[i] = float64(r.IntN(16))
	}
	for _, tol := range []float64{1e-6, 1e-10, 1e-12} {
		for _, scale := range []float64{0x1p-150, 1, 0x1p150} {
			for _, side := range []float64{0.999, 1.001} {
				// z = x + d·(part of e off 1 and x), d chosen so that the rest is tol·side.
				p := dense(y, one, x, e)
				ref := p.factor(all(3), 0)
				rest := ref.q[2]
				norm := math.Sqrt(size(p.inner(ref.cols[1], ref.cols[1])))
				hi, lo := make([]float64, n), make([]float64, n)
				for i := range n {
					z := plus(num(x[i]), times(num(side*tol*norm), rest[i]))
					hi[i] = plain(z)
					lo[i] = plain(minus(z, num(hi[i])))
					hi[i], lo[i] = hi[i]*scale, lo[i]*scale
				}
				q := dense(y, one, x, hi)
				q.lo[2] = lo
				f := NewFactor(q.gram(BlockRows), []int{0}, Settings{Tol: tol})
				if want := 2; side > 1 {
					want = 3
					if f.Rank != want || math.Abs(f.SmallestKept/tol-side) > 1e-4 {
						t.Errorf("tol %g scale %g: rank %d, smallest pivot %g of the tolerance", tol, scale, f.Rank, f.SmallestKept/tol)
					}
				} else if f.Rank != want || math.Abs(f.LargestAside/tol-side) > 1e-4 {
					t.Errorf("tol %g scale %g: rank %d, largest aside %g of the tolerance", tol, scale, f.Rank, f.LargestAside/tol)
				}
			}
		}
	}
}

// TestRepeatedRows: repeating rows changes neither the rank nor any pivot. The
// smallest, 4e-10, is the root of what 10⁻³² in the sums leaves of 10⁻¹⁹.
func TestRepeatedRows(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 2))
	const n = 30
	var cols [][]float64
	y := make([]float64, n)
	for i := range y {
		y[i] = r.NormFloat64()
	}
	for k := range 8 { // powers of a shifted covariate: badly conditioned
		c := make([]float64, n)
		for i := range c {
			c[i] = math.Pow(5+float64(i)/n, float64(k))
		}
		cols = append(cols, c)
	}
	cols = append(cols, cols[3]) // and one that is spanned
	p := dense(y, cols...)
	once := NewFactor(p.gram(BlockRows), []int{0}, Settings{Tol: 1e-12})
	for _, times := range []int{2, 37, 1000} {
		q := &problem{n: n * times, rhs: 1, groups: p.groups}
		for j := range p.hi {
			var h []float64
			for range times {
				h = append(h, p.hi[j]...)
			}
			q.hi, q.lo = append(q.hi, h), append(q.lo, make([]float64, len(h)))
		}
		f := NewFactor(q.gram(BlockRows), []int{0}, Settings{Tol: 1e-12})
		if f.Rank != once.Rank || math.Abs(f.SmallestKept/once.SmallestKept-1) > 1e-7 || f.LargestAside > 1e-14 {
			t.Errorf("%d times: rank %d, smallest kept %g, largest aside %g; once %d, %g", times, f.Rank, f.SmallestKept, f.LargestAside, once.Rank, once.SmallestKept)
		}
	}
}

// TestConfoundedFactors: the largest model keeps one column of constant and second
// factor, whose own rank is 3.
func TestConfoundedFactors(t *testing.T) {
	p := &problem{n: 6, rhs: 1, groups: []Group{{Dense: 1}, {Levels: 3}, {Levels: 3}},
		index: [][]int32{{0, 0, 1, 1, 2, 2}, {0, 0, 1, 1, 2, 2}}, vhi: make([][]float64, 2), vlo: make([][]float64, 2),
		hi: [][]float64{{1, 1, 1, 1, 1, 1}, {1, 2, 4, 3, 7, 9}}, lo: [][]float64{make([]float64, 6), make([]float64, 6)}}
	f := NewFactor(p.gram(BlockRows), []int{0, 1, 2}, Settings{Tol: testTol})
	check(t, p, f, 1e-28)
	if f.Rank != 3 {
		t.Fatalf("rank %d, want 3", f.Rank)
	}
	sub := NewFactor(f.Clean(), []int{0, 2}, Settings{Tol: testTol})
	if sub.Rank != 3 {
		t.Errorf("constant and second factor: rank %d, want 3", sub.Rank)
	}
	if rank, ok := f.Prefix([]int{1, 0}); !ok || rank != 3 {
		t.Errorf("first two groups: %d %v", rank, ok)
	}
	if _, ok := f.Prefix([]int{0, 2}); ok {
		t.Error("constant and second factor are no prefix")
	}
}

// TestThreeFactors: cells 000, 011, 101 of 2×2×2 are connected in every pair
// of factors, yet the additive model has rank 3 where components give 4.
func TestThreeFactors(t *testing.T) {
	p := &problem{n: 3, rhs: 1, groups: []Group{{Dense: 1}, {Levels: 2}, {Levels: 2}, {Levels: 2}},
		index: [][]int32{{0, 0, 1}, {0, 1, 0}, {0, 1, 1}}, vhi: make([][]float64, 3), vlo: make([][]float64, 3),
		hi: [][]float64{{1, 1, 1}, {1, 2, 4}}, lo: [][]float64{make([]float64, 3), make([]float64, 3)}}
	f := NewFactor(p.gram(BlockRows), all(4), Settings{Tol: testTol})
	check(t, p, f, 1e-28)
	if f.Rank != 3 {
		t.Errorf("rank %d, want 3", f.Rank)
	}
}

// TestClean: a column that is spanned to within the tolerance is projected, so that
// a smaller space without the columns that span it still holds it in full, and one
// that keeps both is not of higher rank than the largest space.
func TestClean(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 2))
	const n = 25
	one, x, near, y := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range n {
		one[i], x[i], y[i] = 1, r.NormFloat64(), r.NormFloat64()
		near[i] = 2 + 3*x[i] + 1e-13*r.NormFloat64()
	}
	p := &problem{n: n, rhs: 1, groups: []Group{{Dense: 1}, {Dense: 1}, {Dense: 1}, {Levels: 3}}, hi: [][]float64{one, x, near, y}}
	for range p.hi {
		p.lo = append(p.lo, make([]float64, n))
	}
	idx := make([]int32, n)
	for i := range idx {
		idx[i] = int32(r.IntN(3))
	}
	p.index, p.vhi, p.vlo = [][]int32{idx}, make([][]float64, 1), make([][]float64, 1)
	g := p.gram(BlockRows)
	f := NewFactor(g, all(4), Settings{Tol: 1e-11})
	if f.Rank != 4 {
		t.Fatalf("rank %d, want 4", f.Rank)
	}
	c := f.Clean()
	if c == g {
		t.Fatal("nothing was cleaned")
	}
	again := NewFactor(c, all(4), Settings{Tol: 1e-11})
	if again.Rank != 4 || again.LargestAside > 1e-14 {
		t.Errorf("cleaned: rank %d, largest aside %g", again.Rank, again.LargestAside)
	}
	// Constant and near alone: the projection is 1 and x, exactly.
	sub := NewFactor(c, []int{0, 2}, Settings{Tol: 1e-11})
	if r := sub.Outside(1, 0); r > 1e-15 {
		t.Errorf("x leaves %g outside of constant and its near copy", r)
	}
	if r := NewFactor(g, []int{0, 2}, Settings{Tol: 1e-11}).Outside(1, 0); !(r > 1e-15) {
		t.Errorf("before cleaning x left %g outside", r)
	}
	// Gram without anything set aside is handed back.
	if h := NewFactor(g, []int{0, 1, 3}, Settings{Tol: 1e-11}); h.Clean() != g {
		t.Error("Clean copied for nothing")
	}
}

// TestOutside: the part of a column that a space leaves, against the reference.
func TestOutside(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 2))
	p := shape{n: 30, dense: []int{2, 2}, levels: []int{4, -3}, weighted: true, scaled: true}.random(r)
	g := p.gram(BlockRows)
	ref := p.factor([]int{0, 1, 4, 5, 6, 7}, testTol)
	f := NewFactor(g, []int{0, 2}, Settings{Tol: testTol})
	at := 0
	for gi, gr := range p.groups {
		for c := range gr.Columns() {
			left, _ := ref.project(ref.cols[at])
			want := math.Sqrt(plain(over(p.inner(left, left), p.inner(ref.cols[at], ref.cols[at]))))
			if got := f.Outside(gi, c); math.Abs(got-want) > 1e-14 {
				t.Errorf("group %d column %d: %g, want %g", gi, c, got, want)
			}
			at++
		}
	}
}

// TestBetween: squared lengths between two prefixes are differences of residuals.
func TestBetween(t *testing.T) {
	r := rand.New(rand.NewPCG(10, 2))
	p := shape{n: 40, dense: []int{1, 3, 2}, levels: []int{5}}.random(r)
	g := p.gram(BlockRows)
	f := NewFactor(g, all(4), Settings{Tol: testTol})
	rank := 0
	rss := g.RHS(0, 0)
	for k := range 4 {
		to, ok := f.Prefix(all(k + 1))
		if !ok {
			t.Fatalf("prefix %d", k)
		}
		sub := NewFactor(g, all(k+1), Settings{Tol: testTol})
		diff := rss.Sub(sub.Residual(0, 0))
		if e := apart(f.Between(0, rank, to), exact(diff), g.RHS(0, 0).Hi); e > 1e-28 {
			t.Errorf("groups %d: off by %g", k, e)
		}
		rank, rss = to, sub.Residual(0, 0)
	}
}

// TestViolation: whether a function of the coefficients is one of the fitted
// values does not depend on the scale of the columns.
func TestViolation(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 2))
	const n = 20
	for _, scale := range []float64{0x1p-60, 1, 0x1p60} {
		one, x, twice := make([]float64, n), make([]float64, n), make([]float64, n)
		for i := range n {
			one[i], x[i] = 1, scale*float64(r.IntN(32))
			twice[i] = 2 * x[i]
		}
		p := dense(make([]float64, n), one, x, twice)
		f := NewFactor(p.gram(BlockRows), []int{0}, Settings{Tol: testTol})
		vector := func(a, b, c float64) Vec {
			v := f.g.NewVec()
			v.Set(0, dd.From(a))
			v.Set(1, dd.From(b))
			v.Set(2, dd.From(c))
			return v
		}
		for _, c := range []struct {
			a, b, c float64
			want    bool
		}{
			{1, 0, 0, true},
			{1, scale, 2 * scale, true},
			{0, scale, 2 * scale, true},
			{0, 0, scale, false},
			{1, scale, 3 * scale, false},
			{1, scale, 2.001 * scale, false},
			{1, scale, 0, false},
		} {
			h, bad, worst := f.Half(vector(c.a, c.b, c.c))
			if got := bad < 1e-9; got != c.want {
				t.Errorf("scale 2^%d: (%g, %g, %g) counts as estimable: %v (violation %g)", math.Ilogb(scale), c.a, c.b, c.c, got, bad)
			}
			if !c.want && worst != 2 {
				t.Errorf("the violation is blamed on column %d", worst)
			}
			if math.IsNaN(h.Dot(h).Hi) {
				t.Error("NaN")
			}
		}
	}
}
