package lrt

import (
	"math"

	"subsume.example/dist"
)

// BothTails returns the exact p-value P(λ ≤ λ observed) of a likelihood ratio
// that depends on the data through one positive statistic x alone: the two
// tails of the law of x beyond the roots of equal λ, one of which is x. logLambda
// gives log λ as a function of x; it must rise to 0 at one point and fall after
// it. The equal-tailed p-value (twice the smaller tail) is another quantity.
//
// p and its logarithm are NaN for x outside (0, ∞), for an invalid law, and
// where logLambda is not a number.
func BothTails(law dist.Law, logLambda func(x float64) float64, x float64) (p, logP float64) {
	if !(x >= 0) || law.Validate() != nil {
		return nan, nan
	}
	if x == 0 || math.IsInf(x, 1) {
		return 0, -inf
	}
	l := logLambda(x)
	if math.IsNaN(l) {
		return nan, nan
	}
	// Which side of the top is x on, and where is λ the same on the other?
	rising := logLambda(x*(1+1e-6)) > l
	far := x
	for i := 0; ; i++ {
		next := far * 2
		if !rising {
			next = far / 2
		}
		if i > 2200 || next == 0 || math.IsInf(next, 1) {
			far = next
			break
		}
		far = next
		if v := logLambda(far); v <= l {
			break
		}
	}
	top := topBetween(logLambda, x, far)
	a, b := math.Log(top), math.Log(far)
	for range 200 { // λ(a) above, λ(b) at or below the observed one
		m := 0.5 * (a + b)
		if m == a || m == b || math.IsInf(b, 0) {
			break
		}
		if logLambda(math.Exp(m)) > l {
			a = m
		} else {
			b = m
		}
	}
	lo, hi := x, math.Exp(b)
	if !rising {
		lo, hi = hi, lo
	}
	p = law.CDF(lo) + law.Survival(hi)
	if p > 1e-290 {
		return math.Min(p, 1), math.Min(math.Log(p), 0)
	}
	return p, math.Max(math.Log(law.CDF(lo)), law.LogSurvival(hi))
}

// topBetween finds where a rising-then-falling function is largest, by golden
// section on the log scale; any point above the ends would do.
func topBetween(f func(float64) float64, x, y float64) float64 {
	a, b := math.Log(x), math.Log(y)
	if a > b {
		a, b = b, a
	}
	if math.IsInf(b, 1) || math.IsInf(a, -1) {
		return x
	}
	g := (math.Sqrt(5) - 1) / 2
	c, d := b-g*(b-a), a+g*(b-a)
	fc, fd := f(math.Exp(c)), f(math.Exp(d))
	for b-a > 1e-9*(1+math.Abs(a)) {
		if fc > fd {
			b, d, fd = d, c, fc
			c = b - g*(b-a)
			fc = f(math.Exp(c))
		} else {
			a, c, fc = c, d, fd
			d = a + g*(b-a)
			fd = f(math.Exp(d))
		}
	}
	return math.Exp(0.5 * (a + b))
}
