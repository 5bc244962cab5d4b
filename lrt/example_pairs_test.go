package lrt_test

import (
	"context"
	"fmt"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// lidComparison is the comparison of lids A and B among four, on an invented trial.
func lidComparison() (lrt.Comparison, error) {
	data, err := glm.NewData(
		glm.Labels("lid", []string{"A", "A", "A", "B", "B", "B", "C", "C", "C", "D", "D", "D"}),
		glm.Numbers("force", []float64{14, 15, 13, 18, 19, 17, 15, 14, 16, 15, 17, 16}))
	if err != nil {
		return lrt.Comparison{}, err
	}
	full, err := glm.Normal(context.Background(), data, "force", []glm.Term{glm.Factor{Field: "lid"}}, nil)
	if err != nil {
		return lrt.Comparison{}, err
	}
	equal, err := full.Restrict(lrt.Equate("lid=A", "lid=B"))
	return lrt.Comparison{Name: "A and B", Restricted: equal, Full: full}, err
}

func ExamplePairs() {
	// A and B were picked out because they lie farthest apart: the raw p does not
	// know that, the studentized range of four means does.
	c, err := lidComparison()
	if err != nil {
		fmt.Println(err)
		return
	}
	r, err := c.Run(context.Background(), &lrt.Settings{References: []lrt.Reference{lrt.Pairs{Groups: 4, Balanced: true}}})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("raw p = %.4f, among all pairs p = %.4f (%s)\n", r.Exact.P, r.Others[0].P, r.Others[0].Kind)
	// Output:
	// raw p = 0.0012, among all pairs p = 0.0052 (exact)
}

func ExampleScheffe() {
	c, err := lidComparison()
	if err != nil {
		fmt.Println(err)
		return
	}
	r, err := c.Run(context.Background(), &lrt.Settings{References: []lrt.Reference{lrt.Scheffe{Dimension: 3}}})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("raw p = %.4f, among all contrasts of four means p = %.4f\n", r.Exact.P, r.Others[0].P)
	// Output:
	// raw p = 0.0012, among all contrasts of four means p = 0.0086
}
