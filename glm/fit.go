package glm

import (
	"context"
	"fmt"
	"math"
	"slices"

	"subsume.example/dist"
	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// Coefficient is an estimated coefficient of a model.
type Coefficient struct {
	Term, Name string
	Estimate   float64
	// SE is the standard error; NaN without error degrees of freedom.
	SE float64
	// T is Estimate/SE, P the two-sided p-value of the hypothesis that the
	// coefficient is zero, by Student's t (or the normal law with known variance).
	// Both are NaN where restrictions fix the coefficient (SE 0).
	T, P float64
	// Lower and Upper bound the interval of Fit.Level.
	Lower, Upper float64
	// Aliased: set aside, estimate 0, no standard error.
	Aliased bool
}

// Fit is a fitted normal linear model. It holds the triangular factor, not the
// rows; methods that need the rows pass over the source again. A Fit is safe
// for concurrent use.
type Fit struct {
	// Model is what was fitted.
	Model *Model
	// N is the number of observations: rows, or Σw with frequency weights, or
	// rows of positive precision weight. Rows is how many were read, Dropped how
	// many were left out before for missing values.
	N, Rows, Dropped int
	// Rank is the dimension of the mean space, DFError = N − Rank.
	Rank, DFError int
	// RSS is the (weighted) residual sum of squares, TotalSS that about the
	// mean, or about zero for a model without a constant.
	RSS, TotalSS float64
	// Variance is RSS/DFError, or the known variance; SD its square root.
	Variance, SD float64
	// RSquared is 1 − RSS/TotalSS, NaN where TotalSS is 0.
	RSquared float64
	// LogLikelihood is the maximum with all constants; +Inf for a perfect fit.
	LogLikelihood float64
	// Coefficients are in the order of Model.Coefficients.
	Coefficients []Coefficient
	// Aliased lists the columns set aside.
	Aliased []Alias
	// Tolerance is the rank tolerance, SmallestKept and LargestAside the relative
	// pivots on both sides of it.
	Tolerance, SmallestKept, LargestAside float64
	// Level is the confidence level of the intervals.
	Level    float64
	Warnings []lrt.Warning

	j       *joint
	v       *view
	f       *linalg.Factor
	order   *termOrder // where the factorization did not follow the terms
	reading *reading
	whole   linalg.Vec // all coefficients, where they are many; used while the fit is made
}

// Fit estimates the model. The confidence level of the intervals is that of s.
// Errors are those of Normal for values found at fault, ErrNotEstimable and
// ErrContradiction for restrictions, and the error of the context.
func (m *Model) Fit(ctx context.Context, s *lrt.Settings) (*Fit, error) {
	level := 0.95
	if s != nil && s.Level != 0 {
		if level = s.Level; !(level > 0 && level < 1) {
			return nil, fmt.Errorf("glm: %w: level %g, want strictly between 0 and 1", lrt.ErrInvalid, level)
		}
	}
	j, err := newJoint(ctx, []*Model{m}, m.columns() > maxOrdered)
	if err != nil {
		return nil, err
	}
	if !j.mappable(m, j.factor) {
		if j, err = newJointUnshifted(ctx, m); err != nil {
			return nil, err
		}
	}
	own := *m
	own.joint = j
	v := &view{m: &own, rhs: j.offset(m.opt.Offset), factor: j.factor}
	if v.groups, err = j.groups(m); err != nil {
		return nil, err
	}
	if err := j.solve(v); err != nil {
		return nil, err
	}
	f := &Fit{Model: m, j: j, v: v, f: j.factor, Level: level}
	return f, f.summarize()
}

// maxOrdered is the number of columns up to which a fit keeps the order of the
// terms; beyond it the largest factor goes first.
const maxOrdered = 600

func (m *Model) columns() int {
	p := 0
	for _, b := range m.cols {
		p += len(b.Names)
	}
	return p
}

// newJointUnshifted factors the columns as they are asked for.
func newJointUnshifted(ctx context.Context, m *Model) (*joint, error) {
	bare := *m
	bare.cols = append([]*bound(nil), m.cols...)
	for i, b := range bare.cols {
		if b.Key == "constant" || b.partition {
			c := *b
			c.Key, c.partition = c.Key+" unshifted", false
			bare.cols[i] = &c
		}
	}
	j, err := newJoint(ctx, []*Model{&bare}, m.columns() > maxOrdered)
	if err != nil {
		return nil, err
	}
	j.cols = append([]*bound(nil), m.cols...)
	return j, nil
}

func (f *Fit) summarize() error {
	j, v := f.j, f.v
	f.N, f.Rows, f.Dropped = int(j.n), j.rows, j.dropped()
	f.Rank, f.DFError = v.rank, int(j.n)-v.rank
	f.Tolerance, f.SmallestKept, f.LargestAside = j.tol, f.f.SmallestKept, f.f.LargestAside
	rss := math.Max(v.rss.Float64(), 0)
	f.Warnings = j.warnings(v)
	if rss <= j.nilBelow() {
		rss = 0
		f.Warnings = append(f.Warnings, lrt.Warning{Code: "nil-residual", Text: "the residual is nil on the scale of the data: the fit is perfect"})
	}
	f.RSS = math.Ldexp(rss, 2*j.yExp())
	f.LogLikelihood = j.logLikelihood(rss)
	onBasis := rss / float64(f.DFError) // variance on the scale of the joint
	f.Variance = math.Ldexp(onBasis, 2*j.yExp())
	f.SD = math.Ldexp(math.Sqrt(onBasis), j.yExp())
	if j.opt.KnownVariance > 0 {
		f.Variance = j.opt.KnownVariance
		f.SD = math.Sqrt(f.Variance)
		onBasis = math.Ldexp(f.Variance, -2*j.yExp())
	}
	if f.DFError <= 0 && j.opt.KnownVariance == 0 {
		f.Variance, f.SD, onBasis = math.NaN(), math.NaN(), math.NaN()
		f.Warnings = append(f.Warnings, lrt.Warning{Code: "no-error", Text: "no degrees of freedom are left for error: estimates have no standard errors"})
	}
	total := j.totalSS(f.Model)
	f.TotalSS = ldexp(total, 2*j.yExp())
	f.RSquared = math.NaN() // nothing to explain
	if total.Float64() > 0 {
		f.RSquared = total.Sub(v.rss).Div(total).Float64()
		if rss == 0 {
			f.RSquared = 1
		}
	}
	f.Aliased = j.aliases(v, f.f)
	f.reading = newReading(f, onBasis)
	if f.f.Eliminated() {
		f.followTerms()
	}
	for t, b := range f.Model.cols {
		for i := range b.Names {
			f.Coefficients = append(f.Coefficients, f.coefficient(t, b.shown(i)))
		}
	}
	if w, ok := outOfRange(f.Coefficients); ok {
		f.Warnings = append(f.Warnings, w)
	}
	if len(f.Coefficients) > maxReported && f.f.Rank > 0 {
		f.Warnings = append(f.Warnings, lrt.Warning{Code: "standard-errors-on-request", Text: fmt.Sprintf(
			"with more than %d coefficients standard errors are computed by Combination only", maxReported)})
	}
	return nil
}

// maxReported is the number of coefficients up to which a fit computes all standard errors.
const maxReported = 2000

// totalSS returns the sum of squares of response less offset about its mean, or
// about zero without a constant, on the joint's scale.
func (j *joint) totalSS(m *Model) dd.DD {
	k := j.offset(m.opt.Offset)
	yy := j.gram.RHS(0, 0)
	if k > 0 {
		yy = yy.Sub(j.gram.RHS(0, k)).Sub(j.gram.RHS(0, k)).Add(j.gram.RHS(k, k))
	}
	if c := m.carrier(); c >= 0 {
		n, sums := j.gram.Total(j.group(m.cols[c]))
		s := sums[0]
		if k > 0 {
			s = s.Sub(sums[k])
		}
		yy = yy.Sub(s.Sqr().Div(n))
	}
	if yy.Hi < 0 {
		return dd.DD{}
	}
	return yy
}

// reading turns functions of the coefficients into estimates.
type reading struct {
	f        *Fit
	variance float64 // on the scale of the joint
	quantile float64 // of the two-sided interval
}

func newReading(f *Fit, variance float64) *reading {
	r := &reading{f: f, variance: variance}
	q := (1 - f.Level) / 2
	switch {
	case f.j.opt.KnownVariance > 0:
		r.quantile = dist.StudentT{Nu: math.Inf(1)}.UpperQuantile(q)
	case f.DFError > 0:
		r.quantile = dist.StudentT{Nu: float64(f.DFError)}.UpperQuantile(q)
	default:
		r.quantile = math.NaN()
	}
	return r
}

// Estimate is an estimated linear function of the coefficients: value, standard
// error, t with its two-sided p-value, and the interval of Fit.Level. Where
// restrictions fix the value SE is 0 and T and P are NaN; without error degrees of
// freedom all but Value are NaN.
type Estimate struct {
	Value, SE, T, P, Lower, Upper float64
}

// half returns the function on the factor, restrictions taken off.
func (f *Fit) half(ws []weight) (c pulled, h linalg.Half, bad float64, worst int) {
	c = f.j.pullback(f.Model, ws)
	h, bad, worst = f.f.Half(c.c)
	if f.v.restr != nil {
		all := h.Dot(h).Float64()
		h, _ = f.v.restr.reduce(h)
		if h.Dot(h).Float64() <= 1e-24*all { // what is left is rounding: the restrictions fix it
			h = h.Scale(dd.DD{})
		}
	}
	return c, h, bad, worst
}

// covariance returns the covariance of two functions of the coefficients; the error
// wraps ErrNotEstimable.
func (f *Fit) covariance(x, y []weight) (float64, error) {
	cx, hx, bx, wx := f.half(x)
	cy, hy, by, wy := f.half(y)
	if bx > estimable || by > estimable {
		return math.NaN(), fmt.Errorf("glm: %w: it involves %s", ErrNotEstimable, f.j.columnName(max(wx, wy)))
	}
	return math.Ldexp(hx.Dot(hy).Float64()*f.reading.variance, 2*f.j.yExp()+cx.exp+cy.exp), nil
}

func (r *reading) estimate(ws []weight, spread bool) (Estimate, float64, int) {
	f := r.f
	var c pulled
	var h linalg.Half
	var bad float64
	worst := -1
	e := Estimate{SE: math.NaN(), T: math.NaN(), P: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}
	var se float64 // on the scale of the function and the joint
	if spread {
		c, h, bad, worst = f.half(ws)
		se = math.Sqrt(math.Max(h.Dot(h).Float64(), 0) * r.variance)
		e.SE = math.Ldexp(se, f.j.yExp()+c.exp)
	} else {
		c = f.j.pullback(f.Model, ws)
	}
	var x dd.DD
	for i := range c.c.Len() {
		if v := c.c.At(i); v.Hi != 0 {
			x = x.Add(v.Mul(f.v.beta.At(i)))
		}
	}
	e.Value = f.j.asked(x, c)
	if math.IsNaN(e.SE) {
		return e, bad, worst
	}
	e.Lower, e.Upper = e.Value-r.quantile*e.SE, e.Value+r.quantile*e.SE
	if e.T = e.Value / e.SE; e.SE < 0x1p-1022 || math.IsInf(e.SE, 0) || math.IsInf(e.Value, 0) {
		e.T = x.Add(c.carried.MulF(f.j.yShift()).Scale(-f.j.yExp()-c.exp)).Float64() / se
	}
	if se == 0 && r.variance > 0 { // the restrictions fix it
		e.T = math.NaN()
	}
	f.test(&e)
	return e, bad, worst
}

// followTerms makes the coefficients those of the order of the terms.
func (f *Fit) followTerms() {
	o, ok := f.j.orderTerms(f.Model, f.f, f.j.gram.NewVec())
	if !ok {
		f.Warnings = append(f.Warnings, lrt.Warning{Code: "largest-factor-first", Text: "with this many columns the levels of the largest factor are kept and columns of the other terms set aside"})
		return
	}
	if f.order = o; o == nil {
		return
	}
	kept := f.Aliased[:0:0]
	for _, a := range f.Aliased {
		if a.Empty {
			kept = append(kept, a)
		}
	}
	f.Aliased = kept
	for _, at := range o.last {
		b, c := f.columnAt(at)
		f.Aliased = append(f.Aliased, Alias{Term: b.name, Column: b.Names[c], Structural: b.structural(c)})
	}
}

// columnAt returns the column at a place of a Vec.
func (f *Fit) columnAt(at int) (*bound, int) {
	for g, b := range f.j.cols {
		if o := f.j.gram.Offset(g); at >= o && at < o+len(b.Names) {
			return b, at - o
		}
	}
	return nil, 0
}

// aside reports whether the coefficient of a column is zero by the order of the terms.
func (f *Fit) aside(g, column int) bool {
	at := f.j.gram.Offset(g) + column
	for _, a := range f.f.Aside {
		if a.Group == g && a.Column == column && (f.order == nil || a.Empty) {
			return true
		}
	}
	return f.order != nil && slices.Contains(f.order.last, at)
}

// single returns the coefficient of one level without a vector of its own, for there
// may be a hundred thousand.
func (f *Fit) single(term, g, column int) float64 {
	if f.whole.Len() == 0 {
		f.whole = f.j.forward(f.Model, f.v.beta)
	}
	at, carrier := f.j.gram.Offset(g)+column, f.Model.carrier()
	x := f.whole.At(at)
	var c pulled
	if term == carrier {
		c.carried = dd.From(1)
	}
	if f.order != nil {
		for i, v := range f.order.null {
			if a := v.At(at); a.Hi != 0 {
				last := f.order.last[i]
				x = x.Sub(a.Mul(f.whole.At(last)))
				if b, _ := f.columnAt(last); f.Model.find(b) == carrier {
					c.carried = c.carried.Sub(a)
				}
			}
		}
	}
	return f.j.asked(x, c)
}

func (f *Fit) coefficient(term, column int) Coefficient {
	b := f.Model.cols[term]
	c := Coefficient{Term: b.name, Name: b.Names[column], SE: math.NaN(), T: math.NaN(), P: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}
	g := f.j.group(f.j.cols[term])
	if f.aside(g, column) {
		c.Aliased = true
		return c
	}
	if !b.dense() && f.Model.columns() > maxReported {
		c.Estimate = f.single(term, g, column)
		return c
	}
	ws := []weight{{term, column, dd.From(1)}}
	if f.order != nil {
		at := f.j.gram.Offset(g) + column
		for i, v := range f.order.null {
			if x := v.At(at); x.Hi != 0 {
				b, col := f.columnAt(f.order.last[i])
				ws = append(ws, weight{f.Model.find(b), col, x.Neg()})
			}
		}
	}
	e, _, _ := f.reading.estimate(ws, f.Model.columns() <= maxReported)
	c.Estimate, c.SE, c.T, c.P, c.Lower, c.Upper = e.Value, e.SE, e.T, e.P, e.Lower, e.Upper
	return c
}

// Weight is the weight of a named coefficient in a linear function.
type Weight struct {
	Name string
	Coef float64
}

// Combination estimates Σ Coef·coefficient, the coefficients as the fit shows them:
// beside a constant those of a factor are differences from its reference level. A
// function that is not a function of the fitted values has no estimate: the error
// wraps ErrNotEstimable and names the column at fault.
func (f *Fit) Combination(ws ...Weight) (Estimate, error) {
	list, err := f.weights(ws)
	if err != nil {
		return Estimate{}, err
	}
	e, bad, worst := f.reading.estimate(list, true)
	if bad > estimable {
		return Estimate{}, fmt.Errorf("glm: %w: it involves %s", ErrNotEstimable, f.j.columnName(worst))
	}
	return e, nil
}

func (f *Fit) weights(ws []Weight) ([]weight, error) {
	list := make([]weight, len(ws))
	for i, w := range ws {
		if f.Model.ambiguous(w.Name) {
			return nil, &CoefficientError{Name: w.Name, Err: ErrAmbiguous}
		}
		t, c, ok := f.Model.coefficient(w.Name)
		if !ok {
			return nil, f.Model.unknown(w.Name)
		}
		if math.IsNaN(w.Coef) || math.IsInf(w.Coef, 0) {
			return nil, &CoefficientError{Name: w.Name, Err: fmt.Errorf("%w: weight %g", lrt.ErrInvalid, w.Coef)}
		}
		list[i] = weight{t, c, dd.From(w.Coef)}
	}
	if list = f.Model.asDisplayed(list); nothing(list) {
		return nil, &CoefficientError{Name: ws[0].Name, Err: fmt.Errorf("%w: it is 0 by the choice of the reference level", ErrNotEstimable)}
	}
	return list, nil
}

// Covariance returns the covariance of two linear functions of the coefficients.
func (f *Fit) Covariance(a, b []Weight) (float64, error) {
	x, err := f.weights(a)
	if err != nil {
		return math.NaN(), err
	}
	y, err := f.weights(b)
	if err != nil {
		return math.NaN(), err
	}
	return f.covariance(x, y)
}

// Coefficient returns the coefficient of a name.
func (f *Fit) Coefficient(name string) (Coefficient, error) {
	for _, c := range f.Coefficients {
		if c.Name == name {
			return c, nil
		}
	}
	return Coefficient{}, f.Model.unknown(name)
}
