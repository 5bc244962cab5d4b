package dist_test

import (
	"fmt"
	"math"

	"subsume.example/dist"
)

// Three coatings, on 6, 6 and 9 plates, against a control on 12; the error mean square
// has 29 degrees of freedom.
func ExampleDunnettFor() {
	law := dist.DunnettFor(12, []float64{6, 6, 9}, 29, true)
	fmt.Printf("critical |t|    %.6f\n", law.UpperQuantile(0.05))
	fmt.Printf("P(max |t| > 3) = %.6f\n", law.Survival(3))
	// Output:
	// critical |t|    2.502541
	// P(max |t| > 3) = 0.015580
}

// From one side, with a known standard deviation.
func ExampleDunnett() {
	law := dist.Dunnett{Lambda: []float64{0.6, 0.6, 0.7}, Nu: math.Inf(1)}
	fmt.Printf("%.4f %.4f\n", law.CDF(0), law.UpperQuantile(0.01))
	// Output:
	// 0.2233 2.6958
}
