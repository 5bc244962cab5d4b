package anova

import (
	"context"
	"fmt"
	"math"
	"slices"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Method is a way to account for all contrasts of a family at once. Raw p-values
// and intervals are always given beside the adjusted ones.
type Method uint8

const (
	// Bonferroni multiplies p by the number of contrasts; intervals have level
	// 1 − α/m each. Any family fixed in advance.
	Bonferroni Method = iota
	// Holm steps down (Holm 1979): never less powerful than Bonferroni, whose
	// intervals it keeps, for it has none of its own.
	Holm
	// Scheffe holds for every contrast of the groups, also for those that the data
	// suggested (Scheffé 1953).
	Scheffe
	// Tukey is for differences of pairs, by the studentized range over all pairs of
	// groups: exact where all differences have one variance, otherwise by Kramer's
	// approximation, which errs on the safe side for independent means. The family
	// says which.
	Tukey
	// Unadjusted holds for each contrast by itself only.
	Unadjusted
)

// String names the method.
func (m Method) String() string {
	switch m {
	case Bonferroni:
		return "Bonferroni"
	case Holm:
		return "Holm"
	case Scheffe:
		return "Scheffé"
	case Tukey:
		return "Tukey"
	case Unadjusted:
		return "unadjusted"
	}
	return fmt.Sprintf("method %d", uint8(m))
}

// Family is a set of contrasts judged together. It is made by Groups.Test,
// immutable, and safe for concurrent use.
type Family struct {
	groups    *Groups
	method    Method
	level     float64
	lines     []ContrastResult
	all       Row // all groups equal
	dimension float64
	// approximate: the method is not exact here.
	approximate bool
}

// ContrastResult is what became of a contrast.
type ContrastResult struct {
	Contrast
	// Estimate has the raw interval of the level asked for; T and P are about the
	// null value of the contrast.
	Estimate glm.Estimate
	// P and LogP are those of the comparison of the restricted with the full model;
	// AdjustedP and AdjustedLogP account for the family.
	P, LogP, AdjustedP, AdjustedLogP float64
	// Lower and Upper hold for all contrasts of the family at once.
	Lower, Upper float64
	// Row is the comparison: the model in which the contrast has its null value,
	// inside the model. Its F is t².
	Row Row
}

// Test tests the contrasts: each is the comparison of the model restricted by the
// equation of its null value with the model, one degree of freedom, all on one
// factorization. A contrast that the data say nothing about is a line with an
// error in its Row and does not count.
//
// Errors are a *LayoutError wrapping ErrFamily for weights that make no contrast, for
// no contrasts, and for a name used twice.
func (g *Groups) Test(ctx context.Context, cs []Contrast, method Method, s *lrt.Settings) (Family, error) {
	f := Family{groups: g, method: method, level: 0.95}
	if s != nil && s.Level != 0 {
		f.level = s.Level
	}
	switch {
	case len(cs) == 0:
		return f, &LayoutError{Err: fmt.Errorf("%w: no contrasts", ErrFamily)}
	case method > Unadjusted:
		return f, &LayoutError{Err: fmt.Errorf("%w: %v", ErrFamily, method)}
	}
	for i, c := range cs {
		if err := c.check(len(g.list)); err != nil {
			return f, err
		}
		if method == Tukey && !c.pair() {
			return f, &LayoutError{Place: c.Name, Err: fmt.Errorf("%w: Tukey is for differences of two groups; Scheffé holds for any contrast", ErrFamily)}
		}
		if slices.ContainsFunc(cs[:i], func(d Contrast) bool { return d.Name == c.Name }) {
			return f, &LayoutError{Place: c.Name, Err: fmt.Errorf("%w: two contrasts of one name", ErrFamily)}
		}
	}
	questions := make([]lrt.Comparison, 0, len(cs)+1)
	for _, c := range cs {
		questions = append(questions, g.question(c))
	}
	questions = append(questions, g.allEqual(cs))
	settings := lrt.Settings{}
	if s != nil {
		settings = *s
	}
	rows, err := runAll(ctx, questions, &settings)
	if err != nil {
		return f, err
	}
	f.all = rows[len(cs)]
	f.dimension, _ = f.all.DF()
	for i, c := range cs {
		f.lines = append(f.lines, g.estimate(c, rows[i], f.level))
	}
	return f, f.adjust(ctx)
}

// runAll joins the comparisons and runs each.
func runAll(ctx context.Context, questions []lrt.Comparison, s *lrt.Settings) ([]Row, error) {
	var linear []lrt.Comparison
	for _, c := range questions {
		if isLinear(c) {
			linear = append(linear, c)
		}
	}
	joined, err := glm.Join(ctx, linear...)
	if err != nil {
		return nil, err
	}
	rows := make([]Row, len(questions))
	for i, c := range questions {
		if isLinear(c) {
			c, joined = joined[0], joined[1:]
		}
		rows[i] = run(ctx, c, s)
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if isSettings(rows[i].err) {
			return nil, rows[i].err
		}
	}
	return rows, nil
}

// over returns the weights of a function of the groups over the rows.
func (g *Groups) over(w []float64) []float64 {
	out := make([]float64, g.rows.Len())
	for r := range out {
		if x := w[g.group[r]]; x != 0 {
			out[r] = x * g.weight[r]
		}
	}
	return out
}

// question is the comparison of a contrast.
func (g *Groups) question(c Contrast) lrt.Comparison {
	w, k := c.wholeWeights()
	q := lrt.Comparison{Name: c.Name, Full: g.model}
	e, err := g.rows.Equation(g.over(w), c.Null*k)
	if err == nil {
		q.Restricted, err = g.model.Restrict(lrt.Equations(e))
	}
	if err != nil {
		r := &refused{g.model, err}
		q.Restricted, q.Full = r, r
	}
	return q
}

// allEqual is the comparison of all groups having one mean, as far as the data can
// tell: of groups that cannot be compared each set has a mean of its own, and the contrasts
// asked for, which may lie across the sets, are zero too.
func (g *Groups) allEqual(cs []Contrast) lrt.Comparison {
	var eqs []lrt.Equation
	add := func(w []float64) bool {
		o := g.over(w)
		if _, err := g.rows.Estimate(o); err != nil {
			return false
		}
		e, err := g.rows.Equation(o, 0)
		if err == nil {
			eqs = append(eqs, e)
		}
		return true
	}
	var first []int // of each set
	lost := false
	for i, q := range g.list {
		lost = lost || q.Err != nil
		known := false
		for _, k := range first {
			w := make([]float64, len(g.list))
			w[k], w[i] = 1, -1
			if known = add(w); known {
				break
			}
		}
		if !known {
			first = append(first, i)
		}
	}
	if lost {
		for _, c := range cs {
			w, _ := c.wholeWeights()
			add(w)
		}
	}
	c := lrt.Comparison{Name: "all equal", Full: g.model}
	r, err := g.model.Restrict(lrt.Equations(eqs...))
	if err != nil {
		no := &refused{g.model, err}
		c.Restricted, c.Full = no, no
		return c
	}
	c.Restricted = r
	return c
}

// estimate reads a contrast off the fit.
func (g *Groups) estimate(c Contrast, r Row, level float64) ContrastResult {
	n := math.NaN()
	l := ContrastResult{Contrast: c, Row: r, P: n, LogP: n, AdjustedP: n, AdjustedLogP: n, Lower: n, Upper: n,
		Estimate: glm.Estimate{Value: n, SE: n, T: n, P: n, Lower: n, Upper: n}}
	w, k := c.wholeWeights()
	e, err := g.rows.Estimate(g.over(w))
	if err != nil {
		l.Row.err = g.why(err, w)
		return l
	}
	e.Value, e.SE = e.Value/k, e.SE/k
	half := g.fit.Critical(level) * e.SE
	e.Lower, e.Upper = e.Value-half, e.Value+half
	e.T = (e.Value - c.Null) / e.SE
	if r.err == nil {
		l.P, l.LogP = r.Test().P, r.Test().LogP
	}
	e.P = l.P
	l.Estimate = e
	return l
}

// Lines returns the contrasts in the order given.
func (f Family) Lines() []ContrastResult { return slices.Clone(f.lines) }

// Line returns the contrast of a name.
func (f Family) Line(name string) (ContrastResult, bool) {
	for _, l := range f.lines {
		if l.Name == name {
			return l, true
		}
	}
	return ContrastResult{}, false
}

// AllEqual returns the comparison of all groups having one mean, which the
// contrasts split up.
func (f Family) AllEqual() Row { return f.all }

// Dimension returns the number of independent contrasts of the groups.
func (f Family) Dimension() float64 { return f.dimension }

// Method returns how the family was accounted for, Level the simultaneous level.
func (f Family) Method() Method { return f.method }

// Level returns the level of the intervals.
func (f Family) Level() float64 { return f.level }
