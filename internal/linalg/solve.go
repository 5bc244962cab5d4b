package linalg

import (
	"math"

	"subsume.example/internal/dd"
)

// Vec is a vector of double-doubles over all columns of a Gram, by group and
// column, with the right-hand sides at the end.
type Vec = vec

// Columns returns the number of columns of all groups.
func (g *Gram) Columns() int {
	n := 0
	for _, gr := range g.groups {
		n += gr.Columns()
	}
	return n
}

// Offset returns the number of the first column of a group within a Vec.
func (g *Gram) Offset(group int) int {
	n := 0
	for _, gr := range g.groups[:group] {
		n += gr.Columns()
	}
	return n
}

// NewVec returns a zero vector over the columns and right-hand sides of g.
func (g *Gram) NewVec() Vec { return newVec(g.Columns() + g.rhs) }

// At and Set read and write an element.
func (v vec) At(i int) dd.DD     { return v.at(i) }
func (v vec) Set(i int, x dd.DD) { v.set(i, x) }

// Len returns the length.
func (v vec) Len() int { return len(v.hi) }

// Residual returns the cross-product of the parts of two right-hand sides that
// the space leaves.
func (f *Factor) Residual(i, j int) dd.DD { return f.resd[i*f.g.rhs+j] }

// Half is R⁻ᵀc: the coordinates of a linear function of the coefficients.
type Half struct {
	level []dd.DD // c of the eliminated levels divided by their diagonal
	c     []dd.DD // c of the eliminated levels
	rest  vec
}

// Half solves Rᵀh = c over the kept columns. c is a function of the fitted values
// when every column set aside has the coefficient that writing it in the kept
// ones asks for; violation is the largest departure, worst the column in a Vec
// where it is found, −1 for none. A departure is taken relative to the terms
// that make it up, |c_k| + ‖h‖‖x_k‖, so that it depends on the scale of no column.
func (f *Factor) Half(c Vec) (h Half, violation float64, worst int) {
	worst = -1
	note := func(x dd.DD, scale float64, at int) {
		if v := math.Abs(x.Hi); v > violation*scale {
			violation, worst = v/scale, at
		}
	}
	rhs := newVec(f.q) // c of the rest less what the eliminated levels explain
	at := 0
	for i, gi := range f.rest {
		at = f.g.Offset(gi)
		for j := range f.g.groups[gi].Columns() {
			rhs.set(f.pos[i]+j, c.at(at+j))
		}
	}
	var length float64 // ‖h‖² so far
	if f.elim >= 0 {
		at = f.g.Offset(f.elim)
		h.level = make([]dd.DD, len(f.d))
		h.c = make([]dd.DD, len(f.d))
		for l, d := range f.d {
			x := c.at(at + l)
			if x.Hi == 0 {
				continue
			}
			if d.Hi <= 0 {
				note(x, math.Abs(x.Hi), at+l)
				continue
			}
			h.c[l], h.level[l] = x, x.Div(d)
			length += x.Hi * h.level[l].Hi
			for _, e := range f.rows[l] {
				if int(e.col) < f.q {
					rhs.set(int(e.col), rhs.at(int(e.col)).Sub(h.level[l].Mul(e.val)))
				}
			}
		}
	}
	h.rest = newVec(len(f.piv))
	t := 0
	for k := range f.q {
		x := rhs.at(k).Sub(dot(f.r[k], h.rest, t))
		if t < len(f.piv) && f.piv[t] == k {
			x = x.Div(f.r[k].at(t))
			h.rest.set(t, x)
			length += x.Hi * x.Hi
			t++
			continue
		}
		if x.Hi == 0 {
			continue
		}
		gi, col := f.locate(k)
		at := f.g.Offset(gi) + col
		note(x, math.Abs(c.hi[at])+math.Sqrt(length*f.norm(k)), at)
	}
	return h, violation, worst
}

// Dot returns hᵀk.
func (h Half) Dot(k Half) dd.DD {
	s := dot(h.rest, k.rest, len(h.rest.hi))
	for l, x := range h.level {
		if x.Hi != 0 && k.c[l].Hi != 0 {
			s = s.Add(x.Mul(k.c[l]))
		}
	}
	return s
}

// Coordinates returns Qᵀ of a right-hand side as a Half, so that Dot with
// Half(c) is cᵀβ.
func (f *Factor) Coordinates(rhs int) Half {
	h := Half{rest: f.r[f.q+rhs].slice(len(f.piv))}
	if f.elim >= 0 {
		h.level, h.c = make([]dd.DD, len(f.d)), make([]dd.DD, len(f.d))
		for l, row := range f.rows {
			for _, e := range row {
				if int(e.col) == f.q+rhs {
					h.c[l] = e.val
					h.level[l] = e.val.Div(f.d[l])
				}
			}
		}
	}
	return h
}

func (v vec) slice(n int) vec { return vec{v.hi[:n], v.lo[:n]} }

// Back solves Rb = h: the coefficients, zero for columns set aside.
func (f *Factor) Back(h Half) Vec {
	b := f.g.NewVec()
	rest := newVec(f.q)
	for t := len(f.piv) - 1; t >= 0; t-- {
		k := f.piv[t]
		x := h.rest.at(t)
		for u := t + 1; u < len(f.piv); u++ {
			j := f.piv[u]
			x = x.Sub(f.r[j].at(t).Mul(rest.at(j)))
		}
		rest.set(k, x.Div(f.r[k].at(t)))
	}
	for i, gi := range f.rest {
		at := f.g.Offset(gi)
		for j := range f.g.groups[gi].Columns() {
			b.set(at+j, rest.at(f.pos[i]+j))
		}
	}
	if f.elim >= 0 {
		at := f.g.Offset(f.elim)
		for l, d := range f.d {
			if d.Hi <= 0 {
				continue
			}
			x := h.c[l]
			for _, e := range f.rows[l] {
				if int(e.col) < f.q {
					x = x.Sub(e.val.Mul(rest.at(int(e.col))))
				}
			}
			b.set(at+l, x.Div(d))
		}
	}
	return b
}

// Solve returns the least-squares coefficients of a right-hand side.
func (f *Factor) Solve(rhs int) Vec { return f.Back(f.Coordinates(rhs)) }

// NormSq returns ‖Xδ‖², δ over the columns of f and the right-hand sides, as a
// sum of squares of coordinates.
func (f *Factor) NormSq(delta Vec) dd.DD {
	nc := f.g.Columns()
	cols := newVec(len(f.r))
	for i, gi := range f.rest {
		at := f.g.Offset(gi)
		for j := range f.g.groups[gi].Columns() {
			cols.set(f.pos[i]+j, delta.at(at+j))
		}
	}
	for k := range f.g.rhs {
		cols.set(f.q+k, delta.at(nc+k))
	}
	var s dd.DD
	coord := newVec(len(f.piv))
	for j := range f.r {
		x := cols.at(j)
		if x.Hi == 0 {
			continue
		}
		n := len(f.piv)
		for t := range n {
			if j < f.q && f.piv[t] > j {
				break
			}
			coord.set(t, coord.at(t).Add(f.r[j].at(t).Mul(x)))
		}
	}
	for t := range f.piv {
		s = s.Add(coord.at(t).Sqr())
	}
	for i := range f.g.rhs {
		for j := range f.g.rhs {
			a, b := cols.at(f.q+i), cols.at(f.q+j)
			if a.Hi != 0 && b.Hi != 0 {
				s = s.Add(f.Residual(i, j).Mul(a).Mul(b))
			}
		}
	}
	if f.elim >= 0 {
		at := f.g.Offset(f.elim)
		for l, d := range f.d {
			if d.Hi <= 0 {
				continue
			}
			x := d.Mul(delta.at(at + l))
			for _, e := range f.rows[l] {
				if y := cols.at(int(e.col)); y.Hi != 0 {
					x = x.Add(e.val.Mul(y))
				}
			}
			if x.Hi != 0 {
				s = s.Add(x.Sqr().Div(d))
			}
		}
	}
	return s
}

// Prefix reports whether the groups, in any order, are the eliminated
// group (if any) and the first groups of the rest, and how many dimensions they span.
func (f *Factor) Prefix(groups []int) (rank int, ok bool) {
	n := len(groups)
	has := func(g int) bool {
		for _, x := range groups {
			if x == g {
				return true
			}
		}
		return false
	}
	if f.elim >= 0 {
		if !has(f.elim) {
			return 0, false
		}
		n--
		rank = f.live
	}
	cols := f.q
	for i, gi := range f.rest {
		if i == n {
			cols = f.pos[i]
			break
		}
		if !has(gi) {
			return 0, false
		}
	}
	for _, k := range f.piv {
		if k < cols {
			rank++
		}
	}
	return rank, true
}

// Between returns the squared norm of the coordinates of a right-hand side
// from dimension lo up to hi, both as Prefix counts them. lo must
// not be below the eliminated levels.
func (f *Factor) Between(rhs, lo, hi int) dd.DD {
	v := f.r[f.q+rhs]
	lo, hi = lo-f.live, hi-f.live
	w := vec{v.hi[lo:hi], v.lo[lo:hi]}
	return dot(w, w, hi-lo)
}

// Outside returns the part of a column of any group that the space leaves,
// relative to the column's norm; 0 for a zero column.
func (f *Factor) Outside(group, column int) float64 {
	in, norm := f.Inside(group, column)
	left := norm.Sub(in)
	if norm.Hi <= 0 || left.Hi <= 0 {
		return 0
	}
	return math.Sqrt(left.Hi / norm.Hi)
}

// Inside returns the squared length of the projection of a column of any group
// on the space, and that of the column.
func (f *Factor) Inside(group, column int) (in, norm dd.DD) {
	c, norm := f.g.crossVec(group, column)
	if norm.Hi <= 0 {
		return dd.DD{}, norm
	}
	h, _, _ := f.Half(c)
	return h.Dot(h), norm
}

// Length returns the squared length of a column of an index group.
func (g *Gram) Length(group, level int) float64 { return g.diag[g.index[group]][level].Hi }

// crossVec returns the cross-products of one column with all, and its squared norm.
func (g *Gram) crossVec(group, column int) (Vec, dd.DD) {
	v := g.NewVec()
	gr, m := g.groups[group], g.nd+g.rhs
	isDense := column < gr.Dense
	l := column - gr.Dense
	at := 0
	for gi, h := range g.groups {
		for j := range h.Dense {
			if isDense {
				v.set(at+j, g.denseEntry(g.dense[group]+column, g.dense[gi]+j))
			} else {
				v.set(at+j, g.sums[g.index[group]].at(l*m+g.dense[gi]+j))
			}
		}
		for j := range h.Levels {
			var x dd.DD
			switch {
			case isDense:
				x = g.sums[g.index[gi]].at(j*m + g.dense[group] + column)
			case gi == group:
				if j == l {
					x = g.diag[g.index[gi]][l]
				}
			default:
				if c, flip := g.pairOf(g.index[group], g.index[gi]); flip {
					x = c.get(j, l)
				} else {
					x = c.get(l, j)
				}
			}
			v.set(at+h.Dense+j, x)
		}
		at += h.Columns()
	}
	if isDense {
		j := g.dense[group] + column
		return v, g.dd[packed(j, j)]
	}
	return v, g.diag[g.index[group]][l]
}

// Sub returns h − k.
func (h Half) Sub(k Half) Half { return h.combine(k, dd.From(-1)) }

// combine returns h + a·k.
func (h Half) combine(k Half, a dd.DD) Half {
	r := Half{rest: newVec(len(h.rest.hi))}
	for i := range r.rest.hi {
		r.rest.set(i, h.rest.at(i).Add(a.Mul(k.rest.at(i))))
	}
	if h.level != nil {
		r.level, r.c = make([]dd.DD, len(h.level)), make([]dd.DD, len(h.c))
		for l := range r.level {
			r.level[l] = h.level[l].Add(a.Mul(k.level[l]))
			r.c[l] = h.c[l].Add(a.Mul(k.c[l]))
		}
	}
	return r
}

// Scale returns a·h.
func (h Half) Scale(a dd.DD) Half {
	r := Half{rest: newVec(len(h.rest.hi))}
	for i := range r.rest.hi {
		r.rest.set(i, a.Mul(h.rest.at(i)))
	}
	if h.level != nil {
		r.level, r.c = make([]dd.DD, len(h.level)), make([]dd.DD, len(h.c))
		for l := range r.level {
			r.level[l], r.c[l] = a.Mul(h.level[l]), a.Mul(h.c[l])
		}
	}
	return r
}

// Total returns 1ᵀ1 and 1ᵀ of each right-hand side, for a group whose columns
// sum to the constant.
func (g *Gram) Total(group int) (n dd.DD, rhs []dd.DD) {
	rhs = make([]dd.DD, g.rhs)
	gr, m := g.groups[group], g.nd+g.rhs
	if gr.Dense > 0 {
		j := g.dense[group]
		for k := range rhs {
			rhs[k] = g.dd[packed(j, g.nd+k)]
		}
		return g.dd[packed(j, j)], rhs
	}
	a := g.index[group]
	for l := range gr.Levels {
		n = n.Add(g.diag[a][l])
		for k := range rhs {
			rhs[k] = rhs[k].Add(g.sums[a].at(l*m + g.nd + k))
		}
	}
	return n, rhs
}

// Null returns one vector for each column set aside that is not empty: 1 there,
// minus the coefficients that write it in the kept columns, so that Xv = 0.
func (f *Factor) Null() []Vec {
	var out []Vec
	for _, a := range f.Aside {
		if a.Empty {
			continue
		}
		k := f.place(a.Group, a.Column)
		h := Half{rest: newVec(len(f.piv))}
		for t, p := range f.piv {
			if p > k {
				break
			}
			h.rest.set(t, f.r[k].at(t).Neg())
		}
		if f.elim >= 0 {
			h.level, h.c = make([]dd.DD, len(f.d)), make([]dd.DD, len(f.d))
			for l, row := range f.rows {
				for _, e := range row {
					if int(e.col) == k {
						h.c[l] = e.val.Neg()
					}
				}
			}
		}
		v := f.Back(h)
		v.set(f.g.Offset(a.Group)+a.Column, dd.From(1))
		out = append(out, v)
	}
	return out
}

// place returns the number of a group's column within the rest.
func (f *Factor) place(group, column int) int {
	for i, gi := range f.rest {
		if gi == group {
			return f.pos[i] + column
		}
	}
	return -1
}
