package lrt

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"subsume.example/dist"
)

// Profile interval of a normal mean by its closed form: ȳ ± s √(e^{q/n} − 1).
func TestProfileOfNormalMean(t *testing.T) {
	for _, scale := range []float64{1e-8, 1, 1e8} {
		for _, with := range []parts{withStart, withStart | withEach, withStart | withGradient} {
			d := normalGroups(12, 1, 3, scale, 4)
			n, s, ss := d.sums()
			full := mustBind(t, normalModel(1, with), d, 12)
			q := dist.ChiSquared{K: 1}.UpperQuantile(0.1)
			half := math.Sqrt(ss[0]/n[0]) * math.Sqrt(math.Expm1(q/n[0]))
			i, err := Profile(bg, full, "mean[1]", 0.9, nil)
			if err != nil {
				t.Fatal(err)
			}
			mean := s[0] / n[0]
			near(t, "lower", (i.Lower-mean)/half, -1, 1e-6)
			near(t, "upper", (i.Upper-mean)/half, 1, 1e-6)
			if i.LowerWhy != "" || i.UpperWhy != "" || i.Exact {
				t.Errorf("%+v", i)
			}
			// By definition: the comparison at either end has p = 0.1.
			for _, v := range []float64{i.Lower, i.Upper} {
				r, err := Compare(bg, mustRestrict(t, full, Fix("mean[1]", v)), full, nil)
				if err != nil {
					t.Fatal(err)
				}
				near(t, "p at the end", r.ChiSquared.P, 0.1, 1e-6)
			}
		}
	}
}

// A quantity that is no parameter: the ratio of two exponential means has a
// profile of its own, the mean log ratio; and a linear one is its equation's.
func TestProfileOfQuantity(t *testing.T) {
	d := normalGroups(24, 2, 1, 1, 6)
	full := mustBind(t, normalModel(2, withStart|withEach), d, 24)
	got, err := ProfileOf(bg, full, Quantity{"difference", func(x []float64) float64 { return x[0] - x[1] }}, 0.95, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, v := range []float64{got.Lower, got.Upper} {
		small := mustRestrict(t, full, Equations(Equation{[]string{"mean[1]", "mean[2]"}, []float64{1, -1}, v}))
		r, err := Compare(bg, small, full, nil)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "p at the end", r.ChiSquared.P, 0.05, 1e-6)
	}
	// log(sd ratio) by reparametrisation: its interval is the logarithm of that of the ratio.
	ratio, err := ProfileOf(bg, full, Quantity{"ratio", func(x []float64) float64 { return x[2] / x[3] }}, 0.95, nil)
	if err != nil {
		t.Fatal(err)
	}
	logs, err := ProfileOf(bg, full, Quantity{"log ratio", func(x []float64) float64 { return math.Log(x[2] / x[3]) }}, 0.95, nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "lower", math.Log(ratio.Lower), logs.Lower, 1e-6)
	near(t, "upper", math.Log(ratio.Upper), logs.Upper, 1e-6)
	near(t, "estimate", math.Log(ratio.Estimate), logs.Estimate, 1e-9)
	if !(ratio.Lower < ratio.Estimate && ratio.Estimate < ratio.Upper) {
		t.Errorf("%v", ratio)
	}
	for _, q := range []Quantity{
		{"constant", func([]float64) float64 { return 1 }},
		{"NaN", func([]float64) float64 { return math.NaN() }},
		{"none", nil},
	} {
		if _, err := ProfileOf(bg, full, q, 0, nil); !errors.Is(err, ErrInvalid) {
			t.Errorf("%s: %v", q.Name, err)
		}
	}
	if _, err := ProfileOf(bg, full, Quantity{"panics", func(x []float64) float64 { return x[9] }}, 0, nil); !errors.Is(err, ErrPanic) {
		t.Errorf("%v", err)
	}
}

func binomial(x, n float64) Model[[2]float64] {
	return Model[[2]float64]{
		Params: []Param{Unit("p")},
		LogLikelihood: func(d [2]float64, th []float64) float64 {
			return xlogy(d[0], th[0]) + xlogy(d[1]-d[0], 1-th[0])
		},
	}
}

// Ends of a range: with no successes the lower end is 0 and the upper 1 − e^{−q/2n}.
func TestProfileAtTheEndOfTheRange(t *testing.T) {
	q := dist.ChiSquared{K: 1}.UpperQuantile(0.05)
	none := mustBind(t, binomial(0, 20), [2]float64{0, 20}, 20)
	i, err := Profile(bg, none, "p", 0.95, nil)
	if err != nil {
		t.Fatal(err)
	}
	if i.Lower != 0 || i.LowerWhy == "" {
		t.Errorf("%v", i)
	}
	near(t, "upper", i.Upper, -math.Expm1(-q/40), 1e-7)
	all := mustBind(t, binomial(20, 20), [2]float64{20, 20}, 20)
	if i, err = Profile(bg, all, "p", 0.95, nil); err != nil {
		t.Fatal(err)
	}
	if i.Upper != 1 || i.UpperWhy == "" {
		t.Errorf("%v", i)
	}
	near(t, "lower", i.Lower, math.Exp(-q/40), 1e-7)
	// A variance component whose interval reaches 0 without being there.
	y := []float64{1, 2, 3, 2, 3, 4.5, 1.5, 2, 2.5, 3, 3.2, 4}
	full := mustBind(t, randomGroups(4, 3), y, 12)
	if i, err = Profile(bg, full, "between", 0.95, nil); err != nil {
		t.Fatal(err)
	}
	if i.Lower != 0 || !strings.Contains(i.LowerWhy, "end of the range") || !(i.Upper > i.Estimate) {
		t.Errorf("%v", i)
	}
}

// An open end: the logistic slope of separated data has no upper limit.
func TestProfileOpenEnd(t *testing.T) {
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
	full := mustBind(t, m, []float64{-2, -1, 1, 2}, 4)
	i, err := Profile(bg, full, "slope", 0.95, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !math.IsInf(i.Upper, 1) || i.UpperWhy == "" {
		t.Errorf("%v", i)
	}
	// 4 terms: Σ log(1 + e^{−s|x|}) = q/2 at the lower end.
	r, err := Compare(bg, mustRestrict(t, full, Fix("slope", i.Lower)), full, nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "p at the lower end", r.ChiSquared.P, 0.05, 1e-5)
}

func TestProfileErrors(t *testing.T) {
	full := mustBind(t, normalModel(1, withStart), normalGroups(12, 1, 3, 1, 4), 12)
	fixed := mustRestrict(t, full, Fix("mean[1]", 3))
	for _, c := range []struct {
		name  string
		space Space
		param string
		level float64
		want  error
	}{
		{"unknown", full, "mu", 0.9, ErrInvalid},
		{"fixed", fixed, "mean[1]", 0.9, ErrInvalid},
		{"level", full, "mean[1]", 1, ErrInvalid},
		{"nil", nil, "mean[1]", 0.9, ErrInvalid},
		{"not restrictable", plain{full}, "mean[1]", 0.9, ErrNotRestrictable},
	} {
		if _, err := Profile(bg, c.space, c.param, c.level, nil); !errors.Is(err, c.want) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	ctx, cancel := context.WithCancel(bg)
	cancel()
	if _, err := Profile(ctx, full, "mean[1]", 0.9, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("%v", err)
	}
}

// plain hides everything but the two methods of a Space.
type plain struct{ s Space }

func (p plain) Observations() Observations                { return p.s.Observations() }
func (p plain) Maximize(ctx context.Context) (Fit, error) { return p.s.Maximize(ctx) }

// The region of mean and spread: every border point has −2 log λ = q by its closed form.
func TestProfileRegion(t *testing.T) {
	d := normalGroups(12, 1, 3, 1, 4)
	n, s, ss := d.sums()
	full := mustBind(t, normalModel(1, withStart|withGradient), d, 12)
	r, err := ProfileRegion(bg, full, "mean[1]", "sd[1]", 0.95, 12, nil)
	if err != nil {
		t.Fatal(err)
	}
	q := dist.ChiSquared{K: 2}.UpperQuantile(0.05)
	for i, p := range r.Border {
		e := s[0]/n[0] - p[0]
		l := -n[0]*math.Log(p[1]) - 0.5*(ss[0]+n[0]*e*e)/(p[1]*p[1])
		top := -0.5*n[0]*math.Log(ss[0]/n[0]) - 0.5*n[0]
		near(t, "−2 log λ on the border", 2*(top-l), q, 1e-6)
		if r.Open[i] {
			t.Errorf("point %d is open", i)
		}
	}
	c, err := ProfileCurve(bg, full, "mean[1]", []float64{2, r.Estimate[0], 4}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !(c[0].SignedRoot < 0) || math.Abs(c[1].SignedRoot) > 1e-4 || !(c[2].SignedRoot > 0) || c[0].Fit.Estimate[0] != 2 {
		t.Errorf("%+v", c)
	}
	if _, err := ProfileRegion(bg, full, "mean[1]", "mean[1]", 0.95, 12, nil); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
}
