package lrt

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// pseudoInverse inverts a symmetric non-negative matrix on the directions with
// curvature, after scaling to a unit diagonal.
func pseudoInverse(a []float64, m int) ([]float64, bool) {
	d := make([]float64, m)
	c := mat.NewSymDense(m, nil)
	for j := range m {
		d[j] = math.Sqrt(math.Abs(a[j*m+j]))
		if d[j] == 0 {
			d[j] = 1
		}
	}
	for j := range m {
		for k := range j + 1 {
			c.SetSym(j, k, a[j*m+k]/(d[j]*d[k]))
		}
	}
	var es mat.EigenSym
	if !finite(a) || !es.Factorize(c, true) {
		return nil, false
	}
	var v mat.Dense
	es.VectorsTo(&v)
	inv := make([]float64, m*m)
	for i, lambda := range es.Values(nil) {
		if lambda < -1e-3 {
			return nil, false
		}
		if lambda < 1e-9*float64(m) {
			continue
		}
		for j := range m {
			for k := range m {
				inv[j*m+k] += v.At(j, i) * v.At(k, i) / (lambda * d[j] * d[k])
			}
		}
	}
	return inv, true
}
