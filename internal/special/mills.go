package special

import "math"

// Tails far from the centre, and near it for large parameters, are found as
// density times Mills ratio,
//
//	tail = f(w) R,  R = ∫_0^∞ exp(-φ(t)) dt,
//
// with f the density in w = log x (gamma) or logit x (beta), which is
// log-concave: φ is convex with φ(0) = 0 and φ'(0) >= 0 on the side away from
// the mode. The integral is cut at T with φ(T) near 44: by convexity what is
// left out is below 1e-19 of R. The 32-point Gauss-Legendre rule on [0, T] is
// exact to 1e-18 there for shape parameters of 16 or more (worst of the
// exponential, the half-normal and the skewed integrands between them; 28
// points give 1e-15), and its terms are positive, so their rounding errors
// average out.

const millsCut = 44

// expm1mx returns e^t - 1 - t without cancellation.
func expm1mx(t float64) float64 {
	if t > 0.7 || t < -0.7 {
		return math.Expm1(t) - t
	}
	const (
		c3  = 1.0 / 3
		c12 = 1.0 / 12
	)
	p := 1.0 / 1307674368000 * 2 * t // 1/15!
	p = t * (2.0/87178291200 + p)
	p = t * (2.0/6227020800 + p)
	p = t * (2.0/479001600 + p)
	p = t * (2.0/39916800 + p)
	p = t * (2.0/3628800 + p)
	p = t * (2.0/362880 + p)
	p = t * (2.0/40320 + p)
	p = t * (2.0/5040 + p)
	p = t * (2.0/720 + p)
	p = t * (2.0/120 + p)
	p = t * (c12 + p)
	p = t * (c3 + p)
	return 0.5 * t * t * (1 + p)
}

// xmlog1p returns z - log(1+z), at least 0, without cancellation.
func xmlog1p(z float64) float64 {
	if z > 0.6 || z < -0.4 {
		return z - math.Log1p(z)
	}
	// s = z/(2+z), |s| <= 1/4: z - log(1+z) = s (z - 2 s² (1/3 + s²/5 + ...)).
	s := z / (2 + z)
	q := s * s
	p := q * (1.0/25 + q*(1.0/27))
	p = q * (1.0/23 + p)
	p = q * (1.0/21 + p)
	p = q * (1.0/19 + p)
	p = q * (1.0/17 + p)
	p = q * (1.0/15 + p)
	p = q * (1.0/13 + p)
	p = q * (1.0/11 + p)
	p = q * (1.0/9 + p)
	p = q * (1.0/7 + p)
	p = q * (1.0/5 + p)
	p = 2 * q * (1.0/3 + p)
	return s * (z - p)
}

// firstCut returns the root of c t + v t²/2 = millsCut.
func firstCut(c, v float64) float64 {
	if c > 1e150 {
		return millsCut / c
	}
	return 2 * millsCut / (c + math.Sqrt(c*c+2*millsCut*v))
}

// gammaMills returns ∫_0^∞ exp(-(c t + x E(t))) dt, c >= 0, with
// E(t) = e^t - 1 - t for up and e^-t - 1 + t otherwise.
func gammaMills(c, x float64, up bool) float64 {
	sign := -1.0
	if up {
		sign = 1
	}
	// Newton for φ(T) = 44 from the root of the quadratic part.
	t := firstCut(c, x)
	for range 12 {
		e := expm1mx(sign * t)
		f := c*t + x*e - millsCut
		if math.Abs(f) < 2 {
			break
		}
		t -= f / (c + x*sign*(e+sign*t))
	}
	sum := 0.0
	for i := range gauss {
		u := t * gauss[i].s
		sum += gauss[i].w * math.Exp(-(c*u + x*expm1mx(sign*u)))
	}
	return t * sum
}

// betaMills returns ∫_0^∞ exp(-φ(t)) dt for the lower tail of the beta law in
// the logit, X <= a/(a+b), c = aY - bX >= 0:
//
//	φ(t) = c t + (a+b) (log(1 + X (e^-t - 1)) + X t)        for X <= 1/2
//	     = c t + (a+b) (log(1 + Y (e^t - 1)) - Y t)         for Y < 1/2.
func betaMills(c, n, x, y float64) float64 {
	z, sign := x, -1.0
	if y < x {
		z, sign = y, 1
	}
	t := firstCut(c, n*x*y)
	for range 40 {
		e := expm1mx(sign * t)
		v := z * (e + sign*t)
		f := c*t + n*(z*e-xmlog1p(v)) - millsCut
		if math.Abs(f) < 2 {
			break
		}
		// φ' = a - (a+b) X(t) with X(t) = X e^-t/(Y + X e^-t); the slope of the bracket
		// is sign z (e^(sign t)/(1+v) - 1).
		d := c + n*sign*z*((1+e+sign*t)/(1+v)-1)
		t -= f / d
	}
	sum := 0.0
	for i := range gauss {
		u := t * gauss[i].s
		e := expm1mx(sign * u)
		sum += gauss[i].w * math.Exp(-(c*u + n*(z*e-xmlog1p(z*(e+sign*u)))))
	}
	return t * sum
}
