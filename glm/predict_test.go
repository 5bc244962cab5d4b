package glm_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"testing"

	"subsume.example/dist"
	"subsume.example/glm"
	"subsume.example/lrt"
)

func predict(t *testing.T, f *glm.Fit, d glm.Source) ([]glm.Prediction, []lrt.Warning) {
	t.Helper()
	ps, ws, err := f.Predict(context.Background(), d)
	if err != nil {
		t.Fatal(err)
	}
	return ps, ws
}

func fitted(t *testing.T, m *glm.Model) *glm.Fit {
	t.Helper()
	f, err := m.Fit(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func newData(t *testing.T, cols ...glm.Column) *glm.Data {
	t.Helper()
	d, err := glm.NewData(cols...)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// TestPredictLine: a straight line by hand: the mean at x has standard error
// s√(1/n + (x−x̄)²/Sxx), one new observation s√(1 + …) (Draper and Smith, Applied
// Regression Analysis, section 1.4).
func TestPredictLine(t *testing.T) {
	x := []float64{1, 2, 3, 4, 5, 6}
	y := []float64{2.1, 3.9, 6.2, 7.8, 10.1, 12.2}
	f := fitted(t, model(t, newData(t, glm.Numbers("y", y), glm.Numbers("x", x)), nil, one, cx))
	ps, ws := predict(t, f, newData(t, glm.Numbers("x", []float64{2.5, 9})))
	var sxx, sxy, my float64
	for i := range x {
		my += y[i] / 6
	}
	for i := range x {
		sxx += (x[i] - 3.5) * (x[i] - 3.5)
		sxy += (x[i] - 3.5) * (y[i] - my)
	}
	var rss float64
	for i := range x {
		e := y[i] - my - sxy/sxx*(x[i]-3.5)
		rss += e * e
	}
	s, q := math.Sqrt(rss/4), dist.StudentT{Nu: 4}.UpperQuantile(0.025)
	for i, at := range []float64{2.5, 9} {
		v := my + sxy/sxx*(at-3.5)
		h := 1.0/6 + (at-3.5)*(at-3.5)/sxx
		for _, c := range []struct {
			what      string
			got, want float64
		}{
			{"value", ps[i].Value, v}, {"SE", ps[i].SE, s * math.Sqrt(h)},
			{"lower", ps[i].Lower, v - q*s*math.Sqrt(h)}, {"upper", ps[i].Upper, v + q*s*math.Sqrt(h)},
			{"new lower", ps[i].NewLower, v - q*s*math.Sqrt(1+h)}, {"new upper", ps[i].NewUpper, v + q*s*math.Sqrt(1+h)},
		} {
			if relative(c.got, c.want) > 1e-13 {
				t.Errorf("x = %g: %s = %.15g, want %.15g", at, c.what, c.got, c.want)
			}
		}
	}
	if !hasCode(ws, "extrapolation") || len(ps[0].Outside) != 0 || !slices.Equal(ps[1].Outside, []string{"x"}) || !ps[1].Estimable {
		t.Errorf("warnings %v, outside %v and %v", ws, ps[0].Outside, ps[1].Outside)
	}
}

// TestPredictNewSource: fields are found by name and levels by name, whatever their order;
// the response is not needed.
func TestPredictNewSource(t *testing.T) {
	p := field(50, 60)
	m := model(t, p.data(t), nil, one, cx, glm.Factor{Field: "a", Reference: "q"}, glm.Cross{fa, fb}, glm.Cross{fa, cx}, glm.Powers{Field: "off", Degree: 3})
	f := fitted(t, m)
	var want []glm.RowFit
	for r, err := range f.Each(context.Background()) {
		if err != nil {
			t.Fatal(err)
		}
		want = append(want, r)
	}
	other := newData(t, glm.Labels("b", p.b).Order("block 4", "block 1", "block 3", "block 2"),
		glm.Labels("unused", p.a), glm.Numbers("off", p.off), glm.Labels("a", p.a).Order("r", "p", "q"), glm.Numbers("x", p.x))
	ps, ws := predict(t, f, other)
	if len(ps) != len(want) || len(ws) != 0 {
		t.Fatalf("%d predictions, warnings %v", len(ps), ws)
	}
	for i := range ps {
		if ps[i].Row != i || !ps[i].Estimable || math.Abs(ps[i].Value-want[i].Fitted) > 1e-12 || relative(ps[i].SE, f.SD*math.Sqrt(want[i].Leverage)) > 1e-12 {
			t.Errorf("row %d: %+v, want %g ± %g", i, ps[i], want[i].Fitted, f.SD*math.Sqrt(want[i].Leverage))
		}
	}
	// More rows than one block.
	var long plot
	for range 30 {
		long.a, long.b, long.x, long.off = append(long.a, p.a...), append(long.b, p.b...), append(long.x, p.x...), append(long.off, p.off...)
	}
	ps, _ = predict(t, f, newData(t, glm.Labels("a", long.a), glm.Labels("b", long.b), glm.Numbers("x", long.x), glm.Numbers("off", long.off)))
	if len(ps) != 1800 || ps[1799].Row != 1799 || math.Abs(ps[1799].Value-want[59].Fitted) > 1e-12 {
		t.Errorf("%d rows, last %+v", len(ps), ps[len(ps)-1])
	}
}

// TestPredictRefusals: what new rows cannot be predicted, and why.
func TestPredictRefusals(t *testing.T) {
	ctx := context.Background()
	p := field(51, 40)
	d := p.data(t)
	f := fitted(t, model(t, d, nil, one, cx, fa))
	var ce *glm.ColumnError
	for _, c := range []struct {
		name   string
		src    glm.Source
		want   error
		column string
		row    int
	}{
		{"unknown level", newData(t, glm.Numbers("x", []float64{1, 2}), glm.Labels("a", []string{"p", "zz"})), glm.ErrUnknownLevel, "a", 1},
		{"no such field", newData(t, glm.Labels("a", []string{"p"})), glm.ErrUnknownColumn, "x", -1},
		{"labels for numbers", newData(t, glm.Labels("x", []string{"1"}), glm.Labels("a", []string{"p"})), glm.ErrNotNumeric, "x", -1},
		{"numbers for labels", newData(t, glm.Numbers("x", []float64{1}), glm.Numbers("a", []float64{1})), glm.ErrNotCategorical, "a", -1},
		{"missing number", newData(t, glm.Numbers("x", []float64{1, math.NaN()}).MissingNumbers(math.NaN()), glm.Labels("a", []string{"p", "q"})), glm.ErrMissing, "x", 1},
		{"missing label", newData(t, glm.Numbers("x", []float64{1, 2}), glm.Labels("a", []string{"", "q"}).MissingTexts("")), glm.ErrMissing, "a", 0},
		{"nothing", nil, glm.ErrEmpty, "", -1},
	} {
		_, _, err := f.Predict(ctx, c.src)
		if !errors.Is(err, c.want) || !errors.As(err, &ce) || ce.Column != c.column || ce.Row != c.row {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	if _, _, err := f.Predict(cancelled, d); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// A number that is a level, unseen.
	g := fitted(t, model(t, newData(t, glm.Numbers("y", []float64{1, 2, 3, 5}), glm.Numbers("x", []float64{1, 1, 2, 2})), nil, one, glm.Factor{Field: "x"}))
	if _, _, err := g.Predict(ctx, newData(t, glm.Numbers("x", []float64{2, 3}))); !errors.Is(err, glm.ErrUnknownLevel) || !errors.As(err, &ce) || ce.Row != 1 || ce.Text != "3" {
		t.Errorf("unseen number: %v", err)
	}
}

// TestPredictNotEstimable: a cell without rows is not made up from the others,
// whatever the scale of a covariate.
func TestPredictNotEstimable(t *testing.T) {
	for _, scale := range []float64{1e-200, 1e-12, 1, 1e12, 1e200} {
		var y, x []float64
		var a, b []string
		for i := range 24 {
			if i%6 == 5 { // cell a=q, b=3 stays empty
				continue
			}
			a, b = append(a, string(rune('p'+i%2))), append(b, fmt.Sprint(i%6/2+1))
			x, y = append(x, scale*float64(i*i%7)), append(y, math.Sin(float64(i)))
		}
		for i := range a { // and one slope in a=q has no spread
			if a[i] == "q" {
				x[i] = 3 * scale
			}
		}
		d := newData(t, glm.Numbers("y", y), glm.Numbers("x", x), glm.Labels("a", a), glm.Labels("b", b))
		f := fitted(t, model(t, d, nil, one, fa, fb, glm.Cross{fa, fb}))
		ps, ws := predict(t, f, newData(t, glm.Labels("a", []string{"p", "q", "q"}), glm.Labels("b", []string{"3", "3", "2"})))
		if !ps[0].Estimable || ps[1].Estimable || !ps[2].Estimable || !math.IsNaN(ps[1].Value) || !hasCode(ws, "not-estimable") {
			t.Errorf("empty cell: %+v %v", ps, ws)
		}
		f = fitted(t, model(t, d, nil, one, fa, glm.Cross{fa, cx}))
		ps, ws = predict(t, f, newData(t, glm.Labels("a", []string{"p", "q", "q"}), glm.Numbers("x", []float64{5 * scale, 3 * scale, 5 * scale})))
		if !ps[0].Estimable || !ps[1].Estimable || ps[2].Estimable || !hasCode(ws, "not-estimable") {
			t.Errorf("scale %g: slope without spread: %+v %v", scale, ps, ws)
		}
		// And the slopes that are there keep their digits.
		c, err := f.Coefficient("a=p × x")
		if err != nil {
			t.Fatal(err)
		}
		var sx, sy, n, sxx, sxy float64
		for i := range y {
			if a[i] == "p" {
				n, sx, sy = n+1, sx+x[i]/scale, sy+y[i]
			}
		}
		for i := range y {
			if a[i] == "p" {
				u := x[i]/scale - sx/n
				sxx, sxy = sxx+u*u, sxy+u*(y[i]-sy/n)
			}
		}
		if relative(c.Estimate*scale, sxy/sxx) > 1e-12 {
			t.Errorf("scale %g: slope %g, want %g", scale, c.Estimate*scale, sxy/sxx)
		}
	}
}

// TestPredictOffset: the offset of new rows is taken, and known variance gives normal intervals.
func TestPredictOffset(t *testing.T) {
	p := field(52, 40)
	f := fitted(t, model(t, p.data(t), &glm.Options{Offset: "off", KnownVariance: 4}, one, cx))
	c0, _ := f.Coefficient("constant")
	c1, _ := f.Coefficient("x")
	ps, _ := predict(t, f, newData(t, glm.Numbers("x", []float64{0.5}), glm.Numbers("off", []float64{100})))
	if want := 100 + c0.Estimate + 0.5*c1.Estimate; relative(ps[0].Value, want) > 1e-13 {
		t.Errorf("%g, want %g", ps[0].Value, want)
	}
	z := 1.959963984540054 // of the normal law
	if relative(ps[0].Upper-ps[0].Value, z*ps[0].SE) > 1e-12 || relative(ps[0].NewUpper-ps[0].Value, z*math.Sqrt(4+ps[0].SE*ps[0].SE)) > 1e-12 {
		t.Errorf("%+v", ps[0])
	}
	if _, _, err := f.Predict(context.Background(), newData(t, glm.Numbers("x", []float64{0.5}))); !errors.Is(err, glm.ErrUnknownColumn) {
		t.Errorf("without the offset: %v", err)
	}
}

// TestPredictWeights: weights are not needed, and a field beyond its range is named once.
func TestPredictWeights(t *testing.T) {
	p := field(53, 40)
	f := fitted(t, model(t, p.data(t), &glm.Options{Weights: glm.Weights{Kind: glm.Precision, Field: "w"}}, one, cx, fa, glm.Cross{fa, cx}))
	ps, _ := predict(t, f, newData(t, glm.Numbers("x", []float64{0.5, 50}), glm.Labels("a", []string{"q", "q"})))
	e, err := f.Combination(glm.Weight{Name: "constant", Coef: 1}, glm.Weight{Name: "x", Coef: 0.5}, glm.Weight{Name: "a=q", Coef: 1}, glm.Weight{Name: "a=q × x", Coef: 0.5})
	if err != nil {
		t.Fatal(err)
	}
	if relative(ps[0].Value, e.Value) > 1e-13 || relative(ps[0].SE, e.SE) > 1e-13 || relative(ps[0].Upper, e.Upper) > 1e-13 {
		t.Errorf("%+v, want %+v", ps[0], e)
	}
	if !slices.Equal(ps[1].Outside, []string{"x"}) {
		t.Errorf("outside: %v", ps[1].Outside)
	}
}
