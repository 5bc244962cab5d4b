package lrt

import "math"

var nan = math.NaN()

const (
	maxFinite = math.MaxFloat64
	epsilon   = 0x1p-52
)

// sum adds in four lanes that carry their rounding errors (Knuth 1969, the
// two-sum), so that a log likelihood of a million rows keeps the digits its
// derivatives are taken from.
func sum(x []float64) float64 {
	var s, c [4]float64
	i := 0
	for ; i+4 <= len(x); i += 4 {
		for k := range 4 {
			v := x[i+k]
			t := s[k] + v
			b := t - s[k]
			c[k] += (s[k] - (t - b)) + (v - b)
			s[k] = t
		}
	}
	total, rest := 0.0, 0.0
	add := func(v float64) {
		t := total + v
		b := t - total
		rest += (total - (t - b)) + (v - b)
		total = t
	}
	for ; i < len(x); i++ {
		add(x[i])
	}
	for k := range 4 {
		add(s[k])
		rest += c[k]
	}
	if r := total + rest; !math.IsNaN(r) {
		return r
	}
	return total // an infinity among the terms leaves NaN in rest
}

func finite(x []float64) bool {
	for _, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}

func dot(a, b []float64) float64 {
	var s float64
	for i, v := range a {
		s += v * b[i]
	}
	return s
}
