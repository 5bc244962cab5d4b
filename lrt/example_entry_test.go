package lrt_test

import (
	"context"
	"errors"
	"fmt"
	"io"
	"log"
	"math"

	"subsume.example/dist"
	"subsume.example/lrt"
)

// loads is a model of breaking loads: normal, with mean and sd.
func loads(y []float64) *lrt.Declared {
	d, err := lrt.Bind(lrt.Model[[]float64]{
		Name:   "breaking load",
		Params: []lrt.Param{lrt.Between("mean", 0, 1000), lrt.Positive("sd")},
		LogLikelihood: func(y, th []float64) (l float64) {
			for _, v := range y {
				z := (v - th[0]) / th[1]
				l -= z*z/2 + math.Log(th[1]*math.Sqrt(2*math.Pi))
			}
			return l
		},
	}, lrt.Observe(y, len(y)))
	if err != nil {
		log.Fatal(err)
	}
	return d
}

var breaking = []float64{412, 398, 441, 425, 380, 407, 433, 419}

// Tests far out in the tail are adjusted on the log scale, where p itself would be 0.
func ExampleAdjustLog() {
	logP := []float64{-2000, -900, math.Log(0.04)}
	adjusted, err := lrt.AdjustLog(lrt.Holm, logP)
	if err != nil {
		log.Fatal(err)
	}
	for i, l := range adjusted {
		fmt.Println(lrt.FormatP(math.Exp(logP[i]), logP[i]), "adjusted:", lrt.FormatP(math.Exp(l), l))
	}
	// Output:
	// p = 10^-868.6 adjusted: p = 10^-868.1
	// p = 10^-390.9 adjusted: p = 10^-390.6
	// p = 0.04 adjusted: p = 0.04
}

// A p-value below the smallest float64 is written from its logarithm.
func ExampleFormatP() {
	law := dist.F{D1: 2, D2: 300}
	for _, f := range []float64{3.1, 1e7} {
		fmt.Println(lrt.FormatP(law.Survival(f), law.LogSurvival(f)))
	}
	// Output:
	// p = 0.0465
	// p = 10^-723.6
}

// What a space can do beside being fitted, it says by the interfaces it meets.
func ExampleMeets() {
	space := loads(breaking)
	fmt.Println(lrt.Meets(space))
	fmt.Println(lrt.Lost(space))
	// A wrapper that embeds a Space lends two methods only.
	fmt.Println(len(lrt.Lost(struct{ lrt.Space }{space})) > 0)
	// Output:
	// [PairFitter Restrictable Nester Improver ExactReferrer Simulator Companion Pivot BartlettCorrector]
	// []
	// true
}

// Bounds make a space whose edge may hold the estimate; the comparison then has a
// boundary law of its own.
func ExampleAtLeast() {
	full := loads(breaking)
	enough, err := full.Restrict(lrt.AtLeast("mean", 420))
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), enough, full, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Println(enough)
	fmt.Printf("−2 log λ = %.4f, p = %.4f by %v\n", r.Statistic, r.P(), r.Boundary.Law)
	_, err = full.Restrict(lrt.AtLeast("mean", 420), lrt.AtMost("mean", 400))
	fmt.Println(errors.Is(err, lrt.ErrContradiction), err)
	// Output:
	// breaking load: mean ≥ 420
	// −2 log λ = 0.7169, p = 0.1986 by ChiBarSquared(0.5, 0.5)
	// true lrt: restriction mean ≤ 400: restrictions contradict each other: nothing is left of the range of mean
}

// The steps of a chain as comparisons, to be run or tabulated one by one.
func ExampleSteps() {
	full := loads(breaking)
	known, err := full.Restrict(lrt.Fix("mean", 400))
	if err != nil {
		log.Fatal(err)
	}
	both, err := lrt.Restrict(known, lrt.Fix("sd", 20))
	if err != nil {
		log.Fatal(err)
	}
	for _, c := range lrt.Steps([]lrt.Space{both, known, full}, false) {
		r, err := c.Run(context.Background(), nil)
		if err != nil {
			log.Fatal(err)
		}
		fmt.Printf("%s: −2 log λ = %.4f\n", c.Hypothesis(), r.Statistic)
	}
	// Output:
	// breaking load: mean = 400, sd = 20, against breaking load: mean = 400: −2 log λ = 0.4208
	// breaking load: mean = 400, against breaking load: all parameters free: −2 log λ = 3.8213
}

// The power of a likelihood ratio test whose noncentrality is known.
func ExamplePlanChiSquared() {
	plan, err := lrt.PlanChiSquared(2, 11)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("rejects beyond %.4f, power %.4f\n", plan.Critical(0.05), plan.Power(0.05))
	need, err := plan.Detectable(0.05, 0.9)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("power 0.9 needs %.4f\n", need)
	// Output:
	// rejects beyond 5.9915, power 0.8526
	// power 0.9 needs 12.6539
}

// An interval for a function of parameters: here the coefficient of variation.
func ExampleProfileOf() {
	cv := lrt.Quantity{Name: "sd/mean", Of: func(x []float64) float64 { return x[1] / x[0] }}
	i, err := lrt.ProfileOf(context.Background(), loads(breaking), cv, 0.95, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Println(i)
	// Output:
	// sd/mean: 0.0443336, 95 % from 0.0290709 to 0.0797415 (inversion of −2 log λ referred to χ²)
}

// The profile of a parameter at chosen values, for a picture.
func ExampleProfileCurve() {
	points, err := lrt.ProfileCurve(context.Background(), loads(breaking), "mean", []float64{400, 420, 430}, nil)
	if err != nil {
		log.Fatal(err)
	}
	for _, p := range points {
		fmt.Printf("%7.3f: log λ = %7.4f, signed root %7.4f\n", p.Value, p.LogLambda, p.SignedRoot)
	}
	// Output:
	// 400.000: log λ = -1.9106, signed root -1.9548
	// 420.000: log λ = -0.3585, signed root  0.8467
	// 430.000: log λ = -2.1772, signed root  2.0867
}

// Content that writes itself is the same wherever it is read.
func ExampleNewID() {
	write := func(text string) func(io.Writer) error {
		return func(w io.Writer) error { _, err := io.WriteString(w, text); return err }
	}
	a, b, c := lrt.NewID(write("rows 1 to 8")), lrt.NewID(write("rows 1 to 8")), lrt.NewID(write("rows 1 to 9"))
	fmt.Println(a.Same(b), a.Same(c), a)
	// Output:
	// true false e90bafb94663
}

// Lifetimes whose logarithms are normal: λ is that of the logarithms.
func ExampleLognormalSamples() {
	space, err := lrt.LognormalSamples(lrt.Samples{{120, 340, 95, 210, 410}, {610, 280, 900, 455, 730}})
	if err != nil {
		log.Fatal(err)
	}
	spread, err := space.Restrict(lrt.Equate("sd[1]", "sd[2]"))
	if err != nil {
		log.Fatal(err)
	}
	same, err := lrt.Restrict(spread, lrt.Equate("mean[1]", "mean[2]"))
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), same, spread, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("−2 log λ = %.4f; %v: %.4f, p = %.4f\n", r.Statistic, r.Exact.Law, r.Exact.Statistic, r.Exact.P)
	// Output:
	// −2 log λ = 7.1170; F(1, 8): 8.2996, p = 0.0205
}
