package linalg

import (
	"math"
	"sort"

	"subsume.example/internal/dd"
)

// BlockRows is the number of rows accumulated at a time. Sums are taken within
// blocks of rows [k·BlockRows, (k+1)·BlockRows) and then over the blocks in
// order, so that bits depend neither on how a source cuts its rows nor on workers.
const BlockRows = 512

// Group is a set of columns that come together: Dense numeric columns, or the
// Levels of an index, of which each row has at most one non-zero.
type Group struct {
	Dense  int
	Levels int
	Valued bool // the non-zero is a number, not 1
}

// Columns returns how many columns the group has.
func (g Group) Columns() int { return g.Dense + g.Levels }

// Block holds up to BlockRows rows: dense columns of all groups in order,
// followed by the right-hand sides; an index for each index group, with its
// value where it is valued; and the weights, nil for ones.
type Block struct {
	Rows   int
	Weight []float64
	Hi, Lo [][]float64
	Index  [][]int32
	VHi    [][]float64
	VLo    [][]float64
}

// Gram holds the cross-products of all columns and right-hand sides.
type Gram struct {
	groups []Group
	rhs    int
	nd     int   // dense columns
	dense  []int // first dense column of a group
	index  []int // number of an index group among them, −1
	ig     []int // the group of each index group

	dd    []dd.DD   // packed by columns: dense columns and right-hand sides
	diag  [][]dd.DD // by index group and level: Σ w v²
	sums  []vec     // by index group: level·(nd+rhs)+j: Σ w v b_j; parts not renormalized before Finish
	cross []cross   // by pair of index groups
	count [][]int64 // rows by index group and level

	// Workers is the largest number of goroutines of one Add; 0 and 1: none.
	Workers int

	ones     int // dense column that is 1 throughout, −1
	weighted bool
	rowsIn   int
	weighty  int // rows whose weight is not 0: no rank is larger
	wx       vec // scratch: weighted column
}

// cross holds Σ w v_g v_h by a pair of levels.
type cross struct {
	rows, cols int
	hi, lo     []float64        // dense; lo nil when all are exact counts
	sparse     map[uint64]dd.DD // else
}

// maxCross is the largest table of level pairs that is kept dense: 32 MiB of counts.
const maxCross = 1 << 22

// NewGram returns an empty Gram. ones is the dense column that is 1 throughout,
// −1 for none; weighted says that weights that are not whole will come.
func NewGram(groups []Group, rhs, ones int, weighted bool) *Gram {
	g := new(Gram)
	g.Init(groups, rhs, ones, weighted)
	return g
}

// Init makes g the empty Gram that NewGram returns. It reuses the memory of g, which
// pays where all groups are dense.
func (g *Gram) Init(groups []Group, rhs, ones int, weighted bool) {
	*g = Gram{groups: groups, rhs: rhs, ones: ones, weighted: weighted, dense: g.dense[:0], index: g.index[:0], dd: g.dd[:0], wx: g.wx}
	for i, gr := range groups {
		g.dense = append(g.dense, g.nd)
		g.nd += gr.Dense
		at := -1
		if gr.Levels > 0 {
			at = len(g.ig)
			g.ig = append(g.ig, i)
		}
		g.index = append(g.index, at)
	}
	m := g.nd + rhs
	if n := m * (m + 1) / 2; cap(g.dd) < n {
		g.dd = make([]dd.DD, n)
	} else {
		g.dd = g.dd[:n]
		clear(g.dd)
	}
	for a, i := range g.ig {
		l := groups[i].Levels
		g.diag = append(g.diag, make([]dd.DD, l))
		g.sums = append(g.sums, newVec(l*m))
		g.count = append(g.count, make([]int64, l))
		for b := range a {
			h := groups[g.ig[b]]
			c := cross{rows: l, cols: h.Levels}
			if l*h.Levels <= maxCross {
				c.hi = make([]float64, l*h.Levels)
				if weighted || groups[i].Valued || h.Valued {
					c.lo = make([]float64, l*h.Levels)
				}
			} else {
				c.sparse = make(map[uint64]dd.DD)
			}
			g.cross = append(g.cross, c)
		}
	}
}

// Rows returns how many rows were added.
func (g *Gram) Rows() int { return g.rowsIn }

// pair returns the cross table of index groups a > b.
func (g *Gram) pair(a, b int) *cross { return &g.cross[a*(a-1)/2+b] }

func packed(i, j int) int { return j*(j+1)/2 + i } // i <= j

// Add accumulates one block. Index entries must be below the number of levels; −1 is no level.
func (g *Gram) Add(b *Block) {
	g.rowsIn += b.Rows
	g.weighty += b.Rows
	for _, w := range b.Weight[:min(b.Rows, len(b.Weight))] {
		if w == 0 {
			g.weighty--
		}
	}
	m := g.nd + g.rhs
	if work := m * m / 2 * b.Rows; g.Workers > 1 && work > 1<<20 {
		g.share(b, m, work)
	} else {
		for j := range m {
			g.addDense(b, j, &g.wx)
		}
	}
	for a := range g.ig {
		g.addIndex(b, a, m)
	}
}

// share is the dense part of Add on several goroutines, each with columns of its own.
func (g *Gram) share(b *Block, m, work int) {
	parallel(g.Workers, work, func(w, of int) {
		var scratch vec
		for j := w; j < m; j += of {
			g.addDense(b, j, &scratch)
		}
	})
}

// addDense adds the products of dense column j with those before it and itself.
func (g *Gram) addDense(b *Block, j int, scratch *vec) {
	n := b.Rows
	x := b.column(j)
	if b.Weight != nil {
		x = weigh(x, b.Weight, n, scratch)
	}
	at := packed(0, j)
	i := 0
	for ; i+1 <= j; i += 4 { // up to four at a time; a remainder of one goes alone
		r := dot4(x, b.column(i), b.column(i+1), b.column(min(i+2, j)), b.column(min(i+3, j)), n)
		for k := range min(4, j-i+1) {
			g.dd[at+i+k] = g.dd[at+i+k].Add(r[k])
		}
	}
	if i == j {
		g.dd[at+j] = g.dd[at+j].Add(dot(x, b.column(j), n))
	}
}

// column returns a dense column or right-hand side.
func (b *Block) column(j int) vec {
	v := vec{hi: b.Hi[j]}
	if b.Lo != nil {
		v.lo = b.Lo[j]
	}
	return v
}

// weigh returns the column times the weights, in the scratch vector.
func weigh(x vec, w []float64, n int, scratch *vec) vec {
	if scratch.hi == nil {
		*scratch = newVec(BlockRows)
	}
	for i := range n {
		scratch.set(i, x.at(i).MulF(w[i]))
	}
	return *scratch
}

func (g *Gram) addIndex(b *Block, a, m int) {
	valued := g.groups[g.ig[a]].Valued
	idx := b.Index[a][:b.Rows]
	count := g.count[a]
	for _, l := range idx {
		if l >= 0 {
			count[l]++
		}
	}
	if valued || b.Weight != nil {
		g.addWeighted(b, a, m)
		return
	}
	diag := g.diag[a]
	for _, l := range idx {
		if l >= 0 {
			diag[l].Hi++
		}
	}
	sh, sl := g.sums[a].hi, g.sums[a].lo
	for j := range m {
		if j == g.ones {
			continue // Finish takes it from the counts
		}
		x := b.Hi[j][:b.Rows]
		for r, l := range idx {
			if l < 0 {
				continue
			}
			at := int(l)*m + j
			s, e := dd.TwoSum(sh[at], x[r])
			sh[at] = s
			sl[at] += e
		}
		if b.Lo == nil || b.Lo[j] == nil {
			continue
		}
		x = b.Lo[j][:b.Rows]
		for r, l := range idx {
			if l >= 0 {
				sl[int(l)*m+j] += x[r]
			}
		}
	}
	for c := range a {
		t := g.pair(a, c)
		kdx := b.Index[c][:b.Rows]
		if t.lo == nil && t.sparse == nil {
			for r, l := range idx {
				if k := kdx[r]; l >= 0 && k >= 0 {
					t.hi[int(l)*t.cols+int(k)]++
				}
			}
			continue
		}
		for r, l := range idx {
			k := kdx[r]
			if l < 0 || k < 0 {
				continue
			}
			p := dd.DD{Hi: 1}
			if g.groups[g.ig[c]].Valued {
				p = b.value(c, r)
			}
			t.add(int(l), int(k), p)
		}
	}
}

// addWeighted is addIndex for rows with weights or values.
func (g *Gram) addWeighted(b *Block, a, m int) {
	valued := g.groups[g.ig[a]].Valued
	sums, diag := g.sums[a], g.diag[a]
	for r, l := range b.Index[a][:b.Rows] {
		if l < 0 || b.Weight != nil && b.Weight[r] == 0 {
			continue
		}
		v := dd.DD{Hi: 1}
		if valued {
			v = b.value(a, r)
		}
		wv := v
		if b.Weight != nil {
			wv = v.MulF(b.Weight[r])
		}
		diag[l] = diag[l].Add(wv.Mul(v))
		at := int(l) * m
		for j := range m {
			x := dd.DD{Hi: b.Hi[j][r]}
			if b.Lo != nil && b.Lo[j] != nil {
				x.Lo = b.Lo[j][r]
			}
			x = x.Mul(wv)
			s, e := dd.TwoSum(sums.hi[at+j], x.Hi)
			sums.hi[at+j] = s
			sums.lo[at+j] += e + x.Lo
		}
		for c := range a {
			k := b.Index[c][r]
			if k < 0 {
				continue
			}
			p := wv
			if g.groups[g.ig[c]].Valued {
				p = p.Mul(b.value(c, r))
			}
			g.pair(a, c).add(int(l), int(k), p)
		}
	}
}

// Finish brings the sums to their final form; nothing may be added afterwards.
func (g *Gram) Finish() {
	m := g.nd + g.rhs
	for a, s := range g.sums {
		for i := range s.hi {
			s.hi[i], s.lo[i] = dd.TwoSum(s.hi[i], s.lo[i])
		}
		if g.ones >= 0 && !g.groups[g.ig[a]].Valued {
			for l, d := range g.diag[a] {
				s.set(l*m+g.ones, d)
			}
		}
	}
}

func (b *Block) value(a, r int) dd.DD {
	v := dd.DD{Hi: b.VHi[a][r]}
	if b.VLo != nil && b.VLo[a] != nil {
		v.Lo = b.VLo[a][r]
	}
	return v
}

func (c *cross) add(i, j int, x dd.DD) {
	at := i*c.cols + j
	switch {
	case c.sparse != nil:
		k := uint64(i)<<32 | uint64(j)
		c.sparse[k] = c.sparse[k].Add(x)
	case c.lo == nil:
		c.hi[at] += x.Hi
	default:
		s := dd.DD{Hi: c.hi[at], Lo: c.lo[at]}.Add(x)
		c.hi[at], c.lo[at] = s.Hi, s.Lo
	}
}

// Merge adds h, the Gram of later rows, to g.
func (g *Gram) Merge(h *Gram) {
	g.rowsIn += h.rowsIn
	g.weighty += h.weighty
	for i := range g.dd {
		g.dd[i] = g.dd[i].Add(h.dd[i])
	}
	for a := range g.ig {
		for l := range g.diag[a] {
			g.diag[a][l] = g.diag[a][l].Add(h.diag[a][l])
			g.count[a][l] += h.count[a][l]
		}
		for i := range g.sums[a].hi {
			s, e := dd.TwoSum(g.sums[a].hi[i], h.sums[a].hi[i])
			g.sums[a].hi[i] = s
			g.sums[a].lo[i] += e + h.sums[a].lo[i]
		}
	}
	for p := range g.cross {
		c, d := &g.cross[p], &h.cross[p]
		for i := range c.hi {
			x := dd.DD{Hi: d.hi[i]}
			if d.lo != nil {
				x.Lo = d.lo[i]
			}
			if x.Hi != 0 {
				c.add(i/c.cols, i%c.cols, x)
			}
		}
		for k, x := range d.sparse { // one entry a key: the order does not matter
			c.sparse[k] = c.sparse[k].Add(x)
		}
	}
}

// Small reports whether partial Grams are cheap to make and merge.
func (g *Gram) Small() bool {
	size := 0
	for a := range g.ig {
		size += len(g.sums[a].hi)
	}
	for i := range g.cross {
		if g.cross[i].sparse != nil {
			return false
		}
		size += len(g.cross[i].hi)
	}
	return size <= 1<<14
}

// Empty returns a Gram of the same shape without rows.
func (g *Gram) Empty() *Gram { return NewGram(g.groups, g.rhs, g.ones, g.weighted) }

// Finite reports whether every sum is finite.
func (g *Gram) Finite() bool {
	var s float64
	for _, x := range g.dd {
		s += x.Hi * 0
	}
	for a := range g.ig {
		for _, x := range g.diag[a] {
			s += x.Hi * 0
		}
		for _, x := range g.sums[a].hi {
			s += x * 0
		}
	}
	return s == 0 && !math.IsNaN(s)
}

// Count returns the rows at a level of an index group.
func (g *Gram) Count(group, level int) int64 { return g.count[g.index[group]][level] }

// RHS returns the cross-product of two right-hand sides.
func (g *Gram) RHS(i, j int) dd.DD {
	if i > j {
		i, j = j, i
	}
	return g.dd[packed(g.nd+i, g.nd+j)]
}

// entry is a non-zero of a sparse row.
type entry struct {
	col int32
	val dd.DD
}

// levelRow appends the cross-products of level l of index group e with the
// columns of the listed groups (from numbers pos) and the right-hand sides (from
// number at). sparse holds the rows of the tables that are kept sparse.
func (g *Gram) levelRow(row []entry, e, l int, groups, pos []int, at int, sparse [][][]entry) []entry {
	m := g.nd + g.rhs
	s := g.sums[e]
	put := func(c int, x dd.DD) {
		if x.Hi != 0 {
			row = append(row, entry{int32(c), x})
		}
	}
	for k, gi := range groups {
		gr := g.groups[gi]
		for j := range gr.Dense {
			put(pos[k]+j, s.at(l*m+g.dense[gi]+j))
		}
		switch {
		case gr.Levels == 0:
		case sparse[k] != nil:
			for _, x := range sparse[k][l] {
				put(pos[k]+int(x.col), x.val)
			}
		default:
			c, flip := g.pairOf(e, g.index[gi])
			for j := range gr.Levels {
				if flip {
					put(pos[k]+j, c.get(j, l))
				} else {
					put(pos[k]+j, c.get(l, j))
				}
			}
		}
	}
	for j := range g.rhs {
		put(at+j, s.at(l*m+g.nd+j))
	}
	return row
}

// pairOf returns the cross table of e and f, and whether its rows belong to f.
func (g *Gram) pairOf(e, f int) (c *cross, flip bool) {
	if e > f {
		return g.pair(e, f), false
	}
	return g.pair(f, e), true
}

func (c *cross) get(i, j int) dd.DD {
	switch {
	case c.sparse != nil:
		return c.sparse[uint64(i)<<32|uint64(j)]
	case c.lo == nil:
		return dd.DD{Hi: c.hi[i*c.cols+j]}
	}
	return dd.DD{Hi: c.hi[i*c.cols+j], Lo: c.lo[i*c.cols+j]}
}

// sparseRows lists the entries of a sparse table by its rows, or by its columns when flip is set.
func (c *cross) sparseRows(flip bool) [][]entry {
	n := c.rows
	if flip {
		n = c.cols
	}
	rows := make([][]entry, n)
	for k, x := range c.sparse {
		i, j := int(k>>32), int(k&(1<<32-1))
		if flip {
			i, j = j, i
		}
		rows[i] = append(rows[i], entry{int32(j), x})
	}
	for _, r := range rows {
		sort.Slice(r, func(a, b int) bool { return r[a].col < r[b].col })
	}
	return rows
}
