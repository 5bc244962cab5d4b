package accuracy

import (
	"math"

	"subsume.example/dist"
	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// Tables lists the tables of dist/testdata; each law adds its own.
var Tables = []Table{
	{File: "chi2", Params: 1, New: func(p []float64) Distribution { return dist.ChiSquared{K: p[0]} }, Everyday: everydayDF(1)},
	{File: "f", Params: 2, New: func(p []float64) Distribution { return dist.F{D1: p[0], D2: p[1]} }, Everyday: everydayDF(2)},
	{File: "t", Params: 1, New: func(p []float64) Distribution { return dist.StudentT{Nu: p[0]} }, Everyday: everydayDF(1)},
	{File: "betainc", Params: 2, New: func(p []float64) Distribution { return Beta{p[0], p[1]} }, Everyday: func(p []float64) bool {
		return min(p[0], p[1]) >= 0.25 && max(p[0], p[1]) <= 5e3
	}},
	{File: "chi2_wide", Params: 1, New: func(p []float64) Distribution { return dist.ChiSquared{K: p[0]} }, Everyday: everydayDF(1)},
	{File: "f_wide", Params: 2, New: func(p []float64) Distribution { return dist.F{D1: p[0], D2: p[1]} }, Everyday: everydayDF(2)},
	{File: "t_wide", Params: 1, New: func(p []float64) Distribution { return dist.StudentT{Nu: p[0]} }, Everyday: everydayDF(1)},
	{File: "srange", Params: 2, NoDensity: true, New: func(p []float64) Distribution { return dist.StudentizedRange{K: int(p[0]), Nu: p[1]} }, Everyday: everydayScale},
	{File: "smm", Params: 2, NoDensity: true, New: func(p []float64) Distribution { return dist.MaximumModulus{K: int(p[0]), Nu: p[1]} }, Everyday: everydayScale},
}

// everydayScale holds for every row with an estimated or known scale.
func everydayScale([]float64) bool { return true }

// everydayDF reports whether the first n parameters lie in 0.5 ... 1e4.
func everydayDF(n int) func(p []float64) bool {
	return func(p []float64) bool {
		for _, v := range p[:n] {
			if v < 0.5 || v > 1e4 {
				return false
			}
		}
		return true
	}
}

// Beta is the beta law on the kernels of internal/special.
type Beta struct{ A, B float64 }

func (b Beta) tail(x float64) (special.Scaled, bool) {
	if x < 1e-270 {
		t, _ := special.BetaTailTiny(dd.From(b.A), dd.From(b.B), dd.Log(dd.From(x)))
		return t, false
	}
	return special.BetaTail(dd.From(b.A), dd.From(b.B), dd.From(x), dd.Sum(1, -x))
}

func (b Beta) density(x float64) special.Scaled {
	X, Y := dd.From(x), dd.Sum(1, -x)
	if x < 1e-270 {
		_, k := special.BetaTailTiny(dd.From(b.A), dd.From(b.B), dd.Log(X))
		k.L = k.L.Sub(dd.Log(X))
		return k
	}
	k := special.BetaKernel(dd.From(b.A), dd.From(b.B), X, Y)
	k.M = k.M.Div(X.Mul(Y))
	return k
}

// CDF returns I_x(A, B).
func (b Beta) CDF(x float64) float64 {
	t, upper := b.tail(x)
	if upper {
		return t.Complement()
	}
	return t.Float64()
}

// Survival returns 1 - I_x(A, B).
func (b Beta) Survival(x float64) float64 {
	t, upper := b.tail(x)
	if upper {
		return t.Float64()
	}
	return t.Complement()
}

// LogCDF returns log I_x(A, B).
func (b Beta) LogCDF(x float64) float64 {
	t, upper := b.tail(x)
	if upper {
		return t.LogComplement()
	}
	return t.Log()
}

// LogSurvival returns log(1 - I_x(A, B)).
func (b Beta) LogSurvival(x float64) float64 {
	t, upper := b.tail(x)
	if upper {
		return t.Log()
	}
	return t.LogComplement()
}

// Prob returns the beta density.
func (b Beta) Prob(x float64) float64 { return b.density(x).Float64() }

// LogProb returns its logarithm.
func (b Beta) LogProb(x float64) float64 { return b.density(x).Log() }

// Quantile inverts the CDF by bisection over the floats in [0, 1].
func (b Beta) Quantile(p float64) float64 {
	if p > 0.5 {
		return b.UpperQuantile(1 - p)
	}
	return b.bisect(func(x float64) bool { return b.CDF(x) < p })
}

// UpperQuantile inverts the survival function likewise.
func (b Beta) UpperQuantile(q float64) float64 {
	if q > 0.5 {
		return b.Quantile(1 - q)
	}
	return b.bisect(func(x float64) bool { return b.Survival(x) > q })
}

func (b Beta) bisect(below func(float64) bool) float64 {
	lo, hi := uint64(0), math.Float64bits(1)
	for hi-lo > 1 {
		m := lo + (hi-lo)/2
		if below(math.Float64frombits(m)) {
			lo = m
		} else {
			hi = m
		}
	}
	return math.Float64frombits(hi)
}
