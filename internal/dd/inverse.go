package dd

import "math"

// Inv returns 1/a with relative error below 4u²: a float64 quotient and one
// correction by its exact residual.
func (a DD) Inv() DD {
	q := 1 / a.Hi
	e := math.FMA(-q, a.Lo, math.FMA(-q, a.Hi, 1))
	s, t := QuickTwoSum(q, float64(q*math.FMA(e, e, e)))
	return DD{s, t}
}
