package lrt_test

import (
	"context"
	"fmt"
	"log"
	"math"

	"subsume.example/dist"
	"subsume.example/lrt"
)

// compare runs a comparison of a space with the part of it on which the
// restrictions hold.
func compare(full *lrt.Declared, s *lrt.Settings, rs ...lrt.Restriction) lrt.Result {
	small, err := full.Restrict(rs...)
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), small, full, s)
	if err != nil {
		log.Fatal(err)
	}
	return r
}

// Do three paint robots make blemishes at one rate per square metre?
func ExamplePoissonRates() {
	full, err := lrt.PoissonRates(lrt.Exposure{Events: []float64{14, 25, 9}, Time: []float64{120, 130, 110}})
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, nil, lrt.Equate(lrt.Names("rate", 3)...))
	fmt.Printf("−2 log λ = %.4f, p = %.4f\n", r.Statistic, r.P())
	// Output:
	// −2 log λ = 5.7830, p = 0.0555
}

// Hours to failure of two kinds of bearing, all run to failure.
func ExampleExponentialMeans() {
	full, err := lrt.ExponentialMeans(lrt.Exposure{Events: []float64{8, 6}, Time: []float64{4120, 1310}}, true)
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, &lrt.Settings{References: []lrt.Reference{lrt.Bartlett{}}}, lrt.Equate("mean[1]", "mean[2]"))
	fmt.Printf("χ² %.4f, corrected %.4f, exact %.4f\n", r.ChiSquared.P, r.Others[0].P, r.Exact.P)
	// Output:
	// χ² 0.1246, corrected 0.1314, exact 0.1315
}

// Seed colours expected as 9 to 3 to 4.
func ExampleMultinomial() {
	full, err := lrt.Multinomial([]float64{98, 27, 35})
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, nil, lrt.Fix("p[1]", 9./16), lrt.Fix("p[2]", 3./16), lrt.Fix("p[3]", 4./16))
	fmt.Printf("−2 log λ = %.4f on %g, p = %.4f\n", r.Statistic, r.Pair.DF, r.P())
	// Output:
	// −2 log λ = 1.6543 on 2, p = 0.4373
}

// Is a complaint as likely on every shift?
func ExampleNewCrossTable() {
	table, err := lrt.NewCrossTable([][]float64{{12, 388}, {19, 341}, {31, 329}})
	if err != nil {
		log.Fatal(err)
	}
	homogeneous, err := table.Independent()
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), homogeneous, table.Full(), &lrt.Settings{References: []lrt.Reference{lrt.ScoreTest{}}})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("−2 log λ = %.3f, Pearson %.3f, p = %.5f\n", r.Statistic, r.Others[0].Statistic, r.P())
	// Output:
	// −2 log λ = 11.515, Pearson 11.475, p = 0.00316
}

var weights = lrt.Samples{{50.2, 49.8, 50.9, 50.1, 49.7, 50.4}, {51.9, 48.0, 50.3, 53.1, 47.2, 50.8, 49.1}}

// Two filling lines: is their spread the same?
func ExampleNormalSamples() {
	full, err := lrt.NormalSamples(weights)
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, nil, lrt.Equate("sd[1]", "sd[2]"))
	fmt.Print(r)
	// Output:
	// log λ = -5.74099, λ = 0.00321159, −2 log λ = 11.482
	// asymptotic: −2 log λ referred to ChiSquared(1), p = 0.0007027
	// exact: variance ratio = 0.0428187 referred to F(5, 6), p = 0.002765
	// read the exact test: the ratio of two normal variances has an F law; p is the probability of a λ as small, both tails
}

// Breaking loads of two fibres: one Weibull shape? The bootstrap is exact here.
func ExampleWeibullSamples() {
	full, err := lrt.WeibullSamples(lrt.Samples{{3.1, 4.7, 2.2, 5.0, 3.9, 4.1}, {4.4, 4.9, 5.3, 4.1, 5.6, 5.0, 4.6}})
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, &lrt.Settings{Seed: 7, References: []lrt.Reference{lrt.Bootstrap{Draws: 999, Stop: 20}}}, lrt.Equate("shape[1]", "shape[2]"))
	fmt.Printf("χ² %.3f, %v %.2f\n", r.ChiSquared.P, r.Recommended, r.P())
	// Output:
	// χ² 0.071, simulated 0.12
}

// Gloss and hardness of boards from two presses, taken together.
func ExampleNewMeanVectors() {
	boards := [][]float64{{71, 5.1}, {74, 5.6}, {69, 5.0}, {73, 5.9}, {76, 5.2}, {72, 6.3}, {78, 6.1}, {75, 6.8}, {79, 6.5}, {77, 7.0}}
	m, err := lrt.NewMeanVectors(boards, []int{0, 0, 0, 0, 0, 1, 1, 1, 1, 1})
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), m.Equal(), m.Free(), nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%s = %.4f, %v, p = %.4f\n", r.Exact.Name, r.Exact.Statistic, r.Exact.Law, r.P())
	// Output:
	// F of Hotelling's T² = 11.4255, F(2, 7), p = 0.0062
}

// How often would the comparison of two bearings find a mean life three times as long?
func ExampleComparison_SimulatePower() {
	full, err := lrt.ExponentialMeans(lrt.Exposure{Events: []float64{10, 10}, Time: []float64{1, 1}}, true)
	if err != nil {
		log.Fatal(err)
	}
	small, err := full.Restrict(lrt.Equate("mean[1]", "mean[2]"))
	if err != nil {
		log.Fatal(err)
	}
	c := lrt.Comparison{Restricted: small, Full: full}
	p, err := c.SimulatePower(context.Background(), []float64{3, 1}, 0.05, 2000, &lrt.Settings{Seed: 1})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%.2f ± %.2f\n", p.Power, p.StdErr)
	// Output:
	// 0.67 ± 0.01
}

// Expected counts in place of data give the power of a comparison of rates.
func ExampleComparison_Plan() {
	expected, err := lrt.PoissonRates(lrt.Exposure{Events: []float64{20, 36}, Time: []float64{100, 100}})
	if err != nil {
		log.Fatal(err)
	}
	small, err := expected.Restrict(lrt.Equate("rate[1]", "rate[2]"))
	if err != nil {
		log.Fatal(err)
	}
	plan, err := lrt.Comparison{Restricted: small, Full: expected}.Plan(context.Background(), 0, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("noncentrality %.3f, power %.3f\n", plan.Noncentrality, plan.Power(0.05))
	// Output:
	// noncentrality 4.636, power 0.577
}

// Equal means and equal spreads are not nested in each other: criteria compare
// them, without a p-value.
func ExampleByInformation() {
	full, err := lrt.NormalSamples(weights)
	if err != nil {
		log.Fatal(err)
	}
	means, err := full.Restrict(lrt.Equate("mean[1]", "mean[2]"))
	if err != nil {
		log.Fatal(err)
	}
	spreads, err := full.Restrict(lrt.Equate("sd[1]", "sd[2]"))
	if err != nil {
		log.Fatal(err)
	}
	is, err := lrt.ByInformation(context.Background(), means, spreads, full)
	if err != nil {
		log.Fatal(err)
	}
	for _, i := range is {
		fmt.Printf("%v: AIC +%.2f, BIC +%.2f\n", i.Space, i.AICAbove, i.BICAbove)
	}
	// Output:
	// normal samples: mean[1] = mean[2]: AIC +0.00, BIC +0.00
	// normal samples: sd[1] = sd[2]: AIC +11.45, BIC +11.45
	// normal samples: all parameters free: AIC +1.97, BIC +2.54
}

// Four rates on a line: fewer parameters through a map.
func ExampleVia() {
	full, err := lrt.PoissonRates(lrt.Exposure{Events: []float64{3, 7, 12, 20}, Time: []float64{1, 1, 1, 1}})
	if err != nil {
		log.Fatal(err)
	}
	line, err := full.Restrict(lrt.Via(lrt.Map{
		Params: []lrt.Param{lrt.Real("level"), lrt.Real("slope")},
		To: func(phi, rate []float64) {
			for i := range rate {
				rate[i] = math.Exp(phi[0] + phi[1]*float64(i))
			}
		},
	}))
	if err != nil {
		log.Fatal(err)
	}
	fit, err := line.Maximize(context.Background())
	if err != nil {
		log.Fatal(err)
	}
	e, err := line.(*lrt.Declared).Estimates(context.Background(), fit)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%s %.4f ± %.4f\n", e.Names[1], e.Value[1], e.StdErr[1])
	// Output:
	// slope 0.5831 ± 0.1579
}

// The border of a joint region, for a picture.
func ExampleProfileRegion() {
	full, err := lrt.WeibullSamples(lrt.Samples{{3.1, 4.7, 2.2, 5.0, 3.9, 4.1, 2.9, 4.4}})
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.ProfileRegion(context.Background(), full, "shape[1]", "scale[1]", 0.95, 4, nil)
	if err != nil {
		log.Fatal(err)
	}
	for _, p := range r.Border {
		fmt.Printf("%.3f %.3f\n", p[0], p[1])
	}
	c, err := lrt.ProfileCurve(context.Background(), full, "shape[1]", []float64{2, 4, 8}, nil)
	if err != nil {
		log.Fatal(err)
	}
	for _, p := range c {
		fmt.Printf("shape %g: √(−2 log λ) = %.3f\n", p.Value, p.SignedRoot)
	}
	// Output:
	// 9.511 4.344
	// 5.060 5.054
	// 2.169 3.879
	// 5.060 3.564
	// shape 2: √(−2 log λ) = -2.642
	// shape 4: √(−2 log λ) = -0.765
	// shape 8: √(−2 log λ) = 1.713
}

// Both tails of a likelihood ratio of two variances, 3.5 with 3 and 19 degrees
// of freedom, and the equal-tailed p-value, which is another thing.
func ExampleBothTails() {
	law := dist.F{D1: 3, D2: 19}
	p, _ := lrt.BothTails(law, func(x float64) float64 {
		w := 3 * x / 19
		return 2*math.Log(w/(1+w)*6) + 10*math.Log(1.2/(1+w))
	}, 3.5)
	fmt.Printf("%.3f, equal tails %.3f\n", p, 2*law.Survival(3.5))
	// Output:
	// 0.241, equal tails 0.071
}

// Is the mean of the second line larger, as the supplier says?
func ExampleSignedRoot() {
	full, err := lrt.NormalSamples(lrt.Samples{weights[0]})
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, &lrt.Settings{References: []lrt.Reference{lrt.SignedRoot{Name: "mean[1]"}, lrt.WaldTest{}}}, lrt.Fix("mean[1]", 50))
	fmt.Printf("signed root %.3f, one-sided p %.3f; Wald %.3f\n", r.Others[0].Statistic, r.Others[0].P, r.Others[1].Statistic)
	// Output:
	// signed root 1.076, one-sided p 0.141; Wald 1.276
}

// A closed form of a restricted space: two exponential means in the ratio 2 to 1.
func ExampleSolveBy() {
	full, err := lrt.ExponentialMeans(lrt.Exposure{Events: []float64{8, 6}, Time: []float64{4120, 1310}}, true)
	if err != nil {
		log.Fatal(err)
	}
	ratio, err := full.Restrict(lrt.Equations(lrt.Equation{Names: lrt.Names("mean", 2), Coef: []float64{1, -2}, Value: 0}))
	if err != nil {
		log.Fatal(err)
	}
	solved, err := lrt.SolveBy(ratio, func(e lrt.Exposure) ([]float64, error) {
		m := (e.Time[0]/2 + e.Time[1]) / (e.Events[0] + e.Events[1])
		return []float64{2 * m, m}, nil
	})
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), solved, full, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%v: −2 log λ = %.4f\n", ratio, r.Statistic)
	// Output:
	// exponential means: mean[1] − 2·mean[2] = 0: −2 log λ = 0.0925
}
