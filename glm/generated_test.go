package glm_test

import (
	"context"
	"iter"
	"math/rand/v2"
	"strconv"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// generated is a source of two crossed factors that holds no rows: each window is
// drawn from its own seed. passes counts how often it was read.
type generated struct {
	rows, levels int
	passes       int
	id           lrt.ID
}

func (g *generated) Schema() []glm.Field {
	names := make([]string, g.levels)
	for i := range names {
		names[i] = strconv.Itoa(i)
	}
	return []glm.Field{{Name: "y"}, {Name: "a", Levels: names}, {Name: "b", Levels: names}}
}

func (g *generated) Observations(string) lrt.Observations {
	if g.id.IsZero() {
		g.id = lrt.NewID(nil)
	}
	return lrt.Observations{Rows: g.id, Response: g.id}
}

func (g *generated) Windows(ctx context.Context) iter.Seq2[glm.Window, error] {
	g.passes++
	return func(yield func(glm.Window, error) bool) {
		const size = 1000
		y, a, b := make([]float64, size), make([]int32, size), make([]int32, size)
		for first := 0; first < g.rows; first += size {
			if err := ctx.Err(); err != nil {
				yield(glm.Window{}, err)
				return
			}
			n := min(size, g.rows-first)
			r := rand.New(rand.NewPCG(99, uint64(first)))
			for i := range n {
				a[i], b[i] = int32(r.IntN(g.levels)), int32(r.IntN(g.levels))
				y[i] = 0.01*float64(a[i]) + 0.001*float64(b[i]) + r.NormFloat64()
			}
			w := glm.Window{First: first, Rows: n, Hi: [][]float64{y[:n], nil, nil}, Index: [][]int32{nil, a[:n], b[:n]}}
			if !yield(w, nil) {
				return
			}
		}
	}
}
