package noncentral

import "math"

// sinDefect returns x - sin x for 0 <= x <= π without cancellation, given sin x.
func sinDefect(x, sin float64) float64 {
	if x > 0.7 {
		return x - sin
	}
	q := x * x
	s := 1.0 / 6227020800 // 1/13!
	s = 1.0/39916800 - q*(s-q*(1.0/1307674368000-q/355687428096000))
	s = 1.0/362880 - q*s
	s = 1.0/5040 - q*s
	s = 1.0/120 - q*s
	s = 1.0/6 - q*s
	return x * q * s
}

// atanDefect returns x - atan x for x >= 0 without cancellation.
func atanDefect(x float64) float64 {
	if x > 0.3 {
		return x - math.Atan(x)
	}
	// Σ (-1)^k x^(2k+3)/(2k+3): the first term left out is 0.3^30 times the leading one.
	q := x * x
	s := 1.0/29 - q*(1.0/31)
	s = 1.0/27 - q*s
	s = 1.0/25 - q*s
	s = 1.0/23 - q*s
	s = 1.0/21 - q*s
	s = 1.0/19 - q*s
	s = 1.0/17 - q*s
	s = 1.0/15 - q*s
	s = 1.0/13 - q*s
	s = 1.0/11 - q*s
	s = 1.0/9 - q*s
	s = 1.0/7 - q*s
	s = 1.0/5 - q*s
	s = 1.0/3 - q*s
	return x * q * s
}

// sinhCosh returns sinh t and cosh t for t >= 0.
func sinhCosh(t float64) (s, c float64) {
	if t < 0.3 {
		q := t * t
		return t * (1 + q/6*(1+q/20*(1+q/42*(1+q/72*(1+q/110*(1+q/156)))))),
			1 + q/2*(1+q/12*(1+q/30*(1+q/56*(1+q/90*(1+q/132)))))
	}
	e := math.Exp(t)
	r := 1 / e
	return (e - r) / 2, (e + r) / 2
}
