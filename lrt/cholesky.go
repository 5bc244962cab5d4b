package lrt

import "math"

// cholesky overwrites the lower triangle of the n×n matrix a (row-major) with
// its factor and reports whether a is positive definite. Fits of a dozen
// parameters call it in a loop, where a workspace of the caller beats a
// general routine.
func cholesky(a []float64, n int) bool {
	for j := range n {
		rj := a[j*n : j*n+j]
		d := a[j*n+j]
		for _, v := range rj {
			d -= v * v
		}
		if !(d > 0) || math.IsInf(d, 1) {
			return false
		}
		d = math.Sqrt(d)
		a[j*n+j] = d
		for i := j + 1; i < n; i++ {
			s := a[i*n+j]
			ri := a[i*n : i*n+j]
			for k, v := range rj {
				s -= v * ri[k]
			}
			a[i*n+j] = s / d
		}
	}
	return true
}

// choleskySolve overwrites b with the solution of L Lᵀ x = b.
func choleskySolve(l []float64, n int, b []float64) {
	choleskyForward(l, n, b)
	for i := n - 1; i >= 0; i-- {
		s := b[i]
		for k := i + 1; k < n; k++ {
			s -= l[k*n+i] * b[k]
		}
		b[i] = s / l[i*n+i]
	}
}

// choleskyForward overwrites b with L⁻¹ b.
func choleskyForward(l []float64, n int, b []float64) {
	for i := range n {
		s := b[i]
		for k := range i {
			s -= l[i*n+k] * b[k]
		}
		b[i] = s / l[i*n+i]
	}
}
