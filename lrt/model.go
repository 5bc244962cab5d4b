package lrt

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"strings"
)

// Model declares a likelihood over data of the user's own type D. Params and
// LogLikelihood are enough; the other functions make fits faster, or make more
// questions answerable. All of them must be safe for concurrent use, must not
// keep theta, and should return rather than panic (a panic becomes an error
// that holds the parameter value). theta has one value for each of Params, in
// their order, always inside their ranges. Between evaluations a fit looks at
// its context and its Budget; a function that never returns cannot be stopped.
type Model[D any] struct {
	Name   string
	Params []Param

	// LogLikelihood returns the log likelihood with every constant that depends
	// on parameters; -Inf or NaN where theta is impossible. Only Each may
	// replace it.
	LogLikelihood func(d D, theta []float64) float64
	// Each fills the log likelihood of each of the N independent observations.
	// It makes fits from plain likelihoods several times faster (the outer
	// product of scores starts the curvature; Berndt, Hall, Hall, Hausman 1974).
	Each func(d D, theta, each []float64)
	// Gradient fills the derivatives of LogLikelihood. It is checked against
	// differences; a wrong one is reported by a warning and not used.
	Gradient func(d D, theta, gradient []float64)
	// Hessian fills the second derivatives, row-major. It is checked too, and
	// used only beside Gradient.
	Hessian func(d D, theta, hessian []float64)
	// Information fills the expected information, row-major; the score test uses
	// it in place of the observed one. It is used only beside Gradient.
	Information func(d D, theta, information []float64)
	// Start returns a rough estimate; nil: a search over the ranges.
	Start func(d D) []float64
	// ClosedForm returns the maximum likelihood estimate of the unrestricted
	// model. Restricted spaces get theirs by SolveBy.
	ClosedForm func(d D) ([]float64, error)
	// ClosedFor returns the maximum likelihood estimate of a restricted space, in
	// root parameters, and false where it knows none; space.Implies tells what
	// holds in it.
	ClosedFor func(d D, space *Declared) (theta []float64, ok bool)
	// Simulate draws data of the same design at theta.
	Simulate func(design D, theta []float64, src rand.Source) (D, error)
	// Exact returns the exact test of a comparison of two declared spaces of this
	// model, of kind None with the reason where it knows none.
	Exact func(d D, restricted, full *Declared, p Pair) (Test, error)
	// BartlettFactor returns E(−2 log λ)/df of a comparison to the order 1/n,
	// or an error wrapping ErrNoFactor.
	BartlettFactor func(d D, restricted, full *Declared, p Pair) (float64, error)
	// Pivotal says that the null law of λ is free of nuisance parameters.
	Pivotal func(restricted, full *Declared) bool

	// Criterion says what LogLikelihood is; zero: the full likelihood.
	Criterion Criterion
	// Budget is the largest number of evaluations of the log likelihood in one
	// fit; 0: 20,000 + 2,000 for each parameter.
	Budget int
	// Starts is the number of starts a fit makes at least; 0: 1 where Start is
	// given, 3 where it is not. Doubtful fits take more by themselves.
	Starts int
}

// The conditions of declared models, for errors.Is.
var (
	// ErrPanic: a function of a model panicked.
	ErrPanic = errors.New("function of the model panicked")
	// ErrBudget: the budget of evaluations is used up.
	ErrBudget = errors.New("budget of likelihood evaluations used up")
	// ErrNoStart: no point was found where the log likelihood is finite.
	ErrNoStart = errors.New("log likelihood is not finite at any starting point")
	// ErrContradiction: restrictions exclude each other or a parameter's range.
	ErrContradiction = errors.New("restrictions contradict each other")
	// ErrNestingUnknown: whether one space lies inside another cannot be decided.
	ErrNestingUnknown = errors.New("nesting cannot be decided")
)

// ModelError says which function of which model failed, and at which parameter values.
type ModelError struct {
	Model, Func string
	Names       []string  // of the parameters; nil where no value is involved
	Theta       []float64 // their values
	Err         error
}

// Error returns the text "lrt: model NAME: FUNC at a = 1, b = 2: CAUSE".
func (e *ModelError) Error() string {
	var b strings.Builder
	b.WriteString("lrt: model")
	if e.Model != "" {
		fmt.Fprintf(&b, " %s", e.Model)
	}
	if e.Func != "" {
		fmt.Fprintf(&b, ": %s", e.Func)
	}
	for i, v := range e.Theta {
		if i == 0 {
			b.WriteString(" at ")
		} else {
			b.WriteString(", ")
		}
		name := fmt.Sprint(i)
		if i < len(e.Names) {
			name = e.Names[i]
		}
		fmt.Fprintf(&b, "%s = %g", name, v)
	}
	fmt.Fprintf(&b, ": %v", e.Err)
	return b.String()
}

// Unwrap returns the cause.
func (e *ModelError) Unwrap() error { return e.Err }

// core is a model bound to data with the data's type erased. Closures that
// take the data again (simulate, a restricted closed form) go through data.
type core struct {
	name   string
	params []Param
	names  []string
	model  *byte // one address for each Bind; kept by redraws
	n      int
	obs    Observations
	data   any

	logLik    func(theta []float64) float64
	each      func(theta, each []float64)
	gradient  func(theta, g []float64)
	hessian   func(theta, h []float64)
	expected  func(theta, info []float64)
	start     func() []float64
	closed    func(data any) ([]float64, error)
	closedAt  func(s *Declared) ([]float64, bool)
	exact     func(r, f *Declared, p Pair) (Test, error)
	factor    func(r, f *Declared, p Pair) (float64, error)
	pivotal   func(r, f *Declared) bool
	simulate  func(theta []float64, src rand.Source) (*core, error)
	criterion Criterion
	budget    int
	starts    int
	drawn     bool // simulated data: the model's derivatives were checked on the first
}

// Bind joins a declared model to a sample. Every space of a comparison must be
// derived from one Bind by Restrict. The errors wrap ErrInvalid.
func Bind[D any](m Model[D], s Sample[D]) (*Declared, error) {
	fail := func(format string, args ...any) error {
		return &ModelError{Model: m.Name, Err: fmt.Errorf("%w: "+format, append([]any{ErrInvalid}, args...)...)}
	}
	switch {
	case len(m.Params) == 0:
		return nil, fail("no parameters")
	case m.LogLikelihood == nil && m.Each == nil:
		return nil, fail("no log likelihood: LogLikelihood or Each is needed")
	case s.N < 1:
		return nil, fail("%d observations, want at least 1", s.N)
	case s.obs == Observations{}:
		return nil, fail("the sample was not made by Observe")
	case m.Budget < 0 || m.Starts < 0:
		return nil, fail("negative Budget or Starts")
	}
	if err := checkParams(m.Params); err != nil {
		return nil, &ModelError{Model: m.Name, Err: err}
	}
	m.Params = append([]Param(nil), m.Params...)
	c := bindCore(m, s, new(byte))
	root := &frame{params: c.params, index: indexOf(c.params)}
	return &Declared{core: c, frame: root}, nil
}

func bindCore[D any](m Model[D], s Sample[D], id *byte) *core {
	d := s.Value
	c := &core{name: m.Name, params: m.Params, model: id, n: s.N, obs: s.obs, data: d, criterion: m.Criterion, budget: m.Budget, starts: m.Starts}
	for _, p := range m.Params {
		c.names = append(c.names, p.Name)
	}
	if c.budget == 0 {
		c.budget = 20000 + 2000*len(m.Params)
	}
	if m.Each != nil {
		c.each = func(theta, each []float64) { m.Each(d, theta, each) }
	}
	if m.LogLikelihood != nil {
		c.logLik = func(theta []float64) float64 { return m.LogLikelihood(d, theta) }
	}
	if m.Gradient != nil {
		c.gradient = func(theta, g []float64) { m.Gradient(d, theta, g) }
		if m.Information != nil {
			c.expected = func(theta, info []float64) { m.Information(d, theta, info) }
		}
		if m.Hessian != nil {
			c.hessian = func(theta, h []float64) { m.Hessian(d, theta, h) }
		}
	}
	if m.Start != nil {
		c.start = func() []float64 { return m.Start(d) }
	}
	if m.ClosedForm != nil {
		c.closed = func(data any) ([]float64, error) { return m.ClosedForm(data.(D)) }
	}
	if m.ClosedFor != nil {
		c.closedAt = func(s *Declared) ([]float64, bool) { return m.ClosedFor(d, s) }
	}
	if m.Exact != nil {
		c.exact = func(r, f *Declared, p Pair) (Test, error) { return m.Exact(d, r, f, p) }
	}
	if m.BartlettFactor != nil {
		c.factor = func(r, f *Declared, p Pair) (float64, error) { return m.BartlettFactor(d, r, f, p) }
	}
	c.pivotal = m.Pivotal
	if m.Simulate != nil {
		c.simulate = func(theta []float64, src rand.Source) (*core, error) {
			drawn, err := m.Simulate(d, theta, src)
			if err != nil {
				return nil, err
			}
			r := bindCore(m, Observe(drawn, s.N), id)
			r.drawn = true
			return r, nil
		}
	}
	return c
}

// SolveBy gives a closed form to a restricted space: solve returns the root
// parameters that maximise the likelihood over space, given data of the
// model's type D. It is checked like a numerical fit.
func SolveBy[D any](space Space, solve func(d D) ([]float64, error)) (Space, error) {
	d, ok := space.(*Declared)
	if !ok {
		return nil, fmt.Errorf("lrt: SolveBy: %w: %T is not a declared space", ErrInvalid, space)
	}
	if _, ok := d.core.data.(D); !ok || solve == nil {
		return nil, &ModelError{Model: d.core.name, Func: "SolveBy", Err: fmt.Errorf("%w: a function of %T is needed", ErrInvalid, d.core.data)}
	}
	r := *d
	r.closed = func(data any) ([]float64, error) { return solve(data.(D)) }
	return &r, nil
}

// evaluator calls a model's functions, counts, and turns a panic into an error.
// The first error sticks; afterwards every value is NaN.
type evaluator struct {
	ctx   context.Context
	core  *core
	calls int
	loan  []float64
	// what was found wrong with the model's functions, so that they are not used
	noGradient, noHessian, noEach, audited bool
	warnings                               []Warning
	err                                    error
}

// lent is a copy of theta that user code may write to without harm.
func (e *evaluator) lent(theta []float64) []float64 {
	e.loan = append(e.loan[:0], theta...)
	return e.loan
}

func (e *evaluator) fail(fn string, theta []float64, err error) {
	if e.err == nil {
		e.err = &ModelError{Model: e.core.name, Func: fn, Names: e.core.names, Theta: append([]float64(nil), theta...), Err: err}
	}
}

// guard must be deferred around a call of user code.
func (e *evaluator) guard(fn string, theta []float64) {
	if r := recover(); r != nil {
		e.fail(fn, theta, fmt.Errorf("%w: %v", ErrPanic, r))
	}
}

// ready counts an evaluation and reports whether it may be made.
func (e *evaluator) ready() bool {
	if e.err != nil {
		return false
	}
	if err := e.ctx.Err(); err != nil {
		e.err = err
		return false
	}
	e.calls++
	if e.calls > e.core.budget {
		e.err = &ModelError{Model: e.core.name, Err: fmt.Errorf("%w: %w: %d evaluations", ErrNotConverged, ErrBudget, e.core.budget)}
		return false
	}
	return true
}

// value returns the log likelihood at root coordinates; NaN stands for every
// point that cannot be used.
func (e *evaluator) value(theta []float64) (v float64) {
	if !e.ready() {
		return nan
	}
	v = nan // what a panic leaves
	defer e.guard("LogLikelihood", theta)
	if e.core.logLik == nil {
		each := make([]float64, e.core.n)
		e.core.each(e.lent(theta), each)
		v = sum(each)
	} else {
		v = e.core.logLik(e.lent(theta))
	}
	return e.sane(v, theta)
}

// rows fills the log likelihoods of the observations and returns their sum.
func (e *evaluator) rows(theta, each []float64) (v float64) {
	if !e.ready() {
		return nan
	}
	v = nan
	defer e.guard("Each", theta)
	for i := range each {
		each[i] = nan // a term that is forgotten must not be a stale one
	}
	e.core.each(e.lent(theta), each)
	return e.sane(sum(each), theta)
}

// sane turns +Inf into an error: no maximum can be reported above it.
func (e *evaluator) sane(v float64, theta []float64) float64 {
	if v > maxFinite {
		e.fail("LogLikelihood", theta, fmt.Errorf("%w: it is +Inf here", ErrUnbounded))
		return nan
	}
	if v < -maxFinite {
		return nan
	}
	return v
}

func (e *evaluator) grad(theta, g []float64) bool {
	if !e.ready() {
		return false
	}
	e.calls-- // counted, but a gradient is no evaluation of the likelihood
	defer e.guard("Gradient", theta)
	e.core.gradient(e.lent(theta), g)
	return e.err == nil && finite(g)
}

func (e *evaluator) information(theta, info []float64) bool {
	if e.err != nil {
		return false
	}
	defer e.guard("Information", theta)
	e.core.expected(e.lent(theta), info)
	return e.err == nil && finite(info)
}

func (e *evaluator) hess(theta, h []float64) bool {
	if e.err != nil {
		return false
	}
	defer e.guard("Hessian", theta)
	e.core.hessian(e.lent(theta), h)
	return e.err == nil && finite(h)
}
