package linalg

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"subsume.example/internal/dd"
)

const testTol = 1e-12

// apart returns |got − want| over a scale.
func apart(got dd.DD, want *big.Float, scale float64) float64 {
	d := math.Abs(plain(minus(exact(got), want)))
	if d == 0 {
		return 0
	}
	return d / scale
}

// size returns a length to hold differences against.
func size(vs ...*big.Float) float64 {
	m := 0.0
	for _, v := range vs {
		m = math.Max(m, math.Abs(plain(v)))
	}
	return m
}

// check holds a factor of all groups against the reference: rank, columns set
// aside, coefficients, residuals, coordinates, functions of the fitted values.
// The tolerance is for the double-double result itself.
func check(t *testing.T, p *problem, f *Factor, tol float64) {
	t.Helper()
	g := f.g
	order := all(p.count())
	if f.elim >= 0 { // the eliminated group goes first
		order = nil
		first := g.Offset(f.elim)
		n := g.groups[f.elim].Columns()
		for c := range n {
			order = append(order, first+c)
		}
		for c := range p.count() {
			if c < first || c >= first+n {
				order = append(order, c)
			}
		}
	}
	ref := p.factor(order, testTol)
	if f.Rank != len(ref.q) {
		t.Fatalf("rank %d, want %d", f.Rank, len(ref.q))
	}
	gone := make(map[int]bool)
	for _, a := range f.Aside {
		c := g.Offset(a.Group) + a.Column
		gone[c] = true
		if zeroNorm := p.inner(ref.cols[c], ref.cols[c]).Sign() == 0; zeroNorm != a.Empty {
			t.Errorf("column %d set aside, empty = %v", c, a.Empty)
		}
	}
	for _, c := range ref.kept {
		if gone[c] {
			t.Errorf("column %d was set aside, the reference keeps it", c)
		}
	}
	if len(gone)+len(ref.kept) != p.count() {
		t.Errorf("%d set aside and %d kept of %d", len(gone), len(ref.kept), p.count())
	}
	for k := range p.rhs {
		y := ref.cols[p.count()+k]
		yy := size(p.inner(y, y))
		left, _ := ref.project(y)
		for l := range k + 1 {
			other, _ := ref.project(ref.cols[p.count()+l])
			want := p.inner(left, other)
			oo := size(p.inner(ref.cols[p.count()+l], ref.cols[p.count()+l]))
			if e := apart(f.Residual(k, l), want, math.Sqrt(yy*oo)); e > tol {
				t.Errorf("residual %d %d: off by %g", k, l, e)
			}
		}
		b, want := f.Solve(k), ref.solve(y)
		for c := range want {
			norm := math.Sqrt(size(p.inner(ref.cols[c], ref.cols[c])))
			if norm == 0 {
				norm = 1
			}
			if e := apart(b.At(c), want[c], (math.Sqrt(yy)+1e-300)/norm); e > tol {
				t.Errorf("right-hand side %d coefficient %d: %g, want %g (off %g of ‖y‖/‖x‖)", k, c, b.At(c).Float64(), plain(want[c]), e)
			}
		}
		// ‖Xb‖² by NormSq against the projection.
		d := g.NewVec()
		for c := range want {
			d.Set(c, b.At(c))
		}
		fitted := minus(p.inner(y, y), p.inner(left, left))
		if e := apart(f.NormSq(d), fitted, yy); e > tol {
			t.Errorf("‖Xb‖² = %g, want %g", f.NormSq(d).Float64(), plain(fitted))
		}
		// ‖Xb − y‖² the same way is the residual.
		d.Set(p.count()+k, dd.From(-1))
		if e := apart(f.NormSq(d), p.inner(left, left), yy); e > tol {
			t.Errorf("‖Xb − y‖² = %g, want %g", f.NormSq(d).Float64(), plain(p.inner(left, left)))
		}
	}
	// The mean of a row is a function of the fitted values: cᵀ(XᵀX)⁻c is its leverage.
	for i := range min(p.n, 4) {
		if p.w != nil && p.w[i] == 0 {
			continue
		}
		c := g.NewVec()
		for k := range p.count() {
			x := plain(ref.cols[k][i])
			rest := minus(ref.cols[k][i], num(x))
			c.Set(k, dd.DD{Hi: x, Lo: plain(rest)})
		}
		h, bad, _ := f.Half(c)
		lev := zero()
		for _, q := range ref.q {
			lev = plus(lev, times(q[i], q[i]))
		}
		if e := apart(h.Dot(h), lev, math.Max(size(lev), 1e-300)); e > tol || bad > tol {
			t.Errorf("row %d: leverage %g, want %g; violation %g", i, h.Dot(h).Float64(), plain(lev), bad)
		}
		co := f.Coordinates(0)
		fit := zero()
		_, coord := ref.project(ref.cols[p.count()])
		for k, q := range ref.q {
			fit = plus(fit, times(coord[k], q[i]))
		}
		scale := math.Sqrt(size(p.inner(ref.cols[p.count()], ref.cols[p.count()])) * size(lev))
		if e := apart(h.Dot(co), fit, math.Max(scale, 1e-300)); e > tol {
			t.Errorf("row %d: fitted %g, want %g", i, h.Dot(co).Float64(), plain(fit))
		}
	}
	// Null vectors write a column set aside in the kept ones.
	for i, v := range f.Null() {
		sum := make([]*big.Float, p.n)
		for r := range sum {
			sum[r] = zero()
		}
		for c := range p.count() {
			for r := range sum {
				sum[r] = plus(sum[r], times(exact(v.At(c)), ref.cols[c][r]))
			}
		}
		if s := math.Sqrt(math.Abs(plain(p.inner(sum, sum)))); s > 1e-12*nullScale(p, ref, v) {
			t.Errorf("null vector %d: ‖Xv‖ = %g", i, s)
		}
	}
}

func nullScale(p *problem, ref *reference, v Vec) float64 {
	m := 0.0
	for c := range p.count() {
		m = math.Max(m, math.Abs(v.At(c).Hi)*math.Sqrt(size(p.inner(ref.cols[c], ref.cols[c]))))
	}
	return m
}

// TestRandom: random problems of many sizes and shapes against the reference.
func TestRandom(t *testing.T) {
	shapes := []shape{
		{dense: []int{1}},
		{dense: []int{1, 3, 2}},
		{dense: []int{5}, low: true},
		{dense: []int{2, 2}, scaled: true, low: true},
		{dense: []int{2}, weighted: true},
		{levels: []int{3}},
		{dense: []int{1}, levels: []int{4, 3}},
		{dense: []int{1, 1}, levels: []int{3, -3}, low: true},
		{dense: []int{2}, levels: []int{-4, 3, 5}, weighted: true, none: true},
		{dense: []int{3}, levels: []int{-2}, scaled: true, weighted: true, low: true},
	}
	for si, s := range shapes {
		for _, n := range []int{0, 1, 2, 3, 5, 10, 50} {
			r := rand.New(rand.NewPCG(uint64(si), uint64(n)))
			s.n = n
			p := s.random(r)
			t.Run(fmt.Sprintf("shape=%d/n=%d", si, n), func(t *testing.T) {
				for _, size := range []int{1, 7, BlockRows} {
					g := p.gram(size)
					if g.Rows() != n || !g.Finite() {
						t.Fatalf("%d rows, finite %v", g.Rows(), g.Finite())
					}
					check(t, p, NewFactor(g, all(len(p.groups)), Settings{Tol: testTol}), 1e-25)
				}
			})
		}
	}
}

// TestDeficient: columns that others span, in several ways.
func TestDeficient(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 4))
	p := shape{n: 30, dense: []int{1, 4, 2}, levels: []int{4, 4, 3}}.random(r)
	for i := range p.n {
		p.hi[0][i] = 1                           // a constant, which three factors span
		p.hi[2][i] = 3 * p.hi[1][i]              // a multiple
		p.hi[4][i] = p.hi[1][i] - 0.5*p.hi[3][i] // a difference that is exact below
		p.hi[1][i] = math.Round(p.hi[1][i]*1024) / 1024
		p.hi[3][i] = math.Round(p.hi[3][i]*1024) / 1024
		p.hi[2][i] = 3 * p.hi[1][i]
		p.hi[4][i] = p.hi[1][i] - 0.5*p.hi[3][i]
		p.hi[5][i] = 0                // nothing
		p.index[1][i] = p.index[0][i] // confounded
	}
	f := NewFactor(p.gram(BlockRows), all(6), Settings{Tol: testTol})
	check(t, p, f, 1e-25)
	// 1 + (2 of 4) + 0 or 1 + 3 + 0 + 2
	if want := 1 + 2 + 1 + 3 + 2; f.Rank != want {
		t.Errorf("rank %d, want %d", f.Rank, want)
	}
	if r, ok := f.PivotedRank(testTol); ok && r != f.Rank {
		t.Errorf("pivoted rank %d, want %d", r, f.Rank)
	}
}

// TestEliminate: the largest index group eliminated as a diagonal gives the same space.
func TestEliminate(t *testing.T) {
	for si, s := range []shape{
		{n: 60, dense: []int{1, 2}, levels: []int{3, 30}},
		{n: 50, dense: []int{2}, levels: []int{26, -25}, low: true},
		{n: 70, dense: []int{1}, levels: []int{4, 27, 5}, weighted: true},
		{n: 60, dense: []int{1, 1}, levels: []int{-30}, weighted: true, none: true, low: true},
		{n: 40, dense: []int{1}, levels: []int{40}},
	} {
		r := rand.New(rand.NewPCG(uint64(si), 5))
		p := s.random(r)
		for i := range p.n {
			p.hi[0][i], p.lo[0][i] = 1, 0
		}
		t.Run(fmt.Sprint(si), func(t *testing.T) {
			g := p.gram(BlockRows)
			f := NewFactor(g, all(len(p.groups)), Settings{Tol: testTol, Eliminate: true})
			if !f.Eliminated() {
				t.Fatal("nothing was eliminated")
			}
			check(t, p, f, 1e-24)
			in := NewFactor(g, all(len(p.groups)), Settings{Tol: testTol})
			if in.Rank != f.Rank {
				t.Errorf("rank %d eliminated, %d in order", f.Rank, in.Rank)
			}
			for w := 2; w < 5; w++ {
				h := NewFactor(g, all(len(p.groups)), Settings{Tol: testTol, Eliminate: true, Workers: w})
				if h.Residual(0, 0) != f.Residual(0, 0) || h.Residual(1, 0) != f.Residual(1, 0) {
					t.Errorf("%d workers: other bits", w)
				}
			}
		})
	}
}

// TestIndexIsDense: an index group is the same as its columns written out.
func TestIndexIsDense(t *testing.T) {
	r := rand.New(rand.NewPCG(6, 6))
	for _, weighted := range []bool{false, true} {
		p := shape{n: 40, dense: []int{1}, levels: []int{5, -4}, weighted: weighted, none: true, low: true}.random(r)
		q := &problem{n: p.n, rhs: p.rhs, w: p.w, groups: []Group{{Dense: 1}, {Dense: 5}, {Dense: 4}}}
		for _, c := range p.columns() {
			hi, lo := make([]float64, p.n), make([]float64, p.n)
			for i, x := range c {
				hi[i] = plain(x)
				lo[i] = plain(minus(x, num(hi[i])))
			}
			q.hi, q.lo = append(q.hi, hi), append(q.lo, lo)
		}
		a := NewFactor(p.gram(BlockRows), all(3), Settings{Tol: testTol})
		b := NewFactor(q.gram(BlockRows), all(3), Settings{Tol: testTol})
		if a.Rank != b.Rank || len(a.Aside) != len(b.Aside) {
			t.Fatalf("rank %d and %d", a.Rank, b.Rank)
		}
		for k := range 2 {
			x, y := a.Solve(k), b.Solve(k)
			for c := range p.count() {
				if e := apart(x.At(c), exact(y.At(c)), 1+math.Abs(y.At(c).Hi)); e > 1e-26 {
					t.Errorf("coefficient %d: %g as index, %g dense", c, x.At(c).Hi, y.At(c).Hi)
				}
			}
		}
	}
}

// TestSparseTables: cross tables too large to keep dense, and the same groups
// with so few levels that they are dense.
func TestSparseTables(t *testing.T) {
	const n = 400
	r := rand.New(rand.NewPCG(7, 7))
	p := shape{n: n, dense: []int{1}, levels: []int{6, 5}}.random(r)
	for i := range n {
		p.hi[0][i] = 1
	}
	for _, weighted := range []bool{false, true} {
		if weighted {
			p.w = make([]float64, n)
			for i := range p.w {
				p.w[i] = float64(r.IntN(4))
			}
		}
		// The same levels spread over 2,100: 4.4 million pairs.
		q := *p
		q.groups = []Group{{Dense: 1}, {Levels: 2100}, {Levels: 2100}}
		q.index = nil
		for k := range p.index {
			idx := make([]int32, n)
			for i, l := range p.index[k] {
				idx[i] = 300*l + int32(k)
			}
			q.index = append(q.index, idx)
		}
		g, h := p.gram(BlockRows), q.gram(BlockRows)
		if len(h.cross) != 1 || h.cross[0].sparse == nil {
			t.Fatal("the table is not sparse")
		}
		a := NewFactor(g, all(3), Settings{Tol: testTol})
		if testing.Short() {
			continue
		}
		b := NewFactor(h, all(3), Settings{Tol: testTol, Eliminate: true})
		if a.Rank != b.Rank || apart(b.Residual(0, 0), exact(a.Residual(0, 0)), a.Residual(0, 0).Hi) > 1e-26 {
			t.Errorf("rank %d and residual %g, want %d and %g", b.Rank, b.Residual(0, 0).Hi, a.Rank, a.Residual(0, 0).Hi)
		}
		// Merged from two halves.
		m := h.Empty()
		q.addTo(m, 0, 150, BlockRows)
		m2 := h.Empty()
		q.addTo(m2, 150, n, BlockRows)
		m.Merge(m2)
		m.Finish()
		c := NewFactor(m, all(3), Settings{Tol: testTol, Eliminate: true})
		if c.Rank != a.Rank || apart(c.Residual(1, 0), exact(a.Residual(1, 0)), a.Residual(0, 0).Hi) > 1e-26 {
			t.Errorf("merged: rank %d, residual %g", c.Rank, c.Residual(1, 0).Hi)
		}
		// Contrasts of levels agree whichever route.
		d, e := g.NewVec(), h.NewVec()
		d.Set(1+2, dd.From(1))
		d.Set(1+4, dd.From(-1))
		e.Set(1+600, dd.From(1))
		e.Set(1+1200, dd.From(-1))
		x, bad, _ := a.Half(d)
		y, worse, _ := b.Half(e)
		if bad > 1e-20 || worse > 1e-20 || apart(y.Dot(y), exact(x.Dot(x)), x.Dot(x).Hi) > 1e-26 {
			t.Errorf("contrast: %g (violation %g), want %g (%g)", y.Dot(y).Hi, worse, x.Dot(x).Hi, bad)
		}
	}
}

// TestMerge: Grams of parts, merged in order, are the Gram of the whole.
func TestMerge(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 8))
	for _, s := range []shape{
		{n: 60, dense: []int{2, 1}, levels: []int{3, -4}, low: true},
		{n: 60, dense: []int{2}, levels: []int{5, 4}, weighted: true, none: true},
		{n: 60, levels: []int{4, 3}},
	} {
		p := s.random(r)
		whole := NewFactor(p.gram(BlockRows), all(len(p.groups)), Settings{Tol: testTol})
		g := p.empty()
		for _, cut := range [][2]int{{0, 11}, {11, 12}, {12, 12}, {12, 60}} {
			part := g.Empty()
			p.addTo(part, cut[0], cut[1], 5)
			g.Merge(part)
		}
		g.Finish()
		f := NewFactor(g, all(len(p.groups)), Settings{Tol: testTol})
		check(t, p, f, 1e-25)
		if f.Rank != whole.Rank || g.Rows() != p.n {
			t.Errorf("rank %d, %d rows", f.Rank, g.Rows())
		}
		for k := range p.index {
			for l := range p.groups[len(s.dense)+k].Levels {
				want := int64(0)
				for _, x := range p.index[k] {
					if int(x) == l {
						want++
					}
				}
				if got := g.Count(len(s.dense)+k, l); got != want {
					t.Errorf("group %d level %d: %d rows, want %d", k, l, got, want)
				}
			}
		}
	}
}
