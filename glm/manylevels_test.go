package glm_test

import (
	"context"
	"math"
	"testing"

	"subsume.example/glm"
)

// TestManyLevels: the coefficients of thousands of levels, which a fit reads off in
// one go, are those that Combination gives one by one.
func TestManyLevels(t *testing.T) {
	const levels, rows = 2100, 7000
	level, half, x, y := make([]float64, rows), make([]string, rows), make([]float64, rows), make([]float64, rows)
	for i := range rows {
		level[i], half[i] = float64(i%levels), [2]string{"a", "b"}[(i+i/levels)%2]
		x[i] = 1e6 + float64(i*i%37)
		y[i] = 500 + float64(i*7919%1013)/64
	}
	d, err := glm.NewData(glm.Numbers("y", y), glm.Numbers("x", x), glm.Numbers("level", level), glm.Labels("half", half))
	if err != nil {
		t.Fatal(err)
	}
	many, few := glm.Factor{Field: "level"}, glm.Factor{Field: "half"}
	for _, c := range []struct {
		name   string
		minus  bool // a coefficient is a difference from the reference level
		first  string
		others string
		terms  []glm.Term
	}{
		{"constant first", true, "level=0", "level=1000", []glm.Term{one, few, cx, many}},
		{"levels first", false, "", "level=1000", []glm.Term{many, few, cx}},
		{"no constant", false, "", "level=1000", []glm.Term{many, cx}},
		{"small factor first", true, "level=0", "level=1000", []glm.Term{few, cx, many}},
	} {
		f, err := model(t, d, nil, c.terms...).Fit(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		got, err := f.Coefficient(c.others)
		if err != nil || got.Aliased {
			t.Fatal(got, err)
		}
		ws := []glm.Weight{{Name: c.others, Coef: 1}}
		if c.minus {
			ws = append(ws, glm.Weight{Name: c.first, Coef: -1})
		} else if c.name == "levels first" { // the other factor's reference is what its effect is measured from
			ws = append(ws, glm.Weight{Name: "half=a", Coef: 1})
		}
		want, err := f.Combination(ws...)
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		if math.Abs(got.Estimate-want.Value) > 1e-12*(1+math.Abs(want.Value)) {
			t.Errorf("%s: %s = %.17g, want %.17g", c.name, c.others, got.Estimate, want.Value)
		}
	}
	// One-way: differences of group means.
	f, err := model(t, d, nil, one, many).Fit(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	mean := func(l int) (s float64) {
		n := 0.0
		for i := l; i < rows; i += levels {
			s, n = s+y[i], n+1
		}
		return s / n
	}
	for _, c := range f.Coefficients[:1] {
		if math.Abs(c.Estimate-mean(0)) > 1e-12*mean(0) {
			t.Errorf("constant %g, want %g", c.Estimate, mean(0))
		}
	}
	if c, _ := f.Coefficient("level=1234"); math.Abs(c.Estimate-(mean(1234)-mean(0))) > 1e-11 {
		t.Errorf("level=1234: %g, want %g", c.Estimate, mean(1234)-mean(0))
	}
}
