package glm_test

import (
	"context"
	"fmt"
	"iter"
	"math/rand/v2"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Presses is a source of our own: a plant's readings, made as they are asked for
// and never held. Each pass gives the same rows, since each window is drawn from a
// seed of its own.
type Presses struct {
	rows int
	id   lrt.ID // of the rows and of their one response
}

// NewPresses gives the readings an identity. Without a digest they are the same
// only as themselves: models are compared when they are bound to one *Presses.
func NewPresses(rows int) *Presses { return &Presses{rows, lrt.NewID(nil)} }

// Schema declares fields and levels before the first row.
func (p *Presses) Schema() []glm.Field {
	return []glm.Field{{Name: "thickness"}, {Name: "press", Levels: []string{"A", "B", "C"}}}
}

// Observations names the rows and the response.
func (p *Presses) Observations(string) lrt.Observations {
	return lrt.Observations{Rows: p.id, Response: p.id}
}

// Windows passes over the rows. What it shows is valid until the next window, so
// that the slices are used again.
func (p *Presses) Windows(ctx context.Context) iter.Seq2[glm.Window, error] {
	return func(yield func(glm.Window, error) bool) {
		const size = 1000
		thickness, press := make([]float64, size), make([]int32, size)
		for first := 0; first < p.rows; first += size {
			if err := ctx.Err(); err != nil {
				yield(glm.Window{}, err)
				return
			}
			n := min(size, p.rows-first)
			r := rand.New(rand.NewPCG(1, uint64(first)))
			for i := range n {
				press[i] = int32(r.IntN(3))
				thickness[i] = 12 + 0.02*float64(press[i]) + 0.3*r.NormFloat64()
			}
			w := glm.Window{First: first, Rows: n, Hi: [][]float64{thickness[:n], nil}, Index: [][]int32{nil, press[:n]}}
			if !yield(w, nil) {
				return
			}
		}
	}
}

func ExampleSource() {
	ctx := context.Background()
	src := NewPresses(50_000)
	one := must(glm.Normal(ctx, src, "thickness", []glm.Term{glm.Constant{}}, nil))
	each := must(one.With(ctx, glm.Factor{Field: "press"}))
	r := must(lrt.Compare(ctx, one, each, nil))
	fmt.Printf("%d rows, F = %.1f on %v, p = %.1g\n", r.Pair.Full.N, r.Exact.Statistic, r.Exact.Law, r.Exact.P)
	// Output:
	// 50000 rows, F = 79.9 on F(2, 49997), p = 2e-35
}

func ExampleModel_Maximize() {
	ctx := context.Background()
	m := must(glm.Normal(ctx, farm(), "yield", []glm.Term{glm.Constant{}, glm.Factor{Field: "substrate"}}, nil))
	f := must(m.Maximize(ctx)) // the fit as lrt sees it, with all constants
	fmt.Printf("log L = %.4f with %d free parameters, AIC %.3f\n", f.LogLikelihood, f.Dim, f.AIC())
	// Output:
	// log L = -1.0335 with 4 free parameters, AIC 10.067
}

// Simultaneous intervals by Bonferroni's inequality: three differences, each at a
// level of 1 − 0.05/3.
func ExampleFit_Critical() {
	f := substrates(context.Background())
	half := f.Critical(1 - 0.05/3)
	for _, pair := range [][2]string{{"bran", "straw"}, {"husk", "straw"}, {"bran", "husk"}} {
		e := must(f.Combination(
			glm.Weight{Name: "substrate=" + pair[0], Coef: 1},
			glm.Weight{Name: "substrate=" + pair[1], Coef: -1}))
		fmt.Printf("%s − %s: %.3f to %.3f\n", pair[0], pair[1], e.Value-half*e.SE, e.Value+half*e.SE)
	}
	// Output:
	// bran − straw: 0.392 to 0.856
	// husk − straw: -0.230 to 0.273
	// bran − husk: 0.339 to 0.865
}
