package glm_test

import (
	"context"
	"fmt"
	"math"
	"slices"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// list prints the estimates of a model.
func list(ctx context.Context, terms ...glm.Term) {
	m := must(glm.Normal(ctx, farm(), "yield", terms, nil))
	f := must(m.Fit(ctx, nil))
	fmt.Println(m)
	for _, c := range f.Coefficients {
		if c.Aliased {
			fmt.Printf("  %s: set aside\n", c.Name)
		} else {
			fmt.Printf("  %s: %.4f\n", c.Name, c.Estimate)
		}
	}
}

func ExampleConstant() {
	list(context.Background(), glm.Constant{})
	// Output:
	// yield by constant
	//   constant: 3.3583
}

func ExampleCovariate() {
	list(context.Background(), glm.Constant{}, glm.Covariate{Field: "wetness"})
	// Output:
	// yield by constant + wetness
	//   constant: -3.1057
	//   wetness: 0.1031
}

// With a constant, coefficients are differences from the reference level; without
// one they are the means of the levels.
func ExampleFactor() {
	ctx := context.Background()
	list(ctx, glm.Constant{}, glm.Factor{Field: "substrate", Reference: "husk"})
	list(ctx, glm.Factor{Field: "substrate"})
	// Output:
	// yield by constant + substrate
	//   constant: 3.1667
	//   substrate=straw: -0.0467
	//   substrate=bran: 0.6333
	//   substrate=husk: set aside
	// yield by substrate
	//   substrate=straw: 3.1200
	//   substrate=bran: 3.8000
	//   substrate=husk: 3.1667
}

// Is one slope enough, or has each substrate its own?
func ExampleCross() {
	ctx := context.Background()
	substrate, wetness := glm.Factor{Field: "substrate"}, glm.Covariate{Field: "wetness"}
	one := must(glm.Normal(ctx, farm(), "yield", []glm.Term{glm.Constant{}, substrate, wetness}, nil))
	each := must(one.With(ctx, glm.Cross{substrate, wetness}))
	r := must(lrt.Compare(ctx, one, each, nil))
	fmt.Printf("%s\nF = %.3f on %v, p = %.3f\n", each, r.Exact.Statistic, r.Exact.Law, r.Exact.P)
	list(ctx, substrate, glm.Cross{substrate, wetness})
	// Output:
	// yield by constant + substrate + wetness + substrate × wetness
	// F = 1.345 on F(2, 6), p = 0.329
	// yield by substrate + substrate × wetness
	//   substrate=straw: -1.3419
	//   substrate=bran: -3.0559
	//   substrate=husk: -4.0895
	//   substrate=straw × wetness: 0.0715
	//   substrate=bran × wetness: 0.1088
	//   substrate=husk × wetness: 0.1158
}

// Is the line enough, or does it bend?
func ExamplePowers() {
	ctx := context.Background()
	line := must(glm.Normal(ctx, farm(), "yield", []glm.Term{glm.Constant{}, glm.Powers{Field: "wetness", Degree: 1}}, nil))
	curve := must(glm.Normal(ctx, farm(), "yield", []glm.Term{glm.Constant{}, glm.Powers{Field: "wetness", Degree: 2}}, nil))
	r := must(lrt.Compare(ctx, line, curve, nil))
	fmt.Printf("%s inside %s: F = %.3f on %v\n", line, curve, r.Exact.Statistic, r.Exact.Law)
	fmt.Println(curve.Coefficients())
	// Output:
	// yield by constant + wetness inside yield by constant + wetness^1..wetness^2: F = 0.362 on F(1, 9)
	// [constant wetness wetness^2]
}

// Knee is a term of our own: nothing up to a known point, and a line from there. It names its
// field, holds no data, and serves new rows as it serves those of the fit.
type Knee struct {
	Field string
	At    float64
}

func (k Knee) Name() string { return fmt.Sprintf("%s beyond %g", k.Field, k.At) }

// Fields says what the term reads, so that new rows need nothing else.
func (k Knee) Fields() []string { return []string{k.Field} }

// Bind finds the field.
func (k Knee) Bind(_ context.Context, src glm.Source) (glm.Columns, error) {
	at := slices.IndexFunc(src.Schema(), func(f glm.Field) bool { return f.Name == k.Field && f.Numeric() })
	if at < 0 {
		return glm.Columns{}, &glm.ColumnError{Column: k.Field, Row: -1, Err: glm.ErrUnknownColumn}
	}
	return glm.Columns{
		Names: []string{k.Name()},
		Key:   fmt.Sprintf("knee %q %g", k.Field, k.At), // all that the columns depend on
		Fill: func(w glm.Window, hi, lo [][]float64) error {
			for i, x := range w.Hi[at][:w.Rows] {
				hi[0][i], lo[0][i] = math.Max(x-k.At, 0), 0
			}
			return nil
		},
	}, nil
}

func ExampleTerm() {
	ctx := context.Background()
	line := must(glm.Normal(ctx, farm(), "yield", []glm.Term{glm.Constant{}, glm.Covariate{Field: "wetness"}}, nil))
	bent := must(line.With(ctx, Knee{"wetness", 63}))
	r := must(lrt.Compare(ctx, line, bent, nil))
	fmt.Printf("%s: F = %.3f on %v\n", bent, r.Exact.Statistic, r.Exact.Law)

	f := must(bent.Fit(ctx, nil))
	rows := must(glm.NewData(glm.Numbers("wetness", []float64{66})))
	ps, _, err := f.Predict(ctx, rows)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("at 66: %.3f ± %.3f\n", ps[0].Value, ps[0].SE)
	// Output:
	// yield by constant + wetness + wetness beyond 63: F = 0.600 on F(1, 9)
	// at 66: 3.775 ± 0.183
}
