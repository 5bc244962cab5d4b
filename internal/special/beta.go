package special

import "subsume.example/internal/dd"

// betaKernelConstant returns 1 / B(a, b).
func betaKernelConstant(a, b dd.DD) Scaled {
	if a.Cmp(b) > 0 {
		a, b = b, a
	}
	s := a.Add(b)
	if b.Hi < stirlingMin {
		// Gamma(a+b)/(Gamma(a) Gamma(b)) = ab/(a+b) Gamma(1+a+b)/(Gamma(1+a) Gamma(1+b)).
		ga, gb, gs := Gamma1p(a), Gamma1p(b), Gamma1p(s)
		return Scaled{
			L: gs.L.Sub(ga.L).Sub(gb.L),
			M: a.Mul(b).Div(s).Mul(gs.M).Div(ga.M.Mul(gb.M)),
		}
	}
	if a.Hi < stirlingMin {
		// Gamma(a+b)/Gamma(b) = b^a exp((a+b-1/2) log(1+a/b) - a + δ(a+b) - δ(b)).
		ga := Gamma1p(a)
		u := a.Div(b)
		l := s.AddF(-0.5).Mul(dd.Log1p(u)).Sub(a).Add(StirlingError(s)).Sub(StirlingError(b)).Add(a.Mul(dd.Log(b)))
		return Scaled{L: l.Sub(ga.L), M: a.Div(ga.M)}
	}
	// (a+b)^(a+b-1/2) / (a^(a-1/2) b^(b-1/2)) exp(δ(a+b) - δ(a) - δ(b)) / sqrt(2π).
	l := a.Mul(dd.Log(s.Div(a))).Add(b.Mul(dd.Log1p(a.Div(b))))
	l = l.Add(StirlingError(s)).Sub(StirlingError(a)).Sub(StirlingError(b))
	return Scaled{L: l, M: a.Mul(b.Div(s)).Div(twoPi).Sqrt()}
}

// BetaKernel returns x^a y^b / B(a, b), the density of logit X for the beta law,
// for a, b > 0 and x + y = 1, both positive.
//
//	min(a, b) < 16   logarithms of x and y and the constant
//	else             sqrt(ab/(2π(a+b))) exp(-deviance + δ(a+b) - δ(a) - δ(b)), deviance =
//	                 a (u - log(1+u)) + b (v - log(1+v)), a u = -b v = x b - y a
//	                 (Loader 2000), so that nothing cancels near the mean
func BetaKernel(a, b, x, y dd.DD) Scaled {
	if min(a.Hi, b.Hi) < stirlingMin {
		c := betaKernelConstant(a, b)
		c.L = c.L.Add(a.Mul(log1m(x, y)).Add(b.Mul(log1m(y, x))))
		return c
	}
	s := a.Add(b)
	n := x.Mul(b).Sub(y.Mul(a))
	u, v := n.Div(a), n.Div(b).Neg()
	d := a.Mul(deviancePart(u, x.Mul(s), a)).Add(b.Mul(deviancePart(v, y.Mul(s), b)))
	return Scaled{
		L: StirlingError(s).Sub(StirlingError(a)).Sub(StirlingError(b)).Sub(d),
		M: a.Mul(b.Div(s)).Div(twoPi).Sqrt(),
	}
}

// log1m returns log x where x + y = 1, by log1p(-y) when y is the smaller.
func log1m(x, y dd.DD) dd.DD {
	if y.Hi < 0.25 {
		return dd.Log1p(y.Neg())
	}
	return dd.Log(x)
}

// BetaKernelQuick is BetaKernel to 2^-58 where the quick path reaches, else in full. Its
// logarithm is not to be used near 0.
func BetaKernelQuick(a, b, x, y dd.DD) Scaled {
	if a.Lo == 0 && b.Lo == 0 {
		if k, ok := quickBetaKernel(a.Hi, b.Hi, x, y); ok {
			return k
		}
	}
	return BetaKernel(a, b, x, y)
}

// BetaTail returns one tail of the beta law at x, y = 1 - x: the upper one
// 1 - I_x(a, b) = I_y(b, a) if upper is set, else the lower one I_x(a, b). The
// returned tail is the one on the side of x away from the mode a/(a+b) of the logit.
//
// With the arguments exchanged so that x <= a/(a+b):
//
//	y (a+b) < 8 and x > 0.6, or a < 16 and x > 0.6   complement of the series in y, in double-double
//	a < 30 or r < 0.6                                positive series in x (DLMF 8.17.8)
//	otherwise                                        Mills ratio by quadrature
//
// where r = max(x, x (a+b)/(a+1)) bounds the quotient of terms. Where a and b are plain numbers
// from 1e-3 to 1e13 and the prefactor is above e^-660, quickBetaTail answers first.
func BetaTail(a, b, x, y dd.DD) (t Scaled, upper bool) {
	switch {
	case x.Hi <= 0:
		return Scaled{}, false
	case y.Hi <= 0:
		return Scaled{}, true
	}
	if a.Lo == 0 && b.Lo == 0 {
		if t, upper, ok := quickBetaTail(a.Hi, b.Hi, x, y); ok {
			return t, upper
		}
	}
	c := a.Mul(y).Sub(b.Mul(x))
	if c.Hi < 0 {
		a, b, x, y, c, upper = b, a, y, x, c.Neg(), true
	}
	f := BetaKernel(a, b, x, y)
	s := a.Add(b)
	r := x.Hi * max(1, s.Hi/(a.Hi+1))
	switch {
	case x.Hi > 0.6 && (a.Hi < stirlingMin || y.Hi*s.Hi < 8):
		f.M = f.M.Mul(betaSeries(b, s, y, 0, 0x1p-106))
		return f.complement(), upper
	case r < 0.6 || a.Hi < 30 && x.Hi <= 0.6:
		f.M = f.M.Mul(betaSeries(a, s, x, 0x1p-40, 0x1p-76))
	default:
		f.M = f.M.MulF(betaMills(c.Hi, s.Hi, x.Hi, y.Hi))
	}
	return f, upper
}

// betaSeries returns Σ_n (s)_n / (a (a+1) ... (a+n)) x^n, s = a + b, where
// I_x(a, b) is x^a y^b/B(a, b) times it. Terms above coarse times the sum are in
// double-double, the rest, down to fine times the sum, in plain arithmetic.
func betaSeries(a, s, x dd.DD, coarse, fine float64) dd.DD {
	term := dd.DD{Hi: 1}
	sum := term
	n := 1.0
	for ; n < 400; n++ {
		term = term.Mul(x.Mul(s.AddF(n - 1))).Div(a.AddF(n))
		sum = sum.Add(term)
		if term.Hi <= coarse*sum.Hi || term.Hi <= fine*sum.Hi {
			break
		}
	}
	t, rest := term.Hi, 0.0
	for n++; t > fine*sum.Hi && n < 800; n++ {
		t *= x.Hi * (s.Hi + (n - 1)) / (a.Hi + n)
		rest += t
	}
	return sum.AddF(rest).Div(a)
}

// InverseBeta returns 1 / B(a, b).
func InverseBeta(a, b dd.DD) Scaled { return betaKernelConstant(a, b) }
