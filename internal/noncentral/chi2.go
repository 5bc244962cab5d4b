package noncentral

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// The regions of noncentral χ²(k, λ) at x, with A = λU/2, B = x/(2U) at the
// saddle point (AB = λx/4, B - A = k/2):
//
//	A+B >= 22   contour integral on the circle through the saddle point
//	else        Poisson mixture in double-double; A, the index of its
//	            dominating term, is below 11
//
// What the circle leaves out (its path from -U to 0) is e^{-2(A+B)} < e^-44 of the
// integral.
//
// For x below chi2Tiny the lower tail is its first term, and above 1e40 max(1, k, λ) every
// logarithm is -x/2 to all digits.
const (
	chi2Few  = 22
	chi2Tiny = 1e-250
)

// chi2Saddle returns A and B.
func chi2Saddle(k, lambda, x float64) (a, b float64) {
	if p := lambda * x; p > 1e-250 && p < 1e250 && k < 1e100 {
		b = (k/2 + math.Sqrt(k*k/4+p)) / 2
		return p / (4 * b), b
	}
	q := math.Sqrt(lambda) * math.Sqrt(x)
	b = (k/2 + math.Hypot(k/2, q)) / 2
	return q / b * (q / 4), b
}

func chi2Mixture(k, lambda float64, x dd.DD) mixture {
	a := dd.From(k / 2)
	m := mixture{a: k / 2, half: dd.From(lambda / 2)}
	m.a1 = a.AddF(1)
	m.y = x.MulF(0.5)
	if x.Hi < chi2Tiny {
		m.c, _ = special.GammaTailTiny(a, dd.Log(x).Sub(dd.Ln2))
		m.t0, m.end = m.c, -1
		return m
	}
	return m
}

// ChiSquared is noncentral χ² at a point.
type ChiSquared struct {
	contour bool
	far     bool // x so large that only -x/2 counts in every logarithm
	right   bool // the saddle point lies right of the pole
	x       float64
	path    chi2Path
	mix     mixture
}

// AtChiSquared prepares noncentral χ² at x, for finite k > 0, λ >= 0, x > 0.
func AtChiSquared(k, lambda float64, x dd.DD) (p ChiSquared) {
	a, b := chi2Saddle(k, lambda, x.Hi)
	p.x = x.Hi
	if x.Hi > 1e40*max(1, k, lambda) {
		p.far = true
		return p
	}
	if a+b >= chi2Few && x.Hi >= chi2Tiny {
		p.contour = true
		p.path = newChi2Path(k, lambda, x, b)
		return p
	}
	p.right = x.Hi >= 2*b
	p.mix = chi2Mixture(k, lambda, x)
	return p
}

// All returns one tail, the upper one if upper is set, and the smaller one or at least one not
// near 1; the density of log X, x times that of X; and the derivative of the upper
// tail in λ. The latter two are good for Newton steps; see Kernel.
func (p *ChiSquared) All() (t special.Scaled, upper bool, kernel, slope special.Scaled) {
	if p.far {
		v := special.Scaled{L: dd.From(-p.x / 2), M: dd.From(1)}
		return v, true, v, v
	}
	if p.contour {
		return p.path.result(p.x)
	}
	return p.mix.all(p.right)
}

// Tail returns the first two results of All.
func (p *ChiSquared) Tail() (t special.Scaled, upper bool) {
	t, upper, _, _ = p.All()
	return t, upper
}

// Kernel returns the density of log X to full accuracy.
func (p *ChiSquared) Kernel() (kernel special.Scaled) {
	if p.mixed() {
		return p.mix.kernel()
	}
	_, _, kernel, _ = p.All()
	return kernel
}

func (p *ChiSquared) mixed() bool { return !p.contour && !p.far }
