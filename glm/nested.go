package glm

import (
	"fmt"
	"math"
	"slices"

	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// nested shows that view s lies inside view b, or says which column, equation
// or offset does not.
func (j *joint) nested(s, b *view) (string, error) {
	how := "every term of the restricted space is a term of the full space"
	for i, g := range s.groups {
		if contains(b.groups, g) {
			continue
		}
		if len(b.m.eqs) > 0 {
			return "", fmt.Errorf("%w: term %q is not in the restricted full space", lrt.ErrNotNested, s.m.cols[i].name)
		}
		how = "every column of the restricted space is a combination of columns of the full space"
		if j.coarser(g, b.groups) {
			continue
		}
		f := j.factorOf(b)
		for c, name := range s.m.cols[i].Names {
			if r := f.Outside(g, c); r > 10*j.tol {
				return "", fmt.Errorf("%w: column %q leaves %.3g of its length outside", lrt.ErrNotNested, name, r)
			}
		}
	}
	if err := j.impliedEquations(s, b); err != nil {
		return "", err
	}
	return how, j.nestedOffsets(s, b)
}

// coarser reports whether the cells of a group are unions of the cells of one of
// others: the levels of a factor, of those of its products; the constant, of any.
func (j *joint) coarser(g int, others []int) bool {
	b := j.cols[g]
	if b.Key != "constant" && !b.partition {
		return false
	}
	for _, h := range others {
		c := j.cols[h]
		if !c.partition {
			continue
		}
		all := true
		for _, f := range b.factors {
			all = all && slices.ContainsFunc(c.factors, func(l levelSet) bool { return l.field == f.field })
		}
		if all {
			return true
		}
	}
	return false
}

// impliedEquations checks that what restricts b also holds on s.
func (j *joint) impliedEquations(s, b *view) error {
	if len(b.m.eqs) == 0 {
		return nil
	}
	if err := j.solve(s); err != nil {
		return err
	}
	f := j.factorOf(s)
	for _, e := range b.m.eqs {
		c, value, err := j.functional(b.m, e)
		if err != nil {
			return err
		}
		// On s the columns it does not have carry coefficient zero.
		for i, g := range b.groups {
			if !contains(s.groups, g) {
				at := j.gram.Offset(g)
				for k := range b.m.cols[i].Names {
					c.Set(at+k, dd.DD{})
				}
			}
		}
		h, bad, _ := f.Half(c)
		if bad > estimable {
			return fmt.Errorf("%w: %s does not follow from the restricted space", lrt.ErrNotNested, equationText(e))
		}
		norm := h.Dot(h).Float64()
		left, implied, size := h, dd.DD{}, 0.0
		if s.restr != nil {
			left, implied = s.restr.reduce(h)
			size = s.restr.size(h)
		}
		if rest := left.Dot(left).Float64(); rest > 1e-18*norm && rest > 0 {
			return fmt.Errorf("%w: %s does not follow from the restricted space", lrt.ErrNotNested, equationText(e))
		}
		if d := math.Abs(implied.Sub(value).Float64()); d > 1e-9*(math.Abs(value.Float64())+size) {
			return fmt.Errorf("%w: %s has another value in the restricted space", lrt.ErrNotNested, equationText(e))
		}
	}
	return nil
}

// nestedOffsets checks that the difference of two offsets is a combination of columns of b.
func (j *joint) nestedOffsets(s, b *view) error {
	if s.rhs == b.rhs {
		return nil
	}
	f := j.factorOf(b)
	part := func(r func(i, k int) dd.DD) float64 {
		var x dd.DD
		if s.rhs > 0 {
			x = x.Add(r(s.rhs, s.rhs))
		}
		if b.rhs > 0 {
			x = x.Add(r(b.rhs, b.rhs))
		}
		if s.rhs > 0 && b.rhs > 0 {
			x = x.Sub(r(s.rhs, b.rhs)).Sub(r(s.rhs, b.rhs))
		}
		return math.Max(x.Float64(), 0)
	}
	left, all := part(f.Residual), part(j.gram.RHS)
	if left > 100*j.tol*j.tol*all {
		return fmt.Errorf("%w: the offsets %q and %q differ by more than the full space holds (%.3g of the difference)",
			lrt.ErrNotNested, s.m.opt.Offset, b.m.opt.Offset, math.Sqrt(left/all))
	}
	return nil
}

// estimable is the relative violation that a function of the fitted values may show by rounding.
const estimable = 1e-9

// restrict finds the independent ones among the equations of a view and what
// they say on the basis of the joint.
func (j *joint) restrict(v *view, f *linalg.Factor) (*restricted, error) {
	r := &restricted{}
	for _, e := range v.m.eqs {
		c, value, err := j.functional(v.m, e)
		if err != nil {
			return nil, err
		}
		h, bad, worst := f.Half(c)
		if bad > estimable {
			return nil, fmt.Errorf("glm: %w: %s involves %s", ErrNotEstimable, equationText(e), j.columnName(worst))
		}
		norm := h.Dot(h)
		left, implied := r.reduce(h)
		rest := left.Dot(left)
		if rest.Float64() <= 1e-20*norm.Float64() || norm.Float64() == 0 {
			if d := math.Abs(implied.Sub(value).Float64()); d > 1e-9*(math.Abs(value.Float64())+r.size(h)) {
				return nil, fmt.Errorf("glm: %w: %s cannot hold together with the others", ErrContradiction, equationText(e))
			}
			continue // follows from the others
		}
		// Orthonormal halfs: Gram and Schmidt, twice is enough.
		left2, _ := r.reduce(left)
		scale := dd.From(1).Div(left2.Dot(left2).Sqrt())
		r.eqs = append(r.eqs, e)
		r.halfs = append(r.halfs, left2.Scale(scale))
		r.value = append(r.value, value.Sub(implied).Mul(scale))
	}
	return r, nil
}

// reduce returns what is left of a function when those of r are taken off it,
// and the value that r implies for the part taken off.
func (r *restricted) reduce(h linalg.Half) (linalg.Half, dd.DD) {
	var implied dd.DD
	for i, u := range r.halfs {
		a := u.Dot(h)
		implied = implied.Add(a.Mul(r.value[i]))
		h = h.Sub(u.Scale(a))
	}
	return h, implied
}

// size returns the sum of the absolute terms of the value that r implies for a function.
func (r *restricted) size(h linalg.Half) float64 {
	s := 0.0
	for i, u := range r.halfs {
		s += math.Abs(u.Dot(h).Mul(r.value[i]).Float64())
	}
	return s
}

// apply moves coordinates onto the restricted space and returns the sum of squares that costs.
func (r *restricted) apply(h linalg.Half) (linalg.Half, dd.DD) {
	var cost dd.DD
	for i, u := range r.halfs {
		d := u.Dot(h).Sub(r.value[i])
		cost = cost.Add(d.Sqr())
		h = h.Sub(u.Scale(d))
	}
	return h, cost
}

// columnName names the column at a place of a Vec.
func (j *joint) columnName(at int) string {
	for g, b := range j.cols {
		if o := j.gram.Offset(g); at >= o && at < o+len(b.Names) {
			hint := ""
			if b.Key != "constant" && b.structural(at-o) {
				hint = "; state differences between levels"
			}
			return fmt.Sprintf("%q, which other columns span or no row has%s", b.Names[at-o], hint)
		}
	}
	return "a column that is not in the model"
}
