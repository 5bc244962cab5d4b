package glm_test

import (
	"context"
	"errors"
	"math"
	"slices"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// byteDesign turns bytes into a small design: columns of ordinary and of awkward
// numbers, factors, weights, an offset, and a list of terms.
type byteDesign struct {
	b  []byte
	at int
}

func (d *byteDesign) next() byte {
	if d.at >= len(d.b) {
		d.at++
		return byte(d.at * 37)
	}
	d.at++
	return d.b[d.at-1]
}

var awkward = []float64{0, 1, -1, 0.1, 3, math.NaN(), math.Inf(1), math.Inf(-1), 1e300, -1e300, 1e-300, math.MaxFloat64,
	math.SmallestNonzeroFloat64, 1e155, 1e-155, 1e16, 1e16 + 2, math.Copysign(0, -1)}

func (d *byteDesign) column(n int) []float64 {
	x := make([]float64, n)
	kind, a := d.next()%9, float64(d.next())
	for i := range x {
		v := float64(int8(d.next()))
		switch kind {
		case 0:
			x[i] = a // constant
		case 1:
			x[i] = 1e12 + v
		case 2:
			x[i] = v * 1e250
		case 3:
			x[i] = v * 1e-250
		case 4:
			x[i] = awkward[int(uint8(v))%len(awkward)]
		case 5:
			x[i] = a + 1e-14*v
		default:
			x[i] = v / 4
		}
	}
	return x
}

func (d *byteDesign) build() (*glm.Data, []glm.Term, *glm.Options, error) {
	n := int(d.next() % 14)
	level := func(k int) []string {
		s := make([]string, n)
		for i := range s {
			s[i] = string(rune('p' + int(d.next())%k))
		}
		return s
	}
	x := d.column(n)
	z := d.column(n)
	if d.next()%4 == 0 { // collinear
		for i := range z {
			z[i] = 2*x[i] + 1
		}
	}
	w := make([]float64, n)
	for i := range w {
		w[i] = float64(d.next() % 4)
	}
	data, err := glm.NewData(glm.Numbers("y", d.column(n)), glm.Numbers("x", x), glm.Numbers("z", z), glm.Numbers("w", w),
		glm.Labels("a", level(3)), glm.Labels("b", level(2)))
	o := &glm.Options{}
	switch d.next() % 6 {
	case 0:
		o.Weights = glm.Weights{Kind: glm.Frequency, Field: "w"}
	case 1:
		o.Weights = glm.Weights{Kind: glm.Precision, Field: "w"}
	case 2:
		o.Offset = "z"
	case 3:
		o.KnownVariance = 2
	}
	all := []glm.Term{glm.Constant{}, glm.Covariate{Field: "x"}, glm.Covariate{Field: "z"}, fa, fb,
		glm.Cross{fa, fb}, glm.Cross{fa, cx}, glm.Powers{Field: "x", Degree: 3}, glm.Cross{cx, glm.Covariate{Field: "z"}}, glm.Factor{Field: "x"}}
	pick := uint(d.next()) | uint(d.next())<<8
	var ts []glm.Term
	for i, t := range all {
		if pick>>i&1 == 1 {
			ts = append(ts, t)
		}
	}
	return data, ts, o, err
}

// typed reports whether an error is one that a caller can take apart.
func typed(err error) bool {
	var column *glm.ColumnError
	var term *glm.TermError
	var coefficient *glm.CoefficientError
	var comparison *lrt.ComparisonError
	return errors.As(err, &column) || errors.As(err, &term) || errors.As(err, &coefficient) || errors.As(err, &comparison) ||
		errors.Is(err, glm.ErrOverflow) || errors.Is(err, glm.ErrNotEstimable)
}

// wide reports whether the squares of a column's values span more than the float64 range.
func wide(d *glm.Data, name string) bool {
	v, _ := d.Values(name)
	small, large := math.Inf(1), 0.0
	for _, x := range v {
		if x != 0 {
			small, large = math.Min(small, math.Abs(x)), math.Max(large, math.Abs(x))
		}
	}
	return small/large < 1e-140
}

func FuzzFit(f *testing.F) {
	f.Add([]byte{})
	f.Add([]byte{9, 7, 3, 1, 2, 3, 4, 5, 6, 7, 8, 9, 7, 1, 200, 100, 3, 4, 5, 6, 7, 8, 9})
	for k := range byte(9) {
		f.Add([]byte{12, k, 5, 11, 22, 33, 44, 55, 66, 77, 88, 99, 110, 121, 132, 8 - k, 3, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, k, k})
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		ctx := context.Background()
		d := &byteDesign{b: b}
		data, ts, o, err := d.build()
		if err != nil {
			if !typed(err) {
				t.Fatalf("data: untyped error %v", err)
			}
			return
		}
		full, err := glm.Normal(ctx, data, "y", ts, o)
		if err != nil {
			if !typed(err) {
				t.Fatalf("model: untyped error %v", err)
			}
			return
		}
		fit, err := full.Fit(ctx, nil)
		if err != nil {
			if !typed(err) {
				t.Fatalf("fit: untyped error %v", err)
			}
			return
		}
		if fit.Rank < 0 || fit.Rank > fit.N || fit.DFError != fit.N-fit.Rank || fit.RSS < 0 || math.IsNaN(fit.RSS) || math.IsNaN(fit.TotalSS) {
			t.Fatalf("rank %d of %d, error df %d, RSS %g, total %g", fit.Rank, fit.N, fit.DFError, fit.RSS, fit.TotalSS)
		}
		if len(fit.Coefficients) != len(full.Coefficients()) {
			t.Fatalf("%d coefficients, %d names", len(fit.Coefficients), len(full.Coefficients()))
		}
		kept := 0
		for _, c := range fit.Coefficients {
			if !c.Aliased {
				kept++
			}
			if math.IsNaN(c.Estimate) && !hasCode(fit.Warnings, "coefficient-range") || c.SE < 0 {
				t.Fatalf("%s = %g ± %g", c.Name, c.Estimate, c.SE)
			}
		}
		if kept != fit.Rank {
			t.Fatalf("%d coefficients kept, rank %d; aliased %v", kept, fit.Rank, fit.Aliased)
		}
		leverage := 0.0
		for r, err := range fit.Each(ctx) {
			if err != nil {
				t.Fatal(err)
			}
			if math.IsNaN(r.Fitted) && r.Weight > 0 || r.Leverage < 0 || r.Leverage > 1 {
				t.Fatalf("row %+v", r)
			}
			if o.Weights.Kind == glm.Frequency {
				leverage += r.Leverage * r.Weight
			} else {
				leverage += r.Leverage
			}
		}
		if math.Abs(leverage-float64(fit.Rank)) > 1e-6 && fit.SmallestKept > 1e-8 && !wide(data, "x") && !wide(data, "z") {
			t.Fatalf("leverages sum to %g, rank %d", leverage, fit.Rank)
		}
		if _, _, err := fit.Predict(ctx, data); err != nil {
			t.Fatalf("prediction of the rows of the fit: %v", err)
		}
		for k := range ts {
			small, err := glm.Normal(ctx, data, "y", slices.Delete(slices.Clone(ts), k, k+1), o)
			if err != nil {
				t.Fatal(err)
			}
			r, err := lrt.Compare(ctx, small, full, nil)
			if err != nil {
				if !typed(err) {
					t.Fatalf("compare: untyped error %v", err)
				}
				continue
			}
			fl := r.Exact.Statistic
			switch {
			case math.IsNaN(fl) || fl < 0 || math.IsNaN(r.P()) || r.P() < 0 || r.P() > 1:
				t.Fatalf("without %s: F = %g, p = %g", ts[k].Name(), fl, r.P())
			case math.IsInf(fl, 1) && !r.HasWarning("nil-residual") && o.KnownVariance == 0:
				t.Fatalf("without %s: F = %g unflagged: %v", ts[k].Name(), fl, r.Warnings)
			}
		}
	})
}
