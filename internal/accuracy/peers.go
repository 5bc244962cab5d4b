package accuracy

import (
	"math"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/distuv"
)

// Peers are gonum's laws on the same tables, under the same measure.
var Peers = []Table{
	{File: "chi2", Params: 1, New: func(p []float64) Distribution { return peer{distuv.ChiSquared{K: p[0]}} }, Everyday: everydayDF(1)},
	{File: "f", Params: 2, New: func(p []float64) Distribution { return peer{distuv.F{D1: p[0], D2: p[1]}} }, Everyday: everydayDF(2)},
	{File: "t", Params: 1, New: func(p []float64) Distribution { return peer{distuv.StudentsT{Sigma: 1, Nu: p[0]}} }, Everyday: everydayDF(1)},
	{File: "betainc", Params: 2, New: func(p []float64) Distribution { return peerBeta{p[0], p[1]} }, Everyday: func(p []float64) bool {
		return min(p[0], p[1]) >= 0.25 && max(p[0], p[1]) <= 5e3
	}},
}

// peer adapts a law of gonum, whose panics (it has some on extreme parameters) become NaN.
type peer struct {
	law interface {
		CDF(float64) float64
		Survival(float64) float64
		Prob(float64) float64
		LogProb(float64) float64
	}
}

func guard(f func(float64) float64, x float64) (v float64) {
	defer func() {
		if recover() != nil {
			v = math.NaN()
		}
	}()
	return f(x)
}

func (p peer) CDF(x float64) float64         { return guard(p.law.CDF, x) }
func (p peer) Survival(x float64) float64    { return guard(p.law.Survival, x) }
func (p peer) LogCDF(x float64) float64      { return math.Log(p.CDF(x)) }
func (p peer) LogSurvival(x float64) float64 { return math.Log(p.Survival(x)) }
func (p peer) Prob(x float64) float64        { return guard(p.law.Prob, x) }
func (p peer) LogProb(x float64) float64     { return guard(p.law.LogProb, x) }

type peerBeta struct{ a, b float64 }

func (p peerBeta) CDF(x float64) float64 {
	return guard(func(x float64) float64 { return mathext.RegIncBeta(p.a, p.b, x) }, x)
}

func (p peerBeta) Survival(x float64) float64 {
	return guard(func(x float64) float64 { return mathext.RegIncBeta(p.b, p.a, 1-x) }, x)
}

func (p peerBeta) LogCDF(x float64) float64      { return math.Log(p.CDF(x)) }
func (p peerBeta) LogSurvival(x float64) float64 { return math.Log(p.Survival(x)) }

func (p peerBeta) Prob(x float64) float64 {
	return guard(distuv.Beta{Alpha: p.a, Beta: p.b}.Prob, x)
}

func (p peerBeta) LogProb(x float64) float64 {
	return guard(distuv.Beta{Alpha: p.a, Beta: p.b}.LogProb, x)
}
