package glm

import (
	"context"
	"fmt"
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// view is one space within a joint factorization.
type view struct {
	m      *Model
	groups []int
	rank   int
	rhs    int // right-hand side of the offset, 0 for none

	prefix bool           // the space is spanned by the first pivots of the joint factor
	factor *linalg.Factor // of the space without its restrictions; made when asked for
	beta   linalg.Vec     // coefficients on the joint basis; made when asked for
	solved bool
	rss    dd.DD // ‖y − offset − Xβ‖² on the joint's scale

	restr *restricted
}

// restricted holds the independent equations of a space: orthonormal functions
// of the fitted values and their values.
type restricted struct {
	eqs   []lrt.Equation
	halfs []linalg.Half
	value []dd.DD // what each function must be, on the basis
}

// space makes the view of a model.
func (j *joint) space(m *Model) (*view, error) {
	v := j.newView()
	v.m, v.rhs = m, j.offset(m.opt.Offset)
	for _, b := range m.cols {
		g := j.group(b)
		if g < 0 {
			return nil, fmt.Errorf("glm: %w: term %q is not in the joint factorization", lrt.ErrInvalid, b.name)
		}
		v.groups = append(v.groups, g)
	}
	if len(m.eqs) == 0 && v.rhs == 0 {
		if v.rank, v.prefix = j.factor.Prefix(v.groups); v.prefix {
			v.rss = j.factor.Residual(0, 0).Add(j.factor.Between(0, v.rank, j.factor.Rank))
			return v, nil
		}
	}
	return v, j.solve(v)
}

func (j *joint) newView() *view {
	if ws := j.ws; ws != nil && ws.used < len(ws.views) {
		v := &ws.views[ws.used]
		ws.used++
		*v = view{groups: v.groups[:0]}
		return v
	}
	return new(view)
}

// solve finds the coefficients of a view on the basis of the joint.
func (j *joint) solve(v *view) error {
	if v.solved {
		return nil
	}
	f := j.factorOf(v)
	h := f.Coordinates(0)
	v.rss = f.Residual(0, 0)
	if v.rhs > 0 {
		h = h.Sub(f.Coordinates(v.rhs))
		v.rss = v.rss.Sub(f.Residual(0, v.rhs)).Sub(f.Residual(0, v.rhs)).Add(f.Residual(v.rhs, v.rhs))
	}
	v.rank = f.Rank
	if len(v.m.eqs) > 0 {
		r, err := j.restrict(v, f)
		if err != nil {
			return err
		}
		v.restr = r
		var cost dd.DD
		h, cost = r.apply(h)
		v.rss = v.rss.Add(cost)
		v.rank -= len(r.halfs)
	}
	v.beta = f.Back(h)
	v.solved = true
	return nil
}

// factorOf returns the factor of the view's own columns, restrictions aside.
func (j *joint) factorOf(v *view) *linalg.Factor {
	if v.factor == nil {
		if len(v.groups) == len(j.cols) && ordered(v.groups) {
			v.factor = j.factor
		} else {
			v.factor = linalg.NewFactor(j.gram, v.groups, j.settings(true))
		}
	}
	return v.factor
}

func ordered(gs []int) bool {
	for i, g := range gs {
		if g != i {
			return false
		}
	}
	return true
}

// nilBelow returns the sum of squares, on the joint's scale, that counts as nil:
// the response is known to half a unit in its last place and the fitted values to
// a few, and a residual sum of squares is the remainder of q subtractions in
// double-double from the sum of squares of the response.
func (j *joint) nilBelow() float64 {
	unit := 2 * 0x1p-52
	if j.decimal {
		unit = 0x1p-94
	}
	y := math.Ldexp(j.maxY, -j.yExp()) * unit
	q := float64(j.factor.Rank)
	return math.Max(j.sumW*y*y, (16+4*q)*0x1p-104*j.gram.RHS(0, 0).Float64())
}

func (j *joint) yExp() int { return j.exp[len(j.exp)-1] }

// FitPair fits a comparison of linear spaces, m being c.Full, on one joint
// factorization: that of Join where the spaces come from it, else one of their own.
func (m *Model) FitPair(ctx context.Context, c lrt.Comparison) (lrt.Pair, error) {
	j := m.joint
	if c.Error == nil && c.Effects == nil {
		s, ok := c.Restricted.(*Model)
		if !ok {
			return lrt.Pair{}, notLinear(c.Restricted)
		}
		if j == nil || s.joint != j {
			return pairAlone(ctx, c, s, m)
		}
		return j.pair(c)
	}
	if j != nil {
		if _, err := c.Each(func(s lrt.Space) (lrt.Space, error) {
			if v, ok := s.(*Model); !ok || v.joint != j {
				j = nil
			}
			return s, nil
		}); err != nil {
			return lrt.Pair{}, err
		}
	}
	if j == nil {
		cs, err := Join(ctx, c)
		if err != nil {
			return lrt.Pair{}, err
		}
		c = cs[0]
		j = c.Full.(*Model).joint
	}
	return j.pair(c)
}

func notLinear(s lrt.Space) error {
	return fmt.Errorf("%w: %T is not a linear model of this package", lrt.ErrInvalid, s)
}

func (j *joint) pair(c lrt.Comparison) (lrt.Pair, error) {
	var p lrt.Pair
	s, err := j.space(c.Restricted.(*Model))
	if err != nil {
		return p, &lrt.ComparisonError{Comparison: c.Name, Place: "restricted", Err: err}
	}
	b, err := j.space(c.Full.(*Model))
	if err != nil {
		return p, &lrt.ComparisonError{Comparison: c.Name, Place: "full", Err: err}
	}
	if p.Nesting, err = j.nested(s, b); err != nil {
		if _, swapped := j.nested(b, s); swapped == nil && b.rank < s.rank {
			err = fmt.Errorf("%w: the full space lies inside the restricted one: they look swapped", lrt.ErrNotNested)
		}
		return p, &lrt.ComparisonError{Comparison: c.Name, Place: "restricted", Err: err}
	}
	p.Restricted, p.Full = j.fitOf(s), j.fitOf(b)
	p.DF = float64(b.rank - s.rank)
	l := &p.Linear
	l.RankS, l.RankB, l.Scale, l.Known = s.rank, b.rank, j.yExp(), j.opt.KnownVariance
	if l.Numerator, err = j.between(s, b); err != nil {
		return p, err
	}
	e0, e1, err := j.errorPair(c, l, s, b)
	if err != nil {
		return p, err
	}
	tiny := j.nilBelow()
	l.Nil, l.NilNumerator = l.Denominator <= tiny, l.Numerator <= tiny
	if l.Nil {
		l.Denominator = 0
	}
	cert, err := j.certify(c, s, b, e0, e1)
	if err != nil {
		return p, err
	}
	p.Certificate = cert
	l.Certified = cert.Exact
	p.Warnings = j.warnings(b)
	return p, nil
}

// errorPair fills in the denominator and returns its spaces; a larger one of nil is all rows.
func (j *joint) errorPair(c lrt.Comparison, l *lrt.Linear, s, b *view) (e0, e1 *view, err error) {
	e0 = b
	if c.Error != nil {
		if e0, err = j.space(c.Error.Smaller.(*Model)); err != nil {
			return nil, nil, &lrt.ComparisonError{Comparison: c.Name, Place: "error", Err: err}
		}
		if c.Error.Larger != nil {
			if e1, err = j.space(c.Error.Larger.(*Model)); err != nil {
				return nil, nil, &lrt.ComparisonError{Comparison: c.Name, Place: "error", Err: err}
			}
			if _, err = j.nested(e0, e1); err != nil {
				return nil, nil, &lrt.ComparisonError{Comparison: c.Name, Place: "error", Err: err}
			}
		}
	}
	l.RankE0 = e0.rank
	l.M = j.n
	if e1 == nil {
		l.RankE1 = int(j.n)
		l.Denominator = e0.rss.Float64()
	} else {
		l.RankE1 = e1.rank
		if l.Denominator, err = j.between(e0, e1); err != nil {
			return nil, nil, err
		}
	}
	l.Denominator = math.Max(l.Denominator, 0)
	if c.Error != nil && (e1 != nil || !sameGroups(e0, b)) {
		// With nothing in the stratum there is no test, and M = 0 would say "not linear".
		if m := l.RankB - l.RankS + l.RankE1 - l.RankE0; m > 0 {
			l.Stratum, l.M = true, float64(m)
		}
	}
	return e0, e1, nil
}

func sameGroups(a, b *view) bool {
	if len(a.groups) != len(b.groups) || len(a.m.eqs)+len(b.m.eqs) > 0 || a.rhs != b.rhs {
		return false
	}
	for _, g := range a.groups {
		if !contains(b.groups, g) {
			return false
		}
	}
	return true
}

func contains(s []int, x int) bool {
	for _, v := range s {
		if v == x {
			return true
		}
	}
	return false
}

// between returns ‖fit of b − fit of s‖² on the joint's scale, as a sum of squares.
func (j *joint) between(s, b *view) (float64, error) {
	if s.prefix && b.prefix {
		return j.factor.Between(0, s.rank, max(b.rank, s.rank)).Float64(), nil
	}
	for _, v := range []*view{s, b} {
		if err := j.solve(v); err != nil {
			return 0, err
		}
	}
	d := j.gram.NewVec()
	nc := j.gram.Columns()
	for i := range nc {
		d.Set(i, b.beta.At(i).Sub(s.beta.At(i)))
	}
	// fitted values are offset + Xβ
	if s.rhs != b.rhs {
		if b.rhs > 0 {
			d.Set(nc+b.rhs, dd.From(1))
		}
		if s.rhs > 0 {
			d.Set(nc+s.rhs, dd.From(-1))
		}
	}
	n := j.factor.NormSq(d).Float64()
	if math.IsNaN(n) || math.IsInf(n, 0) {
		return 0, fmt.Errorf("glm: %w: the distance between %v and %v on the scale of the response", ErrOverflow, s.m, b.m)
	}
	return math.Max(n, 0), nil
}

// fitOf returns the summary of a view.
func (j *joint) fitOf(v *view) lrt.Fit {
	f := lrt.Fit{N: int(j.n), Dim: v.rank, Dropped: j.dropped()}
	rss := math.Max(v.rss.Float64(), 0)
	if rss <= j.nilBelow() {
		rss = 0
	}
	f.Deviance = math.Ldexp(rss, 2*j.yExp())
	f.LogLikelihood = j.logLikelihood(rss)
	if j.opt.KnownVariance == 0 {
		f.Dim++
	}
	return f
}

// logLikelihood of a residual sum of squares on the joint's scale, the variance
// maximised or known, with all constants.
func (j *joint) logLikelihood(rss float64) float64 {
	c := math.Log(2 * math.Pi)
	ll := 0.5 * j.logW.Float64()
	if v := j.opt.KnownVariance; v > 0 {
		return ll - 0.5*(j.n*(c+math.Log(v))+math.Ldexp(rss/v, 2*j.yExp()))
	}
	if rss == 0 {
		return math.Inf(1)
	}
	return ll - 0.5*j.n*(c+1+math.Log(rss/j.n)+2*float64(j.yExp())*math.Ln2)
}

// dropped returns the rows left out on the way to the source, where it knows.
func (j *joint) dropped() int {
	if d, ok := j.src.(interface{ Account() Account }); ok {
		return d.Account().Left()
	}
	return 0
}

// Maximize fits the model alone.
func (m *Model) Maximize(ctx context.Context) (lrt.Fit, error) {
	j, v, err := m.alone(ctx)
	if err != nil {
		return lrt.Fit{}, err
	}
	f := j.fitOf(v)
	f.Warnings = j.warnings(v)
	return f, nil
}

// alone returns a joint and the model's view on it.
func (m *Model) alone(ctx context.Context) (*joint, *view, error) {
	j := m.joint
	if j == nil {
		var err error
		if j, err = newJoint(ctx, []*Model{m}, false); err != nil {
			return nil, nil, err
		}
	}
	v, err := j.space(m)
	return j, v, err
}

// NestedIn returns nil when the model lies inside larger, a *Model on the same observations.
func (m *Model) NestedIn(larger lrt.Space) error {
	b, ok := larger.(*Model)
	if !ok {
		return fmt.Errorf("glm: %w: %T is not a linear model of this package", lrt.ErrNotNested, larger)
	}
	cs, err := Join(context.Background(), lrt.Comparison{Restricted: m, Full: b})
	if err != nil {
		return err
	}
	j := cs[0].Full.(*Model).joint
	sv, err := j.space(cs[0].Restricted.(*Model))
	if err != nil {
		return err
	}
	bv, err := j.space(cs[0].Full.(*Model))
	if err != nil {
		return err
	}
	if _, err = j.nested(sv, bv); err != nil {
		return fmt.Errorf("glm: %w", err)
	}
	return nil
}
