package lrt

import "math"

var nan = math.NaN()

const (
	maxFinite = math.MaxFloat64
	epsilon   = 0x1p-52
)

// sum adds with compensation (Neumaier 1974), so that a
// log likelihood of a million rows keeps the digits its derivatives are taken from.
func sum(x []float64) float64 {
	var s, c float64
	for _, v := range x {
		t := s + v
		if math.Abs(s) >= math.Abs(v) {
			c += (s - t) + v
		} else {
			c += (v - t) + s
		}
		s = t
	}
	if r := s + c; !math.IsNaN(r) {
		return r
	}
	return s // an infinity among the terms leaves NaN in c
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
