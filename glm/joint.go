package glm

import (
	"context"
	"fmt"
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// joint is the factorization of all columns that some models name, made in
// one pass over the rows. Models are compared as views on it.
type joint struct {
	src      Source
	response string
	opt      Options
	at       places
	cols     []*bound // every column once
	offsets  []string // right-hand side i+1
	offsetAt []int    // their fields

	basis  // centre and scale of what was accumulated
	tally  // what the rows were
	tol    float64
	gram   *linalg.Gram
	factor *linalg.Factor
	ws     *workspace // memory to use; nil: new
}

// basis says how the accumulated columns come from those asked for: b = (x −
// shift)·2^−exp for each dense column. Nothing is shifted unless every space has the constant.
type basis struct {
	shifted bool
	shift   []float64 // by dense column; the response last
	exp     []int
	powers  map[int]*powers // by group: the conditioned basis of a polynomial
	scales  map[int]int     // by index group: exponent of its values, where far from 0
}

// tally counts the rows.
type tally struct {
	rows    int     // rows read
	n       float64 // observations: rows, Σw, or rows with w > 0
	zero    int     // rows of weight 0
	logW    dd.DD   // Σ log w of precision weights
	maxY    float64 // largest |y| and |offset|
	sumW    float64 // Σ w, rows without weights
	decimal bool    // the response has digits beyond float64
}

// Join factors all columns that the comparisons name once, in one pass over the
// rows, and returns the same comparisons as views on that factorization. Every
// space must be a *Model of this package; all must rest on the same observations.
// A comparison of models that are not joined joins its own on the fly.
func Join(ctx context.Context, cs ...lrt.Comparison) ([]lrt.Comparison, error) {
	var models, random []*Model
	effects := false
	for _, c := range cs {
		to := &models
		add := func(s lrt.Space) (lrt.Space, error) {
			m, ok := s.(*Model)
			if !ok || m == nil {
				return nil, notLinear(s)
			}
			*to = append(*to, m)
			return s, nil
		}
		fitted := c
		if c.Effects != nil {
			effects = true
			fitted.Effects = &lrt.Effects{Fixed: c.Effects.Fixed, NullFixed: c.Effects.NullFixed}
		}
		if _, err := fitted.Each(add); err != nil {
			return nil, err
		}
		if c.Effects == nil {
			continue
		}
		to = &random
		rest := lrt.Comparison{Name: c.Name, Effects: &lrt.Effects{Random: c.Effects.Random}}
		if _, err := rest.Each(add); err != nil {
			return nil, err
		}
	}
	if len(models) == 0 {
		return nil, fmt.Errorf("glm: %w: nothing to join", lrt.ErrInvalid)
	}
	j, err := newJoint(ctx, models, !effects || unionColumns(models, random) > linalg.MaxCoordinates, random...)
	if err != nil {
		return nil, err
	}
	out := make([]lrt.Comparison, len(cs))
	for i, c := range cs {
		out[i], err = c.Each(func(s lrt.Space) (lrt.Space, error) {
			view := *s.(*Model)
			view.joint = j
			return &view, nil
		})
		if err != nil {
			return nil, err
		}
	}
	return out, nil
}

// unionColumns counts the columns that the models name, each once.
func unionColumns(lists ...[]*Model) int {
	var all joint
	n := 0
	for _, models := range lists {
		for _, m := range models {
			for _, b := range m.cols {
				if all.group(b) < 0 {
					all.cols = append(all.cols, b)
					n += len(b.Names)
				}
			}
		}
	}
	return n
}

// newJoint factors the columns of the models, and of the random terms of a
// comparison, which are not fitted and need no constant.
func newJoint(ctx context.Context, models []*Model, eliminate bool, random ...*Model) (*joint, error) {
	j := new(joint)
	return j, j.init(ctx, models, eliminate, random...)
}

func (j *joint) init(ctx context.Context, models []*Model, eliminate bool, random ...*Model) error {
	first := models[0]
	*j = joint{src: first.src, response: first.response, opt: first.opt, at: first.at, ws: j.ws, cols: j.cols[:0],
		basis: basis{shift: j.shift[:0], exp: j.exp[:0]}}
	j.shifted = true
	largest, fitted := 0, len(models)
	if len(random) > 0 {
		models = append(models[:fitted:fitted], random...)
	}
	for i, m := range models {
		if err := first.obs.Check(m.obs); err != nil {
			return err
		}
		if i < fitted && (m.opt.KnownVariance != first.opt.KnownVariance || m.opt.Weights.Kind != first.opt.Weights.Kind) {
			return fmt.Errorf("glm: %w: known variance and kind of weights differ", lrt.ErrDifferentCriterion)
		}
		p := 0
		for _, b := range m.cols {
			p += len(b.Names)
			if j.group(b) < 0 {
				j.cols = append(j.cols, b)
			}
		}
		largest = max(largest, p)
		if i < fitted && m.carrier() < 0 {
			j.shifted = false
		}
		if m.opt.Offset != "" && j.offset(m.opt.Offset) == 0 {
			j.offsets = append(j.offsets, m.opt.Offset)
			j.offsetAt = append(j.offsetAt, m.at.offset)
		}
		j.opt.RankTolerance = math.Max(j.opt.RankTolerance, m.opt.RankTolerance)
	}
	if j.tol = j.opt.RankTolerance; j.tol == 0 {
		j.tol = 100 * float64(max(largest, 1)) * 0x1p-52
	}
	if err := j.accumulate(ctx); err != nil {
		return err
	}
	j.gram.Finish()
	if !j.gram.Finite() {
		return fmt.Errorf("glm: %w: response %q or a column is beyond 1e300 on its own scale", ErrOverflow, j.response)
	}
	j.factor = j.newFactor(eliminate)
	j.gram = j.factor.Clean()
	return ctx.Err()
}

// newFactor factors all columns.
func (j *joint) newFactor(eliminate bool) *linalg.Factor {
	var all []int
	var f *linalg.Factor
	if j.ws != nil {
		all, f = j.ws.all[:0], &j.ws.factor
	} else {
		f = new(linalg.Factor)
	}
	for i := range j.cols {
		all = append(all, i)
	}
	if j.ws != nil {
		j.ws.all = all
	}
	f.Init(j.gram, all, j.settings(eliminate))
	return f
}

func (j *joint) settings(eliminate bool) linalg.Settings {
	return linalg.Settings{Tol: j.tol, Eliminate: eliminate, Workers: j.opt.Workers}
}

// group returns the number of the columns of b, −1.
func (j *joint) group(b *bound) int {
	for i, c := range j.cols {
		if c.same(b) {
			return i
		}
	}
	return -1
}

// offset returns the right-hand side of an offset, 0 for none.
func (j *joint) offset(name string) int {
	for i, o := range j.offsets {
		if o == name {
			return i + 1
		}
	}
	return 0
}

// carrier returns the first term whose columns sum to the constant, −1.
func (m *Model) carrier() int {
	for i, b := range m.cols {
		if b.Key == "constant" || b.partition {
			return i
		}
	}
	return -1
}

// groups returns the numbers of the model's columns in j.
func (j *joint) groups(m *Model) ([]int, error) {
	gs := make([]int, len(m.cols))
	for i, b := range m.cols {
		if gs[i] = j.group(b); gs[i] < 0 {
			return nil, fmt.Errorf("glm: %w: term %q is not in the joint factorization", lrt.ErrInvalid, b.name)
		}
	}
	return gs, nil
}

// dense reports whether a group has dense columns.
func (b *bound) dense() bool { return b.Fill != nil }
