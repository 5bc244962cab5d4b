package dist

import "math"

// tinyTail, the smallest normal number, is where inversion turns from tails to their logarithms.
const tinyTail = 0x1p-1022

// invertible is what invertTail needs of a law.
type invertible interface {
	// tailAt returns, at a point x inside the support, the upper tail P(X > x) if
	// upper is set, else P(X <= x); its logarithm, which may be left 0 where
	// the tail is at least tinyTail; and the hazard density(x)/tail, which may be 0 or
	// +Inf where it cannot be told (bisection then takes over).
	tailAt(x float64, upper bool) (tail, logTail, hazard float64)
	// support returns the ends of the support: (0, +Inf), (0, 1) or (-Inf, +Inf).
	support() (lo, hi float64)
}

// invertTail returns the x where the chosen tail equals p: the inverse of the CDF for
// upper = false, of the survival function for upper = true. start is a guess
// (any value; outside the support or NaN means none). p outside [0, 1] gives
// NaN, p = 0 and 1 the ends of the support. It never fails: the work is bounded by about 130
// evaluations of tailAt, and takes 3 to 8 of them when the start is fair.
//
// The tail with the smaller target is inverted (for p > 1/2 the other one at 1-p,
// which is exact). Newton's iteration runs on the logarithm of the tail over log x
// (asinh x on the whole line), where the laws of this package are concave and
// close to straight far out, sped up by inverse Hermite interpolation between
// the last two points; a bracket is kept, and a step that leaves it, or
// two steps that fail to halve it, give way to bisection over the ordered
// floats, which ends after at most 64 steps whatever the law.
func invertTail[L invertible](law L, p float64, upper bool, start float64) float64 {
	lo, hi := law.support()
	switch {
	case !(p >= 0 && p <= 1):
		return math.NaN()
	case p == 0 && upper || p == 1 && !upper:
		return hi
	case p == 0 || p == 1:
		return lo
	}
	if p > 0.5 {
		p, upper = 1-p, !upper
	}
	logp := 0.0
	if p < tinyTail {
		logp = logOf(p)
	}
	positive := lo == 0
	a, b := orderOf(lo), orderOf(hi)
	x := start
	if !(x > lo && x < hi) {
		x = 1
		if !positive {
			x = 0
		} else if hi <= 1 {
			x = hi / 2
		}
	}
	slow := 0
	var lastR, lastStep, lastNewton float64 // lastStep is 0 after bisection
	best, bestR := x, math.Inf(1)
	for range 130 {
		tail, logTail, hazard := law.tailAt(x, upper)
		var r float64 // log(tail/p)
		if tail >= tinyTail && p >= tinyTail {
			if r = tail/p - 1; math.Abs(r) > 0.25 {
				r = math.Log(tail / p)
			} else {
				r = math.Log1p(r)
			}
		} else {
			if tail >= tinyTail {
				logTail = math.Log(tail)
			}
			if logp == 0 {
				logp = math.Log(p)
			}
			r = logTail - logp
		}
		if math.Abs(r) < bestR {
			best, bestR = x, math.Abs(r)
		}
		if r == 0 {
			return x
		}
		o := orderOf(x)
		width := uint64(b - a) // may exceed an int64
		if (r > 0) == upper {  // the root lies to the right
			a = o
		} else {
			b = o
		}
		if uint64(b-a) <= 1 {
			break
		}
		// Newton step in u = log x or asinh x.
		scale := math.Abs(x)
		if !positive {
			scale = math.Sqrt(1 + x*x)
			if scale > 1e150 {
				scale = math.Abs(x)
			}
		}
		slope := hazard * scale
		if !(slope > 0 && slope <= math.MaxFloat64) {
			slope = math.NaN() // bisect
		}
		step := r / slope
		if !upper {
			step = -step
		}
		newton := step
		// From the second point on: the cubic through both points and their slopes, u as a function of r.
		if math.Abs(r) < 0.5*math.Abs(lastR) && lastStep != 0 {
			d1, d0 := -newton/r, -lastNewton/lastR // du/dr
			dr := lastR - r
			m := -lastStep / dr
			c1 := (m - d1) / dr
			c2 := ((d0-m)/dr - c1) / dr
			s := newton + r*r*(c1-c2*lastR)
			if q := s / newton; q > 0.5 && q < 2 {
				step = s
			}
		}
		var next float64
		switch {
		case math.Abs(step) < 1e-9:
			next = x + step*scale
		case positive:
			next = x * math.Exp(step)
		default:
			next = x*math.Cosh(step) + scale*math.Sinh(step)
		}
		if next == x || math.Abs(step)*scale < 0x1p-54*math.Abs(x) {
			break
		}
		// What is left after the step is of the order r² (the tails are log-concave in u, with a
		// curvature of at most slope²): not worth an evaluation.
		if math.Abs(r) < 1e-10 && r*r < 0x1p-58*slope && orderOf(next) > a && orderOf(next) < b {
			return next
		}
		if uint64(b-a) > width/2 {
			slow++
		} else {
			slow = 0
		}
		if n := orderOf(next); !(next > lo && next < hi) || n <= a || n >= b || slow > 3 && math.Abs(step) > 1e-6 || slow > 8 {
			// Both ends may still be those of the support: the middle of the ordered floats then is
			// near 1 (or 0 on the whole line).
			next = fromOrder(a + int64(uint64(b-a)/2))
			slow = 0
			step = 0
		}
		lastR, lastStep, lastNewton = r, step, newton
		x = next
	}
	// A root beyond the floats is an end of the support: 0 or infinite.
	right := func(x float64) bool { // whether the root lies to the right of x
		tail, logTail, _ := law.tailAt(x, upper)
		if tail < tinyTail || p < tinyTail {
			if tail >= tinyTail {
				logTail = math.Log(tail)
			}
			return (logTail > logOf(p)) == upper
		}
		return (tail > p) == upper
	}
	switch {
	case bestR < 1e-9:
	case b == orderOf(hi) && right(math.Nextafter(hi, lo)):
		return hi
	case positive && a == orderOf(lo) && !right(5e-324):
		return lo
	case !positive && a == orderOf(lo) && !right(-math.MaxFloat64):
		return lo
	}
	return best
}

// orderOf maps floats to integers in the same order, adjacent to adjacent.
func orderOf(x float64) int64 {
	b := int64(math.Float64bits(x))
	if b < 0 {
		return math.MinInt64 - b
	}
	return b
}

// fromOrder is the inverse of orderOf.
func fromOrder(o int64) float64 {
	if o < 0 {
		return math.Float64frombits(uint64(math.MinInt64 - o))
	}
	return math.Float64frombits(uint64(o))
}

// logOf is math.Log made right for denormals, which some implementations take
// for zero exponents.
func logOf(x float64) float64 {
	if x < 0x1p-1022 && x > 0 {
		return math.Log(x*0x1p200) - 200*math.Ln2
	}
	return math.Log(x)
}
