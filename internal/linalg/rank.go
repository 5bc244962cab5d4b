package linalg

import "math"

// PivotedRank counts the rank of R by taking the largest remaining column
// first, on columns of norm one (Golub's column pivoting). It reports ok = false,
// at no cost, where the order of the columns cannot hide a deficiency: with k
// kept columns and smallest relative pivot ρ the smallest singular value is at
// least ρ/2^(k−1) of the largest norm (Higham 2002, section 8.3).
func (f *Factor) PivotedRank(tol float64) (rank int, ok bool) {
	k := len(f.piv)
	if k <= 1 || k > 400 || f.SmallestKept*math.Exp2(-float64(k)) > tol {
		return 0, false
	}
	a := make([][]float64, k) // columns
	for i, c := range f.piv {
		a[i] = make([]float64, k)
		s := 0.0
		for t := range i + 1 {
			a[i][t] = f.r[c].hi[t]
			s += a[i][t] * a[i][t]
		}
		// Norms are those of the full columns, the eliminated part included.
		n := math.Sqrt(math.Max(s, f.norm(c)))
		for t := range a[i] {
			a[i][t] /= n
		}
	}
	for rank = 0; rank < k; rank++ {
		best, at := -1.0, rank
		for i := rank; i < k; i++ {
			s := 0.0
			for t := rank; t < k; t++ {
				s += a[i][t] * a[i][t]
			}
			if s > best {
				best, at = s, i
			}
		}
		if math.Sqrt(best) <= tol {
			break
		}
		a[rank], a[at] = a[at], a[rank]
		reflect(a[rank:], rank)
	}
	return f.Rank - k + rank, true
}

// reflect applies the Householder reflection that clears the first column below
// row t to all columns.
func reflect(cols [][]float64, t int) {
	v := append([]float64(nil), cols[0][t:]...)
	s := 0.0
	for _, x := range v {
		s += x * x
	}
	norm := math.Sqrt(s)
	if norm == 0 {
		return
	}
	if v[0] > 0 {
		norm = -norm
	}
	v[0] -= norm
	d := 0.0
	for _, x := range v {
		d += x * x
	}
	for _, c := range cols {
		p := 0.0
		for i, x := range v {
			p += x * c[t+i]
		}
		p *= 2 / d
		for i, x := range v {
			c[t+i] -= p * x
		}
	}
}
