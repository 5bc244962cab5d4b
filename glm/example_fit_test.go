package glm_test

import (
	"context"
	"errors"
	"fmt"
	"math"

	"subsume.example/glm"
	"subsume.example/lrt"
)

func substrates(ctx context.Context) *glm.Fit {
	m := must(glm.Normal(ctx, farm(), "yield", []glm.Term{
		glm.Constant{}, glm.Covariate{Field: "wetness"}, glm.Factor{Field: "substrate"}}, nil))
	return must(m.Fit(ctx, nil))
}

func ExampleModel_Fit() {
	f := substrates(context.Background())
	for _, c := range f.Coefficients {
		if c.Aliased {
			fmt.Printf("%-16s the level to compare with\n", c.Name)
			continue
		}
		fmt.Printf("%-16s %7.4f ± %.4f, %.0f %% interval %7.4f to %7.4f, p = %.2g\n", c.Name, c.Estimate, c.SE, 100*f.Level, c.Lower, c.Upper, c.P)
	}
	fmt.Printf("n = %d, rank %d, residual SD %.4f on %d degrees of freedom, R² %.3f\n", f.N, f.Rank, f.SD, f.DFError, f.RSquared)
	// Output:
	// constant         -2.7033 ± 0.7795, 95 % interval -4.5010 to -0.9057, p = 0.0085
	// wetness           0.0933 ± 0.0125, 95 % interval  0.0646 to  0.1221, p = 7e-05
	// substrate=straw  the level to compare with
	// substrate=bran    0.6240 ± 0.0769, 95 % interval  0.4466 to  0.8014, p = 4e-05
	// substrate=husk    0.0218 ± 0.0834, 95 % interval -0.1706 to  0.2142, p = 0.8
	// n = 12, rank 4, residual SD 0.1142 on 8 degrees of freedom, R² 0.948
}

// A difference between two levels, neither of which is the reference; and the
// reference itself, of which there is nothing to tell.
func ExampleFit_Combination() {
	f := substrates(context.Background())
	e, err := f.Combination(glm.Weight{Name: "substrate=bran", Coef: 1}, glm.Weight{Name: "substrate=husk", Coef: -1})
	fmt.Printf("bran − husk: %.4f ± %.4f, %.4f to %.4f, t = %.3f %v\n", e.Value, e.SE, e.Lower, e.Upper, e.T, err)

	_, err = f.Combination(glm.Weight{Name: "substrate=straw", Coef: 1})
	fmt.Println(errors.Is(err, glm.ErrNotEstimable), err)
	// Output:
	// bran − husk: 0.6022 ± 0.0873, 0.4009 to 0.8035, t = 6.899 <nil>
	// true glm: coefficient "substrate=straw": not estimable from these data: it is 0 by the choice of the reference level
}

func ExampleFit_Coefficient() {
	f := substrates(context.Background())
	c, err := f.Coefficient("wetness")
	fmt.Printf("%.4f kg per per cent, %v\n", c.Estimate, err)
	_, err = f.Coefficient("warmth")
	fmt.Println(err)
	// Output:
	// 0.0933 kg per per cent, <nil>
	// glm: coefficient "warmth": no such coefficient; there are "constant", "wetness", "substrate=straw", "substrate=bran", "substrate=husk"
}

func ExampleFit_Covariance() {
	f := substrates(context.Background())
	bran := []glm.Weight{{Name: "substrate=bran", Coef: 1}, {Name: "substrate=straw", Coef: -1}}
	husk := []glm.Weight{{Name: "substrate=husk", Coef: 1}, {Name: "substrate=straw", Coef: -1}}
	cov, err := f.Covariance(bran, husk)
	if err != nil {
		fmt.Println(err)
		return
	}
	a, _ := f.Combination(bran...)
	b, _ := f.Combination(husk...)
	fmt.Printf("correlation %.3f: both are differences from straw\n", cov/(a.SE*b.SE))
	// Output:
	// correlation 0.410: both are differences from straw
}

// New rows need the fields of the model's terms, found by name, and no response.
func ExampleFit_Predict() {
	ctx := context.Background()
	f := substrates(ctx)
	rows := must(glm.NewData(
		glm.Labels("substrate", []string{"bran", "husk"}),
		glm.Numbers("wetness", []float64{63, 75})))
	ps, warnings, err := f.Predict(ctx, rows)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, p := range ps {
		fmt.Printf("row %d: %.3f, mean %.3f to %.3f, one tray %.3f to %.3f, outside: %v\n", p.Row, p.Value, p.Lower, p.Upper, p.NewLower, p.NewUpper, p.Outside)
	}
	for _, w := range warnings {
		fmt.Println(w.Code+":", w.Text)
	}

	rows = must(glm.NewData(glm.Labels("substrate", []string{"sawdust"}), glm.Numbers("wetness", []float64{63})))
	_, _, err = f.Predict(ctx, rows)
	fmt.Println(errors.Is(err, glm.ErrUnknownLevel), err)
	// Output:
	// row 0: 3.800, mean 3.668 to 3.932, one tray 3.506 to 4.094, outside: []
	// row 1: 4.318, mean 3.932 to 4.703, one tray 3.851 to 4.785, outside: [wetness]
	// extrapolation: values lie outside the range of the fit: wetness
	// true glm: column "substrate" row 0: "sawdust": label is not among the declared levels
}

// What the fit says about each row: which is far from its fitted value, and which
// could pull the fit.
func ExampleFit_Each() {
	ctx := context.Background()
	f := substrates(ctx)
	var far, pull glm.RowFit
	for r, err := range f.Each(ctx) {
		if err != nil {
			fmt.Println(err)
			return
		}
		if math.Abs(r.Studentized) > math.Abs(far.Studentized) {
			far = r
		}
		if r.Leverage > pull.Leverage {
			pull = r
		}
	}
	fmt.Printf("row %d: residual %.3f, standardized %.2f, studentized %.2f\n", far.Row, far.Residual, far.Standardized, far.Studentized)
	fmt.Printf("row %d: leverage %.2f (mean %.2f)\n", pull.Row, pull.Leverage, float64(f.Rank)/float64(f.N))
	// Output:
	// row 4: residual -0.176, standardized -1.73, studentized -2.04
	// row 3: leverage 0.44 (mean 0.33)
}

// The mean at stated values, and a difference of two such means.
func ExampleFit_RowMeans() {
	ctx := context.Background()
	f := substrates(ctx)
	rows := must(glm.NewData(
		glm.Labels("substrate", []string{"straw", "bran", "husk"}),
		glm.Numbers("wetness", []float64{63, 63, 63})))
	means := must(f.RowMeans(ctx, rows))
	for i, name := range []string{"straw", "bran", "husk"} {
		w := make([]float64, means.Len())
		w[i] = 1
		e := must(means.Estimate(w))
		fmt.Printf("%-5s %.3f ± %.3f\n", name, e.Value, e.SE)
	}
	e := must(means.Estimate([]float64{-0.5, 1, -0.5}))
	fmt.Printf("bran above the mean of the others by %.3f ± %.3f\n", e.Value, e.SE)

	// The same as a comparison: F = t².
	eq := must(means.Equation([]float64{-0.5, 1, -0.5}, 0))
	equal := must(f.Model.Restrict(lrt.Equations(eq)))
	r := must(lrt.Compare(ctx, equal, f.Model, nil))
	fmt.Printf("F = %.3f, t² = %.3f\n", r.Exact.Statistic, e.T*e.T)
	// Output:
	// straw 3.176 ± 0.052
	// bran  3.800 ± 0.057
	// husk  3.198 ± 0.066
	// bran above the mean of the others by 0.613 ± 0.071
	// F = 74.739, t² = 74.739
}

// One small comparison after another, without allocating: the arithmetic only.
func ExampleWorkspace() {
	const n = 6
	w, err := glm.NewWorkspace(n, 2)
	if err != nil {
		fmt.Println(err)
		return
	}
	columns := [][]float64{{1, 1, 1, 1, 1, 1}, {58, 60, 62, 64, 66, 68}}
	for _, y := range [][]float64{
		{2.8, 2.9, 3.1, 3.3, 3.3, 3.6},
		{3.1, 3.0, 3.2, 2.9, 3.1, 3.2},
	} {
		l, err := w.Compare(columns, y, 1) // the first column against both
		if err != nil {
			fmt.Println(err)
			return
		}
		f, p, _ := l.F()
		fmt.Printf("slope %.4f ± %.4f, F = %.2f, p = %.4f\n", w.Estimate[1], w.SE[1], f, p)
	}
	// Output:
	// slope 0.0771 ± 0.0077, F = 99.41, p = 0.0006
	// slope 0.0071 ± 0.0152, F = 0.22, p = 0.6631
}
