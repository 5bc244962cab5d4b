package special

import (
	"math"

	"subsume.example/internal/dd"
)

// GammaKernel returns x^a e^-x / Gamma(a), the density of log X for the gamma
// law of shape a, for a > 0 and x > 0.
//
//	a < 16   exp(a log x - x) / Gamma(a), by the shifted Stirling series
//	a >= 16  sqrt(a/2π) exp(-a D - δ(a)), D = x/a - 1 - log(x/a) (Loader 2000, with
//	         Stirling's error δ), so that nothing cancels near x = a
func GammaKernel(a, x dd.DD) Scaled {
	if a.Hi < stirlingMin {
		g := Gamma1p(a)
		return Scaled{
			L: a.Mul(dd.Log(x)).Sub(x).Sub(g.L),
			M: a.Div(g.M),
		}
	}
	d := deviancePart(x.Sub(a).Div(a), x, a)
	return Scaled{
		L: d.Mul(a).Add(StirlingError(a)).Neg(),
		M: a.Div(twoPi).Sqrt(),
	}
}

// deviancePart returns u - log(1+u), where 1 + u = p/q is also given as a quotient.
func deviancePart(u, p, q dd.DD) dd.DD {
	if math.Abs(u.Hi) <= 0.2 {
		return dd.Log1pmx(u).Neg()
	}
	return u.Sub(dd.Log(p.Div(q)))
}

// GammaKernelQuick is GammaKernel to 2^-58 where the quick path reaches, else in full. Its
// logarithm is not to be used near 0.
func GammaKernelQuick(a, x dd.DD) Scaled {
	if a.Lo == 0 {
		if k, ok := quickGammaKernel(a.Hi, x); ok {
			return k
		}
	}
	return GammaKernel(a, x)
}

// GammaTail returns one tail of the gamma law of shape a at x, a > 0, x >= 0: the
// upper one Q(a, x) if upper is set, else the lower one P(a, x). The returned tail
// is the smaller one or at least not so near 1 that its complement loses digits.
//
//	x <= a, a < 30 or x < 0.6a   lower: positive series (DLMF 8.7.1), at most 130 terms
//	x <= a otherwise             lower: Mills ratio by quadrature
//	x > a, x < 8                 upper: complement of the series in double-double
//	x > a otherwise              upper: Mills ratio by quadrature
//
// Where a is a plain number from 1e-3 to 1e13 and the prefactor is above e^-660, quickGammaTail
// answers first.
func GammaTail(a, x dd.DD) (t Scaled, upper bool) {
	switch {
	case x.Hi <= 0:
		return Scaled{}, false
	case math.IsInf(x.Hi, 1):
		return Scaled{}, true
	}
	if a.Lo == 0 {
		if t, upper, ok := quickGammaTail(a.Hi, x); ok {
			return t, upper
		}
	}
	if x.Cmp(a) <= 0 {
		f := GammaKernel(a, x)
		if a.Hi < 30 || x.Hi < 0.6*a.Hi {
			f.M = f.M.Mul(gammaSeries(a, x, 0x1p-40, 0x1p-76))
		} else {
			f.M = f.M.MulF(gammaMills(a.Sub(x).Hi, x.Hi, false))
		}
		return f, false
	}
	f := GammaKernel(a, x)
	if x.Hi < 8 {
		f.M = f.M.Mul(gammaSeries(a, x, 0, 0x1p-106))
		return f.complement(), true
	}
	f.M = f.M.MulF(gammaMills(x.Sub(a).Hi, x.Hi, true))
	return f, true
}

// gammaSeries returns Σ_n x^n / (a (a+1) ... (a+n)). Terms above coarse times
// the sum are in double-double, the rest, down to fine times the sum, in plain
// arithmetic.
func gammaSeries(a, x dd.DD, coarse, fine float64) dd.DD {
	term := dd.DD{Hi: 1}
	sum := term
	n := 1.0
	for ; n < 400; n++ {
		term = term.Mul(x).Div(a.AddF(n))
		sum = sum.Add(term)
		if term.Hi <= coarse*sum.Hi || term.Hi <= fine*sum.Hi {
			break
		}
	}
	t, rest := term.Hi, 0.0
	for n++; t > fine*sum.Hi && n < 800; n++ {
		t *= x.Hi / (a.Hi + n)
		rest += t
	}
	return sum.AddF(rest).Div(a)
}
