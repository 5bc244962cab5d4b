package lrt

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// Multinomial declares counts in k cells with the probabilities p[1] … p[k]
// that add up to 1. Restrict it by Fix (every cell for goodness of fit),
// Equate, or Via a map from fewer parameters (a genetic model, independence).
// The free space, fixed cells and equal cells have closed forms. The likelihood
// holds the multinomial coefficient; Observations counts the events.
//
// Score tests use the expected information, which makes them Pearson's. For a
// completely specified null the Bartlett factor is that of Williams (1976),
// 1 + (Σ 1/pᵢ − 1)/(6n(k − 1)).
func Multinomial(counts []float64) (*Declared, error) {
	k := len(counts)
	if k < 2 {
		return nil, fmt.Errorf("lrt: multinomial: %w: %d cells, want at least 2", ErrInvalid, k)
	}
	n := 0.0
	for i, v := range counts {
		if !(v >= 0) || v != math.Trunc(v) || v > 1e15 {
			return nil, fmt.Errorf("lrt: multinomial: %w: cell %d has the count %g, want a whole number up to 1e15", ErrInvalid, i+1, v)
		}
		n += v
	}
	if n == 0 {
		return nil, fmt.Errorf("lrt: multinomial: %w: all counts are 0", ErrInvalid)
	}
	counts = append([]float64(nil), counts...)
	ones := make([]float64, k)
	for i := range ones {
		ones[i] = 1
	}
	total := Equations(Equation{Names("p", k), ones, 1})
	root, err := Bind(Model[[]float64]{
		Name:   "multinomial",
		Params: Block(k, Unit("p")),
		LogLikelihood: func(y, th []float64) float64 {
			l := multinomialConstant(y)
			for i, v := range y {
				l += xlogx(v, th[i])
			}
			return l
		},
		Gradient: func(y, th, g []float64) {
			for i, v := range y {
				g[i] = 0
				if v > 0 {
					g[i] = v / th[i]
				}
			}
		},
		Information: func(_, th, info []float64) {
			clear(info)
			for i, v := range th {
				info[i*k+i] = n / v
			}
		},
		Start: func(y []float64) []float64 {
			th := make([]float64, k)
			for i, v := range y {
				th[i] = (v + 0.5) / (n + 0.5*float64(k))
			}
			return th
		},
		ClosedFor: multinomialClosedFor,
		BartlettFactor: func(_ []float64, r, f *Declared, p Pair) (float64, error) {
			if r.Free() != 0 || f.Free() != k-1 || len(p.Restricted.Estimate) != k {
				return 0, ErrNoFactor
			}
			s := 0.0
			for _, v := range p.Restricted.Estimate {
				s += 1 / v
			}
			return 1 + (s-1)/(6*n*float64(k-1)), nil
		},
		Pivotal: func(r, _ *Declared) bool { return r.Free() == 0 },
		Simulate: func(_, th []float64, src rand.Source) ([]float64, error) {
			r := rand.New(src)
			y := make([]float64, k)
			for range int(n) {
				u := r.Float64()
				i := 0
				for ; i < k-1 && u >= th[i]; i++ {
					u -= th[i]
				}
				y[i]++
			}
			return y, nil
		},
	}, Observe(counts, int(n)))
	if err != nil {
		return nil, err
	}
	s, err := root.Restrict(total)
	if err != nil {
		return nil, err
	}
	return s.(*Declared), nil
}

func multinomialConstant(y []float64) float64 {
	n, c := 0.0, 0.0
	for _, v := range y {
		lg, _ := math.Lgamma(v + 1)
		c -= lg
		n += v
	}
	lg, _ := math.Lgamma(n + 1)
	return c + lg
}

// multinomialClosedFor solves spaces in which some cells are fixed and others
// equal: what is left of 1 is shared in proportion to the counts.
func multinomialClosedFor(y []float64, s *Declared) ([]float64, bool) {
	k := len(y)
	if s.frame.layer != nil || s.frame.lower != nil || len(s.frame.params) != k {
		return nil, false
	}
	th := make([]float64, k)
	fixed := make([]bool, k)
	left, n := 1.0, 0.0
	one := make([]float64, k)
	for i := range k {
		clear(one)
		one[i] = 1
		if l, rest, _ := s.frame.eq.reduce(one, 0); zero(l) {
			th[i], fixed[i] = -rest, true
			left -= th[i]
		} else {
			n += y[i]
		}
	}
	free := 0
	done := append([]bool(nil), fixed...)
	for i := range k {
		if done[i] {
			continue
		}
		if n == 0 {
			return nil, false // nothing tells the free cells apart
		}
		var members []int
		c := 0.0
		for j := i; j < k; j++ {
			if !done[j] && (j == i || s.Implies(Equate(s.frame.params[i].Name, s.frame.params[j].Name))) {
				members = append(members, j)
				c += y[j]
			}
		}
		free++
		for _, j := range members {
			th[j], done[j] = left*c/n/float64(len(members)), true
		}
	}
	return th, max(free-1, 0) == s.Free()
}

// CrossTable is a table of counts, rows by columns, whose cells are the
// multinomial p[1] … row by row.
type CrossTable struct {
	counts     [][]float64
	row, col   []float64
	n          float64
	rows, cols int
	full       *Declared
}

// NewCrossTable takes a table of whole counts without an empty row or column.
// The slices are copied.
func NewCrossTable(counts [][]float64) (*CrossTable, error) {
	t := &CrossTable{rows: len(counts)}
	if t.rows < 2 || len(counts[0]) < 2 {
		return nil, fmt.Errorf("lrt: table: %w: at least 2 rows and 2 columns are needed", ErrInvalid)
	}
	t.cols = len(counts[0])
	t.row, t.col = make([]float64, t.rows), make([]float64, t.cols)
	var flat []float64
	for i, r := range counts {
		if len(r) != t.cols {
			return nil, fmt.Errorf("lrt: table: %w: row %d has %d columns, row 1 has %d", ErrInvalid, i+1, len(r), t.cols)
		}
		t.counts = append(t.counts, append([]float64(nil), r...))
		for j, v := range r {
			t.row[i] += v
			t.col[j] += v
			t.n += v
		}
		flat = append(flat, r...)
	}
	for i, v := range t.row {
		if v == 0 {
			return nil, fmt.Errorf("lrt: table: %w: row %d is empty", ErrInvalid, i+1)
		}
	}
	for j, v := range t.col {
		if v == 0 {
			return nil, fmt.Errorf("lrt: table: %w: column %d is empty", ErrInvalid, j+1)
		}
	}
	full, err := Multinomial(flat)
	if err != nil {
		return nil, err
	}
	own := *full.core // the table knows more about itself than any multinomial
	own.factor = func(r, f *Declared, _ Pair) (float64, error) { return t.williams(r) }
	own.exact = func(r, f *Declared, p Pair) (Test, error) { return t.exact(r, p), nil }
	own.closedAt = func(s *Declared) ([]float64, bool) {
		if s.frame.layer != nil && s.frame.layer.m.tag == independence && len(s.frame.eq.rows) == 0 {
			return independentCells(own.data.([]float64), t.rows, t.cols)
		}
		return multinomialClosedFor(own.data.([]float64), s)
	}
	simulate := own.simulate
	own.simulate = func(theta []float64, src rand.Source) (*core, error) {
		c, err := simulate(theta, src)
		if err != nil {
			return nil, err
		}
		data := c.data.([]float64)
		c.closedAt = func(s *Declared) ([]float64, bool) {
			if s.frame.layer != nil && s.frame.layer.m.tag == independence && len(s.frame.eq.rows) == 0 {
				return independentCells(data, t.rows, t.cols)
			}
			return multinomialClosedFor(data, s)
		}
		return c, nil
	}
	t.full = &Declared{core: &own, frame: full.frame}
	return t, nil
}

// independence tags the map of independent rows and columns.
const independence = "independence"

// Full returns the space in which every cell has its own probability.
func (t *CrossTable) Full() *Declared { return t.full }

// Independent returns the space in which rows and columns are independent (or
// rows homogeneous): parameters row[1] … and column[1] …, the last of each left
// out. Its closed form is the product of the margins. Against Full it has the
// factor of Williams (1976) and, for 2×2, the exact test given both margins, which
// adds up the probabilities of tables with a λ as small.
func (t *CrossTable) Independent() (*Declared, error) {
	params := append(Block(t.rows-1, Unit("row")), Block(t.cols-1, Unit("column"))...)
	start := make([]float64, 0, len(params))
	for _, v := range t.row[:t.rows-1] {
		start = append(start, v/t.n)
	}
	for _, v := range t.col[:t.cols-1] {
		start = append(start, v/t.n)
	}
	s, err := t.full.Restrict(Via(Map{Params: params, Start: start, tag: independence, To: func(phi, p []float64) {
		r, c := complete(phi[:t.rows-1]), complete(phi[t.rows-1:])
		for i := range t.rows {
			for j := range t.cols {
				p[i*t.cols+j] = r[i] * c[j]
			}
		}
	}}))
	if err != nil {
		return nil, err
	}
	return s.(*Declared), nil
}

// complete appends what is left of 1.
func complete(p []float64) []float64 {
	out := append(make([]float64, 0, len(p)+1), p...)
	rest := 1.0
	for _, v := range p {
		rest -= v
	}
	return append(out, rest)
}

func independentCells(y []float64, rows, cols int) ([]float64, bool) {
	r, c := make([]float64, rows), make([]float64, cols)
	n := 0.0
	for i := range rows {
		for j := range cols {
			v := y[i*cols+j]
			r[i] += v
			c[j] += v
			n += v
		}
	}
	th := make([]float64, rows*cols)
	for i := range rows {
		for j := range cols {
			th[i*cols+j] = r[i] / n * (c[j] / n)
		}
	}
	return th, true
}

func (t *CrossTable) williams(r *Declared) (float64, error) {
	if r.frame.layer == nil || r.frame.layer.m.tag != independence || len(r.frame.eq.rows) > 0 {
		return 0, ErrNoFactor
	}
	a, b := -1.0, -1.0
	for _, v := range t.row {
		a += t.n / v
	}
	for _, v := range t.col {
		b += t.n / v
	}
	return 1 + a*b/(6*t.n*float64((t.rows-1)*(t.cols-1))), nil
}

// exact is the test of independence in a 2×2 table given both margins.
func (t *CrossTable) exact(r *Declared, p Pair) Test {
	if t.rows != 2 || t.cols != 2 || r.frame.layer == nil || r.frame.layer.m.tag != independence || len(r.frame.eq.rows) > 0 {
		return Test{Why: "an exact law is known for the independence of a 2×2 table"}
	}
	if t.n > 1e7 {
		return Test{Why: "the table is too large for an exact sum, and χ² is good there"}
	}
	n, a, b := t.n, t.row[0], t.col[0]
	lo, hi := math.Max(0, a+b-n), math.Min(a, b)
	lg := func(x float64) float64 { v, _ := math.Lgamma(x + 1); return v }
	half := func(x float64) float64 {
		s := 0.0
		for _, c := range [][2]float64{{x, a * b}, {a - x, a * (n - b)}, {b - x, (n - a) * b}, {n - a - b + x, (n - a) * (n - b)}} {
			s += xlogx(c[0], c[0]*n/c[1])
		}
		return s
	}
	seen := half(t.counts[0][0]) * (1 - 1e-12)
	constant := lg(a) + lg(n-a) + lg(b) + lg(n-b) - lg(n)
	top := -inf
	var logs []float64
	for x := lo; x <= hi; x++ {
		if half(x) < seen {
			continue
		}
		l := constant - lg(x) - lg(a-x) - lg(b-x) - lg(n-a-b+x)
		logs = append(logs, l)
		top = math.Max(top, l)
	}
	s := 0.0
	for _, l := range logs {
		s += math.Exp(l - top)
	}
	out := Test{Kind: Exact, Name: "first cell given the margins", Statistic: t.counts[0][0], LogP: math.Min(0, top+math.Log(s)),
		Why: "given both margins the first cell is hypergeometric under independence (Fisher 1935); p is the probability of a λ as small"}
	out.P = math.Exp(out.LogP)
	return out
}
