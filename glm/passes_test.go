package glm_test

import (
	"context"
	"errors"
	"iter"
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// choppy cuts the windows of data at odd places, some of no rows at all, and
// leaves out low parts that are zero as another source may.
type choppy struct {
	*glm.Data
	seed uint64
	fail int // row before which the source breaks down; 0: never
}

// Len hides that blocks could be had at once.
func (choppy) Len() {}

var errBroken = errors.New("the wire is cut")

func (c choppy) Windows(ctx context.Context) iter.Seq2[glm.Window, error] {
	return func(yield func(glm.Window, error) bool) {
		r := rand.New(rand.NewPCG(c.seed, 4))
		var w glm.Window
		n := c.Data.Len()
		for at := 0; at < n; {
			if err := ctx.Err(); err != nil {
				yield(glm.Window{}, err)
				return
			}
			rows := min(r.IntN(1400), n-at)
			if r.IntN(4) == 0 {
				rows = r.IntN(2) * min(rows, 1)
			}
			if c.fail > 0 && at+rows >= c.fail {
				yield(glm.Window{}, errBroken)
				return
			}
			c.Data.Slice(&w, at, rows)
			w.Lo = nil
			if !yield(w, nil) {
				return
			}
			at += rows
		}
	}
}

// TestCutOfRows: how a source cuts its rows changes no bit of any result.
func TestCutOfRows(t *testing.T) {
	ctx := context.Background()
	p := field(90, 40000)
	d := p.data(t)
	terms := []glm.Term{one, cx, fa, glm.Cross{fb, cx}, glm.Powers{Field: "off", Degree: 2}}
	for _, o := range []*glm.Options{nil, {Weights: glm.Weights{Kind: glm.Frequency, Field: "w"}}, {Offset: "off"}} {
		want := fitted(t, model(t, d, o, terms...))
		var rows []glm.RowFit
		for r, err := range want.Each(ctx) {
			if err != nil {
				t.Fatal(err)
			}
			if rows = append(rows, r); len(rows) == 3000 {
				break
			}
		}
		for seed := range uint64(3) {
			got := fitted(t, model(t, choppy{Data: d, seed: seed}, o, terms...))
			if got.RSS != want.RSS || got.LogLikelihood != want.LogLikelihood || got.N != want.N || got.Rows != want.Rows {
				t.Errorf("RSS %.17g, want %.17g; n %d, want %d", got.RSS, want.RSS, got.N, want.N)
			}
			for i, c := range want.Coefficients {
				if g := got.Coefficients[i]; g.Estimate != c.Estimate || !c.Aliased && g.SE != c.SE {
					t.Errorf("%s = %.17g ± %.17g, want %.17g ± %.17g", c.Name, g.Estimate, g.SE, c.Estimate, c.SE)
				}
			}
			k := 0
			for r, err := range got.Each(ctx) {
				if err != nil {
					t.Fatal(err)
				}
				if r != rows[k] {
					t.Fatalf("row %+v, want %+v", r, rows[k])
				}
				if k++; k == len(rows) {
					break
				}
			}
		}
	}
}

// TestBrokenSource: an error of the source comes back, from every method that reads rows.
func TestBrokenSource(t *testing.T) {
	ctx := context.Background()
	d := field(91, 5000).data(t)
	m := model(t, choppy{Data: d, fail: 3000}, nil, one, cx, fa)
	if _, err := m.Fit(ctx, nil); !errors.Is(err, errBroken) {
		t.Errorf("Fit: %v", err)
	}
	if _, err := lrt.Compare(ctx, model(t, m.Source(), nil, one), m, nil); !errors.Is(err, errBroken) {
		t.Errorf("Compare: %v", err)
	}
	if _, err := glm.Normal(ctx, m.Source(), "y", []glm.Term{glm.Factor{Field: "w"}}, nil); !errors.Is(err, errBroken) {
		t.Errorf("Bind: %v", err)
	}
	f := fitted(t, model(t, d, nil, one, cx, fa))
	if _, _, err := f.Predict(ctx, m.Source()); !errors.Is(err, errBroken) {
		t.Errorf("Predict: %v", err)
	}
}

// TestFirstFault: of several faults the first row is named, whatever the number of workers.
func TestFirstFault(t *testing.T) {
	ctx := context.Background()
	p := field(92, 60000)
	p.x[59000], p.x[33333], p.off[40000] = math.NaN(), math.NaN(), math.NaN()
	d := newData(t, glm.Numbers("y", p.y), glm.Numbers("x", p.x).MissingNumbers(math.NaN()), glm.Numbers("off", p.off).MissingNumbers(math.NaN()), glm.Labels("a", p.a))
	for _, terms := range [][]glm.Term{{one, cx, fa}, {one, fa, glm.Cross{fa, cx}}} {
		for _, workers := range []int{1, 2, 5} {
			for _, src := range []glm.Source{d, choppy{Data: d}} {
				_, err := model(t, src, &glm.Options{Workers: workers}, append(terms, glm.Covariate{Field: "off"})...).Fit(ctx, nil)
				var ce *glm.ColumnError
				if !errors.As(err, &ce) || ce.Column != "x" || ce.Row != 33333 || !errors.Is(err, glm.ErrMissing) {
					t.Errorf("%d workers: %v", workers, err)
				}
			}
		}
	}
}

// TestCancelDuringPass: a context that ends while rows are read ends the pass.
func TestCancelDuringPass(t *testing.T) {
	d := field(93, 200000).data(t)
	for _, workers := range []int{1, 2} {
		ctx, cancel := context.WithCancel(context.Background())
		m, err := glm.Normal(ctx, d, "y", []glm.Term{one, fa, stopper{cancel}}, &glm.Options{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := m.Fit(ctx, nil); !errors.Is(err, context.Canceled) {
			t.Errorf("%d workers: %v", workers, err)
		}
	}
}

// stopper is a column of ones that cancels once it is far into the rows.
type stopper struct{ cancel func() }

func (stopper) Name() string { return "stopper" }

func (s stopper) Bind(context.Context, glm.Source) (glm.Columns, error) {
	return glm.Columns{Names: []string{"s"}, Fill: func(w glm.Window, hi, lo [][]float64) error {
		if w.First > 50000 {
			s.cancel()
		}
		for i := range w.Rows {
			hi[0][i], lo[0][i] = float64((w.First+i)%7), 0
		}
		return nil
	}}, nil
}

// TestConcurrent: one model and one fit serve many goroutines.
func TestConcurrent(t *testing.T) {
	ctx := context.Background()
	d := field(94, 3000).data(t)
	s, b := model(t, d, nil, one, cx), model(t, d, nil, one, cx, fa, glm.Cross{fa, fb})
	f := fitted(t, b)
	want := compare(t, s, b).Exact.Statistic
	errs := make(chan error, 8)
	for range 8 {
		go func() {
			errs <- func() error {
				r, err := lrt.Compare(ctx, s, b, nil)
				if err != nil {
					return err
				}
				if r.Exact.Statistic != want {
					return errors.New("another F")
				}
				if _, err := f.Combination(glm.Weight{Name: "x", Coef: 1}); err != nil {
					return err
				}
				n := 0
				for _, err := range f.Each(ctx) {
					if n++; err != nil || n > 600 {
						return err
					}
				}
				_, _, err = f.Predict(ctx, d)
				return err
			}()
		}()
	}
	var all []error
	for range 8 {
		if err := <-errs; err != nil {
			all = append(all, err)
		}
	}
	if len(all) > 0 {
		t.Error(all)
	}
}
