package dist

import (
	"math"

	"subsume.example/internal/special"
)

// threeValues integrates over one of three values; given it, the other two are
// bivariate normal, a product. The integral is a composite sixteen-point
// Gauss-Legendre rule on panels no wider than what the sharpest conditional law needs.
type threeValues struct {
	lower, upper [3]float64 // in the order first, others
	r1, r2       float64    // correlations of the others with the first
	s1, s2       float64    // their conditional standard deviations
	partial      float64
}

// newThreeValues puts first the value whose removal leaves the others with the
// mildest conditional laws; nil when the matrix is too close to singular.
func newThreeValues(r Rectangle) *threeValues {
	best, found := 0.0, (*threeValues)(nil)
	for f := range 3 {
		a, b := (f+1)%3, (f+2)%3
		r1, r2 := r.Correlation.At(f, a), r.Correlation.At(f, b)
		t := threeValues{
			lower: [3]float64{r.Lower[f], r.Lower[a], r.Lower[b]}, upper: [3]float64{r.Upper[f], r.Upper[a], r.Upper[b]},
			r1: r1, r2: r2, s1: math.Sqrt((1 - r1) * (1 + r1)), s2: math.Sqrt((1 - r2) * (1 + r2)),
		}
		t.partial = (r.Correlation.At(a, b) - r1*r2) / (t.s1 * t.s2)
		mild := math.Min(math.Min(t.s1, t.s2), 1-math.Abs(t.partial))
		if mild > 1e-3 && mild > best {
			best, found = mild, &t
		}
	}
	return found
}

// gaussSixteen is the positive half of the sixteen-point Gauss-Legendre rule.
var (
	gaussSixteenX = [8]float64{0.09501250983763744, 0.2816035507792589, 0.45801677765722739, 0.61787624440264375,
		0.755404408355003, 0.86563120238783174, 0.94457502307323258, 0.98940093499164993}
	gaussSixteenW = [8]float64{0.1894506104550685, 0.18260341504492359, 0.16915651939500254, 0.14959598881657673,
		0.12462897125553387, 0.095158511682492785, 0.062253523938647893, 0.027152459411754095}
)

func (t *threeValues) tails(w float64) (in, out tail) {
	lo, hi := scaled(t.lower[0], w), scaled(t.upper[0], w)
	sin, sout := scaledSum{ref: math.Inf(-1)}, scaledSum{ref: math.Inf(-1)}
	if !math.IsInf(hi, 1) {
		sout.add(0, special.NormalLogUpper(hi), 1)
	}
	if !math.IsInf(lo, -1) {
		sout.add(0, special.NormalLogLower(lo), 1)
	}
	lo, hi = math.Max(lo, -39), math.Min(hi, 39)
	if !(hi > lo) {
		return tail{}, tail{1, 0}
	}
	panels := int(math.Ceil((hi - lo) / math.Min(1.5, 3*math.Min(t.s1, t.s2))))
	half := 0.5 * (hi - lo) / float64(panels)
	// From the panel nearest to 0 outwards, as far as the normal density counts.
	first := int(math.Max(0, math.Min(float64(panels-1), math.Floor(-lo/(2*half)))))
	for dir := 1; dir >= -1; dir -= 2 {
		for p := first + min(dir, 0); p >= 0 && p < panels; p += dir {
			middle := lo + half*(2*float64(p)+1)
			near := math.Max(0, math.Abs(middle)-half)
			if -0.5*near*near < math.Min(sin.ref, sout.ref)-45 {
				break
			}
			t.panel(w, middle, half, &sin, &sout)
		}
	}
	if sin.total() > 0 {
		in = tail{sin.total(), sin.ref}
	}
	if sout.total() > 0 {
		out = tail{sout.total(), sout.ref}
	}
	return in, out
}

// panel adds one panel to the sums of the inside and the outside.
func (t *threeValues) panel(w, middle, half float64, sin, sout *scaledSum) {
	l := math.Sqrt(math.Abs(t.partial))
	k := math.Copysign(l, t.partial)
	var groups [2]productGroup
	for i := range 16 {
		x, weight := gaussSixteenX[i/2], gaussSixteenW[i/2]
		if i&1 == 1 {
			x = -x
		}
		z := middle + half*x
		groups[0] = newProductGroup(l, (scaled(t.lower[1], w)-t.r1*z)/t.s1, (scaled(t.upper[1], w)-t.r1*z)/t.s1, 1)
		groups[1] = newProductGroup(k, (scaled(t.lower[2], w)-t.r2*z)/t.s2, (scaled(t.upper[2], w)-t.r2*z)/t.s2, 1)
		u := unitRectangle{product: newProduct(groups[:])}
		a, b := u.tails(1)
		e := special.NormalLogDensity(z) + math.Log(weight*half)
		if a.mant > 0 {
			sin.add(0, e+a.logValue(), 1)
		}
		if b.mant > 0 {
			sout.add(0, e+b.logValue(), 1)
		}
	}
}
