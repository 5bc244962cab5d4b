package glm

import (
	"math"

	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// byCoordinates computes the identities of a random term.
func (k *certificate) byCoordinates(r lrt.RandomTerm, z *view, known bool) error {
	if err := k.numerator(); err != nil || !k.out.Exact {
		return err
	}
	zs, length := k.columns(z)
	cn, rn := k.qn.Spread(zs)
	k.out.C = append(k.out.C, cn*length)
	if known {
		k.check(r.Name, "Pn K Pn = 0", cn+rn)
		return nil
	}
	if k.check(r.Name, "Pn K Pn = c Pn", rn); !k.out.Exact {
		return nil
	}
	if err := k.denominator(); err != nil || !k.out.Exact {
		return err
	}
	cd, rd := k.qd.Spread(zs)
	if k.whole {
		cd = 0 // K is nil beyond the joint factor, so that c is 0 throughout
		rd = k.qd.Size(zs)
	}
	k.check(r.Name, "Pd K Pd = c Pd", rd)
	if k.qd.Dim() > 0 || k.whole {
		k.check(r.Name, "one constant c for numerator and error", math.Abs(cn-cd))
	}
	k.check(r.Name, "Pn K Pd = 0", k.qn.Cross(k.qd, zs))
	return nil
}

// numerator makes Pn as an orthonormal basis; it refuses where there are too many columns.
func (k *certificate) numerator() (err error) {
	if k.qn == nil && k.coordinates() {
		k.qn, err = k.between(k.s, k.b)
	}
	return err
}

// denominator makes Pd likewise.
func (k *certificate) denominator() (err error) {
	if k.qd == nil && k.coordinates() {
		k.whole = k.e1 == nil && int(k.j.n) > k.j.factor.Rank
		k.qd, err = k.between(k.e0, k.e1)
	}
	return err
}

func (k *certificate) coordinates() bool {
	if k.co == nil {
		co, ok := k.j.factor.Coordinate()
		if !ok {
			k.refuse("design", "too many columns to check the identities", 0)
			return false
		}
		k.co = co
	}
	return true
}

// between returns a basis of what larger adds to smaller; nil is all rows.
func (k *certificate) between(smaller, larger *view) (*linalg.Subspace, error) {
	s, err := k.j.subspace(k.co, smaller)
	if err != nil {
		return nil, err
	}
	l := k.co.Whole()
	if larger != nil {
		if l, err = k.j.subspace(k.co, larger); err != nil {
			return nil, err
		}
	}
	return l.Minus(s), nil
}

// columns returns the columns of a random term in coordinates, as asked for up to
// the constant, which no pair sees, divided by the length of the longest, whose
// square is returned.
func (k *certificate) columns(z *view) (zs [][]float64, length float64) {
	for i, g := range z.groups {
		b := z.m.cols[i]
		zs = append(zs, k.j.askedColumns(k.co, g, b)...)
	}
	length = largest(zs)
	if length == 0 {
		return nil, 0
	}
	m := math.Sqrt(length)
	for _, z := range zs {
		for t := range z {
			z[t] /= m
		}
	}
	return zs, length
}

// largest returns the largest squared length.
func largest(zs [][]float64) float64 {
	m := 0.0
	for _, z := range zs {
		s := 0.0
		for _, x := range z {
			s += x * x
		}
		m = math.Max(m, s)
	}
	return m
}

// askedColumns undoes the scale of dense columns and the basis of powers.
func (j *joint) askedColumns(co *linalg.Coordinates, g int, b *bound) [][]float64 {
	zs := co.Columns(g)
	if !b.dense() {
		if e := j.scales[g]; e != 0 {
			for _, z := range zs {
				rescale(z, -e)
			}
		}
		return zs
	}
	if p := j.basis.powers[g]; p != nil {
		// x = centre + 2^exp u.
		out := make([][]float64, len(zs))
		row := []float64{1}
		for k := range zs {
			next := make([]float64, len(row)+1)
			for i, a := range row {
				next[i] += a * p.centre
				next[i+1] += a * math.Ldexp(1, p.exp)
			}
			row = next
			out[k] = make([]float64, len(zs[k]))
			for i, a := range row[1:] {
				for t, x := range zs[i] {
					out[k][t] += a * x
				}
			}
		}
		return out
	}
	d := j.denseColumn(g)
	for c, z := range zs {
		for t := range z {
			z[t] = math.Ldexp(z[t], j.exp[d+c])
		}
	}
	return zs
}

// subspace returns a view as an orthonormal basis in the coordinates of the joint factor.
func (j *joint) subspace(co *linalg.Coordinates, v *view) (*linalg.Subspace, error) {
	u := co.Span(v.groups, j.tol)
	if len(v.m.eqs) == 0 {
		return u, nil
	}
	if err := j.solve(v); err != nil {
		return nil, err
	}
	f := j.factorOf(v)
	for _, h := range v.restr.halfs {
		u = u.Without(co.Of(f.Back(h)))
	}
	return u, nil
}
