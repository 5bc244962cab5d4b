package linalg

import (
	"math"

	"subsume.example/internal/dd"
)

// Small factors one small dense problem after another in memory of its own: the
// cross-products and Cholesky's method of Gram and Factor without their generality.
type Small struct {
	p    int
	r    []dd.DD // packed by columns, the response last
	inv  []dd.DD // reciprocal pivots; 0 for columns set aside
	solv []dd.DD

	// Rank of all columns; Kept tells which.
	Rank int
	Kept []bool
	// YY and RSS are the squared norms of the response and of what the columns leave of it.
	YY, RSS float64
}

// NewSmall returns room for p columns.
func NewSmall(p int) *Small {
	m := p + 1
	return &Small{p: p, r: make([]dd.DD, m*(m+1)/2), inv: make([]dd.DD, p), solv: make([]dd.DD, p), Kept: make([]bool, p)}
}

// Factor takes the columns x and the response y, all of one length.
func (s *Small) Factor(x [][]float64, y []float64, tol float64) {
	n := len(y)
	col := func(j int) vec {
		if j == s.p {
			return vec{hi: y}
		}
		return vec{hi: x[j]}
	}
	for j := range s.p + 1 {
		b := col(j)
		at := packed(0, j)
		i := 0
		for ; i+1 <= j; i += 4 { // up to four at a time; a remainder of one goes alone
			k1, k2, k3 := min(i+1, j), min(i+2, j), min(i+3, j)
			g := dot4(b, col(i), col(k1), col(k2), col(k3), n)
			for k := range min(4, j-i+1) {
				s.r[at+i+k] = g[k]
			}
		}
		if i == j {
			s.r[at+j] = dot(b, b, n)
		}
	}
	s.YY = s.r[len(s.r)-1].Float64()
	s.Rank = 0
	for k := range s.p {
		ck := s.r[packed(0, k) : packed(k, k)+1]
		norm := ck[k].Hi
		left := ck[k]
		for t := range k {
			if s.Kept[t] {
				left = left.Sub(ck[t].Sqr())
			}
		}
		s.Kept[k] = left.Hi > tol*tol*norm
		if !s.Kept[k] {
			s.inv[k] = dd.DD{}
			continue
		}
		s.Rank++
		root := left.Sqrt()
		inv := root.Inv()
		s.inv[k] = inv
		ck[k] = root
		for j := k + 1; j <= s.p; j++ {
			cj := s.r[packed(0, j) : packed(j, j)+1]
			x := cj[k]
			for t := range k {
				if s.Kept[t] {
					x = x.Sub(ck[t].Mul(cj[t]))
				}
			}
			cj[k] = x.Mul(inv)
		}
	}
	cy := s.r[packed(0, s.p):]
	left := cy[s.p]
	for t := range s.p {
		if s.Kept[t] {
			left = left.Sub(cy[t].Sqr())
		}
	}
	s.RSS = math.Max(left.Float64(), 0)
}

// Between returns the squared norm that columns lo to hi−1 add to the fit of the
// columns before them.
func (s *Small) Between(lo, hi int) float64 {
	cy := s.r[packed(0, s.p):]
	var sum dd.DD
	for t := lo; t < hi; t++ {
		if s.Kept[t] {
			sum = sum.Add(cy[t].Sqr())
		}
	}
	return sum.Float64()
}

// Solve writes the coefficients, 0 for columns set aside.
func (s *Small) Solve(beta []float64) {
	cy := s.r[packed(0, s.p):]
	for k := s.p - 1; k >= 0; k-- {
		if !s.Kept[k] {
			s.solv[k] = dd.DD{}
			beta[k] = 0
			continue
		}
		x := cy[k]
		for j := k + 1; j < s.p; j++ {
			if s.Kept[j] {
				x = x.Sub(s.r[packed(k, j)].Mul(s.solv[j]))
			}
		}
		s.solv[k] = x.Mul(s.inv[k])
		beta[k] = s.solv[k].Float64()
	}
}

// Diagonal writes the diagonal of (XᵀX)⁻¹, NaN for columns set aside: the squared
// norms of the rows of R⁻¹.
func (s *Small) Diagonal(d []float64) {
	for k := range s.p {
		if !s.Kept[k] {
			d[k] = math.NaN()
			continue
		}
		// Row k of R⁻¹ is the solution v of vᵀR = e_kᵀ.
		v := s.solv
		v[k] = s.inv[k]
		sum := v[k].Hi * v[k].Hi
		for j := k + 1; j < s.p; j++ {
			if !s.Kept[j] {
				continue
			}
			var x dd.DD
			for t := k; t < j; t++ {
				if s.Kept[t] {
					x = x.Sub(v[t].Mul(s.r[packed(t, j)]))
				}
			}
			v[j] = x.Mul(s.inv[j])
			sum += v[j].Hi * v[j].Hi
		}
		d[k] = sum
	}
}

// Spread returns the sum of the columns' squared norms times zero: NaN where the
// cross-products are not finite.
func (s *Small) Spread() float64 {
	t := 0.0
	for i := range s.r {
		t += s.r[i].Hi * 0
	}
	return t
}
