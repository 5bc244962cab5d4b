package glm_test

import (
	"context"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// design is the rows of an experiment by the levels of its factors.
type design struct {
	names []string
	rows  [][]int
}

// crossing returns every combination of levels, numbered from 1.
func crossing(names string, levels ...int) design {
	d := design{names: strings.Fields(names), rows: [][]int{{}}}
	for _, n := range levels {
		var next [][]int
		for _, r := range d.rows {
			for l := range n {
				next = append(next, append(append([]int(nil), r...), l+1))
			}
		}
		d.rows = next
	}
	return d
}

// with adds a factor computed from the others.
func (d design) with(name string, f func(r []int) int) design {
	e := design{names: append(append([]string(nil), d.names...), name)}
	for _, r := range d.rows {
		e.rows = append(e.rows, append(append([]int(nil), r...), f(r)))
	}
	return e
}

// where keeps some rows.
func (d design) where(f func(i int, r []int) bool) design {
	e := design{names: d.names}
	for i, r := range d.rows {
		if f(i, r) {
			e.rows = append(e.rows, r)
		}
	}
	return e
}

// data draws a response, and a covariate x, and a positive w.
func (d design) data(t testing.TB) *glm.Data {
	t.Helper()
	r := rand.New(rand.NewPCG(1, uint64(len(d.rows))))
	n := len(d.rows)
	y, x, w := make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range y {
		y[i], x[i], w[i] = 20+r.NormFloat64(), r.NormFloat64(), 0.5+r.Float64()
		if at := slices.Index(d.names, "k"); at >= 0 { // a planned covariate
			x[i] = 1000 + float64(d.rows[i][at])
		}
	}
	cols := []glm.Column{glm.Numbers("y", y), glm.Numbers("x", x), glm.Numbers("w", w)}
	for k, name := range d.names {
		v := make([]int, n)
		for i, row := range d.rows {
			v[i] = row[k]
		}
		cols = append(cols, glm.Levels(name, v))
	}
	data, err := glm.NewData(cols...)
	if err != nil {
		t.Fatal(err)
	}
	return data
}

// terms reads "1 a b a:b" as a list of terms; x is a covariate.
func terms(s string) []glm.Term {
	var ts []glm.Term
	one := func(f string) glm.Term {
		if f == "x" {
			return glm.Covariate{Field: f}
		}
		return glm.Factor{Field: f}
	}
	for f := range strings.FieldsSeq(s) {
		switch parts := strings.Split(f, ":"); {
		case f == "1":
			ts = append(ts, glm.Constant{})
		case len(parts) > 1:
			var c glm.Cross
			for _, p := range parts {
				c = append(c, one(p))
			}
			ts = append(ts, c)
		default:
			ts = append(ts, one(f))
		}
	}
	return ts
}

// layout is one test of one layout.
type layout struct {
	name      string
	design    design
	s, b      string
	e0, e1    string // "": the default, and all rows
	fixed     string // "": not declared
	random    string // terms with a variance of their own
	d1, d2    float64
	breaks    string // "": certified; else the term at fault
	identity  string
	nullFixed string
	options   *glm.Options
}

func (l layout) comparison(t testing.TB) lrt.Comparison {
	t.Helper()
	d := l.design.data(t)
	m := func(s string) lrt.Space { return model(t, d, l.options, terms(s)...) }
	c := lrt.Comparison{Name: l.name, Restricted: m(l.s), Full: m(l.b)}
	if l.e0 != "" {
		c.Error = &lrt.ErrorPair{Smaller: m(l.e0)}
		if l.e1 != "" {
			c.Error.Larger = m(l.e1)
		}
	}
	if l.fixed != "" || l.random != "" {
		c.Effects = &lrt.Effects{}
		if l.fixed != "" {
			c.Effects.Fixed = m(l.fixed)
		}
		if l.nullFixed != "" {
			c.Effects.NullFixed = m(l.nullFixed)
		}
		for f := range strings.FieldsSeq(l.random) {
			c.Effects.Random = append(c.Effects.Random, lrt.RandomTerm{Name: f, Space: m(f)})
		}
	}
	return c
}

func latin(t int) design {
	return crossing("r c", t, t).with("t", func(r []int) int { return (r[0]+r[1])%t + 1 })
}

// subjects gives g groups of n subjects each, t times; uneven drops one subject.
func subjects(g, n, times int, uneven bool) design {
	d := crossing("g u t", g, n, times).with("s", func(r []int) int { return r[0]*100 + r[1] })
	if uneven {
		d = d.where(func(_ int, r []int) bool { return r[0] != 1 || r[1] != 1 })
	}
	return d
}

func uneven(d design) design {
	return d.where(func(i int, _ []int) bool { return i%7 != 3 })
}

var (
	splitPlot  = crossing("r a b", 4, 3, 2)
	randomised = crossing("u a b", 4, 3, 2).with("plot", func(r []int) int { return r[0]*10 + r[1] })
	nested     = crossing("a k rep", 3, 4, 3).with("b", func(r []int) int { return r[0]*10 + r[1] })
	lopsided   = nested.where(func(i int, r []int) bool { return r[1] != 1 || r[0] != 2 || r[2] == 1 })
	mixed      = crossing("a b rep", 3, 4, 2)
	sloped     = crossing("s k", 6, 5)
	crossover  = crossing("u p", 8, 2).with("q", func(r []int) int { return r[0]%2 + 1 }).with("t", func(r []int) int { return (r[0]+r[1])%2 + 1 })
)

// layouts are those of experiments, each with the degrees of freedom and the
// verdict that theory gives it (Scheffé, The Analysis of Variance, 1959, chapters
// 4, 7 and 8, for the mean squares and their laws).
var layouts = []layout{
	{name: "one-way, unequal", design: uneven(crossing("a rep", 4, 6)), s: "1", b: "1 a", d1: 3, d2: 17},
	{name: "factorial, interaction, unbalanced", design: uneven(mixed), s: "1 a b", b: "1 a b a:b", d1: 6, d2: 9},
	{name: "factorial, A adjusted for B", design: uneven(mixed), s: "1 b", b: "1 a b", e0: "1 a b a:b", d1: 2, d2: 9},
	{name: "factorial, A ignoring B", design: uneven(mixed), s: "1", b: "1 a", e0: "1 a b a:b", fixed: "1 a", d1: 2, d2: 9},
	{name: "factorial, A ignoring B that matters", design: uneven(mixed), s: "1", b: "1 a", e0: "1 a b a:b", fixed: "1 a b a:b", nullFixed: "1 b", d1: 2, d2: 9, breaks: "numerator", identity: "Pn M0 = 0"},
	{name: "factorial, an empty cell", design: mixed.where(func(_ int, r []int) bool { return r[0] != 1 || r[1] != 1 }), s: "1 a b", b: "1 a b a:b", d1: 5, d2: 11},
	{name: "factorial, one row a cell", design: crossing("a b", 3, 4), s: "1 b", b: "1 a b", d1: 2, d2: 6},
	{name: "complete blocks, random", design: crossing("b t", 5, 4), s: "1 b", b: "1 b t", fixed: "1 t", random: "b", d1: 3, d2: 12},
	{name: "incomplete blocks, random", design: crossing("b k", 4, 3).with("t", func(r []int) int { return (r[0]+r[1])%4 + 1 }), s: "1 b", b: "1 b t", fixed: "1 t", random: "b", d1: 3, d2: 5},
	{name: "incomplete blocks, random, treatments not adjusted", design: crossing("b k", 4, 3).with("t", func(r []int) int { return (r[0]+r[1])%4 + 1 }), s: "1", b: "1 t", e0: "1 b t", fixed: "1 t", random: "b", d1: 3, d2: 5, breaks: "b", identity: "one constant c for numerator and error"},
	{name: "Latin square, rows and columns random", design: latin(5), s: "1 r c", b: "1 r c t", fixed: "1 t", random: "r c", d1: 4, d2: 12},
	{name: "Graeco-Latin square", design: latin(5).with("g", func(r []int) int { return (2*r[0]+r[1])%5 + 1 }), s: "1 r c g", b: "1 r c g t", d1: 4, d2: 8},
	{name: "crossover, treatment", design: crossover, s: "1 u p", b: "1 u p t", fixed: "1 p t q", random: "u", d1: 1, d2: 6},
	{name: "crossover, carry-over", design: crossover, s: "1", b: "1 q", e0: "1 q", e1: "1 u", fixed: "1 q p t", random: "u", d1: 1, d2: 6},
	{name: "nested, B in A", design: nested, s: "1 a", b: "1 a b", d1: 9, d2: 24},
	{name: "nested, B in A, unbalanced", design: lopsided, s: "1 a", b: "1 a b", d1: 9, d2: 22},
	{name: "nested, A, B random", design: nested, s: "1", b: "1 a", e0: "1 a", e1: "1 a b", fixed: "1 a", random: "b", d1: 2, d2: 9},
	{name: "nested, A, B random, unbalanced", design: lopsided, s: "1", b: "1 a", e0: "1 a", e1: "1 a b", fixed: "1 a", random: "b", d1: 2, d2: 9, breaks: "b", identity: "Pn K Pn = c Pn"},
	{name: "nested, A, B random, against the rows", design: nested, s: "1", b: "1 a", e0: "1 a b", fixed: "1 a", random: "b", d1: 2, d2: 24, breaks: "b", identity: "one constant c for numerator and error"},
	{name: "nested, A, B fixed", design: nested, s: "1", b: "1 a", e0: "1 a b", fixed: "1 a b", d1: 2, d2: 24},
	{name: "split plot, A", design: splitPlot, s: "1 r", b: "1 r a", e0: "1 r a", e1: "r:a", fixed: "1 a b a:b", random: "r r:a", d1: 2, d2: 6},
	{name: "split plot, A, whole plots in no blocks", design: randomised, s: "1", b: "1 a", e0: "1 a", e1: "plot", fixed: "1 a b a:b", random: "plot", d1: 2, d2: 9},
	{name: "split plot, B", design: splitPlot, s: "r:a", b: "r:a b", e0: "r:a a:b", fixed: "1 a b a:b", random: "r r:a", d1: 1, d2: 9},
	{name: "split plot, AB", design: splitPlot, s: "r:a b", b: "r:a a:b", fixed: "1 a b a:b", random: "r r:a", d1: 2, d2: 9},
	{name: "split plot, A against the subplots", design: splitPlot, s: "1 r", b: "1 r a", e0: "r:a a:b", fixed: "1 a b a:b", random: "r r:a", d1: 2, d2: 9, breaks: "r:a", identity: "one constant c for numerator and error"},
	{name: "split plot, A, a subplot lost", design: splitPlot.where(func(i int, _ []int) bool { return i != 3 }), s: "1 r", b: "1 r a", e0: "1 r a", e1: "r:a", fixed: "1 a b a:b", random: "r:a", d1: 2, d2: 6, breaks: "error", identity: "Pd M1 = 0"},
	{name: "split plot, AB, a subplot lost", design: splitPlot.where(func(i int, _ []int) bool { return i != 3 }), s: "r:a b", b: "r:a a:b", fixed: "1 a b a:b", random: "r:a", d1: 2, d2: 8},
	{name: "strip plot, A", design: crossing("r a b", 4, 3, 2), s: "1 r", b: "1 r a", e0: "1 r a", e1: "r:a", fixed: "1 a b a:b", random: "r r:a r:b", d1: 2, d2: 6},
	{name: "strip plot, B", design: crossing("r a b", 4, 3, 2), s: "1 r", b: "1 r b", e0: "1 r b", e1: "r:b", fixed: "1 a b a:b", random: "r r:a r:b", d1: 1, d2: 3},
	{name: "strip plot, AB", design: crossing("r a b", 4, 3, 2), s: "r:a r:b", b: "r:a r:b a:b", fixed: "1 a b a:b", random: "r r:a r:b", d1: 2, d2: 6},
	{name: "strip plot, A against the cells", design: crossing("r a b", 4, 3, 2), s: "1 r", b: "1 r a", e0: "r:a r:b a:b", fixed: "1 a b a:b", random: "r r:a r:b", d1: 2, d2: 6, breaks: "r:a", identity: "one constant c for numerator and error"},
	{name: "repeated, groups", design: subjects(3, 4, 3, false), s: "1", b: "1 g", e0: "1 g", e1: "s", fixed: "1 g t g:t", random: "s", d1: 2, d2: 9},
	{name: "repeated, groups, unequal sizes", design: subjects(3, 4, 3, true), s: "1", b: "1 g", e0: "1 g", e1: "s", fixed: "1 g t g:t", random: "s", d1: 2, d2: 8},
	{name: "repeated, times", design: subjects(3, 4, 3, true), s: "s", b: "s t", e0: "s g:t", fixed: "1 g t g:t", random: "s", d1: 2, d2: 16},
	{name: "repeated, groups × times", design: subjects(3, 4, 3, true), s: "s t", b: "s g:t", fixed: "1 g t g:t", random: "s", d1: 4, d2: 16},
	{name: "repeated, groups, a time lost", design: subjects(3, 4, 3, false).where(func(i int, _ []int) bool { return i != 5 }), s: "1", b: "1 g", e0: "1 g", e1: "s", fixed: "1 g", random: "s", d1: 2, d2: 9, breaks: "s", identity: "Pn K Pn = c Pn"},
	{name: "covariance, equal slopes", design: uneven(crossing("a rep", 3, 8)), s: "1 a x", b: "1 a x a:x", d1: 2, d2: 15},
	{name: "covariance, adjusted groups", design: uneven(crossing("a rep", 3, 8)), s: "1 x", b: "1 a x", d1: 2, d2: 17},
	{name: "random, one-way, variance nil", design: uneven(crossing("a rep", 4, 6)), s: "1", b: "1 a", fixed: "1", d1: 3, d2: 17},
	{name: "mixed, A, B random", design: mixed, s: "1 b", b: "1 a b", e0: "1 a b", e1: "1 a b a:b", fixed: "1 a", random: "b a:b", d1: 2, d2: 6},
	{name: "mixed, A, B random, unbalanced", design: uneven(mixed), s: "1 b", b: "1 a b", e0: "1 a b", e1: "1 a b a:b", fixed: "1 a", random: "b a:b", d1: 2, d2: 6, breaks: "a:b", identity: "Pn K Pn = c Pn"},
	{name: "mixed, AB variance", design: uneven(mixed), s: "1 a b", b: "1 a b a:b", fixed: "1 a", random: "b", d1: 6, d2: 9},
	{name: "mixed, B variance", design: mixed, s: "1 a", b: "1 a b", e0: "1 a b", e1: "1 a b a:b", fixed: "1 a", random: "a:b", d1: 3, d2: 6},
	{name: "mixed, B variance against the rows", design: mixed, s: "1 a", b: "1 a b", e0: "1 a b a:b", fixed: "1 a", random: "a:b", d1: 3, d2: 12, breaks: "a:b", identity: "one constant c for numerator and error"},
	{name: "three-way random, A", design: crossing("a b c rep", 3, 3, 2, 2), s: "1 b c", b: "1 a b c", e0: "1 a b c", e1: "1 a b c a:b", fixed: "1", random: "a:b a:c b:c a:b:c b c", d1: 2, d2: 4, breaks: "a:c", identity: "one constant c for numerator and error"},
	{name: "random slopes, mean slope", design: sloped, s: "s", b: "s x", e0: "s x", e1: "s s:x", fixed: "1 x", random: "s s:x", d1: 1, d2: 5},
	{name: "random slopes, mean slope against the rows", design: sloped, s: "s", b: "s x", e0: "s s:x", fixed: "1 x", random: "s s:x", d1: 1, d2: 18, breaks: "s:x", identity: "one constant c for numerator and error"},
	{name: "weighted rows, blocks random", design: crossing("b t rep", 4, 3, 2), options: &glm.Options{Weights: glm.Weights{Kind: glm.Precision, Field: "w"}}, s: "1 b", b: "1 b t", fixed: "1 t", random: "b", d1: 2, d2: 18},
	{name: "weighted rows, nested random", design: nested, options: &glm.Options{Weights: glm.Weights{Kind: glm.Precision, Field: "w"}}, s: "1", b: "1 a", e0: "1 a", e1: "1 a b", fixed: "1 a", random: "b", d1: 2, d2: 9, breaks: "b", identity: "Pn K Pn = c Pn"},
	{name: "known variance, blocks random", design: crossing("b t", 5, 4), options: &glm.Options{KnownVariance: 1}, s: "1 b", b: "1 b t", fixed: "1 t", random: "b", d1: 3, d2: 12},
	{name: "known variance, nested random", design: nested, options: &glm.Options{KnownVariance: 1}, s: "1", b: "1 a", fixed: "1 a", random: "b", d1: 2, d2: 33, breaks: "b", identity: "Pn K Pn = 0"},
}

// TestLayouts: ranks give the degrees of freedom, and the certificate is given or refused as theory says.
func TestLayouts(t *testing.T) {
	for _, l := range layouts {
		t.Run(l.name, func(t *testing.T) {
			r, err := l.comparison(t).Run(context.Background(), nil)
			if err != nil {
				t.Fatal(err)
			}
			c := r.Pair.Certificate
			if d1, d2 := r.Pair.Linear.DF(); d1 != l.d1 || d2 != l.d2 {
				t.Errorf("degrees of freedom %g and %g, want %g and %g", d1, d2, l.d1, l.d2)
			}
			if c.Exact != (l.breaks == "") || c.Term != l.breaks || c.Identity != l.identity {
				t.Errorf("certified %v, broken by %q: %q (residual %g); want %q: %q", c.Exact, c.Term, c.Identity, c.Residual, l.breaks, l.identity)
			}
			if want := lrt.Exact; l.breaks != "" {
				want = lrt.Approximate
				if r.Exact.Kind != want || !strings.Contains(r.Exact.Why, l.identity) {
					t.Errorf("kind %v, why %q", r.Exact.Kind, r.Exact.Why)
				}
			} else if r.Exact.Kind != want || r.Recommended != want || c.Residual > 1e-10 {
				t.Errorf("kind %v, recommended %v, residual %g", r.Exact.Kind, r.Recommended, c.Residual)
			}
		})
	}
}

func (echo) Name() string { return "echo" }
func (echo) Bind(_ context.Context, src glm.Source) (glm.Columns, error) {
	return glm.Columns{Names: []string{"echo"}, FromResponse: true, Fill: func(w glm.Window, hi, lo [][]float64) error {
		for i := range w.Rows {
			hi[0][i], lo[0][i] = w.Hi[0][i]*w.Hi[0][i], 0
		}
		return nil
	}}, nil
}
