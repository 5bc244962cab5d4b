package glm

import (
	"fmt"
	"math"

	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// The certificate. With Pn = P_B − P_S, Pd = P_E1 − P_E0, the fixed space M1, its
// part M0 under the null, and K_j = Z_j Z_jᵀ of the independent errors (K_0 = I)
// and of each random term, all of rows times root weights, the F of a
// comparison has exactly the F law under the null, for every value of the
// variances left free, if
//
//	Pn M0 = 0, Pd M1 = 0, Pn K_j Pn = c_j Pn, Pd K_j Pd = c_j Pd, Pn K_j Pd = 0
//
// with one constant c_j for each j (numerator and denominator are then independent
// multiples of χ² with one common factor). Most designs are decided by nesting: a
// random term inside S lies off Pn; one whose columns have one length and
// hold B has Pn K Pn = length² Pn. The rest are decided in coordinates of the
// joint factor, which must not be too many.

const certTol = 1e-8

// certificate is one decision in the making.
type certificate struct {
	j            *joint
	c            lrt.Comparison
	s, b, e0, e1 *view // e1 nil: all rows
	out          *lrt.Certificate

	co     *linalg.Coordinates // made when asked for
	qn, qd *linalg.Subspace
	whole  bool // qd is the part of all rows inside the joint factor, which does not hold them all
}

// certify decides whether the F of a comparison is exact under its null.
func (j *joint) certify(c lrt.Comparison, s, b, e0, e1 *view) (*lrt.Certificate, error) {
	k := &certificate{j: j, c: c, s: s, b: b, e0: e0, e1: e1,
		out: &lrt.Certificate{Exact: true, Tol: certTol, C: []float64{1}}}
	return k.out, k.decide()
}

// refuse records which identity a term breaks.
func (k *certificate) refuse(term, identity string, residual float64) {
	c := k.out
	c.Exact, c.Term, c.Identity, c.Residual = false, term, identity, math.Max(c.Residual, residual)
}

// check refuses where a residual is above the tolerance.
func (k *certificate) check(term, identity string, residual float64) {
	k.out.Residual = math.Max(k.out.Residual, residual)
	if !(residual <= certTol) && k.out.Exact {
		k.refuse(term, identity, residual)
	}
}

func (k *certificate) decide() error {
	for _, v := range []*view{k.s, k.b, k.e0, k.e1} {
		if v == nil {
			continue
		}
		for _, col := range v.m.cols {
			if col.FromResponse {
				k.refuse(col.name, "the column is made from the response", 0)
				return nil
			}
		}
	}
	known := k.j.opt.KnownVariance > 0 // no denominator
	if !known && !k.inside(k.b, k.e0) {
		if err := k.sameOrigin(); err != nil || !k.out.Exact {
			return err
		}
		for _, make := range []func() error{k.numerator, k.denominator} {
			if err := make(); err != nil || !k.out.Exact {
				return err
			}
		}
		k.check("numerator", "Pn Pd = 0", k.qn.Overlap(k.qd))
	}
	ef := k.c.Effects
	if ef == nil || !k.out.Exact {
		return nil
	}
	if ef.Fixed != nil && !known {
		if err := k.apart(ef.Fixed, k.e0, k.e1, "error", "Pd M1 = 0"); err != nil {
			return err
		}
	}
	if ef.NullFixed != nil && k.out.Exact {
		if err := k.apart(ef.NullFixed, k.s, k.b, "numerator", "Pn M0 = 0"); err != nil {
			return err
		}
	}
	for _, r := range ef.Random {
		if !k.out.Exact {
			return nil
		}
		if err := k.random(r, known); err != nil {
			return err
		}
	}
	return nil
}

// inside reports whether a lies inside b, origins included.
func (k *certificate) inside(a, b *view) bool {
	if a == b {
		return true
	}
	_, err := k.j.nested(a, b)
	return err == nil
}

// linear is a view without its origin: fixed spaces and random terms have none.
func linear(v, like *view) *view {
	w := *v
	w.rhs = like.rhs
	return &w
}

// sameOrigin refuses an error pair whose spaces do not share the origin of S, and
// do not hold B: what the offset or the value puts into Pd would be no error.
func (k *certificate) sameOrigin() error {
	for _, v := range []*view{k.e0, k.e1} {
		if v == nil {
			continue
		}
		moved := v.rhs != k.s.rhs
		for _, e := range v.m.eqs {
			moved = moved || e.Value != 0
		}
		if moved {
			k.refuse("error", "one origin for all spaces", 0)
		}
	}
	return nil
}

// apart checks that a fixed space has no part in larger off smaller.
func (k *certificate) apart(space lrt.Space, smaller, larger *view, term, identity string) error {
	m, ok := space.(*Model)
	if !ok {
		return notLinear(space)
	}
	v, err := k.j.space(m)
	if err != nil {
		return err
	}
	switch {
	case k.inside(linear(v, smaller), smaller):
		return nil
	case larger == nil && len(smaller.m.eqs) == 0:
		k.refuse(term, identity, k.outside(v, smaller))
		return nil
	case larger != nil && len(smaller.m.eqs)+len(larger.m.eqs)+len(m.eqs) == 0:
		// ‖P x‖² is the same for both spaces.
		f0, f1 := k.j.factorOf(smaller), k.j.factorOf(larger)
		worst := 0.0
		for i, g := range v.groups {
			for c := range v.m.cols[i].Names {
				in0, norm := f0.Inside(g, c)
				in1, _ := f1.Inside(g, c)
				if norm.Hi > 0 {
					worst = math.Max(worst, in1.Sub(in0).Hi/norm.Hi)
				}
			}
		}
		k.check(term, identity, math.Sqrt(worst))
		return nil
	}
	make := k.denominator
	if smaller == k.s {
		make = k.numerator
	}
	if err := make(); err != nil || !k.out.Exact {
		return err
	}
	q := k.qd
	if smaller == k.s {
		q = k.qn
	}
	u, err := k.j.subspace(k.co, v)
	if err != nil {
		return err
	}
	k.check(term, identity, q.Overlap(u))
	return nil
}

// outside returns the largest part of a column of v that a space leaves.
func (k *certificate) outside(v, space *view) float64 {
	f, worst := k.j.factorOf(space), 0.0
	for i, g := range v.groups {
		for c := range v.m.cols[i].Names {
			worst = math.Max(worst, f.Outside(g, c))
		}
	}
	return worst
}

// random checks the identities of one random term.
func (k *certificate) random(r lrt.RandomTerm, known bool) error {
	m, ok := r.Space.(*Model)
	if !ok {
		return notLinear(r.Space)
	}
	if len(m.eqs) > 0 {
		return fmt.Errorf("%w: random term %q is a restricted space", lrt.ErrInvalid, r.Name)
	}
	z, err := k.j.space(m)
	if err != nil {
		return err
	}
	if k.byNesting(r, z, known) {
		return nil
	}
	return k.byCoordinates(r, z, known)
}

// byNesting decides a random term whose space holds the pairs or is held by
// them; it reports false where that does not tell.
func (k *certificate) byNesting(r lrt.RandomTerm, z *view, known bool) bool {
	length, even := k.evenLength(z)
	constant := func(smaller, larger *view) (float64, bool) {
		switch {
		case k.inside(linear(z, smaller), smaller):
			return 0, true
		case larger != nil && even && len(larger.m.eqs) == 0 && k.inside(linear(larger, z), z):
			return length, true
		}
		return 0, false
	}
	cn, ok := constant(k.s, k.b)
	if !ok {
		return false
	}
	if known {
		k.out.C = append(k.out.C, cn)
		k.check(r.Name, "Pn K Pn = 0", cn)
		return true
	}
	cd, ok := constant(k.e0, k.e1)
	switch {
	case ok:
	case k.e1 == nil && len(k.e0.m.eqs) == 0 && int(k.j.n) > k.j.factor.Rank:
		// K is nil beyond the joint factor, so that c must be 0, and Z is not inside E0.
		k.out.C = append(k.out.C, cn)
		k.refuse(r.Name, "Pd K Pd = c Pd", k.outside(z, k.e0))
		return true
	default:
		return false
	}
	k.out.C = append(k.out.C, cn)
	if cn != cd {
		k.refuse(r.Name, "one constant c for numerator and error", 1)
	}
	return true
}

// evenLength returns the squared length that all columns of an index have in
// common: then ZZᵀ is that multiple of a projection.
func (k *certificate) evenLength(z *view) (float64, bool) {
	if len(z.groups) != 1 || z.m.cols[0].dense() {
		return 0, false
	}
	g, length := z.groups[0], 0.0
	for l := range z.m.cols[0].Names {
		switch d := k.j.gram.Length(g, l); {
		case d == 0:
		case length == 0:
			length = d
		case math.Abs(d-length) > 1e-12*length:
			return 0, false
		}
	}
	return length, length > 0
}
