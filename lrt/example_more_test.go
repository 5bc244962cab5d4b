package lrt_test

import (
	"context"
	"fmt"
	"log"

	"subsume.example/lrt"
)

// Blocks of parameters get numbered names.
func ExampleBlock() {
	for _, p := range lrt.Block(2, lrt.Positive("rate")) {
		fmt.Println(p.Name, p.Lower, p.Upper)
	}
	fmt.Println(lrt.Names("rate", 3))
	// Output:
	// rate[1] 0 +Inf
	// rate[2] 0 +Inf
	// [rate[1] rate[2] rate[3]]
}

// Moisture of planks from three kilns: Bartlett's test of equal spread.
func ExampleResidualVariances() {
	full, err := lrt.ResidualVariances(lrt.Samples{{8.1, 8.9, 7.6, 8.4, 9.0}, {9.2, 7.1, 10.4, 8.0}, {8.8, 8.6, 8.9, 8.5, 9.0, 8.7}})
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, &lrt.Settings{References: []lrt.Reference{lrt.Bartlett{}}}, lrt.Equate(lrt.Names("sd", 3)...))
	fmt.Printf("%.3f, corrected %.3f, p = %.4f\n", r.Statistic, r.Others[0].Statistic, r.P())
	// Output:
	// 13.644, corrected 12.219, p = 0.0022
}

// Repair times: does a gamma law with one shape serve both workshops?
func ExampleGammaSamples() {
	full, err := lrt.GammaSamples(lrt.Samples{{1.2, 0.7, 3.1, 2.2, 1.9, 0.9}, {4.1, 2.5, 3.3, 6.0, 2.8}})
	if err != nil {
		log.Fatal(err)
	}
	r := compare(full, nil, lrt.Equate("shape[1]", "shape[2]"))
	fmt.Printf("−2 log λ = %.4f, χ² %.3f\n", r.Statistic, r.ChiSquared.P)
	fmt.Println(r.HasWarning("small-sample"))
	// Output:
	// −2 log λ = 1.1518, χ² 0.283
	// true
}

// Sphericity of three readings of each board, taken together, and independence
// of the third from the first two.
func ExampleNewCovariances() {
	rows := [][]float64{{3.1, 2.9, 7.7}, {3.6, 3.3, 7.1}, {2.8, 2.9, 7.9}, {3.9, 3.8, 7.4}, {3.3, 3.0, 7.0}, {4.1, 4.2, 7.6}, {3.5, 3.7, 7.3}, {3.0, 3.1, 7.2}}
	c, err := lrt.NewCovariances(rows, nil)
	if err != nil {
		log.Fatal(err)
	}
	blocks, err := c.Blocks([]int{0, 0, 1})
	if err != nil {
		log.Fatal(err)
	}
	ctx := context.Background()
	for _, small := range []lrt.Space{c.Spherical(), blocks} {
		r, err := lrt.Compare(ctx, small, c.Common(), &lrt.Settings{References: []lrt.Reference{lrt.Bartlett{}}})
		if err != nil {
			log.Fatal(err)
		}
		fmt.Printf("%v: %v test, p = %.4f\n", small, r.Recommended, r.P())
	}
	// Output:
	// sphericity: approximate test, p = 0.0276
	// independent blocks: exact test, p = 0.5626
}

// Two steps of a chain are two tests: Holm's adjustment of their recommended p-values.
func ExampleAdjustResults() {
	full, err := lrt.NormalSamples(weights)
	if err != nil {
		log.Fatal(err)
	}
	var rs []lrt.Result
	for _, r := range []lrt.Restriction{lrt.Equate("sd[1]", "sd[2]"), lrt.Equate("mean[1]", "mean[2]")} {
		rs = append(rs, compare(full, nil, r))
	}
	p, _, err := lrt.AdjustResults(lrt.Holm, rs)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%.4f %.4f\n", p[0], p[1])
	// Output:
	// 0.0055 0.8672
}

// Power of a one-way comparison of four groups of six, noncentrality 12.
func ExamplePlanF() {
	plan, err := lrt.PlanF(3, 20, 12)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("F above %.3f, power %.3f\n", plan.Critical(0.05), plan.Power(0.05))
	// Output:
	// F above 3.098, power 0.755
}
