package dist

import "math"

// positiveEnds answers for a law on (0, +Inf) where no computation is needed: NaN, x <= 0
// (left) and +Inf (right).
func positiveEnds(x float64, valid bool, left, right float64) (float64, bool) {
	switch {
	case x > 0 && x <= math.MaxFloat64 && valid:
		return 0, false
	case !valid || math.IsNaN(x):
		return math.NaN(), true
	case x <= 0:
		return left, true
	}
	return right, true
}

// realEnds does the same for a law on the whole line.
func realEnds(x float64, valid bool, left, right float64) (float64, bool) {
	switch {
	case math.Abs(x) <= math.MaxFloat64 && valid:
		return 0, false
	case !valid || math.IsNaN(x):
		return math.NaN(), true
	case x < 0:
		return left, true
	}
	return right, true
}
