package special

import "subsume.example/internal/dd"

// GammaTailTiny returns P(a, x) = x^a / Gamma(1+a) and the kernel x^a / Gamma(a)
// for an x so small that e^-x = 1 to all digits (x below 1e-30 a), given log x: x itself may lie
// outside the range of a float64.
func GammaTailTiny(a, logx dd.DD) (lower, kernel Scaled) {
	g := Gamma1p(a)
	l := a.Mul(logx).Sub(g.L)
	m := dd.From(1).Div(g.M)
	return Scaled{L: l, M: m}, Scaled{L: l, M: a.Mul(m)}
}

// BetaTailTiny returns I_x(a, b) = x^a / (a B(a, b)) and the kernel x^a / B(a, b) for
// an x so small that (1-x)^b = 1 to all digits, given log x.
func BetaTailTiny(a, b, logx dd.DD) (lower, kernel Scaled) {
	c := betaKernelConstant(a, b)
	l := c.L.Add(a.Mul(logx))
	return Scaled{L: l, M: c.M.Div(a)}, Scaled{L: l, M: c.M}
}
