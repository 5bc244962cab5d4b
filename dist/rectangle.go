package dist

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// ErrTolerance is wrapped by the error of a simulation that used up its points
// before its error estimate met the target. The result that comes with it is valid.
var ErrTolerance = errors.New("dist: error estimate above the target")

// Rectangle is the event Lower[i] < Tᵢ <= Upper[i] for all i, with Tᵢ = Zᵢ/s: Z
// multivariate normal with mean 0, variances 1 and the given correlations, s
// independent with Nu degrees of freedom (Nu = +Inf: s = 1), so that T is multivariate t.
//
// Limits may be infinite; Lower[i] <= Upper[i]. The correlation matrix has unit
// diagonal and is positive semidefinite: it may be singular, as it is for all differences
// of means. Nu is a real number from 1e-3 to 1e12, or +Inf.
type Rectangle struct {
	Lower, Upper []float64
	Correlation  mat.Symmetric
	Nu           float64
}

// MaxRectangle is the largest number of values of a Rectangle, and maxFactors
// the largest rank of its correlation matrix.
const (
	MaxRectangle = 5000
	maxFactors   = 100
)

// RectangleMethod says how a rectangle's probability was found.
type RectangleMethod uint8

const (
	// RectangleProduct: correlations are products, as between comparisons
	// with one control, or there are one or two values. One integral over
	// the common normal inside one over log s, relative error 1e-10.
	RectangleProduct RectangleMethod = iota
	// RectangleThree: any three values, with one more integral, over the first of them.
	RectangleThree
	// RectanglePlane: correlations of rank one or two, such as the three
	// differences of three means. One integral across a polygon.
	RectanglePlane
	// RectangleLattice: randomized lattice rule with an error estimate.
	RectangleLattice
)

// String returns "product", "three", "plane" or "lattice".
func (m RectangleMethod) String() string {
	switch m {
	case RectangleProduct:
		return "product"
	case RectangleThree:
		return "three"
	case RectanglePlane:
		return "plane"
	case RectangleLattice:
		return "lattice"
	}
	return fmt.Sprintf("RectangleMethod(%d)", uint8(m))
}

// RectangleSettings hold the choices of a simulation; nil and zero fields mean
// the defaults.
type RectangleSettings struct {
	Seed      uint64  // shift i of the lattice is drawn from (Seed, i)
	Target    float64 // absolute error to reach; 0: 1e-6
	MaxPoints int     // evaluations to stay below; 0: 16,000,000
	Workers   int     // 0: one a processor; the result does not depend on it
	Simulate  bool    // use the lattice also where an exact method exists
}

// RectangleProbability is the answer for a Rectangle.
type RectangleProbability struct {
	// Inside is P(all inside) and Outside its complement. The exact methods
	// compute each directly, so both keep their relative accuracy when small.
	Inside, Outside float64
	// Error bounds the absolute error: for the lattice 3.25 standard errors over
	// its ten random shifts (99 % of the t law with 9 degrees of freedom), otherwise 1e-10 of
	// the smaller of the two.
	Error  float64
	Method RectangleMethod
	Points int // evaluations of the lattice, 0 for the exact methods
}

// Probability finds the probability of the rectangle. Product correlations,
// one or two values, any three values, and correlations of rank two are integrated deterministically,
// everything else by a randomized lattice rule (see the lattice source for the
// transformation). The same seed gives the same bits whatever the number of workers.
//
// Errors: *ParamError for limits or Nu, *MatrixError for the correlations,
// ErrTolerance when the error estimate stayed above the target (with a valid
// result), and the context's own error.
//
// Known fault: with a finite limit beyond about 1e150 and large Nu the result can be
// 0 both inside and outside; give such a limit as ±Inf.
func (r Rectangle) Probability(ctx context.Context, s *RectangleSettings) (RectangleProbability, error) {
	if err := r.Validate(); err != nil {
		return RectangleProbability{}, err
	}
	if s == nil {
		s = &RectangleSettings{}
	}
	if err := ctx.Err(); err != nil {
		return RectangleProbability{}, err
	}
	if !s.Simulate {
		if u := r.exact(); u != nil {
			return u.probability(r.Nu), nil
		}
	}
	f, err := r.latticeForm()
	if err != nil {
		return RectangleProbability{}, err
	}
	if len(f.columns) == 0 {
		return RectangleProbability{Inside: 1}, nil // no limits at all
	}
	if !s.Simulate {
		if p := newPlaneRegion(f); p != nil {
			u := unitRectangle{plane: p, values: len(r.Lower), largest: r.largest()}
			return u.probability(r.Nu), nil
		}
	}
	return r.lattice(ctx, f, s)
}

// largest returns the largest modulus of a finite limit.
func (r Rectangle) largest() float64 {
	m := 0.0
	for i := range r.Lower {
		for _, v := range [2]float64{r.Lower[i], r.Upper[i]} {
			if !math.IsInf(v, 0) {
				m = math.Max(m, math.Abs(v))
			}
		}
	}
	return m
}

// Validate returns an error that names the first limit, parameter or entry
// outside its range, nil when there is none. That the correlation matrix is positive
// semidefinite is found out by Probability.
func (r Rectangle) Validate() error {
	n := len(r.Lower)
	if n < 1 || n > MaxRectangle {
		return &ParamError{"Rectangle", "len(Lower)", float64(n), fmt.Sprintf("1 to %d", MaxRectangle)}
	}
	if len(r.Upper) != n {
		return &ParamError{"Rectangle", "len(Upper)", float64(len(r.Upper)), fmt.Sprintf("the length of Lower, %d", n)}
	}
	for i, l := range r.Lower {
		if math.IsNaN(l) {
			return &ParamError{"Rectangle", fmt.Sprintf("Lower[%d]", i), l, "a number"}
		}
		if u := r.Upper[i]; !(u >= l) {
			return &ParamError{"Rectangle", fmt.Sprintf("Upper[%d]", i), u, fmt.Sprintf("at least Lower[%d] = %v", i, l)}
		}
	}
	if err := studentizedNuError("Rectangle", r.Nu); err != nil {
		return err
	}
	return checkCorrelation("Rectangle", r.Correlation, n)
}

// checkCorrelation looks at everything but definiteness.
func checkCorrelation(name string, c mat.Symmetric, n int) error {
	if c == nil {
		return &ParamError{name, "Correlation", 0, "a matrix"}
	}
	if m := c.SymmetricDim(); m != n {
		return &ParamError{name, "the order of Correlation", float64(m), fmt.Sprintf("the number of values, %d", n)}
	}
	for i := range n {
		if d := c.At(i, i); !(math.Abs(d-1) <= 1e-8) {
			return &MatrixError{name, i, i, d, "1"}
		}
		for j := range i {
			if v := c.At(i, j); !(math.Abs(v) <= 1+1e-8) {
				return &MatrixError{name, i, j, v, "a correlation from -1 to 1"}
			}
		}
	}
	return nil
}

// productForm finds λ with c[i][j] = λᵢ λⱼ off the diagonal, nil when there is none.
func productForm(c mat.Symmetric) []float64 {
	n := c.SymmetricDim()
	l := make([]float64, n)
	if n == 1 {
		return l
	}
	// The largest correlation, and the value most correlated with that pair.
	a, b, k, top := 0, 1, -1, -1.0
	for i := range n {
		for j := range i {
			if v := math.Abs(c.At(i, j)); v > top {
				a, b, top = i, j, v
			}
		}
	}
	if top > 0 {
		best := 0.0
		for i := range n {
			if i != a && i != b {
				if v := math.Abs(c.At(i, a) * c.At(i, b)); v > best {
					k, best = i, v
				}
			}
		}
		la := math.Sqrt(top)
		if k >= 0 {
			la = math.Sqrt(math.Abs(c.At(a, b) / c.At(k, b) * c.At(a, k)))
		}
		l[a] = la
		for i := range n {
			if i != a {
				l[i] = c.At(i, a) / la
			}
		}
	}
	for i := range n {
		if !(math.Abs(l[i]) <= maxLambda) {
			return nil
		}
		for j := range i {
			if !(math.Abs(c.At(i, j)-l[i]*l[j]) <= 1e-14) {
				return nil
			}
		}
	}
	return l
}

// unitRectangle is a rectangle whose limits are scaled by w: a product, or
// three values of which the first is integrated over, or a polygon.
type unitRectangle struct {
	product product
	three   *threeValues
	plane   *planeRegion
	values  int
	largest float64 // the largest finite limit
}

// exact returns the deterministic form of the rectangle, nil when it has none.
func (r Rectangle) exact() *unitRectangle {
	n := len(r.Lower)
	u := &unitRectangle{values: n, largest: r.largest()}
	if l := productForm(r.Correlation); l != nil {
		groups := make([]productGroup, 0, n)
	next:
		for i := range n {
			for j := range groups {
				if g := &groups[j]; g.lambda == l[i] && g.lower == r.Lower[i] && g.upper == r.Upper[i] {
					g.count++
					continue next
				}
			}
			groups = append(groups, newProductGroup(l[i], r.Lower[i], r.Upper[i], 1))
		}
		u.product = newProduct(groups)
		return u
	}
	if n == 3 {
		if u.three = newThreeValues(r); u.three != nil {
			return u
		}
	}
	return nil
}

// tails returns P(all inside) and P(some outside) with all limits times w.
func (u *unitRectangle) tails(w float64) (in, out tail) {
	switch {
	case u.three != nil:
		return u.three.tails(w)
	case u.plane != nil:
		return u.plane.tails(w)
	}
	in, _ = u.product.inside(w, false)
	if out = (tail{1 - in.value(), 0}); out.mant < 0.1 {
		out, _ = u.product.outside(w, false)
	}
	return in, out
}

// probability integrates over v = log s on a lattice that covers all of the
// weight g(v), because a rectangle away from 0 is not monotone in s: nodes are left
// out only where g alone is negligible.
func (u *unitRectangle) probability(nu float64) RectangleProbability {
	p := RectangleProbability{Method: RectangleProduct}
	switch {
	case u.three != nil:
		p.Method = RectangleThree
	case u.plane != nil:
		p.Method = RectanglePlane
	}
	if math.IsInf(nu, 1) {
		in, out := u.tails(1)
		p.Inside, p.Outside = in.value(), out.value()
	} else {
		g := 0.72 / math.Sqrt(2*nu)
		b := math.Sqrt(2*math.Log(float64(u.values)+1)) + 0.5
		k := math.Min(0.12, 0.39/(b*b))
		h := 1 / math.Sqrt(1/(g*g)+1/(k*k))
		for range 4 {
			in, out := u.scaleSum(nu, h)
			c := h * math.Exp(logChiPeak(nu))
			p.Inside = c * in.total() * math.Exp(in.ref)
			p.Outside = c * out.total() * math.Exp(out.ref)
			if in.agree() && out.agree() {
				break
			}
			h *= 0.5
		}
	}
	if p.Inside > 0.9 {
		p.Inside = 1 - p.Outside
	} else if p.Outside > 0.9 {
		p.Outside = 1 - p.Inside
	}
	p.Error = 1e-10 * math.Min(p.Inside, p.Outside)
	return p
}

func (u *unitRectangle) scaleSum(nu, h float64) (in, out scaledSum) {
	sums := [2]scaledSum{{ref: math.Inf(-1)}, {ref: math.Inf(-1)}}
	for dir := 1; dir >= -1; dir -= 2 {
		for i, count := min(dir, 0), 0; count < 100000; i, count = i+dir, count+1 {
			v := h * float64(i)
			e := -nu * chiCurve(v)
			// A probability at known scale is at most 1, and one below e^-800 is 0.
			if count > 0 && e < math.Max(-800, math.Min(sums[0].ref, sums[1].ref))-45 {
				break
			}
			w := math.Exp(v)
			a, b := u.tails(w)
			flat := dir < 0 && w*math.Max(u.largest, 1) < 1e-13 && nu*w*w < 1e-17
			for k, t := range [2]tail{a, b} {
				if !(t.mant > 0) {
					continue
				}
				x := sums[k].add(i, e+t.logValue(), 1)
				if flat { // constant from here on: a geometric series
					r := math.Exp(-nu * h)
					f := x * r / -math.Expm1(-2*nu*h)
					sums[k].acc[1-i&1] += f
					sums[k].acc[i&1] += f * r
				}
			}
			if flat {
				break
			}
		}
	}
	return sums[0], sums[1]
}
