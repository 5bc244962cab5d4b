package lrt_test

import (
	"context"
	"fmt"
	"log"

	"subsume.example/lrt"
)

// How many filters of each of two makes are needed to find a difference of 0.8
// standard deviations with 90 % power, when one of the second make costs four
// times as much?
func ExampleSizeSearch() {
	search := lrt.SizeSearch{
		Alpha: 0.05, Power: 0.9,
		Step: []int{2, 1}, Cost: []float64{1, 4}, Free: true,
		Plan: func(n []int) (lrt.Plan, error) {
			a, b := float64(n[0]), float64(n[1])
			return lrt.PlanF(1, a+b-2, 0.8*0.8*a*b/(a+b))
		},
	}
	size, err := search.Solve(context.Background())
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%v units, cost %g, power %.4f\n", size.N, size.Cost, size.Power)
	lambda, err := size.Plan.Detectable(0.05, 0.8)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("noncentrality %.3f, and %.3f would be found with power 0.8\n", size.Plan.Noncentrality, lambda)
	// Output:
	// [52 25] units, cost 152, power 0.9006
	// noncentrality 10.805, and 8.055 would be found with power 0.8
}

func ExampleAdjust() {
	p := []float64{0.004, 0.03, 0.2, 0.011}
	for _, a := range []lrt.Adjustment{lrt.Bonferroni, lrt.Holm, lrt.BenjaminiHochberg} {
		adjusted, err := lrt.Adjust(a, p)
		if err != nil {
			log.Fatal(err)
		}
		fmt.Printf("%v %.3f\n", a, adjusted)
	}
	// Output:
	// Bonferroni [0.016 0.120 0.800 0.044]
	// Holm [0.016 0.060 0.200 0.033]
	// Benjamini-Hochberg [0.016 0.040 0.200 0.022]
}
