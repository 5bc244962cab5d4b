package dist_test

import (
	"context"
	"fmt"

	"gonum.org/v1/gonum/mat"

	"subsume.example/dist"
)

// A variance component cannot be negative, so under "it is zero" the statistic
// is 0 half of the time and χ²(1) otherwise.
func ExampleChiBarSquared() {
	law := dist.NewChiBarSquared(0.5, 0.5)
	fmt.Printf("P(X > 3.1)  = %.6f\n", law.Survival(3.1))
	fmt.Printf("5%% point    = %.6f\n", law.UpperQuantile(0.05))
	two := law.Shift(2) // two ordinary parameters are tested along with it
	fmt.Printf("with two more: %.6f\n", two.UpperQuantile(0.05))
	// Output:
	// P(X > 3.1)  = 0.039146
	// 5% point    = 2.705543
	// with two more: 7.045060
}

// Two slopes that cannot be negative; their estimates are correlated.
func ExampleBoundaryWeights() {
	cov := mat.NewSymDense(2, []float64{
		0.040, 0.012,
		0.012, 0.025,
	})
	w, err := dist.BoundaryWeights(context.Background(), cov, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("weights %.4f, exact: %v\n", w.Value, w.Exact())
	fmt.Printf("5%% point %.4f\n", w.Law().UpperQuantile(0.05))
	// Output:
	// weights [0.1881 0.5000 0.3119], exact: true
	// 5% point 4.4934
}
