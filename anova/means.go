package anova

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// MeansOptions say which means are asked for. nil and every zero field mean the
// default.
type MeansOptions struct {
	// At holds covariates (or the offset) at values; the others are held at their
	// mean over the observations.
	At map[string]float64
	// Observed weights the levels of the other factors by how often their
	// combinations were observed; otherwise all combinations count equally.
	Observed bool
}

// Groups are the means of the levels of a factor, or of the cells of several: as
// observed, and by a model that holds everything else alike. They are made by
// Means, immutable, and safe for concurrent use.
type Groups struct {
	model    *glm.Model
	fit      *glm.Fit
	factors  []string
	list     []Group
	at       []Held
	others   []string // factors averaged over
	observed bool
	rows     *glm.RowMeans
	group    []int     // of each of the rows
	weight   []float64 // of each of the rows in the mean of its group
	empty    []string  // name of each of the rows without observations; "" for others
}

// Group is one of Groups.
type Group struct {
	Name   string   // the levels, joined with " × "
	Levels []string // of each factor
	// N is the number of observations.
	N   float64
	Raw Raw
	// Adjusted is the mean by the model, with the standard error from the error
	// mean square of the model and the interval of the level asked for. T and P
	// are about the hypothesis that the mean is zero.
	Adjusted glm.Estimate
	// Err says why there is no adjusted mean: it wraps glm.ErrNotEstimable. The
	// numbers of Adjusted are then NaN.
	Err error
}

// Raw is the mean of the observations of a group, with nothing held alike; SD, SE
// and the interval (Student's t) are from the group alone, and NaN below two observations.
// With precision weights the mean is weighted and SD that of an observation of weight 1.
type Raw struct{ Mean, SD, SE, Lower, Upper float64 }

// Held is a covariate held at a value.
type Held struct {
	Field  string
	Value  float64
	Stated bool // asked for, not the mean over the observations
}

// maxGrid is the largest number of combinations that means are averaged over.
const maxGrid = 1 << 18

// Means returns the means of the levels of a factor of the model, or of the cells
// of several of its factors, observed and adjusted: covariates at the values of
// MeansOptions.At, the other factors averaged over their levels. The level of
// intervals comes from s. The model is fitted once more; the rows are passed over three times.
//
// Errors are a *LayoutError wrapping ErrLayout for fields that the model does not
// have as factors or covariates, and those of glm.Model.Fit.
func Means(ctx context.Context, m *glm.Model, factors []string, o *MeansOptions, s *lrt.Settings) (*Groups, error) {
	if m == nil {
		return nil, &LayoutError{Err: fmt.Errorf("%w: no model", ErrLayout)}
	}
	g := &Groups{model: m, factors: slices.Clone(factors)}
	if len(factors) == 0 {
		return nil, &LayoutError{Err: fmt.Errorf("%w: no factors", ErrLayout)}
	}
	for i, f := range factors {
		if !slices.Contains(m.Factors(), f) || slices.Contains(factors[:i], f) {
			return nil, &LayoutError{Place: f, Err: fmt.Errorf("%w: want factors of the model, each once; it has %s", ErrLayout, strings.Join(m.Factors(), ", "))}
		}
	}
	v, err := takeSurvey(ctx, m)
	if err != nil {
		return nil, err
	}
	if err := g.hold(v, o); err != nil {
		return nil, err
	}
	if err := g.observe(ctx, v, s); err != nil {
		return nil, err
	}
	if g.fit, err = m.Fit(ctx, s); err != nil {
		return nil, err
	}
	if err := g.spread(ctx, v); err != nil {
		return nil, err
	}
	for i := range g.list {
		if err := ctx.Err(); err != nil { // thousands of groups take a while
			return nil, err
		}
		w := make([]float64, len(g.list))
		w[i] = 1
		e, err := g.rows.Estimate(g.over(w))
		if err != nil {
			n := math.NaN()
			e, g.list[i].Err = glm.Estimate{Value: n, SE: n, T: n, P: n, Lower: n, Upper: n}, g.why(err, w)
		}
		g.list[i].Adjusted = e
	}
	return g, nil
}

// hold decides the values of the covariates.
func (g *Groups) hold(v *survey, o *MeansOptions) error {
	if o == nil {
		o = &MeansOptions{}
	}
	g.observed = o.Observed
	stated := make([]string, 0, len(o.At))
	for f := range o.At {
		stated = append(stated, f)
	}
	slices.Sort(stated)
	for _, f := range stated {
		x := o.At[f]
		switch {
		case !slices.Contains(v.covariates, f) || slices.Contains(v.cells.Factors, f):
			return &LayoutError{Place: f, Err: fmt.Errorf("%w: not a covariate of the model; it has %s", ErrLayout, strings.Join(v.covariates, ", "))}
		case math.IsNaN(x) || math.IsInf(x, 0):
			return &LayoutError{Place: f, Err: fmt.Errorf("%w: value %g", ErrLayout, x)}
		}
	}
	for i, c := range v.covariates {
		if slices.Contains(v.cells.Factors, c) {
			continue // its value is that of the level
		}
		h := Held{Field: c, Value: v.mean[i]}
		if x, ok := o.At[c]; ok {
			h.Value, h.Stated = x, true
		}
		g.at = append(g.at, h)
	}
	for _, f := range v.cells.Factors {
		if !slices.Contains(g.factors, f) {
			g.others = append(g.others, f)
		}
	}
	return nil
}

// observe takes the means, deviations and counts of the groups.
func (g *Groups) observe(ctx context.Context, v *survey, s *lrt.Settings) error {
	m := g.model
	cells, err := bindCells(ctx, m.Source(), g.factors)
	if err != nil {
		return err
	}
	k := len(cells.Count)
	y := fieldAt(m.Source(), m.Response())
	value := func(w glm.Window, i int, shift float64) float64 {
		x := w.Hi[y][i] - shift
		if w.Lo != nil && w.Lo[y] != nil {
			x += w.Lo[y][i]
		}
		return x
	}
	group := func(level []int) int {
		at := 0
		for f, l := range level {
			at = at*len(cells.Levels[f]) + l
		}
		return at
	}
	shift, sum, weight, most := make([]float64, k), make([]float64, k), make([]float64, k), make([]float64, k)
	if err := cells.pass(ctx, m.Source(), m.Options().Weights, func(w glm.Window, i int, wt, _ float64, level []int) {
		c := group(level)
		if weight[c] == 0 {
			shift[c] = w.Hi[y][i]
		}
		x := value(w, i, shift[c])
		sum[c] += wt * x
		weight[c] += wt
		most[c] = math.Max(most[c], math.Abs(x))
	}); err != nil {
		return err
	}
	ss := make([]float64, k)
	second, err := bindCells(ctx, m.Source(), g.factors)
	if err != nil {
		return err
	}
	if err := second.pass(ctx, m.Source(), m.Options().Weights, func(w glm.Window, i int, wt, _ float64, level []int) {
		c := group(level)
		if most[c] > 0 {
			d := (value(w, i, shift[c]) - sum[c]/weight[c]) / most[c]
			ss[c] += wt * d * d
		}
	}); err != nil {
		return err
	}
	level := 0.95
	if s != nil && s.Level != 0 {
		level = s.Level
	}
	for c := range k {
		n := math.NaN()
		q := Group{N: cells.Count[c], Raw: Raw{n, n, n, n, n}}
		for f, l := range cells.index(c) {
			q.Levels = append(q.Levels, cells.Levels[f][l])
		}
		q.Name = strings.Join(q.Levels, " × ")
		if q.N > 0 {
			q.Raw.Mean = shift[c] + sum[c]/weight[c]
		}
		if q.N > 1 {
			q.Raw.SD = most[c] * math.Sqrt(ss[c]/(q.N-1))
			q.Raw.SE = most[c] * math.Sqrt(ss[c]/(q.N-1)/weight[c])
			half := studentCritical(q.N-1, level) * q.Raw.SE
			q.Raw.Lower, q.Raw.Upper = q.Raw.Mean-half, q.Raw.Mean+half
		}
		g.list = append(g.list, q)
	}
	return nil
}

// spread lays out the rows over which the means are averaged.
func (g *Groups) spread(ctx context.Context, v *survey) error {
	src := g.model.Source()
	all := len(v.cells.Count)
	if all > maxGrid {
		return &LayoutError{Place: strings.Join(v.cells.Factors, " × "), Err: fmt.Errorf("%w: %d combinations of levels to average over, more than %d", ErrLayout, all, maxGrid)}
	}
	rows := newGrid(src, all)
	share := make(map[string]float64) // of each combination of the other factors
	other := make([]string, all)
	g.group, g.weight, g.empty = make([]int, all), make([]float64, all), make([]string, all)
	combos := 0.0
	for c := range all {
		name := ""
		at := v.cells.index(c)
		pick := make([]int, len(g.factors))
		for f, l := range at {
			rows.set(fieldAt(src, v.cells.Factors[f]), c, v.level[f][l])
			if k := slices.Index(g.factors, v.cells.Factors[f]); k >= 0 {
				pick[k] = l
			} else {
				name += v.cells.names[f][l] + " × "
			}
		}
		for k, f := range g.factors {
			g.group[c] = g.group[c]*len(v.cells.Levels[slices.Index(v.cells.Factors, f)]) + pick[k]
		}
		for _, h := range g.at {
			rows.set(fieldAt(src, h.Field), c, cellValue{hi: h.Value})
		}
		other[c] = name
		if v.cells.Count[c] == 0 {
			g.empty[c] = v.cells.Name(c)
		}
		if _, ok := share[name]; !ok {
			combos++
		}
		share[name] += v.cells.Count[c]
	}
	total := 0.0
	for _, n := range v.cells.Count {
		total += n
	}
	for c := range all {
		g.weight[c] = 1 / combos
		if g.observed {
			g.weight[c] = share[other[c]] / total
		}
	}
	var err error
	g.rows, err = g.fit.RowMeans(ctx, rows)
	return err
}

// why names the empty cells that a function of the groups would need.
func (g *Groups) why(err error, w []float64) error {
	if !errors.Is(err, glm.ErrNotEstimable) {
		return err
	}
	var cells []string
	for c, x := range g.over(w) {
		if x != 0 && g.empty[c] != "" {
			cells = append(cells, g.empty[c])
		}
	}
	if len(cells) == 0 {
		return err
	}
	return &EmptyCellsError{Cells: cells}
}

// List returns the groups in the order of the levels, the last factor fastest.
func (g *Groups) List() []Group { return slices.Clone(g.list) }

// Group returns the group of a name.
func (g *Groups) Group(name string) (Group, bool) {
	for _, q := range g.list {
		if q.Name == name {
			return q, true
		}
	}
	return Group{}, false
}

// At returns the covariates and the values they are held at.
func (g *Groups) At() []Held { return slices.Clone(g.at) }

// Fit returns the fit of the model.
func (g *Groups) Fit() *glm.Fit { return g.fit }

// Factors returns the factors whose levels the groups are.
func (g *Groups) Factors() []string { return slices.Clone(g.factors) }
