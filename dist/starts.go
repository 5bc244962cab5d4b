package dist

import "math"

// normalStart returns a z with P(Z > z) near q (Abramowitz and Stegun 26.2.23, error below
// 4.5e-4), for 0 < q < 1.
func normalStart(q float64) float64 {
	s := 1.0
	if q > 0.5 {
		q, s = 1-q, -1
	}
	t := math.Sqrt(-2 * logOf(q))
	return s * (t - (2.515517+t*(0.802853+t*0.010328))/(1+t*(1.432788+t*(0.189269+t*0.001308))))
}

// chiStart returns a start for the chi-squared quantile: the cube of Wilson and Hilferty
// (1931), or the leading term of the lower tail, whichever is larger.
func chiStart(k, p float64, upper bool) float64 {
	if !(p > 0 && p < 1) {
		return math.NaN()
	}
	z, lp := normalStart(p), logOf(p)
	if !upper {
		z = -z
	} else {
		lp = math.Log1p(-p)
	}
	h := 2 / (9 * k)
	w := 1 - h + z*math.Sqrt(h)
	x := 0.0
	if w > 0 {
		x = k * w * w * w
	}
	g, _ := math.Lgamma(1 + k/2)
	low := 2 * math.Exp((lp+g)*2/k)
	if k < 1 || w <= 0.3 {
		// P <= (x/2)^(k/2)/Gamma(1+k/2): low never exceeds the quantile.
		if upper && k < 1 && w > 0 && p < 0.1 {
			return max(low, x)
		}
		return max(low, 5e-324)
	}
	return max(low, x)
}

// start returns a start for the F quantile: the normal approximation of the cube root
// (Paulson 1942), else power laws of the tails.
func (f F) start(p float64, upper bool) float64 {
	if !(p > 0 && p < 1) {
		return math.NaN()
	}
	if math.IsInf(f.D2, 1) {
		return chiStart(f.D1, p, upper) / f.D1
	}
	z := normalStart(p)
	if !upper {
		z = -z
	}
	h1, h2 := 2/(9*f.D1), 2/(9*f.D2)
	a, b := 1-h1, 1-h2
	// (b² - z² h2) w² - 2ab w + a² - z² h1 = 0 for w = x^(1/3)
	q := b*b - z*z*h2
	d := a*a*h2 + b*b*h1 - z*z*h1*h2
	if q > 0.2*b*b && d > 0 && a > 0.4 {
		if w := (a*b + z*math.Sqrt(d)) / q; w > 0.2 {
			return w * w * w
		}
	}
	lp, lq := logOf(p), math.Log1p(-p)
	if upper {
		lp, lq = lq, lp
	}
	lb := lgammaOf(f.D1/2) + lgammaOf(f.D2/2) - lgammaOf((f.D1+f.D2)/2)
	r := math.Log(f.D2 / f.D1)
	if z < 0 {
		// P ~ (D1 x/D2)^(D1/2) / (D1/2 B)
		return math.Exp(min(700, r+(lp+lb+math.Log(f.D1/2))*2/f.D1))
	}
	return math.Exp(max(-700, min(700, r-(lq+lb+math.Log(f.D2/2))*2/f.D2)))
}

func lgammaOf(a float64) float64 {
	g, _ := math.Lgamma(a)
	return g
}

// studentStart returns a start for the upper t quantile at q < 1/2: Hill's (1970) leading
// terms for the centre, the power law of the tail beyond.
func studentStart(nu, q float64) float64 {
	if !(q > 0 && q < 0.5) {
		return math.NaN()
	}
	z := normalStart(q)
	if math.IsInf(nu, 1) {
		return z
	}
	x := z * (1 + (z*z+1)/(4*nu) + (5*z*z*z*z+16*z*z+3)/(96*nu*nu))
	if z*z < nu {
		return x
	}
	// P(T > t) ~ (nu/t²)^(nu/2) / (nu B(1/2, nu/2))
	lb := lgammaOf(0.5) + lgammaOf(nu/2) - lgammaOf((nu+1)/2)
	return math.Exp(max(-700, min(700, 0.5*math.Log(nu)-(logOf(q)+lb+math.Log(nu))/nu)))
}
