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

// gammaVariate returns g and s where g e^s is a gamma variate of shape a; s = 0 for a >= 1
// (Marsaglia and Tsang, ACM TOMS 26, 2000, with their section 6 for a < 1: G(a) = G(a+1) U^(1/a),
// whose factor underflows for small a and is left as a logarithm). The loop accepts with probability
// above 0.95 and is cut after 1000 rounds, which never happens in practice.
func gammaVariate(src rand.Source, a float64) (g, s float64) {
	if a < 1 {
		s = math.Log(uniformVariate(src)) / a
		a++
	}
	d := a - 1.0/3
	c := 1 / math.Sqrt(9*d)
	for range 1000 {
		z := normalVariate(src)
		w := c * z
		if w <= -1 {
			continue
		}
		u, q := uniformVariate(src), z*z
		v := w * (3 + w*(3+w)) // (1+w)³ - 1
		if u < 1-0.0331*q*q || math.Log(u) < 0.5*q+d*(3*math.Log1p(w)-v) {
			t := 1 + w
			return d * t * t * t, s
		}
	}
	return a, s
}

// logGammaVariate returns the logarithm of a gamma variate of shape a.
func logGammaVariate(src rand.Source, a float64) float64 {
	g, s := gammaVariate(src, a)
	return math.Log(g) + s
}

// timesExp returns g e^s.
func timesExp(g, s float64) float64 {
	if s == 0 {
		return g
	}
	return g * math.Exp(s)
}
