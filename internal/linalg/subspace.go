package linalg

import "math"

// Coordinates are the columns of a joint factor as vectors on its pivots, in
// plain double precision: what a certificate of exactness needs.
type Coordinates struct {
	f    *Factor
	dim  int
	cols [][]float64 // by column of the rest
}

// MaxCoordinates is the largest dimension for which subspaces are formed.
const MaxCoordinates = 800

// Coordinate returns the coordinates of all columns, ok = false where a group
// was eliminated or the dimension is too large.
func (f *Factor) Coordinate() (*Coordinates, bool) {
	if f.elim >= 0 || len(f.piv) > MaxCoordinates {
		return nil, false
	}
	c := &Coordinates{f: f, dim: len(f.piv)}
	c.cols = make([][]float64, f.q)
	for k := range c.cols {
		c.cols[k] = make([]float64, c.dim)
		for t, p := range f.piv {
			if p > k {
				break
			}
			c.cols[k][t] = f.r[k].at(t).Float64()
		}
	}
	return c, true
}

// group returns the columns of a group.
func (c *Coordinates) group(g int) [][]float64 {
	for i, gi := range c.f.rest {
		if gi == g {
			return c.cols[c.f.pos[i] : c.f.pos[i]+c.f.g.groups[g].Columns()]
		}
	}
	return nil
}

// Of returns the coordinates of Xb.
func (c *Coordinates) Of(b Vec) []float64 {
	v := make([]float64, c.dim)
	for i, gi := range c.f.rest {
		at := c.f.g.Offset(gi)
		for k := range c.f.g.groups[gi].Columns() {
			if x := b.at(at + k).Float64(); x != 0 {
				axpy(x, c.cols[c.f.pos[i]+k], v)
			}
		}
	}
	return v
}

// Columns returns copies of the columns of a group.
func (c *Coordinates) Columns(g int) [][]float64 {
	var out [][]float64
	for _, z := range c.group(g) {
		out = append(out, append([]float64(nil), z...))
	}
	return out
}

// Subspace is an orthonormal basis in the coordinates of a joint factor.
type Subspace struct{ basis [][]float64 }

// Dim returns the dimension.
func (s *Subspace) Dim() int { return len(s.basis) }

func inner(a, b []float64) float64 {
	var s, t, u, v float64
	b = b[:len(a)]
	i := 0
	for ; i+3 < len(a); i += 4 {
		s += a[i] * b[i]
		t += a[i+1] * b[i+1]
		u += a[i+2] * b[i+2]
		v += a[i+3] * b[i+3]
	}
	for ; i < len(a); i++ {
		s += a[i] * b[i]
	}
	return (s + t) + (u + v)
}

func axpy(a float64, x, y []float64) {
	if a == 0 {
		return
	}
	y = y[:len(x)]
	for i, v := range x {
		y[i] += a * v
	}
}

// add takes v off the basis, twice where much goes (Giraud, Langou and
// Rozložník 2005), and appends what is left if it is more than tol of v.
func (s *Subspace) add(v []float64, tol float64) {
	norm := math.Sqrt(inner(v, v))
	if norm == 0 {
		return
	}
	w := append([]float64(nil), v...)
	left := norm
	for range 3 {
		before := left
		for _, q := range s.basis {
			axpy(-inner(q, w), q, w)
		}
		if left = math.Sqrt(inner(w, w)); left <= tol*norm {
			return
		}
		if left > 0.7*before {
			break
		}
	}
	for i := range w {
		w[i] /= left
	}
	s.basis = append(s.basis, w)
}

// minTol is what plain double precision can tell from nil.
const minTol = 1e-11

// Span returns the space of the groups' columns.
func (c *Coordinates) Span(groups []int, tol float64) *Subspace {
	s := &Subspace{}
	for _, g := range groups {
		for _, v := range c.group(g) {
			s.add(v, math.Max(tol, minTol))
		}
	}
	return s
}

// Whole returns the space of all columns.
func (c *Coordinates) Whole() *Subspace {
	s := &Subspace{}
	for t := range c.dim {
		e := make([]float64, c.dim)
		e[t] = 1
		s.basis = append(s.basis, e)
	}
	return s
}

// Minus returns the part of s orthogonal to t, which must lie inside s.
func (s *Subspace) Minus(t *Subspace) *Subspace {
	all := &Subspace{basis: append([][]float64(nil), t.basis...)}
	for _, v := range s.basis {
		all.add(v, 1e-7)
	}
	return &Subspace{basis: all.basis[len(t.basis):]}
}

// Without returns the part of s orthogonal to a vector of s.
func (s *Subspace) Without(v []float64) *Subspace {
	one := &Subspace{}
	one.add(v, 0)
	return s.Minus(one)
}

// Overlap returns the largest inner product of basis vectors: 0 for orthogonal spaces.
func (s *Subspace) Overlap(t *Subspace) float64 {
	m := 0.0
	for _, a := range s.basis {
		for _, b := range t.basis {
			m = math.Max(m, math.Abs(inner(a, b)))
		}
	}
	return m
}

// images returns Zᵀq for each basis vector q, zs being the columns of Z.
func (s *Subspace) images(zs [][]float64) [][]float64 {
	out := make([][]float64, len(s.basis))
	for i, q := range s.basis {
		out[i] = make([]float64, len(zs))
		for k, z := range zs {
			out[i][k] = inner(z, q)
		}
	}
	return out
}

// Spread returns the constant c nearest to QᵀZZᵀQ = cI and the largest departure from it.
func (s *Subspace) Spread(zs [][]float64) (c, residual float64) {
	im := s.images(zs)
	if len(im) == 0 {
		return 0, 0
	}
	for _, v := range im {
		c += inner(v, v) / float64(len(im))
	}
	for i, v := range im {
		for k, w := range im[:i+1] {
			x := inner(v, w)
			if i == k {
				x -= c
			}
			residual = math.Max(residual, math.Abs(x))
		}
	}
	return c, residual
}

// Size returns the largest diagonal element of QᵀZZᵀQ, which bounds all of them.
func (s *Subspace) Size(zs [][]float64) float64 {
	m := 0.0
	for _, v := range s.images(zs) {
		m = math.Max(m, inner(v, v))
	}
	return m
}

// Cross returns the largest element of QᵀZZᵀU.
func (s *Subspace) Cross(t *Subspace, zs [][]float64) float64 {
	a, b := s.images(zs), t.images(zs)
	m := 0.0
	for _, v := range a {
		for _, w := range b {
			m = math.Max(m, math.Abs(inner(v, w)))
		}
	}
	return m
}
