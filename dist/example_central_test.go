package dist_test

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/dist"
)

// The p-value of an F statistic: 3 and 20 degrees of freedom, observed 4.94.
func ExampleF() {
	null := dist.F{D1: 3, D2: 20}
	fmt.Printf("p = %.5f\n", null.Survival(4.94))
	fmt.Printf("critical value at 5 %%: %.4f\n", null.UpperQuantile(0.05))
	// Output:
	// p = 0.00999
	// critical value at 5 %: 3.0984
}

func ExampleF_CDF() {
	fmt.Printf("%.6f\n", dist.F{D1: 4, D2: 11.3}.CDF(1))
	// Output: 0.552972
}

// An upper tail keeps its digits where 1 - CDF has none left.
func ExampleF_Survival() {
	f := dist.F{D1: 3, D2: 20}
	fmt.Printf("%.10g %g\n", f.Survival(1e4), 1-f.CDF(1e4))
	// Output: 6.372054086e-32 0
}

func ExampleF_LogCDF() {
	fmt.Printf("%.6f\n", dist.F{D1: 300, D2: 500}.LogCDF(1e-4))
	// Output: -1197.233383
}

// Logarithms of tails do not underflow.
func ExampleF_LogSurvival() {
	f := dist.F{D1: 2, D2: 1000}
	fmt.Printf("%.5g %.4f\n", f.Survival(1e3), f.LogSurvival(1e3))
	// Output: 2.7503e-239 -549.3061
}

func ExampleF_Prob() {
	fmt.Printf("%.6f\n", dist.F{D1: 3, D2: 20}.Prob(1))
	// Output: 0.430854
}

func ExampleF_LogProb() {
	fmt.Printf("%.4f\n", dist.F{D1: 3, D2: 1e6}.LogProb(2000))
	// Output: -2986.5154
}

func ExampleF_Quantile() {
	fmt.Printf("%.5f\n", dist.F{D1: 3, D2: 20}.Quantile(0.05))
	// Output: 0.11547
}

// The upper quantile takes tails that 1 - q cannot hold.
func ExampleF_UpperQuantile() {
	fmt.Printf("%.6g\n", dist.F{D1: 3, D2: 20}.UpperQuantile(1e-30))
	// Output: 7591.58
}

func ExampleF_Mean() {
	f := dist.F{D1: 3, D2: 20}
	fmt.Printf("%.4f %.4f\n", f.Mean(), f.Variance())
	// Output: 1.1111 1.0802
}

func ExampleF_Variance() {
	fmt.Println(dist.F{D1: 3, D2: 4}.Variance(), dist.F{D1: 3, D2: 2}.Variance())
	// Output: +Inf NaN
}

func ExampleF_Rand() {
	src := rand.NewPCG(1, 2)
	f := dist.F{D1: 3, D2: 20}
	above := 0
	for range 10000 {
		if f.Rand(src) > f.UpperQuantile(0.1) {
			above++
		}
	}
	fmt.Println(above > 900 && above < 1100)
	// Output: true
}

func ExampleF_String() {
	fmt.Println(dist.F{D1: 3, D2: math.Inf(1)})
	// Output: F(3, +Inf)
}

// A likelihood ratio statistic against its limiting law.
func ExampleChiSquared() {
	null := dist.ChiSquared{K: 5}
	fmt.Printf("p = %.4f, critical value %.4f\n", null.Survival(9.24), null.UpperQuantile(0.05))
	fmt.Printf("mean %g, variance %g\n", null.Mean(), null.Variance())
	// Output:
	// p = 0.0999, critical value 11.0705
	// mean 5, variance 10
}

// The degrees of freedom may be very large, and the tails very small.
func ExampleChiSquared_LogSurvival() {
	fmt.Printf("%.6f\n", dist.ChiSquared{K: 1e6}.LogSurvival(1.2e6))
	// Output: -8845.092345
}

func ExampleStudentT() {
	t := dist.StudentT{Nu: 12}
	fmt.Printf("two-sided p = %.5f\n", 2*t.Survival(2.5))
	fmt.Printf("95 %% interval: ±%.4f\n", t.UpperQuantile(0.025))
	fmt.Printf("normal limit: ±%.4f\n", dist.StudentT{Nu: math.Inf(1)}.UpperQuantile(0.025))
	// Output:
	// two-sided p = 0.02792
	// 95 % interval: ±2.1788
	// normal limit: ±1.9600
}

// Every error of a parameter names the law, the field and the value.
func ExampleParamError() {
	err := dist.F{D1: 3, D2: -1}.Validate()
	var p *dist.ParamError
	fmt.Println(err)
	fmt.Println(errors.Is(err, dist.ErrParam), errors.As(err, &p) && p.Param == "D2")
	fmt.Println(dist.F{D1: 3, D2: -1}.Survival(2))
	// Output:
	// dist: F.D2 = -1: want a number above 0, +Inf included
	// true true
	// NaN
}

// A reference law is chosen at run time.
func ExampleLaw() {
	for _, law := range []dist.Law{dist.ChiSquared{K: 2}, dist.F{D1: 2, D2: 10}} {
		fmt.Printf("%v: %.4f\n", law, law.UpperQuantile(0.05))
	}
	// Output:
	// ChiSquared(2): 5.9915
	// F(2, 10): 4.1028
}

// The exact law of the likelihood ratio of two nested linear models: with n = 24 rows, 4 free
// means in the larger and 1 in the smaller, λ^(2/n) = RSS of the larger over RSS of the smaller.
func ExampleBeta() {
	null := dist.Beta{A: 20.0 / 2, B: 3.0 / 2}
	fmt.Printf("P(ratio <= 0.57) = %.5f\n", null.CDF(0.57))
	// The same as the F test, F = (20/3) (1 - 0.57)/0.57.
	fmt.Printf("P(F >= %.4f) = %.5f\n", 20.0/3*0.43/0.57, dist.F{D1: 3, D2: 20}.Survival(20.0/3*0.43/0.57))
	// Output:
	// P(ratio <= 0.57) = 0.00929
	// P(F >= 5.0292) = 0.00929
}

// The total of 12 waiting times of mean 5 minutes.
func ExampleGamma() {
	total := dist.Gamma{Shape: 12, Scale: 5}
	fmt.Printf("mean %.0f, P(total > 90) = %.4f, 95 %% stay below %.1f\n", total.Mean(), total.Survival(90), total.UpperQuantile(0.05))
	// Output: mean 60, P(total > 90) = 0.0549, 95 % stay below 91.0
}
