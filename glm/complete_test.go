package glm_test

import (
	"context"
	"errors"
	"fmt"
	"log"
	"strings"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Two models that read different fields are compared on the rows complete for both.
func ExampleData_CompleteFor() {
	ctx := context.Background()
	file := "press,moisture,strength\na,7.1,31\na,,30\nb,7.4,35\nb,7.0,36\na,6.9,32\nb,7.9,\nb,6.6,37\n"
	all, err := glm.ReadCSV(ctx, strings.NewReader(file), nil)
	if err != nil {
		log.Fatal(err)
	}
	small := []glm.Term{glm.Constant{}, glm.Covariate{Field: "moisture"}}
	large := append(small, glm.Factor{Field: "press"})
	data, err := all.CompleteFor(ctx, "strength", nil, small, large)
	if err != nil {
		log.Fatal(err)
	}
	for _, d := range data.Account().Dropped {
		fmt.Println(d.Reason, d.Column, d.Rows)
	}
	s, err := glm.Normal(ctx, data, "strength", small, nil)
	if err != nil {
		log.Fatal(err)
	}
	b, err := glm.Normal(ctx, data, "strength", large, nil)
	if err != nil {
		log.Fatal(err)
	}
	r, err := lrt.Compare(ctx, s, b, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%d rows, %d left out, F = %.3f\n", r.Pair.Full.N, r.Pair.Full.Dropped, r.Exact.Statistic)
	// Output:
	// missing strength [5]
	// missing moisture [1]
	// 5 rows, 2 left out, F = 413.100
}

func TestCompleteForRefuses(t *testing.T) {
	d := field(1, 10).data(t)
	for _, c := range []struct {
		name string
		term glm.Term
	}{{"nil", nil}, {"without fields", bare{}}} {
		_, err := d.CompleteFor(t.Context(), "y", nil, []glm.Term{c.term})
		var te *glm.TermError
		if !errors.As(err, &te) || !errors.Is(err, glm.ErrTerm) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	if _, err := d.CompleteFor(t.Context(), "y", nil, []glm.Term{glm.Cross{fa, glm.Covariate{Field: "zz"}}}); !errors.Is(err, glm.ErrUnknownColumn) {
		t.Errorf("unknown field: %v", err)
	}
}

// bare is a term that does not say what it reads.
type bare struct{ glm.Constant }

// Fields hides that of Constant under another signature.
func (bare) Fields(int) {}
