package linalg

import (
	"math"
	"slices"

	"subsume.example/internal/dd"
)

// Settings steer a factorization.
type Settings struct {
	// Tol is the rank tolerance: a column is set aside when the part of it that
	// earlier columns leave is at most Tol times its norm.
	Tol float64
	// Eliminate lets the largest index group go first, as a diagonal. The
	// columns set aside are then not the last ones in the order of the groups.
	Eliminate bool
	// Workers is the largest number of goroutines; the bits do not depend on it.
	Workers int
}

// minEliminate is the number of levels from which elimination pays.
const minEliminate = 24

// Aside is a column that earlier columns span.
type Aside struct {
	Group, Column int
	Ratio         float64 // what was left of it, relative to its norm
	Empty         bool    // the column is zero
}

// Factor is the triangular factor of the columns of some groups.
type Factor struct {
	g      *Gram
	groups []int // in order, the eliminated one included
	elim   int   // the eliminated group, −1
	rest   []int // the other groups
	pos    []int // first column of each in the rest
	q      int   // columns of the rest

	d    []dd.DD   // diagonal of the eliminated group
	rows [][]entry // its cross-products with the rest and the right-hand sides
	live int       // its levels that occur

	r    []vec // by column of the rest, then right-hand sides: coordinates on the pivots
	piv  []int // columns of the rest that were kept
	resd []dd.DD

	mem  []float64   // behind r
	left map[int]vec // rows of the Schur complement of dense columns set aside

	// Rank is the dimension of the space.
	Rank int
	// Aside lists the columns set aside, in the order of the factorization.
	Aside []Aside
	// SmallestKept and LargestAside are the relative pivots on both sides of the tolerance.
	SmallestKept, LargestAside float64
}

// NewFactor factors the columns of the groups in the order given.
func NewFactor(g *Gram, groups []int, s Settings) *Factor {
	f := new(Factor)
	f.Init(g, groups, s)
	return f
}

// Init makes f the factor that NewFactor returns, reusing the memory of f.
func (f *Factor) Init(g *Gram, groups []int, s Settings) {
	*f = Factor{g: g, groups: groups, elim: -1, SmallestKept: 1,
		pos: f.pos[:0], r: f.r[:0], piv: f.piv[:0], resd: f.resd[:0], mem: f.mem}
	if s.Eliminate {
		best := minEliminate - 1
		for _, gi := range groups {
			if l := g.groups[gi].Levels; l > best {
				best, f.elim = l, gi
			}
		}
	}
	if f.elim < 0 {
		f.rest = groups
	} else {
		for _, gi := range groups {
			if gi != f.elim {
				f.rest = append(f.rest, gi)
			}
		}
	}
	for _, gi := range f.rest {
		f.pos = append(f.pos, f.q)
		f.q += g.groups[gi].Columns()
	}
	f.load()
	if f.elim >= 0 {
		f.eliminate(s.Workers)
	}
	f.cholesky(s)
}

// load copies the cross-products of the rest and the right-hand sides; entry
// (i, j), i <= j, is f.r[j] at i.
func (f *Factor) load() {
	g, m := f.g, f.q+f.g.rhs
	if cap(f.mem) < 2*m*m {
		f.mem = make([]float64, 2*m*m)
	}
	mem := f.mem[:2*m*m]
	clear(mem)
	for j := range m {
		f.r = append(f.r, vec{mem[2*j*m : (2*j+1)*m], mem[(2*j+1)*m : (2*j+2)*m]})
	}
	put := func(i, j int, x dd.DD) {
		if i > j {
			i, j = j, i
		}
		f.r[j].set(i, x)
	}
	for bi, b := range f.rest {
		for ai := range bi + 1 {
			f.loadPair(f.rest[ai], b, f.pos[ai], f.pos[bi], put)
		}
		gb := g.groups[b]
		for k := range g.rhs {
			for j := range gb.Dense {
				put(f.pos[bi]+j, f.q+k, g.dd[packed(g.dense[b]+j, g.nd+k)])
			}
			if gb.Levels > 0 {
				s := g.sums[g.index[b]]
				for l := range gb.Levels {
					put(f.pos[bi]+l, f.q+k, s.at(l*(g.nd+g.rhs)+g.nd+k))
				}
			}
		}
	}
	for k := range g.rhs {
		for i := range k + 1 {
			put(f.q+i, f.q+k, g.dd[packed(g.nd+i, g.nd+k)])
		}
	}
}

func (f *Factor) loadPair(a, b, pa, pb int, put func(i, j int, x dd.DD)) {
	g := f.g
	ga, gb := g.groups[a], g.groups[b]
	m := g.nd + g.rhs
	for i := range ga.Dense {
		for j := range gb.Dense {
			put(pa+i, pb+j, g.denseEntry(g.dense[a]+i, g.dense[b]+j))
		}
		if gb.Levels > 0 {
			for l := range gb.Levels {
				put(pa+i, pb+l, g.sums[g.index[b]].at(l*m+g.dense[a]+i))
			}
		}
	}
	if ga.Levels == 0 {
		return
	}
	for j := range gb.Dense {
		for l := range ga.Levels {
			put(pa+l, pb+j, g.sums[g.index[a]].at(l*m+g.dense[b]+j))
		}
	}
	switch {
	case gb.Levels == 0:
	case a == b:
		for l, x := range g.diag[g.index[a]] {
			put(pa+l, pb+l, x)
		}
	default:
		c, flip := g.pairOf(g.index[a], g.index[b])
		if c.sparse != nil {
			for i, row := range c.sparseRows(flip) {
				for _, e := range row {
					put(pa+i, pb+int(e.col), e.val)
				}
			}
			return
		}
		for i := range ga.Levels {
			for j := range gb.Levels {
				if flip {
					put(pa+i, pb+j, c.get(j, i))
				} else {
					put(pa+i, pb+j, c.get(i, j))
				}
			}
		}
	}
}

func (g *Gram) denseEntry(i, j int) dd.DD {
	if i > j {
		i, j = j, i
	}
	return g.dd[packed(i, j)]
}

// eliminate subtracts the part of every column that the eliminated group spans.
func (f *Factor) eliminate(workers int) {
	g, e := f.g, f.g.index[f.elim]
	levels := g.groups[f.elim].Levels
	f.d = g.diag[e]
	f.rows = make([][]entry, levels)
	var sparse [][][]entry // by rest group, for tables kept sparse
	for _, gi := range f.rest {
		var rows [][]entry
		if g.groups[gi].Levels > 0 {
			if c, flip := g.pairOf(e, g.index[gi]); c.sparse != nil {
				rows = c.sparseRows(flip)
			}
		}
		sparse = append(sparse, rows)
	}
	work := 0
	for l := range levels {
		switch {
		case f.d[l].Hi > 0:
			f.live++
		default:
			f.Aside = append(f.Aside, Aside{Group: f.elim, Column: l, Empty: true})
			continue
		}
		f.rows[l] = g.levelRow(nil, e, l, f.rest, f.pos, f.q, sparse)
		work += len(f.rows[l]) * len(f.rows[l]) / 2
	}
	parallel(workers, work, func(w, of int) {
		for l, row := range f.rows {
			for b, eb := range row {
				if int(eb.col)%of != w {
					continue
				}
				m := eb.val.Div(f.d[l])
				hi, lo := f.r[eb.col].hi, f.r[eb.col].lo
				for _, ea := range row[:b+1] {
					t := acc{hi[ea.col], lo[ea.col]}
					t.add(-m.Hi, ea.val.Hi)
					t.c -= math.FMA(m.Lo, ea.val.Hi, float64(m.Hi*ea.val.Lo))
					hi[ea.col], lo[ea.col] = t.s, t.c
				}
			}
		}
	})
	for j := range f.r {
		for i := range j + 1 {
			s, t := dd.QuickTwoSum(f.r[j].hi[i], f.r[j].lo[i])
			f.r[j].hi[i], f.r[j].lo[i] = s, t
		}
	}
}

// cholesky replaces each column by its coordinates on the pivots so far, in the
// order of the columns, and sets aside what earlier columns span.
func (f *Factor) cholesky(s Settings) {
	f.Rank = f.live
	tol2 := s.Tol * s.Tol
	m := len(f.r)
	for k := range f.q {
		t := len(f.piv)
		rk := f.r[k]
		norm := f.norm(k)
		left := less(rk.at(k), rk, rk, t)
		ratio := left.Hi / norm
		if !(ratio > tol2) || left.Hi <= 0 || f.live+t >= f.g.weighty || ratio < doubtful && ratio <= f.noise(k, t, norm) {
			f.setAside(k, t, ratio, norm)
			continue
		}
		if r := math.Sqrt(ratio); r < f.SmallestKept {
			f.SmallestKept = r
		}
		root := left.Sqrt()
		inv := root.Inv()
		if n := m - k - 1; n*t > 1<<15 && s.Workers != 1 {
			parallel(s.Workers, n*t, func(w, of int) {
				lo, hi := chunk4(n, w, of)
				f.step(k, t, inv, k+1+lo, k+1+hi)
			})
		} else {
			f.step(k, t, inv, k+1, m)
		}
		rk.set(t, root)
		f.piv = append(f.piv, k)
	}
	f.Rank += len(f.piv)
	t := len(f.piv)
	f.resd = slices.Grow(f.resd, f.g.rhs*f.g.rhs)[:f.g.rhs*f.g.rhs]
	for i := range f.g.rhs {
		for j := range i + 1 {
			x := f.r[f.q+i].at(f.q + j)
			x = x.Sub(dot(f.r[f.q+i], f.r[f.q+j], t))
			f.resd[i*f.g.rhs+j], f.resd[j*f.g.rhs+i] = x, x
		}
	}
}

// step finds the coordinate on pivot t, column k, of the columns from lo to hi−1.
func (f *Factor) step(k, t int, inv dd.DD, lo, hi int) {
	rk := f.r[k]
	j := lo
	for ; t > short && j+3 < hi; j += 4 {
		ds := dot4(rk, f.r[j], f.r[j+1], f.r[j+2], f.r[j+3], t)
		for i := range ds {
			c := f.r[j+i]
			c.set(t, c.at(k).Sub(ds[i]).Mul(inv))
		}
	}
	for ; j < hi; j++ {
		c := f.r[j]
		c.set(t, less(c.at(k), rk, c, t).Mul(inv))
	}
}

// short is the length up to which a dot product is quicker without kernels.
const short = 4

// less returns x − Σ a·b of n elements.
func less(x dd.DD, a, b vec, n int) dd.DD {
	if n > short {
		return x.Sub(dot(a, b, n))
	}
	for i := range n {
		x = x.Sub(dd.DD{Hi: a.hi[i], Lo: a.lo[i]}.Mul(dd.DD{Hi: b.hi[i], Lo: b.lo[i]}))
	}
	return x
}

// doubtful is the squared pivot below which rounding is looked at.
const doubtful = 1e-8

// noise returns what rounding may leave of column k, relative to its squared
// norm, when t earlier columns span it: the factor is that of a matrix of
// cross-products changed by a unit of 2^-104, which changes what is left by as
// much times the square of (1, b), b the coefficients that write the column in
// the earlier ones, in units of the lengths. It matters where these are large:
// where the column leans on a direction that is hardly determined. One unit is
// about ten times the largest error seen against 400 bits.
func (f *Factor) noise(k, t int, norm float64) float64 {
	b := make([]float64, t)
	size := 1.0
	for i := t - 1; i >= 0; i-- {
		x := f.r[k].hi[i]
		for u := i + 1; u < t; u++ {
			x -= f.r[f.piv[u]].hi[i] * b[u]
		}
		b[i] = x / f.r[f.piv[i]].hi[i]
		size += math.Abs(b[i]) * math.Sqrt(f.norm(f.piv[i])/norm)
	}
	return 0x1p-104 * size * size
}

// norm returns the squared norm of a column of the rest.
func (f *Factor) norm(k int) float64 {
	gi, c := f.locate(k)
	gr := f.g.groups[gi]
	if c < gr.Dense {
		j := f.g.dense[gi] + c
		return f.g.dd[packed(j, j)].Hi
	}
	return f.g.diag[f.g.index[gi]][c-gr.Dense].Hi
}

// locate returns the group and column of column k of the rest.
func (f *Factor) locate(k int) (group, column int) {
	i := len(f.pos) - 1
	for f.pos[i] > k {
		i--
	}
	return f.rest[i], k - f.pos[i]
}

func (f *Factor) setAside(k, t int, ratio, norm float64) {
	gi, c := f.locate(k)
	a := Aside{Group: gi, Column: c, Empty: norm == 0}
	if norm > 0 {
		a.Ratio = math.Sqrt(math.Max(ratio, 0))
	}
	f.LargestAside = math.Max(f.LargestAside, a.Ratio)
	f.Aside = append(f.Aside, a)
	if c >= f.g.groups[gi].Dense || norm == 0 {
		return
	}
	if f.left == nil {
		f.left = make(map[int]vec)
	}
	row := newVec(len(f.r))
	for j := k; j < len(f.r); j++ {
		row.set(j, f.r[j].at(k).Sub(dot(f.r[k], f.r[j], t)))
	}
	f.left[k] = row
}

// Clean returns the Gram in which every dense column that f set aside is
// replaced by its projection on the columns kept before it, so that a smaller
// space holding it is judged by the same rank decision. It is f's own
// Gram when there is nothing to replace.
func (f *Factor) Clean() *Gram {
	if len(f.left) == 0 {
		return f.g
	}
	g := *f.g
	g.dd = append([]dd.DD(nil), g.dd...)
	g.sums = append([]vec(nil), g.sums...)
	copied := make([]bool, len(g.sums))
	for k, row := range f.left {
		gk, ck := f.locate(k)
		jk := g.dense[gk] + ck
		for j := k; j < len(f.r); j++ {
			x := row.at(j)
			if j >= f.q {
				at := packed(jk, g.nd+j-f.q)
				g.dd[at] = g.dd[at].Sub(x)
				continue
			}
			gj, cj := f.locate(j)
			if n := g.groups[gj].Dense; cj < n {
				a, b := jk, g.dense[gj]+cj
				if a > b {
					a, b = b, a
				}
				g.dd[packed(a, b)] = g.dd[packed(a, b)].Sub(x)
			} else {
				s := g.index[gj]
				if !copied[s] {
					old := g.sums[s]
					g.sums[s] = vec{append([]float64(nil), old.hi...), append([]float64(nil), old.lo...)}
					copied[s] = true
				}
				at := (cj-n)*(g.nd+g.rhs) + jk
				g.sums[s].set(at, g.sums[s].at(at).Sub(x))
			}
		}
	}
	return &g
}

// Eliminated reports whether a group went first as a diagonal.
func (f *Factor) Eliminated() bool { return f.elim >= 0 }

// Forget drops everything but memory that Init can use again.
func (f *Factor) Forget() {
	*f = Factor{pos: f.pos[:0], r: f.r[:0], piv: f.piv[:0], resd: f.resd[:0], mem: f.mem}
}
