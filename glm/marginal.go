package glm

import (
	"context"
	"fmt"
	"math"

	"subsume.example/dist"
	"subsume.example/internal/dd"
	"subsume.example/lrt"
)

// RowMeans are the means that a fitted model gives to some rows, as functions of
// its coefficients: of cells at stated values of covariates, say. Linear functions
// of them are estimated with their joint covariance, and turned into equations
// that restrict the model. RowMeans are immutable and safe for concurrent use.
type RowMeans struct {
	f      *Fit
	ws     [][]weight
	offset []dd.DD
}

// RowMeans returns the means of the rows of new data, found as in Predict. The
// response and the weights are not needed.
func (f *Fit) RowMeans(ctx context.Context, rows Source) (*RowMeans, error) {
	a, err := f.adapt(rows)
	if err != nil {
		return nil, err
	}
	r := &RowMeans{f: f}
	for w, err := range a.Windows(ctx) {
		if err != nil {
			return nil, err
		}
		if err := r.add(w); err != nil {
			return nil, err
		}
	}
	return r, nil
}

// add appends the rows of a window.
func (r *RowMeans) add(w Window) error {
	m := r.f.Model
	from := len(r.ws)
	r.ws = append(r.ws, make([][]weight, w.Rows)...)
	r.offset = append(r.offset, make([]dd.DD, w.Rows)...)
	for t, b := range m.cols {
		if err := b.rowWeights(w, func(row, column int, x dd.DD) {
			r.ws[from+row] = append(r.ws[from+row], weight{t, column, x})
		}); err != nil {
			return err
		}
	}
	if m.opt.Offset != "" {
		at, err := findNumeric(r.f.j.src, m.opt.Offset)
		if err != nil {
			return err
		}
		for i := range w.Rows {
			r.offset[from+i] = numberAt(w, at, i)
		}
	}
	return nil
}

// rowWeights calls yield with every value of the columns that is not zero.
func (b *bound) rowWeights(w Window, yield func(row, column int, x dd.DD)) error {
	if b.dense() {
		k := len(b.Names)
		hi, lo := make([][]float64, k), make([][]float64, k)
		for c := range k {
			hi[c], lo[c] = make([]float64, w.Rows), make([]float64, w.Rows)
		}
		if err := b.Fill(w, hi, lo); err != nil {
			return err
		}
		for c := range k {
			for i := range w.Rows {
				if x := (dd.DD{Hi: hi[c][i], Lo: lo[c][i]}); x.Hi != 0 {
					yield(i, c, x)
				}
			}
		}
		return nil
	}
	index := make([]int32, w.Rows)
	if err := b.Index(w, index); err != nil {
		return err
	}
	var hi, lo []float64
	if b.Value != nil {
		hi, lo = make([]float64, w.Rows), make([]float64, w.Rows)
		if err := b.Value(w, hi, lo); err != nil {
			return err
		}
	}
	for i, c := range index {
		if c < 0 {
			continue
		}
		x := dd.From(1)
		if hi != nil {
			x = dd.DD{Hi: hi[i], Lo: lo[i]}
		}
		yield(i, int(c), x)
	}
	return nil
}

// Len returns the number of rows.
func (r *RowMeans) Len() int { return len(r.ws) }

// combine returns Σ w[i]·mean(row i) as weights of coefficients, and its offset.
func (r *RowMeans) combine(w []float64) ([]weight, dd.DD, error) {
	if len(w) != len(r.ws) {
		return nil, dd.DD{}, fmt.Errorf("glm: %w: %d weights for %d rows", lrt.ErrInvalid, len(w), len(r.ws))
	}
	var list []weight
	place := make(map[[2]int]int)
	var offset dd.DD
	for i, x := range w {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return nil, dd.DD{}, fmt.Errorf("glm: %w: weight %g of row %d", lrt.ErrInvalid, x, i)
		}
		if x == 0 {
			continue
		}
		offset = offset.Add(r.offset[i].MulF(x))
		for _, c := range r.ws[i] {
			key := [2]int{c.term, c.column}
			k, ok := place[key]
			if !ok {
				k = len(list)
				place[key] = k
				list = append(list, weight{term: c.term, column: c.column})
			}
			list[k].coef = list[k].coef.Add(c.coef.MulF(x))
		}
	}
	kept := list[:0]
	for _, c := range list {
		if c.coef.Hi != 0 {
			kept = append(kept, c)
		}
	}
	return kept, offset, nil
}

// Estimate estimates Σ w[i]·mean(row i), with one weight for each row. A function
// that the data say nothing about has no estimate: the error wraps
// ErrNotEstimable and names the column at fault.
func (r *RowMeans) Estimate(w []float64) (Estimate, error) {
	list, offset, err := r.combine(w)
	if err != nil {
		return Estimate{}, err
	}
	e, bad, worst := r.f.reading.estimate(list, true)
	if bad > estimable {
		return Estimate{}, fmt.Errorf("glm: %w: it involves %s", ErrNotEstimable, r.f.j.columnName(worst))
	}
	if o := offset.Float64(); o != 0 {
		e.Value, e.Lower, e.Upper = e.Value+o, e.Lower+o, e.Upper+o
		e.T = e.Value / e.SE
		r.f.test(&e)
	}
	return e, nil
}

// test fills in P of an estimate from its T.
func (f *Fit) test(e *Estimate) {
	e.P = math.NaN()
	if math.IsNaN(e.T) {
		return
	}
	if math.IsInf(e.T, 0) {
		e.P = 0
		return
	}
	l := lrt.Linear{RankB: 1, RankE1: f.DFError, Numerator: e.T * e.T, Denominator: float64(f.DFError), M: float64(f.N)}
	if f.j.opt.KnownVariance > 0 {
		l.Known = 1
	}
	_, e.P, _ = l.F()
}

// Covariance returns the covariance of two functions of the means.
func (r *RowMeans) Covariance(a, b []float64) (float64, error) {
	x, _, err := r.combine(a)
	if err != nil {
		return math.NaN(), err
	}
	y, _, err := r.combine(b)
	if err != nil {
		return math.NaN(), err
	}
	return r.f.covariance(x, y)
}

// Equation returns Σ w[i]·mean(row i) = value as an equation between coefficients of
// the model, for Model.Restrict: the hypothesis whose comparison with the model
// has t² of Estimate as its F. The coefficients of an equation are float64.
func (r *RowMeans) Equation(w []float64, value float64) (lrt.Equation, error) {
	list, offset, err := r.combine(w)
	if err != nil {
		return lrt.Equation{}, err
	}
	var e lrt.Equation
	for _, c := range list {
		name := r.f.Model.cols[c.term].Names[c.column]
		if t, k, _ := r.f.Model.coefficient(name); t != c.term || k != c.column {
			return e, &CoefficientError{Name: name, Err: fmt.Errorf("%w: two columns of the model have this name", lrt.ErrInvalid)}
		}
		e.Names, e.Coef = append(e.Names, name), append(e.Coef, c.coef.Float64())
	}
	e.Value = dd.From(value).Sub(offset).Float64()
	if len(e.Names) == 0 {
		return e, fmt.Errorf("glm: %w: the function is zero for every value of the coefficients", lrt.ErrInvalid)
	}
	return e, nil
}

// Critical returns the value that |t| of an estimate exceeds with probability 1 −
// level when its true value is 0: the half width of an interval of that level in
// standard errors. NaN without error degrees of freedom, or for a level outside (0, 1).
func (f *Fit) Critical(level float64) float64 {
	q := (1 - level) / 2
	switch {
	case !(level > 0 && level < 1):
		return math.NaN()
	case f.j.opt.KnownVariance > 0:
		return dist.StudentT{Nu: math.Inf(1)}.UpperQuantile(q)
	case f.DFError > 0:
		return dist.StudentT{Nu: float64(f.DFError)}.UpperQuantile(q)
	}
	return math.NaN()
}
