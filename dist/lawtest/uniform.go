package lawtest

import (
	"math"
	"sort"
)

// Uniformity returns the Kolmogorov-Smirnov statistic √n D and the Anderson-Darling
// statistic A² of u against the uniform law on [0, 1]; u is not changed. With X from a
// continuous law of distribution function F, F(X) is uniform. Limits of both at 0.1 % for
// large n: 1.95 and 6.0.
//
// Anderson and Darling, "A test of goodness of fit", JASA 49, 1954; values 0 and 1 are taken as
// 1e-300 and the float next to 1, so that A² stays finite.
func Uniformity(u []float64) (ks, ad float64) {
	v := append([]float64(nil), u...)
	sort.Float64s(v)
	n := float64(len(v))
	sum := 0.0
	for i, p := range v {
		k := float64(i)
		ks = max(ks, math.Abs(p-k/n), math.Abs((k+1)/n-p))
		lo := max(p, 1e-300)
		up := max(1-v[len(v)-1-i], 0x1p-54)
		sum += (2*k + 1) * (math.Log(lo) + math.Log(up))
	}
	return ks * math.Sqrt(n), -n - sum/n
}

// nodes and weights of the 10-point Gauss-Legendre rule on [-1, 1] (Abramowitz and Stegun 25.4).
var gauss10 = [5][2]float64{
	{0.14887433898163122, 0.29552422471475287},
	{0.4333953941292472, 0.26926671930999635},
	{0.6794095682990244, 0.21908636251598204},
	{0.8650633666889845, 0.14945134915058059},
	{0.9739065285171717, 0.06667134430868814},
}

func rule(f func(float64) float64, a, b float64) float64 {
	m, h := (a+b)/2, (b-a)/2
	s := 0.0
	for _, g := range gauss10 {
		s += g[1] * (f(m-h*g[0]) + f(m+h*g[0]))
	}
	return s * h
}

// integrate returns the integral of f over [a, b] to the absolute error tol by halving, at most 12
// times.
func integrate(f func(float64) float64, a, b, tol float64) float64 {
	var halve func(a, b, whole, tol float64, depth int) float64
	halve = func(a, b, whole, tol float64, depth int) float64 {
		m := (a + b) / 2
		l, r := rule(f, a, m), rule(f, m, b)
		if depth == 0 || math.Abs(l+r-whole) <= tol {
			return l + r
		}
		return halve(a, m, l, tol/2, depth-1) + halve(m, b, r, tol/2, depth-1)
	}
	return halve(a, b, rule(f, a, b), tol, 12)
}
