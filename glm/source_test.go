package glm_test

import (
	"context"
	"errors"
	"iter"
	"math"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// delivered is a source that delivers whatever it is given.
type delivered struct {
	fields  []glm.Field
	windows []glm.Window
	id      lrt.ID
}

func (s *delivered) Schema() []glm.Field { return s.fields }

func (s *delivered) Observations(string) lrt.Observations {
	return lrt.Observations{Rows: s.id, Response: s.id}
}

func (s *delivered) Windows(context.Context) iter.Seq2[glm.Window, error] {
	return func(yield func(glm.Window, error) bool) {
		for _, w := range s.windows {
			if !yield(w, nil) {
				return
			}
		}
	}
}

// TestSourceContract: windows that do not fit the schema are refused, not read as other data.
func TestSourceContract(t *testing.T) {
	y, g := []float64{1, 3, 2, 5, 4, 7}, []int32{0, 1, 0, 1, 0, 1}
	window := func(first, rows int, y []float64, g []int32) glm.Window {
		return glm.Window{First: first, Rows: rows, Hi: [][]float64{y, nil}, Index: [][]int32{nil, g}}
	}
	run := func(ws ...glm.Window) error {
		s := &delivered{[]glm.Field{{Name: "y"}, {Name: "g", Levels: []string{"a", "b"}}}, ws, lrt.NewID(nil)}
		m, err := glm.Normal(context.Background(), s, "y", []glm.Term{one}, nil)
		if err != nil {
			t.Fatal(err)
		}
		full, err := m.With(context.Background(), glm.Factor{Field: "g"})
		if err != nil {
			t.Fatal(err)
		}
		_, err = lrt.Compare(context.Background(), m, full, nil)
		return err
	}
	if err := run(window(0, 4, y[:4], g[:4]), window(4, 0, nil, nil), window(4, 2, y[4:], g[4:])); err != nil {
		t.Error(err)
	}
	for name, ws := range map[string][]glm.Window{
		"values missing":        {window(0, 6, y[:3], g)},
		"values over":           {window(0, 3, y, g[:3])},
		"levels missing":        {window(0, 6, y, g[:3])},
		"level out of range":    {window(0, 6, y, []int32{0, 1, 0, 1, 0, 2})},
		"level below none":      {window(0, 6, y, []int32{0, 1, 0, 1, 0, -2})},
		"no slices":             {{Rows: 6}},
		"negative rows":         {window(0, -1, nil, nil)},
		"rows that do not join": {window(0, 4, y[:4], g[:4]), window(0, 2, y[4:], g[4:])},
	} {
		if err := run(ws...); !errors.Is(err, glm.ErrSource) {
			t.Errorf("%s: %v, want ErrSource", name, err)
		}
	}
}

// userTerm is a term that fills one column by a function.
type userTerm func(w glm.Window, hi, lo [][]float64) error

func (userTerm) Name() string { return "mine" }

func (u userTerm) Bind(context.Context, glm.Source) (glm.Columns, error) {
	return glm.Columns{Names: []string{"mine"}, Fill: u}, nil
}

// TestUserTermFaults: what a user's term does wrong names the term and harms nobody else.
func TestUserTermFaults(t *testing.T) {
	n := 3 * 32 * 256 // enough for several goroutines
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i], y[i] = float64(i%97)+0.5, float64((i*7919)%1013)
	}
	d, err := glm.NewData(glm.Numbers("y", y), glm.Numbers("x", x))
	if err != nil {
		t.Fatal(err)
	}
	ctx := context.Background()
	small := model(t, d, &glm.Options{Workers: 2}, one)
	compareWith := func(u userTerm) (lrt.Result, error) {
		full, err := small.With(ctx, u)
		if err != nil {
			return lrt.Result{}, err
		}
		return lrt.Compare(ctx, small, full, nil)
	}
	var te *glm.TermError
	if _, err := compareWith(func(w glm.Window, _, _ [][]float64) error {
		if w.First > n/2 {
			panic("late")
		}
		return nil
	}); !errors.Is(err, lrt.ErrPanic) || !errors.As(err, &te) || te.Term != "mine" {
		t.Errorf("panic: %v", err)
	}
	if _, err := compareWith(func(w glm.Window, hi, _ [][]float64) error {
		hi[0] = append([]float64(nil), w.Hi[1]...)
		return nil
	}); !errors.Is(err, glm.ErrTerm) {
		t.Errorf("replaced slices: %v", err)
	}
	// A term that leaves the low parts alone has none.
	got, err := compareWith(func(w glm.Window, hi, _ [][]float64) error { copy(hi[0], w.Hi[1]); return nil })
	if err != nil {
		t.Fatal(err)
	}
	if want := compare(t, small, model(t, d, nil, one, cx)); relative(got.Exact.Statistic, want.Exact.Statistic) > 1e-14 {
		t.Errorf("F = %g, want %g", got.Exact.Statistic, want.Exact.Statistic)
	}
	// The response explains itself only where a term says that it means to.
	if _, err := small.With(ctx, glm.Covariate{Field: "y"}); !errors.Is(err, glm.ErrTerm) {
		t.Errorf("response as covariate: %v", err)
	}
	if _, err := glm.Join(ctx, lrt.Comparison{Restricted: small, Full: (*glm.Model)(nil)}); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("nil joined: %v", err)
	}
	if _, err := small.With(ctx, glm.Cross{cx, nil}); !errors.Is(err, glm.ErrTerm) {
		t.Errorf("part nil: %v", err)
	}
}

// TestAbsentSpaces: nil in place of data, spaces and references is an error.
func TestAbsentSpaces(t *testing.T) {
	ctx := context.Background()
	if _, err := glm.Normal(ctx, (*glm.Data)(nil), "y", nil, nil); !errors.Is(err, glm.ErrEmpty) {
		t.Errorf("nil data: %v", err)
	}
	d := field(5, 40).data(t)
	m, full := model(t, d, nil, one), model(t, d, nil, one, cx)
	for _, c := range []lrt.Comparison{{Restricted: (*glm.Model)(nil), Full: m}, {Restricted: m, Full: (*glm.Model)(nil)},
		{Restricted: m, Full: full, Error: &lrt.ErrorPair{Smaller: (*glm.Model)(nil)}}} {
		if _, err := c.Run(ctx, nil); !errors.Is(err, lrt.ErrInvalid) {
			t.Errorf("nil space: %v", err)
		}
	}
	if _, err := lrt.Compare(ctx, m, full, &lrt.Settings{References: []lrt.Reference{nil}}); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("nil reference: %v", err)
	}
	// A value so far out that the distance is no float64 is not a comparison without a p-value.
	far, err := lrt.Restrict(full, lrt.Fix("x", math.MaxFloat64))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := lrt.Compare(ctx, far, full, nil); !errors.Is(err, glm.ErrOverflow) {
		t.Errorf("value out of range: %v", err)
	}
}

// TestWorkspaceBelowRange: values whose squares underflow are refused, not taken for zero.
func TestWorkspaceBelowRange(t *testing.T) {
	w, err := glm.NewWorkspace(5, 2)
	if err != nil {
		t.Fatal(err)
	}
	ones, x, y := []float64{1, 1, 1, 1, 1}, []float64{1, 2, 3, 5, 4}, []float64{2, 1, 4, 3, 7}
	times := func(c []float64, a float64) []float64 {
		out := make([]float64, len(c))
		for i, v := range c {
			out[i] = v * a
		}
		return out
	}
	for _, c := range []struct{ x, y []float64 }{{x, times(y, 1e-300)}, {times(x, 1e-300), y}} {
		var ce *glm.ColumnError
		if _, err := w.Compare([][]float64{ones, c.x}, c.y, 1); !errors.Is(err, glm.ErrOverflow) || !errors.As(err, &ce) {
			t.Errorf("%v", err)
		}
	}
	if l, err := w.Compare([][]float64{ones, times(x, 1e-120)}, times(y, 1e-120), 1); err != nil || math.IsNaN(l.Numerator) {
		t.Error(l, err)
	}
	if _, err := w.Compare([][]float64{ones, times(ones, 0)}, y, 1); err != nil { // a column of zeros is spanned, not small
		t.Error(err)
	}
	f, err := model(t, field(5, 40).data(t), nil, one, cx).Fit(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	if _, _, err := f.Predict(context.Background(), (*glm.Data)(nil)); !errors.Is(err, glm.ErrEmpty) {
		t.Errorf("nil rows: %v", err)
	}
}
