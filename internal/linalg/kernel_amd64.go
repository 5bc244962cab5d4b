//go:build amd64 && !noasm

package linalg

// The kernels of kernel_amd64.s take whole groups of four elements; n must be a
// multiple of 4. They use AVX2 and fused multiply-add.

//go:noescape
func dotLanes(a, b *float64, n int, l *lanes)

//go:noescape
func dotLanes4(a, b0, b1, b2, b3 *float64, n int, l *[4]lanes)

//go:noescape
func sumLanes(a, b *float64, n int, l *[4]float64)

// vectorUnits reports whether the processor and the system have what the kernels use.
func vectorUnits() bool

var hasVectors = vectorUnits()

// lanesOf adds the leading elements of a·b to the lanes and returns how many.
func lanesOf(a, b []float64, l *lanes) int {
	n := len(a) &^ 3
	if !hasVectors || n == 0 {
		return 0
	}
	dotLanes(&a[0], &b[0], n, l)
	return n
}

func lanesOf4(a, b0, b1, b2, b3 []float64, l *[4]lanes) int {
	n := len(a) &^ 3
	if !hasVectors || n == 0 {
		return 0
	}
	dotLanes4(&a[0], &b0[0], &b1[0], &b2[0], &b3[0], n, l)
	return n
}

func sumsOf(a, b []float64, l *[4]float64) int {
	n := len(a) &^ 3
	if !hasVectors || n == 0 {
		return 0
	}
	sumLanes(&a[0], &b[0], n, l)
	return n
}
