package anova

import (
	"fmt"
	"math"
)

// Contrast is a linear function of the means of groups, in their order, whose
// weights add up to zero: the difference of two, of two averages, a trend.
type Contrast struct {
	Name    string
	Weights []float64
	// Null is the value tested; 0 unless a shift is the question.
	Null float64
}

// Pairs returns the differences of all pairs of groups, the later less the
// earlier, named "later − earlier".
func (g *Groups) Pairs() []Contrast {
	var cs []Contrast
	for i := range g.list {
		for k := i + 1; k < len(g.list); k++ {
			cs = append(cs, g.difference(k, i))
		}
	}
	return cs
}

// AgainstControl returns the differences of all groups from the named one. The
// error wraps ErrFamily when there is no such group.
func (g *Groups) AgainstControl(name string) ([]Contrast, error) {
	control := -1
	for i, q := range g.list {
		if q.Name == name {
			control = i
		}
	}
	if control < 0 {
		return nil, &LayoutError{Place: name, Err: fmt.Errorf("%w: no such group", ErrFamily)}
	}
	var cs []Contrast
	for i := range g.list {
		if i != control {
			cs = append(cs, g.difference(i, control))
		}
	}
	return cs, nil
}

func (g *Groups) difference(a, b int) Contrast {
	w := make([]float64, len(g.list))
	w[a], w[b] = 1, -1
	return Contrast{Name: g.list[a].Name + " − " + g.list[b].Name, Weights: w}
}

// check refuses weights that make no contrast.
func (c Contrast) check(k int) error {
	fail := func(format string, args ...any) error {
		return &LayoutError{Place: c.Name, Err: fmt.Errorf("%w: "+format, append([]any{ErrFamily}, args...)...)}
	}
	if len(c.Weights) != k {
		return fail("%d weights for %d groups", len(c.Weights), k)
	}
	sum, size := 0.0, 0.0
	for _, w := range c.Weights {
		if math.IsNaN(w) || math.IsInf(w, 0) {
			return fail("weight %g", w)
		}
		sum, size = sum+w, size+math.Abs(w)
	}
	switch {
	case size == 0:
		return fail("all weights are zero")
	case math.Abs(sum) > 1e-12*size:
		return fail("the weights add up to %g, want 0", sum)
	case math.IsNaN(c.Null) || math.IsInf(c.Null, 0):
		return fail("null value %g", c.Null)
	}
	return nil
}

// pair reports whether the contrast is a multiple of the difference of two groups.
func (c Contrast) pair() bool {
	n := 0
	for _, w := range c.Weights {
		if w != 0 {
			n++
		}
	}
	return n == 2
}

// wholeWeights returns weights that are the contrast's times a divisor, whole
// and of sum zero where the contrast is a multiple of such: thirds in binary do
// not add up to one, and a large common mean must not leak into a contrast.
func (c Contrast) wholeWeights() (w []float64, divisor float64) {
	most := 0.0
	for _, x := range c.Weights {
		most = math.Max(most, math.Abs(x))
	}
	for _, unit := range []float64{1, 1 / most} {
		for k := 1.0; k <= 2520; k++ {
			w, sum, ok := make([]float64, len(c.Weights)), 0.0, true
			for i, x := range c.Weights {
				v := x * unit * k
				w[i] = math.Round(v)
				if math.Abs(v-w[i]) > 1e-12*k || math.Abs(w[i]) > 1e6 {
					ok = false
					break
				}
				sum += w[i]
			}
			if ok && sum == 0 {
				return w, unit * k
			}
		}
	}
	return c.Weights, 1
}
