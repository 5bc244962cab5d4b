package glm_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// plot is an invented field: yield by treatment, block and rainfall.
type plot struct {
	y, x, off, w []float64
	a, b         []string
}

func field(seed uint64, n int) plot {
	r := rand.New(rand.NewPCG(seed, 7))
	var p plot
	for range n {
		a, b := r.IntN(3), r.IntN(4)
		x := r.NormFloat64()
		p.a = append(p.a, string(rune('p'+a)))
		p.b = append(p.b, fmt.Sprintf("block %d", b+1))
		p.x = append(p.x, x)
		p.off = append(p.off, r.NormFloat64())
		p.w = append(p.w, float64(1+r.IntN(3)))
		p.y = append(p.y, 10+float64(a)+0.5*float64(b)+0.7*x+r.NormFloat64())
	}
	return p
}

func (p plot) data(t testing.TB) *glm.Data {
	t.Helper()
	d, err := glm.NewData(glm.Numbers("y", p.y), glm.Numbers("x", p.x), glm.Numbers("off", p.off),
		glm.Numbers("w", p.w), glm.Labels("a", p.a).Order("p", "q", "r"), glm.Labels("b", p.b).Order("block 1", "block 2", "block 3", "block 4"))
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func model(t testing.TB, d glm.Source, o *glm.Options, terms ...glm.Term) *glm.Model {
	t.Helper()
	m, err := glm.Normal(context.Background(), d, "y", terms, o)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func compare(t testing.TB, s, b lrt.Space) lrt.Result {
	t.Helper()
	r, err := lrt.Compare(context.Background(), s, b, nil)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func relative(got, want float64) float64 {
	if got == want {
		return 0
	}
	return math.Abs(got-want) / math.Max(math.Abs(want), math.SmallestNonzeroFloat64)
}

var (
	one = glm.Constant{}
	fa  = glm.Factor{Field: "a"}
	fb  = glm.Factor{Field: "b"}
	cx  = glm.Covariate{Field: "x"}
)

// TestIdentities: log λ, −2 log λ and F are one number in three forms, and both
// fits' likelihoods give the same λ.
func TestIdentities(t *testing.T) {
	for seed := range uint64(50) {
		d := field(seed, 20+int(seed)).data(t)
		s, b := model(t, d, nil, one, cx), model(t, d, nil, one, cx, fa, fb)
		r := compare(t, s, b)
		l := r.Pair.Linear
		d1, d2 := l.DF()
		n := float64(20 + seed)
		want := n * math.Log1p(r.Exact.Statistic*d1/d2)
		if e := relative(r.Statistic, want); e > 1e-14 {
			t.Errorf("seed %d: −2 log λ = %.17g, n log(1 + F d1/d2) = %.17g: %g", seed, r.Statistic, want, e)
		}
		if e := relative(r.LogLambda, -r.Statistic/2); e > 1e-15 {
			t.Errorf("seed %d: log λ = %.17g", seed, r.LogLambda)
		}
		if e := math.Abs(r.Pair.Restricted.LogLikelihood - r.Pair.Full.LogLikelihood - r.LogLambda); e > 1e-11 {
			t.Errorf("seed %d: log likelihoods differ by %g from log λ", seed, e)
		}
		if !l.Certified || r.Recommended != lrt.Exact {
			t.Errorf("seed %d: %+v", seed, r.Pair.Certificate)
		}
	}
}

// TestInvariances: order of rows, scale and origin of the response, the
// reference level and the order of terms leave F alone.
func TestInvariances(t *testing.T) {
	p := field(3, 60)
	want := compare(t, model(t, p.data(t), nil, one, fb, cx), model(t, p.data(t), nil, one, fb, cx, fa)).Exact.Statistic
	check := func(name string, p plot, tol float64, terms ...glm.Term) {
		t.Helper()
		if terms == nil {
			terms = []glm.Term{one, fb, cx, fa}
		}
		b := model(t, p.data(t), nil, terms...)
		s, err := b.Without("a")
		if err != nil {
			t.Fatal(err)
		}
		if got := compare(t, s, b).Exact.Statistic; relative(got, want) > tol {
			t.Errorf("%s: F = %.17g, want %.17g", name, got, want)
		}
	}
	q := p
	q.y, q.x, q.off, q.w = slices.Clone(p.y), slices.Clone(p.x), slices.Clone(p.off), slices.Clone(p.w)
	q.a, q.b = slices.Clone(p.a), slices.Clone(p.b)
	for _, s := range []*[]float64{&q.y, &q.x} {
		slices.Reverse(*s)
	}
	slices.Reverse(q.a)
	slices.Reverse(q.b)
	check("rows reversed", q, 1e-14)
	for _, k := range []int{-990, -400, 3, 400, 990} {
		q = p
		q.y = make([]float64, len(p.y))
		for i, y := range p.y {
			q.y[i] = math.Ldexp(y, k)
		}
		check(fmt.Sprintf("response times 2^%d", k), q, 1e-14)
	}
	for _, k := range []int{-990, 300, 990} {
		q = p
		q.x = make([]float64, len(p.x))
		for i, x := range p.x {
			q.x[i] = math.Ldexp(x, k)
		}
		check(fmt.Sprintf("covariate times 2^%d", k), q, 1e-14)
	}
	check("reference level", p, 1e-14, one, fb, cx, glm.Factor{Field: "a", Reference: "r"})
	check("order of terms", p, 1e-14, fa, cx, one, fb)
	check("without a constant", p, 1e-14, fb, cx, fa)
}

// TestHugeAndTiny: data near the ends of the float64 range keep their digits.
func TestHugeAndTiny(t *testing.T) {
	p := field(5, 40)
	fit := func(p plot) *glm.Fit {
		f, err := model(t, p.data(t), nil, one, cx, fa).Fit(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		return f
	}
	want := fit(p)
	for _, scale := range []float64{1e300, 1e-300} {
		q := p
		q.y = make([]float64, len(p.y))
		for i, y := range p.y {
			q.y[i] = y * scale
		}
		got := fit(q)
		for i, c := range got.Coefficients {
			w := want.Coefficients[i]
			if w.Aliased {
				continue
			}
			if relative(c.Estimate/scale, w.Estimate) > 1e-13 || relative(c.SE/scale, w.SE) > 1e-13 || relative(c.P, w.P) > 1e-10 {
				t.Errorf("scale %g: %s = %g ± %g (p %g), want %g ± %g (p %g)", scale, c.Name, c.Estimate, c.SE, c.P, w.Estimate*scale, w.SE*scale, w.P)
			}
		}
		if !hasCode(got.Warnings, "sum-of-squares-range") || hasCode(got.Warnings, "nil-residual") {
			t.Errorf("scale %g: warnings %v", scale, got.Warnings)
		}
		r := compare(t, model(t, q.data(t), nil, one, cx), model(t, q.data(t), nil, one, cx, fa))
		if !r.HasWarning("sum-of-squares-range") || r.Pair.Linear.Nil {
			t.Errorf("scale %g: %v", scale, r.Warnings)
		}
	}
}

// TestHugeAndTinyColumns: columns near the ends of the float64 range keep the digits
// of their slopes, standard errors and covariances, and t where neither can be a float64.
func TestHugeAndTinyColumns(t *testing.T) {
	p := field(5, 40)
	square := glm.Powers{Field: "x", Degree: 2}
	fit := func(sy, sx float64, terms ...glm.Term) *glm.Fit {
		q := p
		q.x, q.y = make([]float64, len(p.x)), make([]float64, len(p.y))
		for i := range p.y {
			q.x[i], q.y[i] = p.x[i]*sx, p.y[i]*sy
		}
		f, err := model(t, q.data(t), nil, terms...).Fit(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		return f
	}
	for _, c := range []struct {
		sy, sx float64
		terms  []glm.Term
	}{
		{1, 0x1p1000, []glm.Term{one, cx, fa}}, {1, 0x1p-1000, []glm.Term{one, cx, fa}}, {0x1p-1000, 0x1p-1020, []glm.Term{one, fa, cx}},
		{0x1p1000, 0x1p1000, []glm.Term{cx}}, {1, 0x1p500, []glm.Term{one, square}}, {1, 0x1p-500, []glm.Term{square, one}},
		{0x1p1000, 0x1p-1000, []glm.Term{one, cx, fa}}, {0x1p-1000, 0x1p1000, []glm.Term{one, cx, fa}},
	} {
		got, want := fit(c.sy, c.sx, c.terms...), fit(1, 1, c.terms...)
		for i, w := range want.Coefficients {
			g, scale := got.Coefficients[i], c.sy
			switch w.Name {
			case "x^2":
				scale = scale / c.sx / c.sx
			case "x", "x^1":
				scale /= c.sx
			}
			if w.Aliased {
				continue
			}
			if relative(g.T, w.T) > 1e-13 || relative(g.P, w.P) > 1e-12 {
				t.Errorf("scales %g, %g: %s has t = %g, p = %g, want %g, %g", c.sy, c.sx, g.Name, g.T, g.P, w.T, w.P)
			}
			if math.IsInf(scale, 0) || scale < 0x1p-1000 {
				if !hasCode(got.Warnings, "coefficient-range") {
					t.Errorf("scales %g, %g: %s = %g without a warning", c.sy, c.sx, g.Name, g.Estimate)
				}
				continue
			}
			if relative(g.Estimate/scale, w.Estimate) > 1e-14 || relative(g.SE/scale, w.SE) > 1e-14 {
				t.Errorf("scales %g, %g: %s = %g ± %g, want %g ± %g times %g", c.sy, c.sx, g.Name, g.Estimate, g.SE, w.Estimate, w.SE, scale)
			}
		}
	}
	// A covariance of a slope near 1e-301 and a constant near 1.
	x, k := []glm.Weight{{Name: "x", Coef: 1}}, []glm.Weight{{Name: "constant", Coef: 1}}
	got, err := fit(1, 0x1p1000, one, cx).Covariance(x, k)
	want, err2 := fit(1, 1, one, cx).Covariance(x, k)
	if err != nil || err2 != nil || relative(got*0x1p1000, want) > 1e-14 {
		t.Errorf("covariance %g, want %g·2^-1000 (%v, %v)", got, want, err, err2)
	}
}

func hasCode(ws []lrt.Warning, code string) bool {
	return slices.ContainsFunc(ws, func(w lrt.Warning) bool { return w.Code == code })
}

// TestWeights: frequency weights are repeated rows; precision weights of one
// constant change nothing but the variance; zero weights are left out.
func TestWeights(t *testing.T) {
	p := field(8, 50)
	var q plot
	for i := range p.y {
		for range int(p.w[i]) {
			q.y, q.x, q.off, q.w = append(q.y, p.y[i]), append(q.x, p.x[i]), append(q.off, p.off[i]), append(q.w, 1)
			q.a, q.b = append(q.a, p.a[i]), append(q.b, p.b[i])
		}
	}
	freq := &glm.Options{Weights: glm.Weights{Kind: glm.Frequency, Field: "w"}}
	got := compare(t, model(t, p.data(t), freq, one, cx), model(t, p.data(t), freq, one, cx, fa))
	want := compare(t, model(t, q.data(t), nil, one, cx), model(t, q.data(t), nil, one, cx, fa))
	if relative(got.Exact.Statistic, want.Exact.Statistic) > 1e-14 || got.Pair.Full.N != len(q.y) || relative(got.Pair.Full.LogLikelihood, want.Pair.Full.LogLikelihood) > 1e-14 {
		t.Errorf("frequency: F %g n %d, want F %g n %d", got.Exact.Statistic, got.Pair.Full.N, want.Exact.Statistic, len(q.y))
	}
	// Zero weights: as if the rows were not there.
	z := p
	z.w = slices.Clone(p.w)
	z.w[3], z.w[10] = 0, 0
	prec := &glm.Options{Weights: glm.Weights{Kind: glm.Precision, Field: "w"}}
	gone := plot{}
	for i := range z.y {
		if z.w[i] > 0 {
			gone.y, gone.x, gone.off, gone.w = append(gone.y, z.y[i]), append(gone.x, z.x[i]), append(gone.off, z.off[i]), append(gone.w, z.w[i])
			gone.a, gone.b = append(gone.a, z.a[i]), append(gone.b, z.b[i])
		}
	}
	got = compare(t, model(t, z.data(t), prec, one, cx), model(t, z.data(t), prec, one, cx, fa))
	want = compare(t, model(t, gone.data(t), prec, one, cx), model(t, gone.data(t), prec, one, cx, fa))
	if relative(got.Exact.Statistic, want.Exact.Statistic) > 1e-13 || got.Pair.Full.N != want.Pair.Full.N || relative(got.Pair.Full.LogLikelihood, want.Pair.Full.LogLikelihood) > 1e-13 || !got.HasWarning("zero-weight") {
		t.Errorf("zero weights: %v, want %v", got, want)
	}
	// By hand: precision weights are rows times √w.
	var sxx, sxy, syy float64
	for i := range p.y {
		sxx += p.w[i] * p.x[i] * p.x[i]
		sxy += p.w[i] * p.x[i] * p.y[i]
		syy += p.w[i] * p.y[i] * p.y[i]
	}
	f, err := model(t, p.data(t), prec, cx).Fit(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	if relative(f.Coefficients[0].Estimate, sxy/sxx) > 1e-13 || relative(f.RSS, syy-sxy*sxy/sxx) > 1e-12 {
		t.Errorf("precision: %g and %g, want %g and %g", f.Coefficients[0].Estimate, f.RSS, sxy/sxx, syy-sxy*sxy/sxx)
	}
}

// TestOffsets: an offset is a known part of the mean.
func TestOffsets(t *testing.T) {
	p := field(9, 40)
	o := &glm.Options{Offset: "off"}
	got := compare(t, model(t, p.data(t), o, one, cx), model(t, p.data(t), o, one, cx, fa))
	q := p
	q.y = make([]float64, len(p.y))
	for i := range p.y {
		q.y[i] = p.y[i] - p.off[i]
	}
	want := compare(t, model(t, q.data(t), nil, one, cx), model(t, q.data(t), nil, one, cx, fa))
	if relative(got.Exact.Statistic, want.Exact.Statistic) > 1e-13 {
		t.Errorf("F = %.17g, want %.17g", got.Exact.Statistic, want.Exact.Statistic)
	}
	// Slope 1 of x: the offset x in the restricted space, x a column of the full one.
	d := p.data(t)
	r := compare(t, model(t, d, &glm.Options{Offset: "x"}, one, fa), model(t, d, nil, one, fa, cx))
	s, err := model(t, d, nil, one, fa, cx).Restrict(lrt.Fix("x", 1))
	if err != nil {
		t.Fatal(err)
	}
	if w := compare(t, s, model(t, d, nil, one, fa, cx)); relative(r.Exact.Statistic, w.Exact.Statistic) > 1e-12 {
		t.Errorf("slope 1 by offset F = %.17g, by restriction %.17g", r.Exact.Statistic, w.Exact.Statistic)
	}
	if _, err := lrt.Compare(context.Background(), model(t, d, o, one), model(t, d, nil, one, fa), nil); !errors.Is(err, lrt.ErrNotNested) {
		t.Errorf("offset outside the full space: %v", err)
	}
}

// TestRestrict: equal levels by restriction are the model without the factor;
// a fixed slope is t².
func TestRestrict(t *testing.T) {
	d := field(11, 45).data(t)
	full := model(t, d, nil, one, cx, fa, fb)
	equal, err := full.Restrict(lrt.Equate("a=p", "a=q", "a=r"))
	if err != nil {
		t.Fatal(err)
	}
	got, want := compare(t, equal, full), compare(t, model(t, d, nil, one, cx, fb), full)
	if relative(got.Exact.Statistic, want.Exact.Statistic) > 1e-13 || got.Pair.DF != 2 {
		t.Errorf("F = %.17g on %g, want %.17g on 2", got.Exact.Statistic, got.Pair.DF, want.Exact.Statistic)
	}
	fit, err := full.Fit(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	c, err := fit.Coefficient("x")
	if err != nil {
		t.Fatal(err)
	}
	for _, v := range []float64{0, 0.5, 1e3} {
		s, err := full.Restrict(lrt.Fix("x", v))
		if err != nil {
			t.Fatal(err)
		}
		tt := (c.Estimate - v) / c.SE
		if r := compare(t, s, full); relative(r.Exact.Statistic, tt*tt) > 1e-12 {
			t.Errorf("slope %g: F = %.17g, t² = %.17g", v, r.Exact.Statistic, tt*tt)
		}
	}
	// The fit of a restricted space obeys the restriction.
	s, err := full.Restrict(lrt.Fix("x", 0.25), lrt.Equate("a=p", "a=q"))
	if err != nil {
		t.Fatal(err)
	}
	rf, err := s.(*glm.Model).Fit(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	if x, _ := rf.Coefficient("x"); math.Abs(x.Estimate-0.25) > 1e-14 || x.SE > 1e-12 {
		t.Errorf("x = %g ± %g, want 0.25 ± 0", x.Estimate, x.SE)
	}
	if e, err := rf.Combination(glm.Weight{Name: "a=p", Coef: 1}, glm.Weight{Name: "a=q", Coef: -1}); err != nil || math.Abs(e.Value) > 1e-13 {
		t.Errorf("difference %g, %v, want 0", e.Value, err)
	}
	// Nesting of restricted spaces, both ways.
	s1, _ := full.Restrict(lrt.Fix("x", 0.25))
	if r := compare(t, s, s1); r.Pair.DF != 1 {
		t.Errorf("df %g, want 1", r.Pair.DF)
	}
	if _, err := lrt.Compare(context.Background(), s1, s, nil); !errors.Is(err, lrt.ErrNotNested) {
		t.Errorf("swapped: %v", err)
	}
	other, _ := full.Restrict(lrt.Fix("x", 0.75), lrt.Equate("a=p", "a=q"))
	if _, err := lrt.Compare(context.Background(), other, s1, nil); !errors.Is(err, lrt.ErrNotNested) {
		t.Errorf("other value: %v", err)
	}
}

// TestRefusals: bad comparisons and bad data give typed errors that name the place.
func TestRefusals(t *testing.T) {
	ctx := context.Background()
	p := field(13, 30)
	d := p.data(t)
	full := model(t, d, nil, one, cx, fa)
	run := func(s, b lrt.Space) error {
		_, err := lrt.Compare(ctx, s, b, nil)
		return err
	}
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	other := field(14, 30)
	constant := p
	constant.y = make([]float64, 30)
	for i := range constant.y {
		constant.y[i] = 5.1
	}
	saturated := field(15, 4)
	restrict := func(rs ...lrt.Restriction) lrt.Space {
		s, err := full.Restrict(rs...)
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
	fitErr := func(s lrt.Space) error {
		_, err := s.(*glm.Model).Fit(ctx, nil)
		return err
	}
	bind := func(o *glm.Options, terms ...glm.Term) error {
		_, err := glm.Normal(ctx, d, "y", terms, o)
		return err
	}
	for _, c := range []struct {
		name string
		err  error
		want error
	}{
		{"swapped", run(full, model(t, d, nil, one, cx)), lrt.ErrNotNested},
		{"equal", run(full, full), lrt.ErrNothingTested},
		{"not nested", run(model(t, d, nil, one, fb), full), lrt.ErrNotNested},
		{"different rows", run(model(t, other.data(t), nil, one), full), lrt.ErrDifferentObservations},
		{"constant response", run(model(t, constant.data(t), nil, one), model(t, constant.data(t), nil, one, fa)), lrt.ErrNoVariation},
		{"no error df", run(model(t, saturated.data(t), nil, one), model(t, saturated.data(t), nil, one, glm.Powers{Field: "x", Degree: 3})), lrt.ErrNoErrorDF},
		{"nil space", run(nil, full), lrt.ErrInvalid},
		{"known against unknown variance", run(model(t, d, &glm.Options{KnownVariance: 1}, one), full), lrt.ErrDifferentCriterion},
		{"cancelled", func() error { _, err := lrt.Compare(cancelled, model(t, d, nil, one), full, nil); return err }(), context.Canceled},
		{"level", func() error {
			_, err := lrt.Compare(ctx, model(t, d, nil, one), full, &lrt.Settings{Level: 2})
			return err
		}(), lrt.ErrInvalid},
		{"unknown column", bind(nil, glm.Covariate{Field: "z"}), glm.ErrUnknownColumn},
		{"labels as numbers", bind(nil, glm.Covariate{Field: "a"}), glm.ErrNotNumeric},
		{"nil term", bind(nil, nil), glm.ErrTerm},
		{"degree", bind(nil, glm.Powers{Field: "x", Degree: 31}), glm.ErrTerm},
		{"empty cross", bind(nil, glm.Cross{}), glm.ErrTerm},
		{"reference level", bind(nil, glm.Factor{Field: "a", Reference: "zz"}), glm.ErrUnknownLevel},
		{"weights without kind", bind(&glm.Options{Weights: glm.Weights{Field: "w"}}, one), glm.ErrOption},
		{"known variance", bind(&glm.Options{KnownVariance: -1}, one), glm.ErrOption},
		{"contradiction", fitErr(restrict(lrt.Fix("x", 1), lrt.Fix("x", 2))), glm.ErrContradiction},
		{"not estimable", fitErr(restrict(lrt.Fix("a=p", 1))), glm.ErrNotEstimable},
		{"negative weight", fitErr(model(t, p.data(t), &glm.Options{Weights: glm.Weights{Kind: glm.Precision, Field: "x"}}, one)), glm.ErrWeight},
		{"fractional frequency", fitErr(model(t, p.data(t), &glm.Options{Weights: glm.Weights{Kind: glm.Frequency, Field: "off"}}, one)), glm.ErrWeight},
	} {
		if !errors.Is(c.err, c.want) {
			t.Errorf("%s: %v, want %v", c.name, c.err, c.want)
		} else if testing.Verbose() {
			t.Logf("%s: %v", c.name, c.err)
		}
	}
	if _, err := full.Restrict(lrt.Fix("zz", 1)); !errors.Is(err, glm.ErrUnknownCoefficient) {
		t.Errorf("unknown coefficient: %v", err)
	}
	twice := model(t, d, nil, one, glm.Powers{Field: "x", Degree: 1}, glm.Powers{Field: "x", Degree: 2})
	if _, err := twice.Restrict(lrt.Fix("x", 0)); !errors.Is(err, glm.ErrAmbiguous) {
		t.Errorf("a name of two columns: %v", err)
	}
	if _, err := full.Restrict(lrt.AtLeast("x", 0)); !errors.Is(err, lrt.ErrNotRestrictable) {
		t.Errorf("bound: %v", err)
	}
	missing, err := glm.NewData(glm.Numbers("y", []float64{1, 2, math.NaN(), 4}).MissingNumbers(math.NaN()), glm.Numbers("x", []float64{1, 2, 3, 5}))
	if err != nil {
		t.Fatal(err)
	}
	_, err = model(t, missing, nil, one, cx).Fit(ctx, nil)
	var ce *glm.ColumnError
	if !errors.As(err, &ce) || ce.Column != "y" || ce.Row != 2 || !errors.Is(err, glm.ErrMissing) {
		t.Errorf("missing value: %v", err)
	}
}

// TestWorksWithWarnings: doubtful designs give answers with coded warnings.
func TestWorksWithWarnings(t *testing.T) {
	ctx := context.Background()
	p := field(21, 30)
	twice := make([]float64, 30)
	for i, x := range p.x {
		twice[i] = 3 - 2*x
	}
	d, err := p.data(t).With(glm.Numbers("x2", twice))
	if err != nil {
		t.Fatal(err)
	}
	fit, err := model(t, d, nil, one, cx, glm.Covariate{Field: "x2"}, fa).Fit(ctx, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !hasCode(fit.Warnings, "collinear") || fit.Rank != 4 {
		t.Errorf("collinear: rank %d, warnings %v", fit.Rank, fit.Warnings)
	}
	if c, _ := fit.Coefficient("x2"); !c.Aliased {
		t.Errorf("x2 is not aliased: %+v", c)
	}
	if _, err := fit.Combination(glm.Weight{Name: "x", Coef: 1}); !errors.Is(err, glm.ErrNotEstimable) {
		t.Errorf("slope of x beside x2: %v", err)
	}
	// A group of one.
	q := field(22, 20)
	q.a[0] = "p"
	for i := range q.a[1:] {
		if q.a[i+1] == "p" {
			q.a[i+1] = "q"
		}
	}
	if r := compare(t, model(t, q.data(t), nil, one), model(t, q.data(t), nil, one, fa)); !r.HasWarning("group-of-one") {
		t.Errorf("group of one: %v", r.Warnings)
	}
	// More columns than rows, rank below n.
	few := field(23, 8)
	few.x = []float64{1, 2, 1, 2, 1, 2, 1, 2}
	f, err := model(t, few.data(t), nil, one, glm.Powers{Field: "x", Degree: 12}).Fit(ctx, nil)
	if err != nil || f.Rank != 2 || !hasCode(f.Warnings, "collinear") {
		t.Errorf("p > n: %v %+v", err, f)
	}
	// Perfect fit.
	exact := p
	exact.y = make([]float64, 30)
	for i, x := range p.x {
		exact.y[i] = 2 + 3*x
	}
	r := compare(t, model(t, exact.data(t), nil, one), model(t, exact.data(t), nil, one, cx))
	if !math.IsInf(r.Exact.Statistic, 1) || r.P() != 0 || !r.HasWarning("nil-residual") || !math.IsInf(r.LogLambda, -1) || r.Lambda != 0 {
		t.Errorf("perfect fit: %v", r)
	}
}

// TestConfounded: two factors that say the same; the largest model keeps one
// column of constant + second, whose own rank is 3.
func TestConfounded(t *testing.T) {
	a := []string{"u", "u", "v", "v", "w", "w"}
	b := []string{"1", "1", "2", "2", "3", "3"}
	d, err := glm.NewData(glm.Numbers("y", []float64{1, 2, 4, 3, 7, 9}), glm.Labels("a", a), glm.Labels("b", b))
	if err != nil {
		t.Fatal(err)
	}
	full := model(t, d, nil, one, fa, fb)
	r := compare(t, model(t, d, nil, one), model(t, d, nil, one, fb))
	want := compare(t, model(t, d, nil, one), model(t, d, nil, one, fa))
	if r.Exact.Statistic != want.Exact.Statistic || r.Pair.DF != 2 {
		t.Errorf("F = %g on %g, want %g", r.Exact.Statistic, r.Pair.DF, want.Exact.Statistic)
	}
	cs, err := glm.Join(context.Background(), lrt.Comparison{Restricted: model(t, d, nil, one), Full: full},
		lrt.Comparison{Restricted: model(t, d, nil, one), Full: model(t, d, nil, one, fb), Error: &lrt.ErrorPair{Smaller: full}})
	if err != nil {
		t.Fatal(err)
	}
	r, err = cs[1].Run(context.Background(), nil)
	if err != nil || r.Pair.DF != 2 || r.Pair.Linear.RankB != 3 {
		t.Errorf("constant + second: %v %+v", err, r.Pair.Linear)
	}
	if _, err := lrt.Compare(context.Background(), model(t, d, nil, one, fa), full, nil); !errors.Is(err, lrt.ErrNothingTested) {
		t.Errorf("confounded factor: %v", err)
	}
	m, err := full.Fit(context.Background(), nil)
	if err != nil || !hasCode(m.Warnings, "collinear") {
		t.Errorf("warnings %v %v", m.Warnings, err)
	}
}

// TestLackOfFit: a line lies inside the levels of its covariate, by columns and not by names.
func TestLackOfFit(t *testing.T) {
	p := field(30, 40)
	for i := range p.x {
		p.x[i] = math.Round(p.x[i] * 2)
	}
	d := p.data(t)
	levels := glm.Factor{Field: "x"}
	r := compare(t, model(t, d, nil, one, cx), model(t, d, nil, levels))
	if r.Pair.Nesting == "" || r.Pair.DF < 2 {
		t.Errorf("nesting %q, df %g", r.Pair.Nesting, r.Pair.DF)
	}
	want := compare(t, model(t, d, nil, one, cx), model(t, d, nil, one, cx, levels))
	if relative(r.Exact.Statistic, want.Exact.Statistic) > 1e-13 {
		t.Errorf("F = %.17g, want %.17g", r.Exact.Statistic, want.Exact.Statistic)
	}
}

// TestWorkers: any number of workers gives the same bits.
func TestWorkers(t *testing.T) {
	p := field(40, 70000)
	d := p.data(t)
	var want lrt.Result
	for i, w := range []int{1, 2, 3, 8} {
		o := &glm.Options{Workers: w}
		r := compare(t, model(t, d, o, one, cx), model(t, d, o, one, cx, fa, glm.Cross{fa, cx}, glm.Powers{Field: "off", Degree: 3}))
		if i == 0 {
			want = r
			continue
		}
		if r.Exact.Statistic != want.Exact.Statistic || r.Pair.Full.LogLikelihood != want.Pair.Full.LogLikelihood {
			t.Errorf("%d workers: F = %.17g, want %.17g", w, r.Exact.Statistic, want.Exact.Statistic)
		}
	}
	// A source without slices gives the same bits too.
	o := &glm.Options{Workers: 2}
	s := streamed{d}
	r := compare(t, model(t, s, o, one, cx), model(t, s, o, one, cx, fa, glm.Cross{fa, cx}, glm.Powers{Field: "off", Degree: 3}))
	if r.Exact.Statistic != want.Exact.Statistic {
		t.Errorf("stream: F = %.17g, want %.17g", r.Exact.Statistic, want.Exact.Statistic)
	}
}

// streamed hides that data can be sliced.
type streamed struct{ glm.Source }

// TestPerfectDecimals: a perfect fit is seen through decimals that float64 cannot hold.
func TestPerfectDecimals(t *testing.T) {
	var x, y []string
	for i := range 12 {
		x = append(x, fmt.Sprintf("%d.%d", i, (3*i)%10))
		y = append(y, fmt.Sprintf("%.2f", 0.7+0.3*(float64(i)+float64((3*i)%10)/10)))
	}
	d, err := glm.NewData(glm.Decimals("y", y), glm.Decimals("x", x))
	if err != nil {
		t.Fatal(err)
	}
	r := compare(t, model(t, d, nil, one), model(t, d, nil, one, cx))
	if !math.IsInf(r.Exact.Statistic, 1) || !r.HasWarning("nil-residual") {
		t.Errorf("F = %g, %v", r.Exact.Statistic, r.Warnings)
	}
	// One unit in the last decimal is not nil.
	y[5] = "2.71"
	if d, err = glm.NewData(glm.Decimals("y", y), glm.Decimals("x", x)); err != nil {
		t.Fatal(err)
	}
	if r := compare(t, model(t, d, nil, one), model(t, d, nil, one, cx)); math.IsInf(r.Exact.Statistic, 1) {
		t.Errorf("F = %g", r.Exact.Statistic)
	}
}
