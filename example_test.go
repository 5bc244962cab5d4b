package subsume_test

import (
	"context"
	"fmt"
	"log"
	"math"
	"strings"

	"subsume.example/anova"
	"subsume.example/dist"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// tiles is an invented trial: thickness of pressed tiles by curing oven, with the
// moisture of the granulate.
const tiles = `oven,moisture,thickness
east,7.1,12.31
east,6.8,12.04
east,7.9,12.20
east,7.4,12.15
west,7.0,12.55
west,6.5,12.48
west,7.7,12.71
north,7.2,12.24
north,7.3,12.39
north,6.9,12.19
`

var ctx = context.Background()

func Example_dist() {
	law := dist.F{D1: 3, D2: 20}
	fmt.Printf("P(F > 1e8) = %.6g, its logarithm %.6f\n", law.Survival(1e8), law.LogSurvival(1e8))
	fmt.Printf("5 %% point %.6f\n", law.UpperQuantile(0.05))
	truth := dist.NoncentralF{D1: 3, D2: 20, Lambda: 12}
	fmt.Printf("power at noncentrality 12: %.6f\n", truth.Survival(law.UpperQuantile(0.05)))
	lambda, err := dist.NoncentralityF(3, 20, law.UpperQuantile(0.05), 0.9)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("power 0.9 needs %.6f\n", lambda)
	// Output:
	// P(F > 1e8) = 6.4166e-72, its logarithm -163.927238
	// 5 % point 3.098391
	// power at noncentrality 12: 0.754586
	// power 0.9 needs 17.290746
}

func Example_lrt() {
	// Hours to failure of two batches of seals: is one rate enough?
	hours := [][]float64{{41, 118, 67, 230, 12, 155}, {190, 402, 88, 510, 260}}
	rates := lrt.Model[[][]float64]{
		Name:   "constant rates",
		Params: lrt.Block(2, lrt.Positive("rate")),
		LogLikelihood: func(d [][]float64, rate []float64) (l float64) {
			for batch, times := range d {
				for _, t := range times {
					l += math.Log(rate[batch]) - rate[batch]*t
				}
			}
			return l
		},
	}
	full, err := lrt.Bind(rates, lrt.Observe(hours, 11))
	if err != nil {
		log.Fatal(err)
	}
	equal, err := full.Restrict(lrt.Equate("rate[1]", "rate[2]"))
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(ctx, equal, full, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("λ = %.5f, −2 log λ = %.5f on %v, p = %.5f\n", r.Lambda, r.Statistic, r.ChiSquared.Law, r.ChiSquared.P)
	// Output:
	// λ = 0.24140, −2 log λ = 2.84260 on ChiSquared(1), p = 0.09180
}

func Example_glm() {
	data, err := glm.ReadCSV(ctx, strings.NewReader(tiles), nil)
	if err != nil {
		log.Fatal(err)
	}
	one, err := glm.Normal(ctx, data, "thickness", []glm.Term{glm.Constant{}, glm.Covariate{Field: "moisture"}}, nil)
	if err != nil {
		log.Fatal(err)
	}
	three, err := one.With(ctx, glm.Factor{Field: "oven"})
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(ctx, one, three, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%v: F = %.4f, p = %.5f\n", r.Exact.Law, r.Exact.Statistic, r.Exact.P)
	fit, err := three.Fit(ctx, nil)
	if err != nil {
		log.Fatal(err)
	}
	for _, c := range fit.Coefficients {
		if !c.Aliased { // oven=east is what the others are compared with
			fmt.Printf("%-10s %8.4f ± %.4f\n", c.Name, c.Estimate, c.SE)
		}
	}
	// Output:
	// F(2, 6): F = 19.1099, p = 0.00250
	// constant    11.0321 ± 0.5567
	// moisture     0.1566 ± 0.0760
	// oven=west    0.4415 ± 0.0726
	// oven=north   0.1244 ± 0.0716
}

func Example_anova() {
	data, err := glm.ReadCSV(ctx, strings.NewReader(tiles), nil)
	if err != nil {
		log.Fatal(err)
	}
	rows, err := anova.OneWay(ctx, data, "thickness", "oven", &anova.Options{Covariates: []string{"moisture"}})
	if err != nil {
		log.Fatal(err)
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Print(table)
	// Output:
	// What explains thickness
	// n = 10 · R² = 0.8657
	//
	// source     sum of squares   df   mean square           F          p   reading      log λ
	// ────────────────────────────────────────────────────────────────────────────────────────
	// moisture         0.003980    1      0.003980    0.467759   0.5195     exact     −0.26275
	// oven             0.325207    2      0.162603   19.1099     0.002498   exact     −9.9871
	// error            0.051053    6      0.008509
	// total            0.380240    9
	//
	// - moisture: constant inside constant + moisture
	// - oven: constant + moisture inside constant + moisture + oven
	// - error: what constant + moisture + oven leaves
	// - log λ is a ratio over all rows where the error of the row is what its own larger model leaves,
	//   else over the stratum of the row and its error
}
