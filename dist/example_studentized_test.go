package dist_test

import (
	"fmt"

	"subsume.example/dist"
)

// Five glazes were fired on four tiles each. The error mean square has 15
// degrees of freedom; the largest and the smallest glaze mean differ by 4.9
// standard errors of a mean.
func ExampleStudentizedRange() {
	law := dist.StudentizedRange{K: 5, Nu: 15}
	fmt.Printf("P(Q > 4.9) = %.6f\n", law.Survival(4.9))
	fmt.Printf("5%% point   = %.6f\n", law.UpperQuantile(0.05))
	// Output:
	// P(Q > 4.9) = 0.024499
	// 5% point   = 4.366985
}

// Simultaneous 95 % intervals for six orthogonal contrasts on 12 degrees of
// freedom: estimate ± this many standard errors.
func ExampleMaximumModulus() {
	law := dist.MaximumModulus{K: 6, Nu: 12}
	fmt.Printf("%.6f\n", law.UpperQuantile(0.05))
	// Output:
	// 3.094500
}

// All ten comparisons of five glazes at once.
func ExampleStudentizedRange_Survivals() {
	law := dist.StudentizedRange{K: 5, Nu: 15}
	for _, p := range law.Survivals(nil, []float64{4.9, 4.1, 3.2, 1.0, 0.3}) {
		fmt.Printf("%.4f\n", p)
	}
	// Output:
	// 0.0245
	// 0.0708
	// 0.2104
	// 0.9517
	// 0.9995
}
