package main

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/dist"
	"subsume.example/lrt"
)

// verdict is one reference's p-value on one data set.
type verdict struct {
	name            string
	p               float64
	exact, discrete bool
}

type testCase struct {
	name      string
	sets      int
	resampled bool
	run       func(ctx context.Context, seed uint64, i int) ([]verdict, error)
}

func source(seed uint64, i int) *rand.Rand {
	return rand.New(rand.NewPCG(seed*0x9e3779b97f4a7c15, uint64(i)*0xbf58476d1ce4e5b9+seed))
}

// pair runs a comparison of a full declared space with some restrictions.
func pair(ctx context.Context, full *lrt.Declared, refs []lrt.Reference, rs ...lrt.Restriction) (lrt.Result, error) {
	small, err := full.Restrict(rs...)
	if err != nil {
		return lrt.Result{}, err
	}
	return lrt.Compare(ctx, small, full, &lrt.Settings{Workers: 1, References: refs})
}

func cases(sets, numeric, resampled int) []testCase {
	var cs []testCase
	add := func(name string, n int, run func(ctx context.Context, seed uint64, i int) ([]verdict, error)) {
		cs = append(cs, testCase{name: name, sets: n, run: run})
	}
	for _, n := range []int{5, 10, 20, 50} {
		add(fmt.Sprintf("one-way F, 3 groups of %d", n), sets, func(_ context.Context, seed uint64, i int) ([]verdict, error) {
			return oneWay(source(seed, i), 3, n), nil
		})
		add(fmt.Sprintf("equal normal variances, 2 groups of %d", n), sets, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
			r := source(seed, i)
			full, err := lrt.NormalSamples(normals(r, 2, n))
			if err != nil {
				return nil, err
			}
			res, err := pair(ctx, full, []lrt.Reference{lrt.Bartlett{}}, lrt.Equate(lrt.Names("sd", 2)...))
			if err != nil {
				return nil, err
			}
			return []verdict{{"variance ratio, both tails of λ", res.Exact.P, true, false}, {"χ²", res.ChiSquared.P, false, false}, {"Bartlett", res.Others[0].P, false, false}}, nil
		})
		add(fmt.Sprintf("exponential means, 2 groups of %d", n), sets, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
			return exponential(ctx, source(seed, i), 2, n)
		})
		add(fmt.Sprintf("exponential means, 5 groups of %d", n), sets, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
			return exponential(ctx, source(seed, i), 5, n)
		})
		add(fmt.Sprintf("Poisson rates, 2 counts of mean %d", n), sets, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
			r := source(seed, i)
			full, err := lrt.PoissonRates(lrt.Exposure{Events: []float64{poisson(r, float64(n)), poisson(r, float64(n))}, Time: []float64{1, 1}})
			if err != nil {
				return nil, err
			}
			res, err := pair(ctx, full, nil, lrt.Equate("rate[1]", "rate[2]"))
			if err != nil {
				return nil, err
			}
			return []verdict{{"binomial given the total", res.Exact.P, true, true}, {"χ²", res.ChiSquared.P, false, false}}, nil
		})
		add(fmt.Sprintf("goodness of fit 9:3:3:1, %d events", 4*n), sets, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
			r := source(seed, i)
			cells := make([]float64, 4)
			for range 4 * n {
				switch u := r.Float64() * 16; {
				case u < 9:
					cells[0]++
				case u < 12:
					cells[1]++
				case u < 15:
					cells[2]++
				default:
					cells[3]++
				}
			}
			full, err := lrt.Multinomial(cells)
			if err != nil {
				return nil, err
			}
			res, err := pair(ctx, full, []lrt.Reference{lrt.Bartlett{}}, lrt.Fix("p[1]", 9./16), lrt.Fix("p[2]", 3./16), lrt.Fix("p[3]", 3./16), lrt.Fix("p[4]", 1./16))
			if err != nil {
				return nil, err
			}
			return []verdict{{"χ²", res.ChiSquared.P, false, false}, {"Williams", res.Others[0].P, false, false}}, nil
		})
		for _, d := range []struct{ p, k int }{{2, 2}, {2, 4}, {3, 5}} {
			add(fmt.Sprintf("mean vectors, %d responses, %d groups of %d", d.p, d.k, n), sets/10, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
				return meanVectors(ctx, source(seed, i), d.p, d.k, n)
			})
		}
		add(fmt.Sprintf("Weibull shapes, 2 groups of %d", n), numeric, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
			r := source(seed, i)
			s := make(lrt.Samples, 2)
			for g := range s {
				for range n {
					s[g] = append(s[g], r.ExpFloat64())
				}
			}
			full, err := lrt.WeibullSamples(s)
			if err != nil {
				return nil, err
			}
			res, err := pair(ctx, full, nil, lrt.Equate("shape[1]", "shape[2]"))
			if err != nil {
				return nil, err
			}
			return []verdict{{"χ²", res.ChiSquared.P, false, false}}, nil
		})
		add(fmt.Sprintf("variance component at 0, %d groups of 4", n), numeric, func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
			return component(ctx, source(seed, i), n, 4)
		})
		cs = append(cs, testCase{name: fmt.Sprintf("exponential means, 3 groups of %d, 199 draws", n), sets: resampled, resampled: true,
			run: func(ctx context.Context, seed uint64, i int) ([]verdict, error) {
				full, err := lrt.ExponentialMeans(exposure(source(seed, i), 3, n), true)
				if err != nil {
					return nil, err
				}
				small, err := full.Restrict(lrt.Equate(lrt.Names("mean", 3)...))
				if err != nil {
					return nil, err
				}
				res, err := lrt.Compare(ctx, small, full, &lrt.Settings{Workers: 1, Seed: uint64(i) + 1, References: []lrt.Reference{lrt.Bootstrap{Draws: 199}}})
				if err != nil {
					return nil, err
				}
				return []verdict{{"bootstrap", res.Others[0].P, false, false}}, nil
			}})
	}
	return cs
}

func normals(r *rand.Rand, k, n int) lrt.Samples {
	s := make(lrt.Samples, k)
	for g := range s {
		s[g] = make([]float64, n)
		for i := range s[g] {
			s[g][i] = r.NormFloat64()
		}
	}
	return s
}

// oneWay is the F of a one-way layout through lrt.Linear, and the χ² of its λ.
func oneWay(r *rand.Rand, k, n int) []verdict {
	s := normals(r, k, n)
	means := make([]float64, k)
	var grand, within, between float64
	for g, x := range s {
		for _, v := range x {
			means[g] += v / float64(n)
		}
		grand += means[g] / float64(k)
	}
	for g, x := range s {
		for _, v := range x {
			within += (v - means[g]) * (v - means[g])
		}
		between += float64(n) * (means[g] - grand) * (means[g] - grand)
	}
	l := lrt.Linear{RankS: 1, RankB: k, RankE0: k, RankE1: k * n, Numerator: between, Denominator: within, M: float64(k * n), Certified: true}
	_, p, _ := l.F()
	return []verdict{{"F", p, true, false}, {"χ²", dist.ChiSquared{K: float64(k - 1)}.Survival(-2 * l.LogLambda()), false, false}}
}

func exposure(r *rand.Rand, k, n int) lrt.Exposure {
	e := lrt.Exposure{Events: make([]float64, k), Time: make([]float64, k)}
	for g := range k {
		e.Events[g] = float64(n)
		for range n {
			e.Time[g] += r.ExpFloat64()
		}
	}
	return e
}

func exponential(ctx context.Context, r *rand.Rand, k, n int) ([]verdict, error) {
	full, err := lrt.ExponentialMeans(exposure(r, k, n), true)
	if err != nil {
		return nil, err
	}
	res, err := pair(ctx, full, []lrt.Reference{lrt.Bartlett{}}, lrt.Equate(lrt.Names("mean", k)...))
	if err != nil {
		return nil, err
	}
	vs := []verdict{{"χ²", res.ChiSquared.P, false, false}, {"Bartlett", res.Others[0].P, false, false}}
	if k == 2 {
		vs = append(vs, verdict{"F, both tails of λ", res.Exact.P, true, false})
	}
	return vs, nil
}

func poisson(r *rand.Rand, mu float64) float64 {
	n := 0.0
	for t := r.ExpFloat64(); t < mu; t += r.ExpFloat64() {
		n++
	}
	return n
}

func meanVectors(ctx context.Context, r *rand.Rand, p, k, n int) ([]verdict, error) {
	rows, group := make([][]float64, 0, k*n), make([]int, 0, k*n)
	for g := range k {
		for range n {
			x := make([]float64, p)
			common := r.NormFloat64()
			for j := range x {
				x[j] = r.NormFloat64() + common
			}
			rows, group = append(rows, x), append(group, g)
		}
	}
	m, err := lrt.NewMeanVectors(rows, group)
	if err != nil {
		return nil, err
	}
	res, err := lrt.Compare(ctx, m.Equal(), m.Free(), &lrt.Settings{Workers: 1, References: []lrt.Reference{lrt.Bartlett{}}})
	if err != nil {
		return nil, err
	}
	return []verdict{{res.Exact.Name, res.Exact.P, res.Exact.Kind == lrt.Exact, false}, {"χ²", res.ChiSquared.P, false, false}, {"Bartlett", res.Others[0].P, false, false}}, nil
}

// component tests a variance component at the end of its range by maximum
// likelihood in a balanced layout.
func component(ctx context.Context, r *rand.Rand, k, m int) ([]verdict, error) {
	y := make([]float64, k*m)
	for i := range y {
		y[i] = r.NormFloat64()
	}
	full, err := lrt.Bind(lrt.Model[[]float64]{
		Params: []lrt.Param{lrt.Real("mean"), lrt.Positive("between"), lrt.Positive("within")},
		LogLikelihood: func(y, th []float64) float64 {
			l, v, total := 0.0, th[2], th[2]+float64(m)*th[1]
			for g := range k {
				var s, ss float64
				for _, x := range y[g*m : g*m+m] {
					s += x - th[0]
				}
				for _, x := range y[g*m : g*m+m] {
					e := x - th[0] - s/float64(m)
					ss += e * e
				}
				l -= 0.5 * (ss/v + s*s/float64(m)/total + float64(m-1)*math.Log(v) + math.Log(total))
			}
			return l
		},
		Start: func(y []float64) []float64 { return []float64{0, 0.5, 1} },
	}, lrt.Observe(y, k*m))
	if err != nil {
		return nil, err
	}
	res, err := pair(ctx, full, nil, lrt.Fix("between", 0))
	if err != nil {
		return nil, err
	}
	return []verdict{{"½χ²(0) + ½χ²(1)", res.Boundary.P, false, false}, {"χ²(1), wrongly", dist.ChiSquared{K: 1}.Survival(res.Statistic), false, false}}, nil
}
