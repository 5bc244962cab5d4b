//go:build !amd64 || noasm

package linalg

// Without vector kernels all elements are added one by one, with the same bits.

func lanesOf(a, b []float64, l *lanes) int { return 0 }

func lanesOf4(a, b0, b1, b2, b3 []float64, l *[4]lanes) int { return 0 }

func sumsOf(a, b []float64, l *[4]float64) int { return 0 }
