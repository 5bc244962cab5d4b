package dist

import (
	"math"
	"slices"

	"subsume.example/internal/special"
)

// planeRegion is a rectangle whose values depend on two normal coordinates only: a convex
// polygon, such as all three differences of three means. Given the first coordinate y, the second lies
// between the highest of the lower lines and the lowest of the upper ones, so the
// probability is one integral, smooth between the corners of the polygon:
// composite sixteen-point Gauss-Legendre from corner to corner.
type planeRegion struct {
	upper, lower []line    // limits of the second coordinate, at w = 1
	corners      []float64 // first coordinates of the corners, ends included, ascending
	width        float64   // widest panel
}

type line struct{ at, slope float64 } // at + slope*y

// maxPlaneRows keeps the search for corners short.
const maxPlaneRows = 64

// newPlaneRegion takes a form with one or two coordinates; nil when there are
// too many rows or too sharp ones.
func newPlaneRegion(f *latticeForm) *planeRegion {
	n := 0
	for _, c := range f.columns {
		n += len(c)
	}
	if len(f.columns) > 2 || n > maxPlaneRows {
		return nil
	}
	p := &planeRegion{width: 1.2}
	left, right := math.Inf(-1), math.Inf(1)
	for k, rows := range f.columns {
		for _, r := range rows {
			lo, hi := r.lower/r.pivot, r.upper/r.pivot
			if r.pivot < 0 {
				lo, hi = hi, lo
			}
			if k == 0 {
				left, right = math.Max(left, lo), math.Min(right, hi)
				continue
			}
			slope := -r.coef[0] / r.pivot
			if !math.IsInf(hi, 1) {
				p.upper = append(p.upper, line{hi, slope})
			}
			if !math.IsInf(lo, -1) {
				p.lower = append(p.lower, line{lo, slope})
			}
			p.width = math.Min(p.width, 1.5*math.Abs(r.pivot))
		}
	}
	if p.width < 0.01 {
		return nil
	}
	// Corners: crossings of lines that bound the region there.
	all := slices.Concat(p.upper, p.lower)
	for i, a := range all {
		for _, b := range all[:i] {
			y := (b.at - a.at) / (a.slope - b.slope)
			if math.IsNaN(y) || math.IsInf(y, 0) {
				continue
			}
			low, high := p.between(1, y)
			v := a.at + a.slope*y
			tol := 1e-9 * (1 + math.Abs(v) + math.Abs(y))
			if v > high+tol || v < low-tol {
				continue
			}
			if low > high-tol && (a.slope != b.slope) { // an end of the polygon
				d := 1e-6 * (1 + math.Abs(y))
				l1, h1 := p.between(1, y-d)
				l2, h2 := p.between(1, y+d)
				if l1 > h1 && l2 <= h2 {
					left = math.Max(left, y)
				}
				if l2 > h2 && l1 <= h1 {
					right = math.Min(right, y)
				}
			}
			p.corners = append(p.corners, y)
		}
	}
	corners := p.corners[:0]
	for _, y := range p.corners {
		if y > left && y < right {
			corners = append(corners, y)
		}
	}
	slices.Sort(corners)
	p.corners = append(append([]float64{left}, slices.Compact(corners)...), right)
	return p
}

// between returns the limits of the second coordinate at y, scaled by w.
func (p *planeRegion) between(w, y float64) (low, high float64) {
	low, high = math.Inf(-1), math.Inf(1)
	for _, l := range p.upper {
		high = math.Min(high, l.at*w+l.slope*y)
	}
	for _, l := range p.lower {
		low = math.Max(low, l.at*w+l.slope*y)
	}
	return low, high
}

func (p *planeRegion) tails(w float64) (in, out tail) {
	left, right := scaled(p.corners[0], w), scaled(p.corners[len(p.corners)-1], w)
	if !(left < right) {
		return tail{}, tail{1, 0}
	}
	sin, sout := scaledSum{ref: math.Inf(-1)}, scaledSum{ref: math.Inf(-1)}
	if !math.IsInf(right, 1) {
		sout.add(0, special.NormalLogUpper(right), 1)
	}
	if !math.IsInf(left, -1) {
		sout.add(0, special.NormalLogLower(left), 1)
	}
	// Segments from the one nearest to 0 outwards.
	first := 1
	for first < len(p.corners)-1 && scaled(p.corners[first], w) < 0 {
		first++
	}
	for i := first; i < len(p.corners); i++ {
		p.segment(w, scaled(p.corners[i-1], w), scaled(p.corners[i], w), &sin, &sout)
	}
	for i := first - 1; i > 0; i-- {
		p.segment(w, scaled(p.corners[i-1], w), scaled(p.corners[i], w), &sin, &sout)
	}
	if sin.total() > 0 {
		in = tail{sin.total(), sin.ref}
	}
	if sout.total() > 0 {
		out = tail{sout.total(), sout.ref}
	}
	return in, out
}

// segment adds the panels from a to b, the one nearest to 0 first, as far as the
// normal density counts.
func (p *planeRegion) segment(w, a, b float64, sin, sout *scaledSum) {
	a, b = math.Max(a, -39), math.Min(b, 39)
	if !(b > a) {
		return
	}
	n := int(math.Ceil((b - a) / p.width))
	half := 0.5 * (b - a) / float64(n)
	first := int(math.Max(0, math.Min(float64(n-1), math.Floor(-a/(2*half)))))
	for dir := 1; dir >= -1; dir -= 2 {
		for i := first + min(dir, 0); i >= 0 && i < n; i += dir {
			middle := a + half*(2*float64(i)+1)
			near := math.Max(0, math.Abs(middle)-half)
			if -0.5*near*near < math.Min(sin.ref, sout.ref)-45 {
				break
			}
			for k := range 16 {
				x := gaussSixteenX[k/2]
				if k&1 == 1 {
					x = -x
				}
				y := middle + half*x
				low, high := p.between(w, y)
				e := special.NormalLogDensity(y)
				c := gaussSixteenW[k/2] * half
				if low < high {
					sin.add(0, e+logInterval(low, high), c)
					sout.add(0, e+logOutside(low, high), c)
				} else {
					sout.add(0, e, c)
				}
			}
		}
	}
}

// logInterval is log P(a < Z <= b), logOutside that of its complement.
func logInterval(a, b float64) float64 {
	switch {
	case !(b > a):
		return math.Inf(-1)
	case b-a < 1: // narrow: by its middle, without cancellation
		return special.NormalAround(a+0.5*(b-a), 0.5*(b-a))
	case a >= 0:
		l := special.NormalLogUpper(a)
		return l + math.Log1p(-math.Exp(special.NormalLogUpper(b)-l))
	case b <= 0:
		l := special.NormalLogLower(b)
		return l + math.Log1p(-math.Exp(special.NormalLogLower(a)-l))
	}
	return math.Log1p(-(special.NormalUpper(b) + special.NormalLower(a)))
}

func logOutside(a, b float64) float64 {
	u, l := math.Inf(-1), math.Inf(-1)
	if !math.IsInf(b, 1) {
		u = special.NormalLogUpper(b)
	}
	if !math.IsInf(a, -1) {
		l = special.NormalLogLower(a)
	}
	if l > u {
		u, l = l, u
	}
	if math.IsInf(u, -1) {
		return u
	}
	return u + math.Log1p(math.Exp(l-u))
}
