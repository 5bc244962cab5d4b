package lrt

import (
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/dist"
)

// ResidualVariances declares the residual likelihood of the spreads of k normal
// samples, their means removed: νᵢ = nᵢ − 1 and parameters sd[1] … sd[k]. The
// comparison of equal sd with free sd is the test of Bartlett (1937): its
// −2 log λ is ν log s² − Σ νᵢ log sᵢ², and the reference Bartlett divides it by
// his C = 1 + (Σ 1/νᵢ − 1/ν)/(3(k − 1)). For two groups the exact test is the
// variance ratio with both tails of this λ. λ is pivotal. It assumes normal
// values and is known to react to their tails more than to their spreads.
// A group of one value has no residual and is refused; one of equal values
// makes the fit ErrUnbounded. (NormalSamples has the likelihood that counts the means.)
func ResidualVariances(s Samples) (*Declared, error) {
	s, total, err := s.check("residual variances", 2, false)
	if err != nil {
		return nil, err
	}
	k := len(s)
	within := NewID(nil)
	tested := func(r, f *Declared) bool { return f.Free() == k && r.Free() == 1 && equalBlock(r, "sd", k) && k > 1 }
	dfs := func(s Samples) (nu, ss []float64) {
		n, _, ss := s.moments()
		for g := range n {
			n[g]--
		}
		return n, ss
	}
	return Bind(Model[Samples]{
		Name:      "residual variances",
		Params:    Block(k, Positive("sd")),
		Criterion: Criterion{Kind: ResidualLikelihood, Within: within},
		LogLikelihood: func(s Samples, th []float64) float64 {
			l := 0.0
			nu, ss := dfs(s)
			for g, v := range nu {
				l -= v*(math.Log(th[g])+0.5*math.Log(2*math.Pi)) + 0.5*ss[g]/th[g]/th[g] + 0.5*math.Log(v+1)
			}
			return l
		},
		Gradient: func(s Samples, th, grad []float64) {
			nu, ss := dfs(s)
			for g, v := range nu {
				grad[g] = (ss[g]/th[g]/th[g] - v) / th[g]
			}
		},
		Start: func(s Samples) []float64 {
			nu, ss := dfs(s)
			pooled := math.Sqrt(sum(ss) / sum(nu))
			if !(pooled > 0) {
				pooled = 1
			}
			th := make([]float64, k)
			for g := range th {
				if th[g] = math.Sqrt(ss[g] / nu[g]); !(th[g] > 0) {
					th[g] = pooled
				}
			}
			return th
		},
		ClosedFor: func(s Samples, r *Declared) ([]float64, bool) {
			if r.frame.layer != nil || r.frame.lower != nil || len(r.frame.params) != k {
				return nil, false
			}
			nu, ss := dfs(s)
			th := make([]float64, k)
			switch {
			case r.Free() == k:
				for g := range th {
					if !(ss[g] > 0) {
						return nil, false
					}
					th[g] = math.Sqrt(ss[g] / nu[g])
				}
			case r.Free() == 1 && equalBlock(r, "sd", k):
				sd := math.Sqrt(sum(ss) / sum(nu))
				for g := range th {
					th[g] = sd
				}
				return th, sd > 0
			default:
				return nil, false
			}
			return th, true
		},
		Exact: func(s Samples, r, f *Declared, p Pair) (Test, error) {
			if !tested(r, f) || k != 2 {
				return Test{Why: "an exact law is known for two groups"}, nil
			}
			nu, ss := dfs(s)
			a, b := nu[0], nu[1]
			t := Test{Kind: Exact, Name: "variance ratio", Statistic: ss[0] / a / (ss[1] / b), Law: dist.F{D1: a, D2: b},
				Why: "the ratio of two normal variances has an F law; p is the probability of a residual λ as small, both tails"}
			t.P, t.LogP = BothTails(t.Law, func(x float64) float64 {
				w := a * x / (a*x + b)
				return 0.5*a*math.Log(w*(a+b)/a) + 0.5*b*math.Log((1-w)*(a+b)/b)
			}, t.Statistic)
			return t, nil
		},
		BartlettFactor: func(s Samples, r, f *Declared, _ Pair) (float64, error) {
			if !tested(r, f) {
				return 0, fmt.Errorf("%w: not a test of equal spread", ErrNoFactor)
			}
			nu, _ := dfs(s)
			c := -1 / sum(nu)
			for _, v := range nu {
				c += 1 / v
			}
			return 1 + c/(3*float64(k-1)), nil
		},
		Pivotal: tested,
		Simulate: func(s Samples, th []float64, src rand.Source) (Samples, error) {
			r := rand.New(src)
			return s.redraw(func(g int) float64 { return th[g] * r.NormFloat64() }), nil
		},
	}, Observe(s, total))
}
