package lrt_test

import (
	"context"
	"fmt"
	"log"
	"math"
	"math/rand/v2"

	"subsume.example/lrt"
)

// leaks are counts of leaks on pipe sections, with their lengths in km.
type leaks struct{ count, length []float64 }

func leakModel() lrt.Model[leaks] {
	return lrt.Model[leaks]{
		Name:   "leaks",
		Params: lrt.Block(3, lrt.Positive("rate")),
		LogLikelihood: func(d leaks, th []float64) float64 {
			l := 0.0
			for i, y := range d.count {
				mu := th[i] * d.length[i]
				lg, _ := math.Lgamma(y + 1)
				l += y*math.Log(mu) - mu - lg
			}
			return l
		},
		Start: func(d leaks) []float64 { return []float64{1, 1, 1} },
		Simulate: func(d leaks, th []float64, src rand.Source) (leaks, error) {
			r := rand.New(src)
			out := leaks{make([]float64, 3), d.length}
			for i := range out.count {
				for t := r.ExpFloat64(); t < th[i]*d.length[i]; t += r.ExpFloat64() {
					out.count[i]++
				}
			}
			return out, nil
		},
	}
}

// The counts are small, so the χ² of equal rates is held against data drawn
// at the common rate.
func ExampleBootstrap() {
	full, err := lrt.Bind(leakModel(), lrt.Observe(leaks{[]float64{2, 5, 9}, []float64{10, 12, 8}}, 3))
	if err != nil {
		log.Fatal(err)
	}
	equal, err := lrt.Restrict(full, lrt.Equate(lrt.Names("rate", 3)...))
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), equal, full, &lrt.Settings{Seed: 1, References: []lrt.Reference{lrt.Bootstrap{Draws: 499}}})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("χ² %.4f, %v %.3f\n", r.ChiSquared.P, r.Recommended, r.P())
	// Output:
	// χ² 0.0296, simulated 0.052
}

// What does a parameter, or a function of several, range over?
func ExampleProfile() {
	ctx := context.Background()
	full, err := lrt.Bind(leakModel(), lrt.Observe(leaks{[]float64{2, 5, 9}, []float64{10, 12, 8}}, 3))
	if err != nil {
		log.Fatal(err)
	}
	i, err := lrt.Profile(ctx, full, "rate[3]", 0.95, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("rate[3] %.3f to %.3f\n", i.Lower, i.Upper)
	ratio := lrt.Quantity{Name: "rate[3] over rate[1]", Of: func(x []float64) float64 { return x[2] / x[0] }}
	if i, err = lrt.ProfileOf(ctx, full, ratio, 0.95, nil); err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%s %.3f to %.3f\n", i.Name, i.Lower, i.Upper)
	// Output:
	// rate[3] 0.541 to 2.028
	// rate[3] over rate[1] 1.450 to 36.893
}

// A variance component can only be 0 or more: the law of −2 log λ is half a
// point mass at 0, half χ²(1).
func ExampleCone() {
	type batches [][]float64
	model := lrt.Model[batches]{
		Name:   "batches",
		Params: []lrt.Param{lrt.Real("mean"), lrt.Positive("between"), lrt.Positive("within")},
		LogLikelihood: func(d batches, th []float64) float64 {
			l := 0.0
			for _, y := range d {
				m := float64(len(y))
				var s, ss float64
				for _, v := range y {
					s += v - th[0]
				}
				for _, v := range y {
					e := v - th[0] - s/m
					ss += e * e
				}
				total := th[2] + m*th[1]
				l -= 0.5 * (ss/th[2] + s*s/m/total + (m-1)*math.Log(th[2]) + math.Log(total) + m*math.Log(2*math.Pi))
			}
			return l
		},
		Start: func(batches) []float64 { return []float64{10, 1, 1} },
	}
	data := batches{{10.2, 10.9, 9.8}, {11.6, 12.1, 11.1}, {9.1, 9.9, 10.0}, {11.0, 10.4, 12.0}}
	full, err := lrt.Bind(model, lrt.Observe(data, 12))
	if err != nil {
		log.Fatal(err)
	}
	none, err := lrt.Restrict(full, lrt.Fix("between", 0))
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), none, full, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%v, p = %.4f\n", r.Boundary.Law, r.P())
	fmt.Println(r.ChiSquared.Why)
	// Output:
	// ChiBarSquared(0.5, 0.5), p = 0.0339
	// inequalities take part: the law is a mixture
}

// The mixture is far off for few groups: the exact law of this design needs no fits.
func ExampleVarianceComponent() {
	law, err := lrt.OneWayVariance([]int{3, 3, 3, 3}, false)
	if err != nil {
		log.Fatal(err)
	}
	law.Draws = 4999
	observed := lrt.Pair{Full: lrt.Fit{N: 12, LogLikelihood: 3.33672933 / 2}}
	t, err := law.Refer(context.Background(), lrt.Comparison{}, observed, &lrt.Settings{Seed: 1})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("p = %.3f\n", t.P)
	// Output:
	// p = 0.018
}
