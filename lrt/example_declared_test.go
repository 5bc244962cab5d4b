package lrt_test

import (
	"context"
	"errors"
	"fmt"
	"log"
	"math"

	"subsume.example/dist"
	"subsume.example/lrt"
)

// lifetimes are hours to failure of pump seals from two batches.
type lifetimes [2][]float64

var seals = lifetimes{
	{41, 118, 67, 230, 12, 155, 90, 301, 77, 49},
	{190, 402, 88, 510, 260, 333, 610, 145},
}

// Weibull lifetimes whose shapes may differ between batches, against one
// shape: no closed form, so the declared model is fitted numerically.
func ExampleBind() {
	model := lrt.Model[lifetimes]{
		Name:   "weibull",
		Params: append(lrt.Block(2, lrt.Positive("shape")), lrt.Block(2, lrt.Positive("scale"))...),
		LogLikelihood: func(d lifetimes, th []float64) float64 {
			l := 0.0
			for b, hours := range d {
				shape, scale := th[b], th[2+b]
				for _, t := range hours {
					z := t / scale
					l += math.Log(shape/scale) + (shape-1)*math.Log(z) - math.Pow(z, shape)
				}
			}
			return l
		},
		Start: func(lifetimes) []float64 { return []float64{1, 1, 100, 100} },
	}
	ctx := context.Background()
	full, err := lrt.Bind(model, lrt.Observe(seals, 18))
	if err != nil {
		log.Fatal(err)
	}
	equal, err := full.Restrict(lrt.Equate("shape[1]", "shape[2]"))
	if err != nil {
		log.Fatal(err)
	}
	fmt.Println(equal)
	r, err := lrt.Compare(ctx, equal, full, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("−2 log λ = %.4f, %v, p = %.4f\n", r.Statistic, r.ChiSquared.Law, r.ChiSquared.P)
	e, err := full.Estimates(ctx, r.Pair.Full)
	if err != nil {
		log.Fatal(err)
	}
	for i, name := range e.Names {
		fmt.Printf("%s %.3f ± %.3f\n", name, e.Value[i], e.StdErr[i])
	}
	// Output:
	// weibull: shape[1] = shape[2]
	// −2 log λ = 0.9753, ChiSquared(1), p = 0.3234
	// shape[1] 1.355 ± 0.333
	// shape[2] 1.975 ± 0.560
	// scale[1] 124.738 ± 30.726
	// scale[2] 359.106 ± 67.809
}

// rates is a custom space with a closed form: exponential lifetimes of two
// batches with one failure rate, or one each.
type rates struct {
	sample lrt.Sample[lifetimes]
	shared bool
}

func (r rates) Observations() lrt.Observations { return r.sample.Observations() }

func (r rates) Maximize(context.Context) (lrt.Fit, error) {
	f := lrt.Fit{N: r.sample.N, Deviance: math.NaN()}
	var all, time float64
	for _, hours := range r.sample.Value {
		n, t := float64(len(hours)), total(hours)
		f.LogLikelihood += n * (math.Log(n/t) - 1)
		f.Dim++
		all, time = all+n, time+t
	}
	if r.shared {
		f.LogLikelihood, f.Dim = all*(math.Log(all/time)-1), 1
	}
	return f, nil
}

// ReferExact: λ depends on the ratio of the two mean lifetimes alone, which is
// F with 2n₁ and 2n₂ degrees of freedom under one rate.
func (r rates) ReferExact(_ context.Context, c lrt.Comparison, p lrt.Pair) (lrt.Test, error) {
	if s, ok := c.Restricted.(rates); !ok || !s.shared {
		return lrt.Test{Why: "exact only against one shared rate"}, nil
	}
	a, b := r.sample.Value[0], r.sample.Value[1]
	n, m := float64(len(a)), float64(len(b))
	x := total(a) / n / (total(b) / m)
	t := lrt.Test{Kind: lrt.Exact, Name: "ratio of means", Statistic: x, Law: dist.F{D1: 2 * n, D2: 2 * m}, Why: "the ratio of two exponential means has an F law whatever the sample sizes"}
	t.P, t.LogP = lrt.BothTails(t.Law, func(x float64) float64 {
		w := n * x / (n*x + m)
		return n*math.Log(w*(n+m)/n) + m*math.Log((1-w)*(n+m)/m)
	}, x)
	return t, nil
}

// NestedIn: one shared rate lies inside two.
func (r rates) NestedIn(larger lrt.Space) error {
	if l, ok := larger.(rates); ok && (r.shared || !l.shared) {
		return nil
	}
	return fmt.Errorf("%w: two rates are not one", lrt.ErrNotNested)
}

func total(x []float64) (s float64) {
	for _, v := range x {
		s += v
	}
	return s
}

// A closed form and an exact law take a dozen lines each.
func ExampleSpace() {
	sample := lrt.Observe(seals, 18)
	r, err := lrt.Compare(context.Background(), rates{sample, true}, rates{sample, false}, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Print(r)
	_, err = lrt.Compare(context.Background(), rates{sample, false}, rates{sample, true}, nil)
	fmt.Println(errors.Is(err, lrt.ErrNotNested))
	// Output:
	// log λ = -2.31604, λ = 0.0986633, −2 log λ = 4.63208
	// asymptotic: −2 log λ referred to ChiSquared(1), p = 0.03138
	// exact: ratio of means = 0.359338 referred to F(20, 16), p = 0.03378
	// read the exact test: the ratio of two exponential means has an F law whatever the sample sizes
	// true
}

// A chain from one rate for all to a free Weibull law for each batch.
func ExampleChain() {
	model := lrt.Model[lifetimes]{
		Name:   "weibull",
		Params: append(lrt.Block(2, lrt.Positive("shape")), lrt.Block(2, lrt.Positive("scale"))...),
		Each: func(d lifetimes, th, each []float64) {
			i := 0
			for b, hours := range d {
				shape, scale := th[b], th[2+b]
				for _, t := range hours {
					z := t / scale
					each[i] = math.Log(shape/scale) + (shape-1)*math.Log(z) - math.Pow(z, shape)
					i++
				}
			}
		},
	}
	full, err := lrt.Bind(model, lrt.Observe(seals, 18))
	if err != nil {
		log.Fatal(err)
	}
	spaces := []lrt.Space{full}
	for _, more := range []lrt.Restriction{
		lrt.Equate("shape[1]", "shape[2]"),
		lrt.Fix("shape[1]", 1),
		lrt.Equate("scale[1]", "scale[2]"),
	} {
		s, err := lrt.Restrict(spaces[0], more)
		if err != nil {
			log.Fatal(err)
		}
		spaces = append([]lrt.Space{s}, spaces...)
	}
	rs, err := lrt.Chain(context.Background(), spaces, false, nil)
	if err != nil {
		log.Fatal(err)
	}
	for _, r := range rs {
		fmt.Printf("%v\n  given %v: −2 log λ = %.3f, p = %.3f\n", r.Comparison.Restricted, r.Comparison.Full, r.Statistic, r.P())
	}
	// Output:
	// weibull: shape[1] = 1, shape[2] = 1, scale[1] = scale[2]
	//   given weibull: shape[1] = 1, shape[2] = 1: −2 log λ = 4.632, p = 0.031
	// weibull: shape[1] = 1, shape[2] = 1
	//   given weibull: shape[1] = shape[2]: −2 log λ = 4.661, p = 0.031
	// weibull: shape[1] = shape[2]
	//   given weibull: all parameters free: −2 log λ = 0.975, p = 0.323
}

// Restrictions can be stated one after the other, in any order.
func ExampleRestrict() {
	model := lrt.Model[int]{
		Name:          "cells",
		Params:        lrt.Block(3, lrt.Unit("p")),
		LogLikelihood: func(int, []float64) float64 { return 0 },
	}
	cells, err := lrt.Bind(model, lrt.Observe(0, 1))
	if err != nil {
		log.Fatal(err)
	}
	s, err := lrt.Restrict(cells, lrt.Equations(lrt.Equation{Names: lrt.Names("p", 3), Coef: []float64{1, 1, 1}, Value: 1}))
	if err != nil {
		log.Fatal(err)
	}
	s, err = lrt.Restrict(s, lrt.Equate("p[1]", "p[3]"), lrt.AtMost("p[2]", 0.5))
	if err != nil {
		log.Fatal(err)
	}
	fmt.Println(s)
	_, err = lrt.Restrict(s, lrt.Fix("p[3]", 0.3), lrt.Fix("p[2]", 0.45))
	fmt.Println(err)
	// Output:
	// cells: p[1] = p[3], p[2] + 2·p[3] = 1, p[2] ≤ 0.5
	// lrt: restriction p[2] = 0.45: restrictions contradict each other: it cannot hold together with p[1] = 0.3, p[2] = 0.4, p[3] = 0.3, p[2] ≤ 0.5
}
