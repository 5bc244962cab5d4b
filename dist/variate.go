package dist

import (
	"math"
	"math/rand/v2"
)

// uniformVariate returns a value in (0, 1), never an end, with 53 bits.
func uniformVariate(src rand.Source) float64 {
	return (float64(src.Uint64()>>11) + 0.5) * 0x1p-53
}

// normalVariate returns a standard normal value.
func normalVariate(src rand.Source) float64 { return rand.New(src).NormFloat64() }

// logGammaVariate returns the logarithm of a gamma variate of shape a (Marsaglia and
// Tsang, ACM TOMS 26, 2000, with their section 6 for a < 1: G(a) = G(a+1) U^(1/a), here in
// logarithms because it underflows for small a). The loop accepts with probability
// above 0.95 and is cut after 1000 rounds, which never happens in practice.
func logGammaVariate(src rand.Source, a float64) float64 {
	add := 0.0
	if a < 1 {
		add = math.Log(uniformVariate(src)) / a
		a++
	}
	d := a - 1.0/3
	c := 1 / math.Sqrt(9*d)
	for range 1000 {
		z := normalVariate(src)
		v := 1 + c*z
		if v <= 0 {
			continue
		}
		lv := 3 * math.Log1p(c*z)
		// log U < z²/2 + d - d v³ + d log v³
		if math.Log(uniformVariate(src)) < 0.5*z*z+d*(lv-math.Expm1(lv)) {
			return math.Log(d) + lv + add
		}
	}
	return math.Log(a) + add
}
