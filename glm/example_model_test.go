package glm_test

import (
	"context"
	"errors"
	"fmt"
	"log"
	"strings"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// An invented mushroom farm: kilograms from a tray by substrate and wetness (per
// cent). Two trays of each shelf stand in one room.
const trays = `shelf,substrate,wetness,trays,yield
1,straw,61,2,3.1
1,bran,64,1,3.9
2,straw,66,2,3.4
2,bran,59,1,3.3
3,straw,63,3,3.0
3,bran,67,2,4.2
4,straw,58,1,2.8
4,husk,60,1,2.9
5,bran,62,2,3.8
5,husk,65,2,3.5
6,straw,64,1,3.3
6,husk,63,1,3.1
`

func farm() *glm.Data {
	d, err := glm.ReadCSV(context.Background(), strings.NewReader(trays), nil)
	if err != nil {
		log.Fatal(err)
	}
	if d, err = d.Categorical("shelf"); err != nil {
		log.Fatal(err)
	}
	return d
}

// must stands for what a caller does about an error.
func must[T any](v T, err error) T {
	if err != nil {
		log.Fatal(err)
	}
	return v
}

func ExampleNormal() {
	ctx := context.Background()
	m, err := glm.Normal(ctx, farm(), "yield", []glm.Term{
		glm.Constant{}, glm.Covariate{Field: "wetness"}, glm.Factor{Field: "substrate"}}, nil)
	if err != nil {
		log.Fatal(err) // names the field or the term
	}
	fmt.Println(m)
	for _, name := range m.Coefficients() {
		fmt.Println(" ", name)
	}
	// Output:
	// yield by constant + wetness + substrate
	//   constant
	//   wetness
	//   substrate=straw
	//   substrate=bran
	//   substrate=husk
}

func ExampleNormal_error() {
	_, err := glm.Normal(context.Background(), farm(), "yield", []glm.Term{glm.Constant{}, glm.Covariate{Field: "wettness"}}, nil)
	var e *glm.ColumnError
	if errors.As(err, &e) && errors.Is(err, glm.ErrUnknownColumn) {
		fmt.Printf("no field %q\n", e.Column)
	}
	fmt.Println(err)
	// Output:
	// no field "wettness"
	// glm: column "wettness": no such column; there are "shelf", "substrate", "wetness", "trays", "yield"
}

// Does the substrate matter beside wetness?
func ExampleModel_With() {
	ctx := context.Background()
	simple := must(glm.Normal(ctx, farm(), "yield", []glm.Term{glm.Constant{}, glm.Covariate{Field: "wetness"}}, nil))
	rich := must(simple.With(ctx, glm.Factor{Field: "substrate"}))
	r := must(lrt.Compare(ctx, simple, rich, nil))
	fmt.Printf("F = %.3f on %v, p = %.5f\n", r.Exact.Statistic, r.Exact.Law, r.Exact.P)
	fmt.Printf("log λ = %.4f over %s\n", r.LogLambda, r.Stratum())
	fmt.Printf("at 5 %% the χ² test would reject %.1f %% of true null hypotheses here\n", 100*r.TrueSize(0.05))
	// Output:
	// F = 38.521 on F(2, 8), p = 0.00008
	// log λ = -14.1823 over rows, n = 12
	// at 5 % the χ² test would reject 13.6 % of true null hypotheses here
}

func ExampleModel_Without() {
	ctx := context.Background()
	full := must(glm.Normal(ctx, farm(), "yield", []glm.Term{
		glm.Constant{}, glm.Covariate{Field: "wetness"}, glm.Factor{Field: "substrate"}}, nil))
	for _, term := range full.Terms()[1:] {
		r := must(lrt.Compare(ctx, must(full.Without(term)), full, nil))
		fmt.Printf("%-10s F = %6.2f on %v\n", term, r.Exact.Statistic, r.Exact.Law)
	}
	_, err := full.Without("shade")
	fmt.Println(err)
	// Output:
	// wetness    F =  56.04 on F(1, 8)
	// substrate  F =  38.52 on F(2, 8)
	// glm: term "shade": term not usable: the model has no such term; it has constant, wetness, substrate
}

// A claimed value, and equality of two levels: restrictions are linear equations
// between coefficients.
func ExampleModel_Restrict() {
	ctx := context.Background()
	full := must(glm.Normal(ctx, farm(), "yield", []glm.Term{
		glm.Constant{}, glm.Covariate{Field: "wetness"}, glm.Factor{Field: "substrate"}}, nil))
	claimed := must(full.Restrict(lrt.Fix("wetness", 0.1)))
	r := must(lrt.Compare(ctx, claimed, full, nil))
	fmt.Printf("slope 0.1: F = %.3f, p = %.3f\n", r.Exact.Statistic, r.Exact.P)

	alike := must(full.Restrict(lrt.Equate("substrate=straw", "substrate=husk")))
	r = must(lrt.Compare(ctx, alike, full, nil))
	fmt.Printf("straw as husk: F = %.3f, p = %.3f\n", r.Exact.Statistic, r.Exact.P)
	fmt.Println(alike)

	_, err := full.Restrict(lrt.Fix("warmth", 0))
	fmt.Println(err)
	// Output:
	// slope 0.1: F = 0.287, p = 0.607
	// straw as husk: F = 0.068, p = 0.801
	// yield by constant + wetness + substrate, where [substrate=straw] − [substrate=husk] = 0
	// glm: coefficient "warmth": no such coefficient; there are "constant", "wetness", "substrate=straw", "substrate=bran", "substrate=husk"
}

// Several questions on one factorization: the rows are read once.
func ExampleJoin() {
	ctx := context.Background()
	d := farm()
	var spaces []lrt.Space
	var terms []glm.Term
	for _, t := range []glm.Term{glm.Constant{}, glm.Covariate{Field: "wetness"}, glm.Factor{Field: "substrate"}} {
		terms = append(terms, t)
		spaces = append(spaces, must(glm.Normal(ctx, d, "yield", terms, nil)))
	}
	steps := lrt.Steps(spaces, true) // each against the next, error of the largest
	joined, err := glm.Join(ctx, steps...)
	if err != nil {
		log.Fatal(err)
	}
	for i, c := range joined {
		r := must(c.Run(ctx, nil))
		fmt.Printf("%-10s F = %6.2f on %v\n", terms[i+1].Name(), r.Exact.Statistic, r.Exact.Law)
	}
	// Output:
	// wetness    F =  69.12 on F(1, 8)
	// substrate  F =  38.52 on F(2, 8)
}

// Trays on one shelf share its draught: the error of what differs between shelves
// is that between shelves. Whether F is exact then follows from the design.
func ExampleJoin_errorTerm() {
	ctx := context.Background()
	const file = `shelf,light,turned,yield
1,dim,no,3.1
1,dim,yes,3.4
2,dim,no,2.8
2,dim,yes,3.3
3,dim,no,3.3
3,dim,yes,3.5
4,bright,no,3.6
4,bright,yes,4.1
5,bright,no,3.4
5,bright,yes,3.6
6,bright,no,3.9
6,bright,yes,4.3
`
	d := must(glm.ReadCSV(ctx, strings.NewReader(file), nil))
	model := func(terms ...glm.Term) *glm.Model { return must(glm.Normal(ctx, d, "yield", terms, nil)) }
	one, light, shelf := glm.Constant{}, glm.Factor{Field: "light"}, glm.Factor{Field: "shelf"}
	c := lrt.Comparison{
		Name:       "light",
		Restricted: model(one),
		Full:       model(one, light),
		Error:      &lrt.ErrorPair{Smaller: model(one, light), Larger: model(shelf)},
		Effects: &lrt.Effects{
			Fixed:  model(one, light, glm.Factor{Field: "turned"}),
			Random: []lrt.RandomTerm{{Name: "shelf", Space: model(shelf)}},
		},
	}
	r := must(c.Run(ctx, nil))
	fmt.Printf("F = %.3f on %v, certified exact: %v (%s)\n", r.Exact.Statistic, r.Exact.Law, r.Pair.Certificate.Exact, r.Stratum())

	turned := glm.Factor{Field: "turned"}
	c.Error = &lrt.ErrorPair{Smaller: model(one, shelf, turned)} // against the trays: no
	r = must(c.Run(ctx, nil))
	k := r.Pair.Certificate
	fmt.Printf("certified exact: %v, since for %s there is not %q\n", k.Exact, k.Term, k.Identity)
	// Output:
	// F = 8.390 on F(1, 4), certified exact: true (stratum, m = 5)
	// certified exact: false, since for shelf there is not "one constant c for numerator and error"
}

func ExampleModel_NestedIn() {
	ctx := context.Background()
	d := farm()
	line := must(glm.Normal(ctx, d, "yield", []glm.Term{glm.Constant{}, glm.Covariate{Field: "wetness"}}, nil))
	levels := must(glm.Normal(ctx, d, "yield", []glm.Term{glm.Factor{Field: "wetness"}}, nil))
	fmt.Println(line.NestedIn(levels)) // a line through the levels of wetness, by columns and not by names
	fmt.Println(levels.NestedIn(line))
	// Output:
	// <nil>
	// glm: restricted space is not inside the full space: column "wetness=59" leaves 0.871 of its length outside
}

// Rows that stand for several equal observations, and rows of unequal precision,
// are different things.
func ExampleWeights() {
	ctx := context.Background()
	for _, w := range []glm.Weights{
		{},
		{Kind: glm.Frequency, Field: "trays"}, // the row was seen so many times
		{Kind: glm.Precision, Field: "trays"}, // the row is a mean of so many
	} {
		m := must(glm.Normal(ctx, farm(), "yield", []glm.Term{glm.Constant{}, glm.Covariate{Field: "wetness"}}, &glm.Options{Weights: w}))
		f := must(m.Fit(ctx, nil))
		c := must(f.Coefficient("wetness"))
		fmt.Printf("%-9v n = %2d, slope %.4f ± %.4f, log L %.3f\n", w.Kind, f.N, c.Estimate, c.SE, f.LogLikelihood)
	}
	// Output:
	// none      n = 12, slope 0.1031 ± 0.0362, log L -2.735
	// frequency n = 19, slope 0.1046 ± 0.0308, log L -5.255
	// precision n = 12, slope 0.1046 ± 0.0402, log L -3.794
}

// An offset is a known part of the mean; a known variance makes the test exact by χ².
func ExampleOptions() {
	ctx := context.Background()
	d := farm()
	wet := must(d.Values("wetness"))
	for i := range wet {
		wet[i] = 0.1 * (wet[i] - 62) // what the handbook of the farm says
	}
	d = must(d.With(glm.Numbers("expected", wet)))
	o := &glm.Options{Offset: "expected", KnownVariance: 0.02}
	one := must(glm.Normal(ctx, d, "yield", []glm.Term{glm.Constant{}}, o))
	each := must(one.With(ctx, glm.Factor{Field: "substrate"}))
	r := must(lrt.Compare(ctx, one, each, nil))
	fmt.Printf("%s: χ² = %.3f on %v, p = %.2g, %v\n", each, r.Exact.Statistic, r.Exact.Law, r.Exact.P, r.Recommended)
	// Output:
	// yield by constant + substrate, offset expected: χ² = 50.058 on ChiSquared(2), p = 1.3e-11, exact
}
