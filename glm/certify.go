package glm

import (
	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// certify decides whether the F of a comparison has exactly the F law under the
// null, for every value of the variances left free. With Pn = P_B − P_S, Pd =
// P_E1 − P_E0, the fixed space M1, its part M0 under the null, and K_j = Z_j Z_jᵀ
// of the independent errors (K_0 = I) and each random term, F is exact if
//
//	Pn M0 = 0, Pd M1 = 0, Pn K_j Pn = c_j Pn, Pd K_j Pd = c_j Pd, Pn K_j Pd = 0
//
// with one constant c_j for each j.
func (j *joint) certify(c lrt.Comparison, s, b *view) (*lrt.Certificate, error) {
	cert := &lrt.Certificate{Exact: true, Tol: 1e-8}
	for _, v := range []*view{s, b} {
		for _, col := range v.m.cols {
			if col.FromResponse {
				return refuse(cert, col.name, "the column is made from the response", 0), nil
			}
		}
	}
	if c.Effects == nil && (c.Error == nil || j.within(b, c.Error.Smaller.(*Model))) {
		return cert, nil // Pd is orthogonal to E0, which holds B and is the fixed space
	}
	return j.certifyNumerically(cert, c, s, b)
}

// refuse records which identity a term breaks.
func refuse(c *lrt.Certificate, term, identity string, residual float64) *lrt.Certificate {
	c.Exact, c.Term, c.Identity, c.Residual = false, term, identity, max(c.Residual, residual)
	return c
}

// within reports whether every term of v is one of m, and m is not restricted.
func (j *joint) within(v *view, m *Model) bool {
	if len(m.eqs) > 0 {
		return false
	}
	for _, b := range v.m.cols {
		if m.find(b) < 0 {
			return false
		}
	}
	return true
}

func (j *joint) certifyNumerically(cert *lrt.Certificate, c lrt.Comparison, s, b *view) (*lrt.Certificate, error) {
	co, ok := j.factor.Coordinate()
	if !ok {
		cert.Exact, cert.Term, cert.Identity = false, "design", "too many columns to check the identities"
		return cert, nil
	}
	space := func(m lrt.Space) (*linalg.Subspace, error) {
		v, err := j.space(m.(*Model))
		if err != nil {
			return nil, err
		}
		return j.subspace(co, v)
	}
	ps, err := j.subspace(co, s)
	if err != nil {
		return nil, err
	}
	pb, err := j.subspace(co, b)
	if err != nil {
		return nil, err
	}
	e0 := pb
	var e1 *linalg.Subspace // nil: all rows
	if c.Error != nil {
		if e0, err = space(c.Error.Smaller); err != nil {
			return nil, err
		}
		if c.Error.Larger != nil {
			if e1, err = space(c.Error.Larger); err != nil {
				return nil, err
			}
		}
	}
	qn := pb.Minus(ps)
	var qd *linalg.Subspace
	all := e1 == nil
	if all {
		qd = co.Whole().Minus(e0)
	} else {
		qd = e1.Minus(e0)
	}
	check := func(term, identity string, residual float64) bool {
		cert.Residual = max(cert.Residual, residual)
		if residual > cert.Tol && cert.Exact {
			refuse(cert, term, identity, residual)
		}
		return cert.Exact
	}
	check("numerator", "Pn Pd = 0", qn.Overlap(qd))
	ef := c.Effects
	if ef == nil {
		return cert, nil
	}
	m1 := e0
	if ef.Fixed != nil {
		if m1, err = space(ef.Fixed); err != nil {
			return nil, err
		}
	}
	check("error", "Pd M1 = 0", qd.Overlap(m1))
	if ef.NullFixed != nil {
		m0, err := space(ef.NullFixed)
		if err != nil {
			return nil, err
		}
		check("numerator", "Pn M0 = 0", qn.Overlap(m0))
	}
	cert.C = []float64{1}
	// Rows beyond the joint factor belong to Pd when the error is all rows.
	beyond := all && int(j.n) > j.factor.Rank
	for _, r := range ef.Random {
		m, ok := r.Space.(*Model)
		if !ok {
			return nil, notLinear(r.Space)
		}
		gs, err := j.groups(m)
		if err != nil {
			return nil, err
		}
		cn, rn := qn.Spread(co, gs)
		cd, rd := qd.Spread(co, gs)
		if beyond {
			cd = 0 // K is nil there, so that c must be 0 throughout
			rd = qd.Size(co, gs)
		}
		scale := co.Scale(gs)
		if scale == 0 {
			continue
		}
		cert.C = append(cert.C, cn)
		check(r.Name, "Pn K Pn = c Pn", rn/scale)
		check(r.Name, "Pd K Pd = c Pd", rd/scale)
		if qd.Dim() > 0 || beyond {
			d := cn - cd
			if d < 0 {
				d = -d
			}
			check(r.Name, "one constant c for numerator and error", d/scale)
		}
		check(r.Name, "Pn K Pd = 0", qn.Cross(qd, co, gs)/scale)
	}
	return cert, nil
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
