package glm

import (
	"fmt"
	"math"
	"strings"

	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// Alias is a column that a fit set aside.
type Alias struct {
	Term, Column string
	// Remainder is the part of the column, relative to its norm, that earlier columns leave.
	Remainder float64
	// Empty: no row has the level or cell.
	Empty bool
	// Structural: the column of a reference level, set aside by design.
	Structural bool
}

// aliases lists the columns of the joint that a factor set aside, those of v only.
func (j *joint) aliases(v *view, f *linalg.Factor) []Alias {
	var as []Alias
	for _, a := range f.Aside {
		if !contains(v.groups, a.Group) {
			continue
		}
		b := j.cols[a.Group]
		empty := j.blank(a)
		as = append(as, Alias{Term: b.name, Column: b.Names[a.Column], Remainder: a.Ratio, Empty: empty,
			Structural: !empty && b.structural(a.Column)})
	}
	return as
}

// structural reports whether a column stands for a reference level.
func (b *bound) structural(column int) bool {
	if b.Key == "constant" {
		return true // a factor before it spans it
	}
	for i := len(b.factors) - 1; i >= 0; i-- {
		n := len(b.factors[i].levels)
		if column%n == n-1 {
			return true
		}
		column /= n
	}
	return false
}

// list names at most ten things.
func list(names []string) string {
	const most = 10
	if len(names) > most {
		return strings.Join(names[:most], ", ") + fmt.Sprintf(" and %d more", len(names)-most)
	}
	return strings.Join(names, ", ")
}

// warnings says what a reader of a fit of v should know. v's own factor is used
// where it has been made.
func (j *joint) warnings(v *view) []lrt.Warning {
	f := j.factor
	if v.factor != nil {
		f = v.factor
	}
	var ws []lrt.Warning
	var collinear, empty []string
	for _, a := range j.aliases(v, f) {
		switch {
		case a.Empty:
			empty = append(empty, a.Column)
		case !a.Structural:
			collinear = append(collinear, a.Column)
		}
	}
	if len(collinear) > 0 {
		ws = append(ws, lrt.Warning{Code: "collinear", Text: "earlier columns span, and so set aside: " + list(collinear)})
	}
	if len(empty) > 0 {
		ws = append(ws, lrt.Warning{Code: "empty", Text: "no row has: " + list(empty)})
	}
	if one := j.singles(v); len(one) > 0 {
		ws = append(ws, lrt.Warning{Code: "group-of-one", Text: "a single row has: " + list(one)})
	}
	if j.zero > 0 {
		ws = append(ws, lrt.Warning{Code: "zero-weight", Text: fmt.Sprintf("%d rows of weight 0 are not counted as observations", j.zero)})
	}
	rss := v.rss.Float64()
	switch ss := math.Ldexp(rss, 2*j.yExp()); {
	case rss <= j.nilBelow():
	case math.IsInf(ss, 1) || ss < 0x1p-1022:
		ws = append(ws, lrt.Warning{Code: "sum-of-squares-range", Text: fmt.Sprintf(
			"the residual sum of squares is outside the floating-point range; its logarithm is %.6f", math.Log(rss)+2*float64(j.yExp())*math.Ln2)})
	}
	if w, ok := j.doubtful(f); ok {
		ws = append(ws, w)
	}
	return ws
}

// singles names levels of factors, not cells of several, that a single row has.
func (j *joint) singles(v *view) []string {
	var names []string
	for _, g := range v.groups {
		b := j.cols[g]
		if !b.partition || len(b.factors) != 1 {
			continue
		}
		for i := range b.Names {
			if c := b.shown(i); j.gram.Count(g, c) == 1 {
				names = append(names, b.Names[c])
			}
		}
	}
	return names
}

// doubtful warns when a column was set aside although more than the tolerance is
// left of it, and when a rank-revealing factorization of R sees another rank.
func (j *joint) doubtful(f *linalg.Factor) (lrt.Warning, bool) {
	if f.LargestAside > j.tol {
		return lrt.Warning{Code: "rank-doubtful", Text: fmt.Sprintf(
			"a column of which %.3g is left was set aside (tolerance %.3g): rounding explains as much, since earlier columns are nearly collinear", f.LargestAside, j.tol)}, true
	}
	other, ok := f.PivotedRank(j.tol)
	if !ok || other == f.Rank {
		return lrt.Warning{}, false
	}
	return lrt.Warning{Code: "rank-doubtful", Text: fmt.Sprintf(
		"in the order of the terms the rank is %d (smallest pivot kept %.3g, largest set aside %.3g, tolerance %.3g), by largest remaining column it is %d",
		f.Rank, f.SmallestKept, f.LargestAside, j.tol, other)}, true
}

// outOfRange warns of coefficients that are not zero on the scale of the fit but leave
// the floating-point range on that of the data: T and P keep their digits.
func outOfRange(cs []Coefficient) (lrt.Warning, bool) {
	var names []string
	for _, c := range cs {
		if !c.Aliased && (math.IsInf(c.Estimate, 0) || math.IsInf(c.SE, 0) || c.SE < 0x1p-1022 && !math.IsInf(c.T, 0) && !math.IsNaN(c.T)) || math.IsNaN(c.Estimate) {
			names = append(names, c.Name)
		}
	}
	if len(names) == 0 {
		return lrt.Warning{}, false
	}
	return lrt.Warning{Code: "coefficient-range", Text: "estimates or standard errors are outside the floating-point range (their t is not): " + list(names)}, true
}
