package dist_test

import (
	"errors"
	"fmt"

	"subsume.example/dist"
)

// The power of a test of three linear restrictions on 24 rows of four parameters at level 5 %,
// when the means under test have a squared length of 12 error variances.
func ExampleNoncentralF() {
	critical := dist.F{D1: 3, D2: 20}.UpperQuantile(0.05)
	law := dist.NoncentralF{D1: 3, D2: 20, Lambda: 12}
	fmt.Printf("critical value %.4f\n", critical)
	fmt.Printf("power %.6f\n", law.Survival(critical))
	fmt.Printf("median of F %.4f, mean %.4f\n", law.Quantile(0.5), law.Mean())
	// Output:
	// critical value 3.0984
	// power 0.754586
	// median of F 4.8103, mean 5.5556
}

// The asymptotic law of -2 log λ near the restricted space.
func ExampleNoncentralChiSquared() {
	law := dist.NoncentralChiSquared{K: 2, Lambda: 10}
	fmt.Printf("power of the 5 %% test %.6f\n", law.Survival(dist.ChiSquared{K: 2}.UpperQuantile(0.05)))
	fmt.Printf("a tail far out: %.6g, its logarithm %.6f\n", law.Survival(4000), law.LogSurvival(4000))
	// Output:
	// power of the 5 % test 0.815421
	// a tail far out: 0, its logarithm -1808.516323
}

// The chance that a one-sided 5 % test finds a mean half a standard deviation above zero with 16 rows.
func ExampleNoncentralT() {
	law := dist.NoncentralT{Nu: 15, Delta: 0.5 * 4}
	critical := dist.StudentT{Nu: 15}.UpperQuantile(0.05)
	fmt.Printf("power %.6f\n", law.Survival(critical))
	fmt.Printf("chance of significance on the wrong side %.4g\n", law.CDF(-critical))
	// Output:
	// power 0.604033
	// chance of significance on the wrong side 0.0001855
}

// The noncentrality that gives 80 % power; rows follow from it by the design.
func ExampleNoncentralityF() {
	critical := dist.F{D1: 3, D2: 20}.UpperQuantile(0.05)
	lambda, err := dist.NoncentralityF(3, 20, critical, 0.8)
	fmt.Printf("%.6f %v\n", lambda, err)
	// An upper confidence limit: the λ that leaves only 2.5 % at or below an observed F of 0.4.
	lambda, err = dist.NoncentralityF(3, 20, 0.4, 0.975)
	fmt.Printf("%.6f %v\n", lambda, err)
	// The lower limit is 0 when even the central law exceeds the observed value more often.
	lambda, err = dist.NoncentralityF(3, 20, 0.4, 0.025)
	fmt.Println(lambda, errors.Is(err, dist.ErrCentralTail))
	// Output:
	// 13.276116 <nil>
	// 5.927145 <nil>
	// 0 true
}

// The noncentrality for 80 % power of a likelihood ratio test with two restrictions at level 5 %.
func ExampleNoncentralityChiSquared() {
	lambda, err := dist.NoncentralityChiSquared(2, dist.ChiSquared{K: 2}.UpperQuantile(0.05), 0.8)
	fmt.Printf("%.4f %v\n", lambda, err)
	// Output: 9.6347 <nil>
}

// A 95 % confidence interval for a standardized mean, from t = 2.6 on 16 rows.
func ExampleNoncentralityT() {
	lower, err := dist.NoncentralityT(15, 2.6, 0.025)
	if err != nil {
		fmt.Println(err)
		return
	}
	upper, err := dist.NoncentralityT(15, 2.6, 0.975)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("δ from %.4f to %.4f, standardized mean from %.4f to %.4f\n", lower, upper, lower/4, upper/4)
	// Output: δ from 0.3986 to 4.7309, standardized mean from 0.0997 to 1.1827
}
