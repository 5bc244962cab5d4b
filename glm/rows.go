package glm

import (
	"context"
	"fmt"
	"iter"
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// RowFit is what a fit says about one row of its source.
type RowFit struct {
	Row                        int // number of the row, from 0
	Response, Fitted, Residual float64
	Weight                     float64
	// Leverage is the derivative of the fitted value by the response, 0 to 1.
	Leverage float64
	// Standardized is the residual over its standard error; NaN at leverage 1.
	Standardized float64
	// Studentized is the residual over its standard error with the variance
	// estimated from the other rows (externally studentized): under the model it
	// is Student's t with DFError − 1 degrees of freedom. NaN where that is not positive
	// and at leverage 1.
	Studentized float64
}

// Each passes over the source once more and yields what the fit says about each
// row, in order. It stops at the first error.
func (f *Fit) Each(ctx context.Context) iter.Seq2[RowFit, error] {
	return func(yield func(RowFit, error) bool) {
		r := f.newRowReader(f.j.src)
		stop := fmt.Errorf("stop")
		err := r.fill.blocks(ctx, func(*filler) error {
			if err := r.fill.finish(false); err != nil {
				return err
			}
			for i := range r.fill.block.Rows {
				if !yield(f.row(r, i), nil) {
					return stop
				}
			}
			return nil
		})
		if err != nil && err != stop {
			yield(RowFit{}, err)
		}
	}
}

// rowReader reads rows on the basis of the fit.
type rowReader struct {
	f    *Fit
	fill *filler
}

func (f *Fit) newRowReader(src Source) *rowReader {
	j := *f.j
	j.src = src
	return &rowReader{f, j.newFiller(linalg.BlockRows)}
}

// dense returns column d of row i of the block.
func (r *rowReader) dense(d, i int) dd.DD {
	x := dd.DD{Hi: r.fill.block.Hi[d][i]}
	if lo := r.fill.block.Lo[d]; lo != nil {
		x.Lo = lo[i]
	}
	return x
}

// value returns the fitted value on the scale of the joint, and Xβ's squared
// standard error in units of the variance; bad is how far the row lies outside
// what the data say something about.
func (r *rowReader) value(i int) (fit dd.DD, h, bad float64) {
	f, b := r.f, &r.fill.block
	c := f.j.gram.NewVec()
	idx := 0
	for g, col := range f.j.cols {
		at := f.j.gram.Offset(g)
		if col.dense() {
			for k := range col.Names {
				c.Set(at+k, r.dense(r.fill.first[g]+k, i))
			}
			continue
		}
		if l := b.Index[idx][i]; l >= 0 {
			x := dd.From(1)
			if b.VHi[idx] != nil {
				x = dd.DD{Hi: b.VHi[idx][i], Lo: b.VLo[idx][i]}
			}
			c.Set(at+int(l), x)
		}
		idx++
	}
	for k := range f.j.gram.Columns() {
		if x := c.At(k); x.Hi != 0 {
			fit = fit.Add(x.Mul(f.v.beta.At(k)))
		}
	}
	half, bad, _ := f.f.Half(c)
	if f.v.restr != nil {
		half, _ = f.v.restr.reduce(half)
	}
	if f.v.rhs > 0 {
		fit = fit.Add(r.dense(r.fill.yc+f.v.rhs, i))
	}
	return fit, math.Max(half.Dot(half).Float64(), 0), bad
}

func (f *Fit) row(r *rowReader, i int) RowFit {
	b := &r.fill.block
	fit, h, _ := r.value(i)
	y := r.dense(r.fill.yc, i)
	e, shift := f.j.yExp(), f.j.yShift()
	res := y.Sub(fit)
	out := RowFit{Row: r.fill.start + i, Weight: 1,
		Response: fromBasis(y, e, shift), Fitted: fromBasis(fit, e, shift), Residual: fromBasis(res, e, 0)}
	if b.Weight != nil {
		out.Weight = b.Weight[i]
	}
	w := out.Weight
	per := w // weight of one observation of the row
	if f.j.opt.Weights.Kind == Frequency {
		per = 1
	}
	out.Leverage = math.Min(h*per, 1)
	out.Standardized, out.Studentized = math.NaN(), math.NaN()
	left := 1 - out.Leverage
	if left < 1e-12 || w == 0 {
		return out
	}
	d := res.Float64() * math.Sqrt(per)
	s2 := f.reading.variance
	out.Standardized = d / math.Sqrt(s2*left)
	if f.DFError > 1 && f.j.opt.KnownVariance == 0 {
		rest := (s2*float64(f.DFError) - d*d/left) / float64(f.DFError-1)
		out.Studentized = d / math.Sqrt(math.Max(rest, 0)*left)
	} else if f.j.opt.KnownVariance > 0 {
		out.Studentized = out.Standardized
	}
	return out
}

// Prediction is the predicted response of a new row.
type Prediction struct {
	Row   int
	Value float64
	// SE is the standard error of the mean, Lower and Upper its interval.
	SE, Lower, Upper float64
	// NewLower and NewUpper bound one new observation (of weight 1).
	NewLower, NewUpper float64
	// Estimable is false where the new row asks for a combination of columns
	// that the data say nothing about; the other numbers are then NaN.
	Estimable bool
	// Outside names the numeric fields whose value lies outside those of the fit.
	Outside []string
}

// Predict returns the predictions for the rows of new data, by the columns that
// the model was bound to. Fields are found by name, levels by name: a level the
// fit never saw is a *ColumnError wrapping ErrUnknownLevel. The response and the
// weights are not needed. Values outside the range of the fit give a warning of
// code "extrapolation", combinations without data one of code "not-estimable".
func (f *Fit) Predict(ctx context.Context, rows Source) ([]Prediction, []lrt.Warning, error) {
	a, err := f.adapt(rows)
	if err != nil {
		return nil, nil, err
	}
	ranges, err := f.ranges(ctx)
	if err != nil {
		return nil, nil, err
	}
	r := f.newRowReader(a)
	var out []Prediction
	var outside, lost []string
	seen := make(map[string]bool)
	r.fill.watch = func(w Window) {
		for i := range w.Rows {
			p := Prediction{Row: w.First + i}
			for _, g := range ranges {
				if x := w.Hi[g.field][i]; x < g.lower || x > g.upper {
					p.Outside = append(p.Outside, g.name)
					if !seen[g.name] {
						seen[g.name] = true
						outside = append(outside, g.name)
					}
				}
			}
			out = append(out, p)
		}
	}
	done := 0
	err = r.fill.blocks(ctx, func(*filler) error {
		if err := r.fill.finish(false); err != nil {
			return err
		}
		for i := range r.fill.block.Rows {
			f.predict(r, i, &out[done])
			if !out[done].Estimable {
				lost = append(lost, fmt.Sprint(out[done].Row))
			}
			done++
		}
		return nil
	})
	if err != nil {
		return nil, nil, err
	}
	var ws []lrt.Warning
	if len(outside) > 0 {
		ws = append(ws, lrt.Warning{Code: "extrapolation", Text: "values lie outside the range of the fit: " + list(outside)})
	}
	if len(lost) > 0 {
		ws = append(ws, lrt.Warning{Code: "not-estimable", Text: "the data say nothing about rows " + list(lost)})
	}
	return out, ws, nil
}

func (f *Fit) predict(r *rowReader, i int, p *Prediction) {
	fit, h, bad := r.value(i)
	e := f.j.yExp()
	p.Value = fromBasis(fit, e, f.j.yShift())
	p.Estimable = bad <= estimable
	if !p.Estimable {
		n := math.NaN()
		p.Value, p.SE, p.Lower, p.Upper, p.NewLower, p.NewUpper = n, n, n, n, n, n
		return
	}
	p.SE = math.Ldexp(math.Sqrt(h*f.reading.variance), e)
	one := math.Ldexp(math.Sqrt((h+1)*f.reading.variance), e)
	q := f.reading.quantile
	p.Lower, p.Upper = p.Value-q*p.SE, p.Value+q*p.SE
	p.NewLower, p.NewUpper = p.Value-q*one, p.Value+q*one
}
