package linalg

import (
	"math"
	"math/big"
	"math/rand/v2"

	"subsume.example/internal/dd"
)

// The reference of the tests: Gram and Schmidt's method, twice, on the columns
// themselves in 400-bit arithmetic. It shares nothing with the package but the
// order of the columns.

const bits = 400

func num(x float64) *big.Float         { return new(big.Float).SetPrec(bits).SetFloat64(x) }
func zero() *big.Float                 { return new(big.Float).SetPrec(bits) }
func plus(a, b *big.Float) *big.Float  { return zero().Add(a, b) }
func minus(a, b *big.Float) *big.Float { return zero().Sub(a, b) }
func times(a, b *big.Float) *big.Float { return zero().Mul(a, b) }
func over(a, b *big.Float) *big.Float  { return zero().Quo(a, b) }
func exact(x dd.DD) *big.Float         { return plus(num(x.Hi), num(x.Lo)) }
func plain(x *big.Float) float64       { f, _ := x.Float64(); return f }

// problem is a least-squares problem by rows.
type problem struct {
	groups []Group
	n, rhs int
	hi, lo [][]float64 // dense columns in order, then right-hand sides
	index  [][]int32   // by index group
	vhi    [][]float64 // nil where not valued
	vlo    [][]float64
	w      []float64
}

// gram adds the rows in blocks of the given size.
func (p *problem) gram(size int) *Gram {
	g := p.empty()
	p.addTo(g, 0, p.n, size)
	g.Finish()
	return g
}

// empty returns a Gram for the problem, told of a first column of ones.
func (p *problem) empty() *Gram {
	ones := -1
	if p.groups[0].Dense > 0 && p.n > 0 {
		ones = 0
		for i := range p.n {
			if p.hi[0][i] != 1 || p.lo[0][i] != 0 {
				ones = -1
			}
		}
	}
	return NewGram(p.groups, p.rhs, ones, p.w != nil)
}

func (p *problem) addTo(g *Gram, first, last, size int) {
	for at := first; at < last; at += size {
		end := min(at+size, last)
		b := Block{Rows: end - at}
		for j := range p.hi {
			b.Hi, b.Lo = append(b.Hi, p.hi[j][at:end]), append(b.Lo, p.lo[j][at:end])
		}
		for k := range p.index {
			b.Index = append(b.Index, p.index[k][at:end])
			if p.vhi[k] != nil {
				b.VHi, b.VLo = append(b.VHi, p.vhi[k][at:end]), append(b.VLo, p.vlo[k][at:end])
			} else {
				b.VHi, b.VLo = append(b.VHi, nil), append(b.VLo, nil)
			}
		}
		if p.w != nil {
			b.Weight = p.w[at:end]
		}
		g.Add(&b)
	}
}

// columns writes out every column of every group, then the right-hand sides.
func (p *problem) columns() [][]*big.Float {
	var cols [][]*big.Float
	d, k := 0, 0
	dense := func() {
		c := make([]*big.Float, p.n)
		for i := range c {
			c[i] = plus(num(p.hi[d][i]), num(p.lo[d][i]))
		}
		cols = append(cols, c)
		d++
	}
	for _, g := range p.groups {
		for range g.Dense {
			dense()
		}
		if g.Levels == 0 {
			continue
		}
		for l := range g.Levels {
			c := make([]*big.Float, p.n)
			for i := range c {
				switch {
				case int(p.index[k][i]) != l:
					c[i] = zero()
				case p.vhi[k] != nil:
					c[i] = plus(num(p.vhi[k][i]), num(p.vlo[k][i]))
				default:
					c[i] = num(1)
				}
			}
			cols = append(cols, c)
		}
		k++
	}
	for range p.rhs {
		dense()
	}
	return cols
}

// inner is the weighted inner product.
func (p *problem) inner(a, b []*big.Float) *big.Float {
	s := zero()
	for i := range a {
		x := times(a[i], b[i])
		if p.w != nil {
			x = times(x, num(p.w[i]))
		}
		s = plus(s, x)
	}
	return s
}

// reference is the orthogonal factorization of some columns.
type reference struct {
	p    *problem
	cols [][]*big.Float // all columns of the problem
	q    [][]*big.Float // orthonormal
	kept []int          // column of each
	r    [][]*big.Float // by kept column: its coordinates
	rest []float64      // by column taken: what was left of it, relative
}

// factor takes the columns in the order given.
func (p *problem) factor(order []int, tol float64) *reference {
	f := &reference{p: p, cols: p.columns()}
	for _, c := range order {
		v, coord := f.project(f.cols[c])
		norm, left := p.inner(f.cols[c], f.cols[c]), p.inner(v, v)
		ratio := 0.0
		if norm.Sign() > 0 {
			ratio = math.Sqrt(plain(over(left, norm)))
		}
		f.rest = append(f.rest, ratio)
		if ratio <= tol {
			continue
		}
		root := zero().Sqrt(left)
		for i := range v {
			v[i] = over(v[i], root)
		}
		f.q = append(f.q, v)
		f.kept = append(f.kept, c)
		f.r = append(f.r, append(coord, root))
	}
	return f
}

// project returns what the space leaves of v, and its coordinates.
func (f *reference) project(v []*big.Float) (left, coord []*big.Float) {
	left = append([]*big.Float(nil), v...)
	for range f.q {
		coord = append(coord, zero())
	}
	for range 2 {
		for t, q := range f.q {
			a := f.p.inner(q, left)
			coord[t] = plus(coord[t], a)
			for i := range left {
				left[i] = minus(left[i], times(a, q[i]))
			}
		}
	}
	return left, coord
}

// solve returns the coefficients over all columns, zero for those set aside.
func (f *reference) solve(v []*big.Float) []*big.Float {
	_, coord := f.project(v)
	b := make([]*big.Float, len(f.cols)-f.p.rhs)
	for i := range b {
		b[i] = zero()
	}
	for t := len(f.q) - 1; t >= 0; t-- {
		x := coord[t]
		for u := t + 1; u < len(f.q); u++ {
			x = minus(x, times(f.r[u][t], b[f.kept[u]]))
		}
		b[f.kept[t]] = over(x, f.r[t][t])
	}
	return b
}

// all returns 0 … n−1.
func all(n int) []int {
	s := make([]int, n)
	for i := range s {
		s[i] = i
	}
	return s
}

func (p *problem) count() int {
	n := 0
	for _, g := range p.groups {
		n += g.Columns()
	}
	return n
}

// shape says what random draws.
type shape struct {
	n        int
	dense    []int // columns of dense groups
	levels   []int // of index groups; negative: valued
	weighted bool
	low      bool // low parts
	scaled   bool // columns at scales from 2^-200 to 2^200
	none     bool // some rows have no level
}

// random draws a problem; dense groups first.
func (s shape) random(r *rand.Rand) *problem {
	p := &problem{n: s.n, rhs: 2}
	column := func() ([]float64, []float64) {
		hi, lo := make([]float64, s.n), make([]float64, s.n)
		e := 0
		if s.scaled {
			e = r.IntN(401) - 200
		}
		for i := range hi {
			hi[i] = math.Ldexp(r.NormFloat64(), e)
			if s.low {
				lo[i] = hi[i] * 0x1p-54 * (r.Float64() - 0.5)
			}
		}
		return hi, lo
	}
	add := func() {
		h, l := column()
		p.hi, p.lo = append(p.hi, h), append(p.lo, l)
	}
	for _, d := range s.dense {
		p.groups = append(p.groups, Group{Dense: d})
		for range d {
			add()
		}
	}
	for _, l := range s.levels {
		g := Group{Levels: max(l, -l), Valued: l < 0}
		p.groups = append(p.groups, g)
		idx := make([]int32, s.n)
		for i := range idx {
			idx[i] = int32(r.IntN(g.Levels))
			if s.none && r.IntN(5) == 0 {
				idx[i] = -1
			}
		}
		p.index = append(p.index, idx)
		if g.Valued {
			h, l := column()
			p.vhi, p.vlo = append(p.vhi, h), append(p.vlo, l)
		} else {
			p.vhi, p.vlo = append(p.vhi, nil), append(p.vlo, nil)
		}
	}
	for range p.rhs {
		add()
	}
	if s.weighted {
		p.w = make([]float64, s.n)
		for i := range p.w {
			p.w[i] = r.Float64() * 4
			if r.IntN(8) == 0 {
				p.w[i] = 0
			}
		}
	}
	return p
}
