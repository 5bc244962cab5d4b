package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"strings"
	"sync"
	"testing"
)

var bg = context.Background()

// normalBest is the closed form maximum, all groups apart.
func normalBest(d grouped) float64 {
	n, _, ss := d.sums()
	l := 0.0
	for j := range n {
		l -= 0.5 * n[j] * (math.Log(2*math.Pi*ss[j]/n[j]) + 1)
	}
	return l
}

// Closed forms against numerical maximisation: 1e-8 in log likelihood, ugly
// scales and n = 3 included, with every combination of what a model may give.
func TestNumericalAgainstClosedForm(t *testing.T) {
	trials := 12
	if os.Getenv("SUBSUME_LONG") == "1" {
		trials = 350
	}
	modes := []struct {
		name string
		with parts
	}{{"plain", 0}, {"start", withStart}, {"each", withStart | withEach}, {"each without start", withEach}, {"gradient", withStart | withGradient}, {"gradient without start", withGradient}}
	for _, mode := range modes {
		t.Run(mode.name, func(t *testing.T) {
			worst := 0.0
			for _, scale := range []float64{1e-8, 1, 1e8} {
				for trial := range trials {
					n, k := 3, 1
					if trial%2 == 1 {
						n, k = 24, 2
					}
					d := normalGroups(n, k, 2, scale, uint64(trial)+1)
					fit, err := mustBind(t, normalModel(k, mode.with), d, n).Maximize(bg)
					if err != nil {
						t.Fatalf("scale %g, trial %d: %v", scale, trial, err)
					}
					miss := math.Abs(fit.LogLikelihood - normalBest(d))
					worst = math.Max(worst, miss)
					if !(miss <= 1e-8) {
						t.Errorf("scale %g, trial %d: log likelihood off by %.3g; warnings %v", scale, trial, miss, fit.Warnings)
					}
				}
			}
			t.Logf("worst %.2g", worst)
		})
	}
}

// A location of 1e8 standard deviations, and data of one part in 1e8.
func TestFitFarFromZero(t *testing.T) {
	d := normalGroups(30, 1, 1e7, 1, 3)
	for _, with := range []parts{withStart, withStart | withEach, withStart | withGradient} {
		fit, err := mustBind(t, normalModel(1, with), d, 30).Maximize(bg)
		if err != nil {
			t.Fatal(err)
		}
		if miss := math.Abs(fit.LogLikelihood - normalBest(d)); !(miss <= 1e-7) {
			t.Errorf("parts %d: off by %.3g", with, miss)
		}
	}
}

func TestGammaModesAgree(t *testing.T) {
	d := gammaGroups(500, 5, 1, 7)
	var want float64
	for i, with := range []parts{withStart | withGradient, withStart | withEach, withStart, 0, withEach} {
		full := mustBind(t, gammaModel(5, with), d, 500)
		small := mustRestrict(t, full, Equate(Names("shape", 5)...), Equate(Names("rate", 5)...))
		r, err := Compare(bg, small, full, nil)
		if err != nil {
			t.Fatal(err)
		}
		if r.Pair.DF != 8 || r.Pair.Nesting == "" {
			t.Errorf("df %g, nesting %q", r.Pair.DF, r.Pair.Nesting)
		}
		if i == 0 {
			want = r.Statistic
		} else if math.Abs(r.Statistic-want) > 2e-8 {
			t.Errorf("parts %d: −2 log λ = %.12g, want %.12g", with, r.Statistic, want)
		}
	}
}

// The gradient at the estimate, from the model's own formula, is nil on the scale of standard errors.
func TestGammaIsAMaximum(t *testing.T) {
	d := gammaGroups(60, 2, 1e-6, 11)
	m := gammaModel(2, withEach)
	s := mustBind(t, m, d, 60)
	fit, err := s.Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	e, err := s.Estimates(bg, fit)
	if err != nil {
		t.Fatal(err)
	}
	g := make([]float64, 4)
	gammaModel(2, withGradient).Gradient(d, fit.Estimate, g)
	for j, v := range g {
		if s := math.Abs(v * e.StdErr[j]); !(s < 1e-5) {
			t.Errorf("%s: score times standard error %.3g", e.Names[j], s)
		}
	}
}

// Observed information of a normal sample: sd²/n and sd²/(2n).
func TestEstimatesOfNormal(t *testing.T) {
	for _, scale := range []float64{1e-8, 1, 1e8} {
		for _, with := range []parts{0, withEach, withGradient, withClosed, withGradient | withClosed} {
			d := normalGroups(40, 2, 1, scale, 9)
			s := mustBind(t, normalModel(2, with), d, 40)
			fit, err := s.Maximize(bg)
			if err != nil {
				t.Fatal(err)
			}
			e, err := s.Estimates(bg, fit)
			if err != nil {
				t.Fatal(err)
			}
			n, _, ss := d.sums()
			for j := range 2 {
				sd := math.Sqrt(ss[j] / n[j])
				for i, want := range []float64{sd / math.Sqrt(n[j]), sd / math.Sqrt(2*n[j])} {
					// Differences of a log likelihood of 40 terms: 8 digits are what they give.
					if got := e.StdErr[i*2+j]; math.Abs(got/want-1) > 1e-6 {
						t.Errorf("scale %g, parts %d: standard error of %s = %.12g, want %.12g", scale, with, e.Names[i*2+j], got, want)
					}
				}
				if c := e.Covariance[j*4+2+j]; math.Abs(c) > 1e-6*sd*sd/n[j] {
					t.Errorf("covariance of mean and sd %g", c)
				}
			}
		}
	}
}

func TestBadModels(t *testing.T) {
	d := normalGroups(12, 1, 0, 1, 1)
	base := normalModel(1, 0)
	with := func(f func(m *Model[grouped])) Model[grouped] {
		m := base
		f(&m)
		return m
	}
	boom := func() { panic("boom") }
	for _, c := range []struct {
		name string
		m    Model[grouped]
		want error
		text string
	}{
		{"NaN everywhere", with(func(m *Model[grouped]) { m.LogLikelihood = func(grouped, []float64) float64 { return math.NaN() } }), ErrNoStart, "give Start"},
		{"−Inf everywhere", with(func(m *Model[grouped]) { m.LogLikelihood = func(grouped, []float64) float64 { return -inf } }), ErrNoStart, ""},
		{"+Inf everywhere", with(func(m *Model[grouped]) { m.LogLikelihood = func(grouped, []float64) float64 { return inf } }), ErrUnbounded, "+Inf"},
		{"panic in LogLikelihood", with(func(m *Model[grouped]) {
			m.LogLikelihood = func(_ grouped, th []float64) float64 {
				if th[1] != 1 {
					boom()
				}
				return 0
			}
		}), ErrPanic, "boom"},
		{"panic in Each", with(func(m *Model[grouped]) {
			m.LogLikelihood = nil
			m.Each = func(grouped, []float64, []float64) { boom() }
		}), ErrPanic, "Each at mean[1] = "},
		{"panic in Gradient", with(func(m *Model[grouped]) { m.Gradient = func(grouped, []float64, []float64) { boom() } }), ErrPanic, "Gradient at"},
		{"panic in Start", with(func(m *Model[grouped]) { m.Start = func(grouped) []float64 { boom(); return nil } }), ErrPanic, "Start"},
		{"panic in ClosedForm", with(func(m *Model[grouped]) {
			m.ClosedForm = func(grouped) ([]float64, error) { boom(); return nil, nil }
		}), ErrPanic, "closed form"},
		{"short Start", with(func(m *Model[grouped]) { m.Start = func(grouped) []float64 { return []float64{1} } }), ErrInvalid, "1 values, want 2"},
		{"short ClosedForm", with(func(m *Model[grouped]) { m.ClosedForm = func(grouped) ([]float64, error) { return nil, nil } }), ErrInvalid, "0 values, want 2"},
		{"budget", with(func(m *Model[grouped]) { m.Budget = 7 }), ErrBudget, "7 evaluations"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := mustBind(t, c.m, d, 12).Maximize(bg)
			var me *ModelError
			if !errors.Is(err, c.want) || !errors.As(err, &me) || !strings.Contains(err.Error(), c.text) {
				t.Errorf("error %v, want one of %v with %q", err, c.want, c.text)
			}
		})
	}
	t.Run("budget is not converged", func(t *testing.T) {
		_, err := mustBind(t, with(func(m *Model[grouped]) { m.Budget = 7 }), d, 12).Maximize(bg)
		if !errors.Is(err, ErrNotConverged) {
			t.Errorf("%v", err)
		}
	})
	t.Run("context", func(t *testing.T) {
		ctx, cancel := context.WithCancel(bg)
		n := 0
		m := with(func(m *Model[grouped]) {
			ll := m.LogLikelihood
			m.LogLikelihood = func(d grouped, th []float64) float64 {
				if n++; n == 20 {
					cancel()
				}
				return ll(d, th)
			}
		})
		if _, err := mustBind(t, m, d, 12).Maximize(ctx); !errors.Is(err, context.Canceled) {
			t.Errorf("%v", err)
		}
		if n != 20 {
			t.Errorf("%d evaluations, want a stop after 20", n)
		}
	})
}

func TestBindErrors(t *testing.T) {
	good := normalModel(1, 0)
	sample := Observe(normalGroups(3, 1, 0, 1, 1), 3)
	for _, c := range []struct {
		name string
		edit func(m *Model[grouped], s *Sample[grouped])
		text string
	}{
		{"no parameters", func(m *Model[grouped], s *Sample[grouped]) { m.Params = nil }, "no parameters"},
		{"no likelihood", func(m *Model[grouped], s *Sample[grouped]) { m.LogLikelihood = nil }, "no log likelihood"},
		{"no rows", func(m *Model[grouped], s *Sample[grouped]) { s.N = 0 }, "0 observations"},
		{"no identity", func(m *Model[grouped], s *Sample[grouped]) { *s = Sample[grouped]{N: 3} }, "Observe"},
		{"two names", func(m *Model[grouped], s *Sample[grouped]) { m.Params = []Param{Real("a"), Real("a")} }, `"a"`},
		{"no name", func(m *Model[grouped], s *Sample[grouped]) { m.Params = []Param{Real(" ")} }, "no name"},
		{"empty range", func(m *Model[grouped], s *Sample[grouped]) { m.Params = []Param{Between("a", 2, 2)} }, "lower < upper"},
		{"NaN range", func(m *Model[grouped], s *Sample[grouped]) { m.Params = []Param{Between("a", math.NaN(), 2)} }, "lower < upper"},
		{"infinite range", func(m *Model[grouped], s *Sample[grouped]) { m.Params = []Param{Between("a", -inf, -inf)} }, "lower < upper"},
		{"negative budget", func(m *Model[grouped], s *Sample[grouped]) { m.Budget = -1 }, "negative"},
	} {
		t.Run(c.name, func(t *testing.T) {
			m, s := good, sample
			c.edit(&m, &s)
			_, err := Bind(m, s)
			if !errors.Is(err, ErrInvalid) || !strings.Contains(err.Error(), c.text) {
				t.Errorf("error %v, want ErrInvalid with %q", err, c.text)
			}
		})
	}
}

func hasWarning(ws []Warning, code string) bool {
	for _, w := range ws {
		if w.Code == code {
			return true
		}
	}
	return false
}

func warningText(ws []Warning, code string) string {
	for _, w := range ws {
		if w.Code == code {
			return w.Text
		}
	}
	return ""
}

func TestWrongDerivativesAreReported(t *testing.T) {
	d := normalGroups(30, 2, 1, 1, 4)
	m := normalModel(2, withStart|withGradient)
	right := m.Gradient
	m.Gradient = func(d grouped, th, g []float64) {
		right(d, th, g)
		g[3] *= -1 // sd[2]
	}
	fit, err := mustBind(t, m, d, 30).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if text := warningText(fit.Warnings, "gradient-disagrees"); !strings.Contains(text, "sd[2]") || strings.Contains(text, "sd[1]") {
		t.Errorf("warnings %v, want gradient-disagrees naming sd[2] alone", fit.Warnings)
	}
	if miss := math.Abs(fit.LogLikelihood - normalBest(d)); miss > 1e-8 {
		t.Errorf("off by %g", miss)
	}

	m.Gradient = right
	m.Hessian = func(d grouped, th, h []float64) { clear(h); h[0] = -1 }
	fit, err = mustBind(t, m, d, 30).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if !hasWarning(fit.Warnings, "hessian-disagrees") || hasWarning(fit.Warnings, "gradient-disagrees") {
		t.Errorf("warnings %v, want hessian-disagrees", fit.Warnings)
	}

	m = normalModel(2, withStart|withEach)
	each := m.Each
	m.Each = func(d grouped, th, e []float64) { each(d, th, e); e[0]++ }
	fit, err = mustBind(t, m, d, 30).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if !hasWarning(fit.Warnings, "each-disagrees") || math.Abs(fit.LogLikelihood-normalBest(d)) > 1e-8 {
		t.Errorf("warnings %v, log likelihood %g", fit.Warnings, fit.LogLikelihood)
	}

	m = normalModel(2, withClosed)
	closed := m.ClosedForm
	m.ClosedForm = func(d grouped) ([]float64, error) {
		th, err := closed(d)
		th[0] += 0.05
		return th, err
	}
	fit, err = mustBind(t, m, d, 30).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if !hasWarning(fit.Warnings, "closed-form-not-maximum") || math.Abs(fit.LogLikelihood-normalBest(d)) > 1e-8 {
		t.Errorf("warnings %v, log likelihood %g", fit.Warnings, fit.LogLikelihood)
	}
}

// The model's own Hessian gives Newton steps and standard errors.
func TestOwnHessian(t *testing.T) {
	d := normalGroups(30, 1, 1, 1, 4)
	m := normalModel(1, withStart|withGradient)
	m.Hessian = func(d grouped, th, h []float64) {
		clear(h)
		for _, y := range d.y {
			e, s := y-th[0], th[1]
			h[0] -= 1 / (s * s)
			h[1] -= 2 * e / (s * s * s)
			h[3] += 1/(s*s) - 3*e*e/(s*s*s*s)
		}
		h[2] = h[1]
	}
	s := mustBind(t, m, d, 30)
	fit, err := s.Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if len(fit.Warnings) > 0 || math.Abs(fit.LogLikelihood-normalBest(d)) > 1e-10 {
		t.Errorf("warnings %v, off by %g", fit.Warnings, fit.LogLikelihood-normalBest(d))
	}
	e, err := s.Estimates(bg, fit)
	if err != nil {
		t.Fatal(err)
	}
	if want := fit.Estimate[1] / math.Sqrt(30); math.Abs(e.StdErr[0]/want-1) > 1e-9 {
		t.Errorf("standard error %.15g, want %.15g", e.StdErr[0], want)
	}
}

func TestStartOutsideRange(t *testing.T) {
	d := normalGroups(30, 1, 1, 1, 4)
	m := normalModel(1, 0)
	m.Start = func(grouped) []float64 { return []float64{math.Inf(1), -3} }
	fit, err := mustBind(t, m, d, 30).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if !hasWarning(fit.Warnings, "start-outside-range") || math.Abs(fit.LogLikelihood-normalBest(d)) > 1e-8 {
		t.Errorf("warnings %v, off by %g", fit.Warnings, fit.LogLikelihood-normalBest(d))
	}
}

// A group of one row, or of equal rows, with a spread of its own.
func TestUnboundedLikelihoodNamesTheGroup(t *testing.T) {
	for _, c := range []struct {
		name string
		y    []float64
		g    []int
	}{
		{"one row", []float64{1, 2, 4, 8, 3}, []int{0, 0, 0, 0, 1}},
		{"ties", []float64{1, 2, 4, 8, 3, 3, 3}, []int{0, 0, 0, 0, 1, 1, 1}},
	} {
		for _, with := range []parts{0, withStart, withStart | withEach, withStart | withGradient} {
			t.Run(fmt.Sprint(c.name, with), func(t *testing.T) {
				d := grouped{c.y, c.g, 2}
				_, err := mustBind(t, normalModel(2, with), d, len(c.y)).Maximize(bg)
				if !errors.Is(err, ErrUnbounded) || !strings.Contains(err.Error(), "sd[2]") {
					t.Errorf("error %v, want ErrUnbounded naming sd[2]", err)
				}
			})
		}
	}
}

// Two parameters of which only the sum matters, and one that does nothing.
func TestNotIdentifiable(t *testing.T) {
	m := Model[[]float64]{
		Params: []Param{Real("a"), Real("b"), Real("idle"), Positive("sd")},
		LogLikelihood: func(y, th []float64) float64 {
			s := 0.0
			for _, v := range y {
				z := (v - th[0] - th[1]) / th[3]
				s -= 0.5*z*z + math.Log(th[3])
			}
			return s
		},
	}
	full := mustBind(t, m, []float64{1, 2, 4, 3, 2.5}, 5)
	fit, err := full.Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	text := warningText(fit.Warnings, "not-identifiable")
	for _, name := range []string{"a", "b", "idle"} {
		if !strings.Contains(text, name) {
			t.Errorf("warnings %v do not name %s", fit.Warnings, name)
		}
	}
	if strings.Contains(text, "sd") {
		t.Errorf("sd is named: %s", text)
	}
	e, err := full.Estimates(bg, fit)
	if err != nil {
		t.Fatal(err)
	}
	if !math.IsInf(e.StdErr[0], 1) || !math.IsInf(e.StdErr[2], 1) || !(e.StdErr[3] > 0) || math.IsInf(e.StdErr[3], 1) {
		t.Errorf("standard errors %v", e.StdErr)
	}
	// Fixing a + b = 2.5 and the idle one costs one degree of freedom, not two.
	small := mustRestrict(t, full, Equations(Equation{[]string{"a", "b"}, []float64{1, 1}, 2}), Fix("idle", 3))
	r, err := Compare(bg, small, full, nil)
	if err != nil {
		t.Fatal(err)
	}
	if r.Pair.DF != 1 {
		t.Errorf("df = %g, want 1; %v", r.Pair.DF, r.Warnings)
	}
	// The closed form: n log(1 + n (mean − 2)²/SS).
	want := 5 * math.Log1p(5*0.25/5)
	if math.Abs(r.Statistic-want) > 1e-8 {
		t.Errorf("−2 log λ = %.12g, want %.12g", r.Statistic, want)
	}
}

// A component of a mixture that is absent under the null leaves its mean
// undetermined: no χ² law is claimed.
func TestIrregularMixture(t *testing.T) {
	m := Model[[]float64]{
		Params: []Param{Unit("weight"), Real("shift")},
		LogLikelihood: func(y, th []float64) float64 {
			s := 0.0
			for _, v := range y {
				s += math.Log((1-th[0])*math.Exp(-v*v/2) + th[0]*math.Exp(-(v-th[1])*(v-th[1])/2))
			}
			return s
		},
		Start: func([]float64) []float64 { return []float64{0.3, 1} },
	}
	d := normalGroups(40, 1, 0.5, 1, 8).y
	full := mustBind(t, m, d, 40)
	small := mustRestrict(t, full, Fix("weight", 0), Fix("shift", 0))
	loose := mustRestrict(t, full, Fix("weight", 0))
	for _, s := range []*Declared{small, loose} {
		p, err := Comparison{Restricted: s, Full: full}.Fit(bg, nil)
		if err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(p.Irregular, "shift") {
			t.Errorf("%v: irregular %q, warnings %v", s, p.Irregular, p.Warnings)
		}
	}
}

// The constrained maximum of a concave likelihood, by its closed form.
func TestBoundsActiveAndNot(t *testing.T) {
	d := normalGroups(20, 2, 0, 1, 21)
	n, s, ss := d.sums()
	m := normalModel(2, withStart)
	full := mustBind(t, m, d, 20)
	for _, at := range []float64{-2, -0.5, 0.5, 2} {
		r := mustRestrict(t, full, AtLeast("mean[1]", at), AtMost("mean[2]", at))
		fit, err := r.Maximize(bg)
		if err != nil {
			t.Fatal(err)
		}
		want := 0.0
		hit := 0
		for j := range 2 {
			mu := s[j] / n[j]
			bound := math.Max(mu, at)
			if j == 1 {
				bound = math.Min(mu, at)
			}
			if bound != mu {
				hit++
			}
			v := ss[j]/n[j] + (mu-bound)*(mu-bound)
			want -= 0.5 * n[j] * (math.Log(2*math.Pi*v) + 1)
			if math.Abs(fit.Estimate[j]-bound) > 1e-5 {
				t.Errorf("at %g: mean[%d] = %g, want %g", at, j+1, fit.Estimate[j], bound)
			}
		}
		if math.Abs(fit.LogLikelihood-want) > 1e-8 {
			t.Errorf("at %g: log likelihood %.12g, want %.12g", at, fit.LogLikelihood, want)
		}
		seen := 0
		for _, w := range fit.Warnings {
			if w.Code == "boundary" {
				seen++
			}
		}
		if seen != hit {
			t.Errorf("at %g: %d boundary warnings, want %d: %v", at, seen, hit, fit.Warnings)
		}
	}
}

// A bound that keeps a likelihood from being unbounded.
func TestBoundMakesLikelihoodFinite(t *testing.T) {
	d := grouped{[]float64{1, 2, 4, 8, 3}, []int{0, 0, 0, 0, 1}, 2}
	full := mustBind(t, normalModel(2, withStart), d, 5)
	fit, err := mustRestrict(t, full, AtLeast("sd[2]", 0.5)).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if fit.Estimate[3] != 0.5 || math.Abs(fit.Estimate[1]-3) > 1e-5 || !hasWarning(fit.Warnings, "boundary") {
		t.Errorf("estimate %v, warnings %v", fit.Estimate, fit.Warnings)
	}
}

// Success probabilities at the ends of their range, which a logit never reaches.
func TestBoundaryOfARange(t *testing.T) {
	m := Model[[2]float64]{
		Params: []Param{Unit("p")},
		LogLikelihood: func(d [2]float64, th []float64) float64 {
			return xlogy(d[0], th[0]) + xlogy(d[1]-d[0], 1-th[0])
		},
	}
	for _, c := range []struct{ x, n, p, l float64 }{{0, 10, 0, 0}, {10, 10, 1, 0}, {3, 10, 0.3, 3*math.Log(0.3) + 7*math.Log(0.7)}} {
		fit, err := mustBind(t, m, [2]float64{c.x, c.n}, int(c.n)).Maximize(bg)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(fit.Estimate[0]-c.p) > 1e-6 || math.Abs(fit.LogLikelihood-c.l) > 1e-9 || hasWarning(fit.Warnings, "boundary") != (c.p == 0 || c.p == 1) {
			t.Errorf("%g of %g: p = %g, log likelihood %g, warnings %v", c.x, c.n, fit.Estimate[0], fit.LogLikelihood, fit.Warnings)
		}
	}
}

func xlogy(x, y float64) float64 {
	if x == 0 {
		return 0
	}
	return x * math.Log(y)
}

// Cell probabilities that add up to one, the last bounded by the others: a wall.
func TestSimplexWithWall(t *testing.T) {
	m := Model[[]float64]{
		Params: Block(4, Unit("p")),
		LogLikelihood: func(n, th []float64) float64 {
			s := 0.0
			for i, v := range n {
				s += xlogy(v, th[i])
			}
			return s
		},
	}
	sumToOne := Equations(Equation{Names("p", 4), []float64{1, 1, 1, 1}, 1})
	for _, counts := range [][]float64{{10, 20, 30, 40}, {10, 0, 30, 40}, {0, 0, 30, 40}, {5, 1, 1, 0}, {0, 3, 5, 2}} {
		s := mustRestrict(t, mustBind(t, m, counts, 100), sumToOne)
		fit, err := s.Maximize(bg)
		if err != nil {
			t.Errorf("%v: %v", counts, err)
			continue
		}
		total, want := 0.0, 0.0
		for _, v := range counts {
			total += v
		}
		for _, v := range counts {
			want += xlogy(v, v/total)
		}
		if fit.Dim != 3 || math.Abs(fit.LogLikelihood-want) > 1e-8 {
			t.Errorf("%v: dim %d, log likelihood %.12g, want %.12g; %v %v", counts, fit.Dim, fit.LogLikelihood, want, fit.Estimate, fit.Warnings)
		}
	}
}

// Linear dose response of rates through a map, against the same fit declared directly.
func TestVia(t *testing.T) {
	counts := []float64{3, 7, 12, 20}
	m := Model[[]float64]{
		Params: Block(4, Positive("rate")),
		LogLikelihood: func(y, th []float64) float64 {
			s := 0.0
			for i, v := range y {
				s += xlogy(v, th[i]) - th[i]
			}
			return s
		},
		Gradient: func(y, th, g []float64) {
			for i, v := range y {
				g[i] = v/th[i] - 1
			}
		},
		Start: func(y []float64) []float64 { return []float64{1, 1, 1, 1} },
	}
	curve := Via(Map{Params: []Param{Real("level"), Real("slope")}, To: func(phi, th []float64) {
		for i := range th {
			th[i] = math.Exp(phi[0] + phi[1]*float64(i))
		}
	}})
	for _, gradient := range []bool{true, false} {
		mm := m
		if !gradient {
			mm.Gradient = nil
		}
		full := mustBind(t, mm, counts, 4)
		line := mustRestrict(t, full, curve)
		flat := mustRestrict(t, line, Fix("slope", 0))
		rs, err := Chain(bg, []Space{flat, line, full}, false, nil)
		if err != nil {
			t.Fatal(err)
		}
		if rs[0].Pair.DF != 1 || rs[1].Pair.DF != 2 {
			t.Errorf("df %g and %g", rs[0].Pair.DF, rs[1].Pair.DF)
		}
		// Flat: the mean 10.5; free: the counts themselves.
		want := 0.0
		for _, v := range counts {
			want += 2 * v * math.Log(v/10.5)
		}
		if got := rs[0].Statistic + rs[1].Statistic; math.Abs(got-want) > 1e-8 {
			t.Errorf("gradient %v: statistics add to %.12g, want %.12g", gradient, got, want)
		}
		fit := rs[0].Pair.Full
		e, err := line.Estimates(bg, fit)
		if err != nil {
			t.Fatal(err)
		}
		// Score equations Σ(y − μ) = Σ i(y − μ) = 0, and standard errors from the information Σ μ [1 i; i i²].
		var s0, s1, i00, i01, i11 float64
		for i, v := range counts {
			mu := math.Exp(e.Value[0] + e.Value[1]*float64(i))
			s0, s1 = s0+v-mu, s1+float64(i)*(v-mu)
			i00, i01, i11 = i00+mu, i01+mu*float64(i), i11+mu*float64(i*i)
		}
		if math.Abs(s0) > 1e-3 || math.Abs(s1) > 1e-3 {
			t.Errorf("scores %g, %g", s0, s1)
		}
		if want := math.Sqrt(i00 / (i00*i11 - i01*i01)); math.Abs(e.StdErr[1]/want-1) > 1e-5 {
			t.Errorf("standard error of the slope %g, want %g", e.StdErr[1], want)
		}
	}
}

func TestViaMistakes(t *testing.T) {
	full := mustBind(t, normalModel(2, withStart), normalGroups(20, 2, 0, 1, 2), 20)
	half := mustRestrict(t, full, Fix("mean[2]", 0))
	for _, c := range []struct {
		name string
		to   func(phi, th []float64)
		want error
	}{
		{"breaks an equation", func(phi, th []float64) { th[0], th[1], th[2], th[3] = phi[0], 1, 1, 1 }, ErrContradiction},
		{"forgets one", func(phi, th []float64) { th[0], th[1], th[2] = phi[0], 0, 1 }, ErrNoStart},
		{"panics", func(phi, th []float64) { th[7] = 1 }, ErrPanic},
		{"leaves the range", func(phi, th []float64) { th[0], th[1], th[2], th[3] = phi[0], 0, -1, 1 }, ErrNoStart},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := mustRestrict(t, half, Via(Map{Params: []Param{Real("u")}, To: c.to}))
			if _, err := s.Maximize(bg); !errors.Is(err, c.want) {
				t.Errorf("error %v, want %v", err, c.want)
			}
		})
	}
}

// Two hills: the full fit must not stay on the lower one.
func TestTwoHills(t *testing.T) {
	// Cauchy location with two clumps; the start is on the smaller one.
	y := []float64{-10.2, -10, -9.8, 9.5, 9.8, 10, 10.1, 10.4}
	m := Model[[]float64]{
		Params: []Param{Real("centre")},
		LogLikelihood: func(y, th []float64) float64 {
			s := 0.0
			for _, v := range y {
				s -= math.Log1p((v - th[0]) * (v - th[0]))
			}
			return s
		},
		Start: func([]float64) []float64 { return []float64{-9} },
	}
	full := mustBind(t, m, y, 8)
	small := mustRestrict(t, full, Fix("centre", 9))
	r, err := Compare(bg, small, full, nil)
	if err != nil {
		t.Fatal(err)
	}
	if e := r.Pair.Full.Estimate[0]; math.Abs(e-9.97) > 0.1 {
		t.Errorf("centre %g, want the higher hill near 10", e)
	}
	if !r.HasWarning("several-maxima") {
		t.Errorf("no warning of several maxima: %v", r.Warnings)
	}
	m.Start, m.Starts = nil, 8
	fit, err := mustBind(t, m, y, 8).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(fit.Estimate[0]-9.97) > 0.1 {
		t.Errorf("without a start: centre %g", fit.Estimate[0])
	}
}

// A likelihood with a kink has no gradient at its maximum.
func TestKinkedLikelihood(t *testing.T) {
	y := []float64{1, 2, 3.5, 8, 9}
	m := Model[[]float64]{
		Params: []Param{Real("centre"), Positive("scale")},
		LogLikelihood: func(y, th []float64) float64 {
			s := 0.0
			for _, v := range y {
				s -= math.Abs(v-th[0])/th[1] + math.Log(2*th[1])
			}
			return s
		},
		Start: func([]float64) []float64 { return []float64{6, 1} },
	}
	fit, err := mustBind(t, m, y, 5).Maximize(bg)
	want := -5 * (math.Log(2*(2.5+1.5+4.5+5.5)/5) + 1) // median 3.5
	if err == nil && math.Abs(fit.LogLikelihood-want) > 1e-4 || err != nil && !errors.Is(err, ErrNotConverged) {
		t.Errorf("log likelihood %.10g, want %.10g, or ErrNotConverged; error %v", fit.LogLikelihood, want, err)
	}
}

// The supremum of a separated logistic likelihood is at infinity.
func TestMaximumAtInfinity(t *testing.T) {
	x := []float64{-2, -1, 1, 2}
	m := Model[[]float64]{
		Params: []Param{Real("slope")},
		LogLikelihood: func(x, th []float64) float64 {
			s := 0.0
			for _, v := range x {
				s -= math.Log1p(math.Exp(-th[0] * math.Abs(v)))
			}
			return s
		},
	}
	fit, err := mustBind(t, m, x, 4).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if fit.LogLikelihood < -1e-6 {
		t.Errorf("log likelihood %g, want its supremum 0", fit.LogLikelihood)
	}
	if len(fit.Warnings) == 0 {
		t.Errorf("no warning; estimate %v", fit.Estimate)
	}
}

func TestRedundantRestrictionIsNamed(t *testing.T) {
	full := mustBind(t, normalModel(3, withStart), normalGroups(30, 3, 0, 1, 2), 30)
	small := mustRestrict(t, full, Equate(Names("mean", 3)...), Equate("mean[3]", "mean[1]"))
	r, err := Compare(bg, small, full, nil)
	if err != nil {
		t.Fatal(err)
	}
	if r.Pair.DF != 2 {
		t.Errorf("df %g, want 2", r.Pair.DF)
	}
	if text := warningText(r.Warnings, "redundant-restriction"); !strings.Contains(text, "mean[3] = mean[1]") {
		t.Errorf("warnings %v", r.Warnings)
	}
}

func TestComparisonsRefused(t *testing.T) {
	d := normalGroups(30, 2, 0, 1, 2)
	full := mustBind(t, normalModel(2, withStart), d, 30)
	small := mustRestrict(t, full, Equate("mean[1]", "mean[2]"))
	same := mustRestrict(t, full)
	other := mustBind(t, normalModel(2, withStart), d, 30)
	for _, c := range []struct {
		name        string
		small, full Space
		want        error
	}{
		{"swapped", full, small, ErrNotNested},
		{"equal", full, same, ErrNothingTested},
		{"other sample", small, other, ErrDifferentObservations},
	} {
		t.Run(c.name, func(t *testing.T) {
			if _, err := Compare(bg, c.small, c.full, nil); !errors.Is(err, c.want) {
				t.Errorf("error %v, want %v", err, c.want)
			}
		})
	}
}

func TestDeclaredIsSafeForConcurrentUse(t *testing.T) {
	full := mustBind(t, gammaModel(2, withStart|withEach), gammaGroups(60, 2, 1, 5), 60)
	small := mustRestrict(t, full, Equate("shape[1]", "shape[2]"))
	var wg sync.WaitGroup
	stats := make([]float64, 8)
	for i := range stats {
		wg.Go(func() {
			if r, err := Compare(bg, small, full, nil); err == nil {
				stats[i] = r.Statistic
			}
		})
	}
	wg.Wait()
	for _, s := range stats {
		if s != stats[0] || s == 0 {
			t.Fatalf("statistics %v", stats)
		}
	}
}

func TestSolveBy(t *testing.T) {
	d := normalGroups(30, 2, 0, 1, 2)
	full := mustBind(t, normalModel(2, withClosed), d, 30)
	small := mustRestrict(t, full, Equate("mean[1]", "mean[2]"), Equate("sd[1]", "sd[2]"))
	solved, err := SolveBy(small, func(d grouped) ([]float64, error) {
		one := grouped{d.y, make([]int, len(d.y)), 1}
		n, s, ss := one.sums()
		mu, sd := s[0]/n[0], math.Sqrt(ss[0]/n[0])
		return []float64{mu, mu, sd, sd}, nil
	})
	if err != nil {
		t.Fatal(err)
	}
	a, err := small.Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	b, err := solved.Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(a.LogLikelihood-b.LogLikelihood) > 1e-9 || len(b.Warnings) > 0 {
		t.Errorf("%.15g and %.15g, warnings %v", a.LogLikelihood, b.LogLikelihood, b.Warnings)
	}
	if _, err := SolveBy(small, func(int) ([]float64, error) { return nil, nil }); !errors.Is(err, ErrInvalid) {
		t.Errorf("wrong type: %v", err)
	}
}

// Sandwich of a normal sample: s/√n for the mean, √((m₄ − s⁴)/n)/(2s) for the spread.
func TestRobustStandardErrors(t *testing.T) {
	d := gammaGroups(80, 1, 1, 9) // far from normal
	for _, with := range []parts{withStart | withEach, withStart | withEach | withGradient} {
		s := mustBind(t, normalModel(1, with), d, 80)
		fit, err := s.Maximize(bg)
		if err != nil {
			t.Fatal(err)
		}
		e, err := s.Estimates(bg, fit)
		if err != nil {
			t.Fatal(err)
		}
		mean := sum(d.y) / 80
		var m2, m4 float64
		for _, v := range d.y {
			e := (v - mean) * (v - mean)
			m2, m4 = m2+e/80, m4+e*e/80
		}
		near(t, "mean", e.Robust[0], math.Sqrt(m2/80), 1e-5)
		near(t, "sd", e.Robust[1], math.Sqrt((m4-m2*m2)/80)/(2*math.Sqrt(m2)), 1e-5)
	}
	s := mustBind(t, normalModel(1, withStart), d, 80)
	fit, err := s.Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if e, err := s.Estimates(bg, fit); err != nil || e.Robust != nil {
		t.Errorf("%v, %v", e.Robust, err)
	}
}

// User code may write to theta, and must fill every term of Each.
func TestUserCodeThatWritesOrForgets(t *testing.T) {
	d := normalGroups(20, 1, 1, 1, 4)
	m := normalModel(1, withStart|withGradient)
	ll := m.LogLikelihood
	m.LogLikelihood = func(d grouped, th []float64) float64 {
		v := ll(d, th)
		th[0], th[1] = 99, -1
		return v
	}
	fit, err := mustBind(t, m, d, 20).Maximize(bg)
	if err != nil || math.Abs(fit.LogLikelihood-normalBest(d)) > 1e-9 || len(fit.Warnings) > 0 {
		t.Errorf("%v, %v, %v", fit, fit.Warnings, err)
	}
	m = normalModel(1, withStart|withEach)
	each := m.Each
	m.LogLikelihood = nil
	m.Each = func(d grouped, th, e []float64) { each(grouped{d.y[:19], d.g, d.k}, th, e) }
	if _, err := mustBind(t, m, d, 20).Maximize(bg); !errors.Is(err, ErrNoStart) {
		t.Errorf("a forgotten term: %v", err)
	}
}

// The degrees of freedom of a t law fitted to data with lighter tails run to
// infinity; the fit says so, and finds the normal maximum.
func TestParameterThatIsOnlyLarge(t *testing.T) {
	y := make([]float64, 60)
	for i := range y {
		y[i] = 3 * (float64(i)/59 - 0.5) // flat: no tails at all
	}
	m := Model[[]float64]{
		Params: []Param{Real("centre"), Positive("scale"), Positive("nu")},
		LogLikelihood: func(y, th []float64) float64 {
			nu := th[2]
			// Γ((ν+1)/2)/(Γ(ν/2)√(ν/2)), by Stirling where the two would cancel.
			c := -0.25 / nu
			if nu < 1e4 {
				a, _ := math.Lgamma((nu + 1) / 2)
				b, _ := math.Lgamma(nu / 2)
				c = a - b - 0.5*math.Log(nu/2)
			}
			l := 0.0
			for _, v := range y {
				z := (v - th[0]) / th[1]
				l += c - 0.5*math.Log(2*math.Pi) - math.Log(th[1]) - (nu+1)/2*math.Log1p(z*z/nu)
			}
			return l
		},
		Start: func([]float64) []float64 { return []float64{0.2, 1, 5} },
	}
	fit, err := mustBind(t, m, y, 60).Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	if want := normalBest(grouped{y, make([]int, 60), 1}); math.Abs(fit.LogLikelihood-want) > 1e-4 {
		t.Errorf("log likelihood %.8g, want the normal %.8g", fit.LogLikelihood, want)
	}
	if text := warningText(fit.Warnings, "maximum-at-infinity"); !strings.Contains(text, "nu") {
		t.Errorf("estimate %v, warnings %v", fit.Estimate, fit.Warnings)
	}
}
