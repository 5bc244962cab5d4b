package lawtest_test

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/dist"
	"subsume.example/dist/lawtest"
)

// Waiting is a law of one's own: the time to the first arrival at a given rate.
type Waiting struct{ Rate float64 }

var errRate = errors.New("waiting: Rate must be a finite number above 0")

func (w Waiting) Validate() error {
	if w.Rate > 0 && w.Rate <= math.MaxFloat64 {
		return nil
	}
	return errRate
}

// at applies f to rate times x, and answers for NaN, the left end and bad parameters.
func (w Waiting) at(x, left float64, f func(y float64) float64) float64 {
	switch {
	case w.Validate() != nil || math.IsNaN(x):
		return math.NaN()
	case x < 0:
		return left
	}
	return f(w.Rate * x)
}

func (w Waiting) CDF(x float64) float64 {
	return w.at(x, 0, func(y float64) float64 { return -math.Expm1(-y) })
}

func (w Waiting) Survival(x float64) float64 {
	return w.at(x, 1, func(y float64) float64 { return math.Exp(-y) })
}

func (w Waiting) LogCDF(x float64) float64 {
	return w.at(x, math.Inf(-1), func(y float64) float64 {
		if y < 1 {
			return math.Log(-math.Expm1(-y))
		}
		return math.Log1p(-math.Exp(-y))
	})
}

func (w Waiting) LogSurvival(x float64) float64 {
	return w.at(x, 0, func(y float64) float64 { return -y })
}

func (w Waiting) Prob(x float64) float64 {
	return w.at(x, 0, func(y float64) float64 { return w.Rate * math.Exp(-y) })
}

func (w Waiting) LogProb(x float64) float64 {
	return w.at(x, math.Inf(-1), func(y float64) float64 { return math.Log(w.Rate) - y })
}

func (w Waiting) Quantile(p float64) float64 {
	if w.Validate() != nil || !(p >= 0 && p <= 1) {
		return math.NaN()
	}
	return -math.Log1p(-p) / w.Rate
}

func (w Waiting) UpperQuantile(q float64) float64 {
	if w.Validate() != nil || !(q >= 0 && q <= 1) {
		return math.NaN()
	}
	return max(0, -math.Log(q)/w.Rate)
}

func (w Waiting) Mean() float64 {
	return w.at(0, 0, func(float64) float64 { return 1 / w.Rate })
}

func (w Waiting) Variance() float64 {
	return w.at(0, 0, func(float64) float64 { return 1 / (w.Rate * w.Rate) })
}

func (w Waiting) Rand(src rand.Source) float64 {
	return w.at(0, 0, func(float64) float64 { return rand.New(src).ExpFloat64() / w.Rate })
}

func (w Waiting) String() string { return fmt.Sprintf("Waiting(%v)", w.Rate) }

// In a test one calls lawtest.Check(t, law, settings); Problems gives the findings as values.
func ExampleProblems() {
	settings := &lawtest.Settings{Invalid: []lawtest.Law{Waiting{Rate: 0}}}
	fmt.Println(len(lawtest.Problems(Waiting{Rate: 2}, settings)), "problems")

	// A law that forgets its rate in the density.
	for _, p := range lawtest.Problems(forgetful{Waiting{Rate: 2}}, settings) {
		fmt.Println(p.Check)
		break
	}
	// Output:
	// 0 problems
	// density
}

type forgetful struct{ Waiting }

func (f forgetful) Prob(x float64) float64    { return f.Waiting.Prob(x) / f.Rate }
func (f forgetful) LogProb(x float64) float64 { return f.Waiting.LogProb(x) - math.Log(f.Rate) }

// The probability integral transform of a law's draws is uniform.
func ExampleUniformity() {
	law := dist.ChiSquared{K: 4.5}
	src := rand.NewPCG(11, 7)
	u := make([]float64, 5000)
	for i := range u {
		u[i] = law.CDF(law.Rand(src))
	}
	ks, ad := lawtest.Uniformity(u)
	fmt.Println(ks < 1.95, ad < 6)
	// Output: true true
}
