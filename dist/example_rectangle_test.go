package dist_test

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"subsume.example/dist"
)

// Two t statistics with correlation 0.4 on 18 degrees of freedom, both between
// -2 and 2.
func ExampleRectangle() {
	r := dist.Rectangle{
		Lower: []float64{-2, -2}, Upper: []float64{2, 2},
		Correlation: mat.NewSymDense(2, []float64{1, 0.4, 0.4, 1}),
		Nu:          18,
	}
	p, err := r.Probability(context.Background(), nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%.8f outside, method %v\n", p.Outside, p.Method)
	// Output:
	// 0.11071687 outside, method product
}

// All differences of four means from 3, 5, 8 and 8 rows: the critical value of
// |t| under their own correlations.
func ExampleLargest() {
	rows := []float64{3, 5, 8, 8}
	var contrasts [][]float64
	for i := range rows {
		for j := range i {
			c := make([]float64, len(rows))
			s := math.Sqrt(1/rows[i] + 1/rows[j])
			c[i], c[j] = 1/s/math.Sqrt(rows[i]), -1/s/math.Sqrt(rows[j])
			contrasts = append(contrasts, c)
		}
	}
	n := len(contrasts)
	corr := mat.NewSymDense(n, nil)
	for i := range n {
		for j := range i + 1 {
			v := 0.0
			for k := range rows {
				v += contrasts[i][k] * contrasts[j][k]
			}
			corr.SetSym(i, j, v)
		}
	}
	law := dist.Largest{Correlation: corr, Nu: 20, TwoSided: true}
	q, err := law.UpperQuantile(context.Background(), 0.05, &dist.RectangleSettings{Seed: 1, Target: 1e-4})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%.2f, method %v\n", q.X, q.Method)
	equal := dist.StudentizedRange{K: 4, Nu: 20}
	fmt.Printf("for equal numbers %.2f\n", equal.UpperQuantile(0.05)/math.Sqrt2)
	// Output:
	// 2.79, method lattice
	// for equal numbers 2.80
}
