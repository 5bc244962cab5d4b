package lrt

import (
	"context"
	"errors"
	"math"
	"testing"

	"subsume.example/dist"
)

// Haynam, Govindarajulu and Leone (1970): noncentrality for a power.
func TestDetectableAgainstTable(t *testing.T) {
	p := load(t, "power-lambda-a")
	df, power, want := p.column(t, "df"), p.column(t, "power"), p.exact(t, "lambda")
	for i := range df {
		plan, err := PlanChiSquared(df[i], 0)
		if err != nil {
			t.Fatal(err)
		}
		got, err := plan.Detectable(0.05, power[i])
		if err != nil {
			t.Fatal(err)
		}
		near(t, "lambda", got, want[i], 1e-9)
		back, err := PlanChiSquared(df[i], got)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "power", back.Power(0.05), power[i], 1e-9)
	}
}

// Cohen (1992), Table 2: total size of the χ² test.
func TestSampleSizeChiSquared(t *testing.T) {
	p := load(t, "samplesize-chisq-a")
	df, w, want := p.column(t, "df"), p.column(t, "w"), p.exact(t, "N")
	for i := range df {
		s, err := SizeSearch{Alpha: 0.05, Power: 0.8, Step: []int{1}, Plan: func(n []int) (Plan, error) {
			return PlanChiSquared(df[i], float64(n[0])*w[i]*w[i])
		}}.Solve(bg)
		if err != nil {
			t.Fatal(err)
		}
		if float64(s.Total) != want[i] || len(s.Cheaper) != 1 || s.Cheaper[0].Power >= 0.8 {
			t.Errorf("df %g, w %g: N = %d, want %g; %v", df[i], w[i], s.Total, want[i], s.Cheaper)
		}
	}
}

// Cohen (1992) and Bratcher, Moran and Zimmer (1970): size of each group of a
// one-way layout, with the power at that size.
func TestSampleSizeOneWay(t *testing.T) {
	for _, c := range []struct {
		file   string
		lambda func(k, effect, n float64) float64
	}{
		{"samplesize-cohen-a", func(k, f, n float64) float64 { return f * f * k * n }},
		{"samplesize-range-a", func(_, d, n float64) float64 { return n * d * d / 2 }},
		{"samplesize-range-b", func(_, d, n float64) float64 { return n * d * d / 2 }},
	} {
		t.Run(c.file, func(t *testing.T) {
			p := load(t, c.file)
			k, effect := p.column(t, "groups"), p.column(t, "effect")
			want, power := p.exact(t, "n_per_group"), p.exact(t, "power_at_n")
			alpha, target := number(t, p.Alpha), number(t, p.Power)
			for i := range k {
				step := make([]int, int(k[i]))
				for j := range step {
					step[j] = 1
				}
				s, err := SizeSearch{Alpha: alpha, Power: target, Step: step, Plan: func(n []int) (Plan, error) {
					m := float64(n[0])
					return PlanF(k[i]-1, k[i]*(m-1), c.lambda(k[i], effect[i], m))
				}}.Solve(bg)
				if err != nil {
					t.Fatal(err)
				}
				if float64(s.N[0]) != want[i] {
					t.Errorf("k %g, effect %g: n = %d, want %g", k[i], effect[i], s.N[0], want[i])
				}
				near(t, "power", s.Power, power[i], 1e-9)
				for _, c := range s.Cheaper {
					if c.Power >= target {
						t.Errorf("k %g, effect %g: the cheaper %v has power %g", k[i], effect[i], c.N, c.Power)
					}
				}
			}
		})
	}
}

// twoMeans plans the comparison of two means with known spread 1.
func twoMeans(n []int, d float64) (Plan, error) {
	a, b := float64(n[0]), float64(n[1])
	return PlanF(1, a+b-2, d*d*a*b/(a+b))
}

func TestSampleSizeByCost(t *testing.T) {
	// A unit of the second group costs nine times one of the first: three times as many of the first
	// are cheapest (square root rule, common practice, no source). The search must find the cheapest of all designs.
	cost := []float64{1, 9}
	q := SizeSearch{Alpha: 0.05, Power: 0.9, Step: []int{3, 1}, Cost: cost, Free: true,
		Plan: func(n []int) (Plan, error) { return twoMeans(n, 0.8) }}
	s, err := q.Solve(bg)
	if err != nil {
		t.Fatal(err)
	}
	best := math.Inf(1)
	for a := 1; a < 200; a++ {
		for b := 1; b < 80; b++ {
			if p, err := twoMeans([]int{a, b}, 0.8); err == nil && p.Power(0.05) >= 0.9 {
				best = math.Min(best, float64(a)+9*float64(b))
			}
		}
	}
	if s.Cost > best+1 { // one unit of the cheap group
		t.Errorf("cost %g for %v, the cheapest design costs %g", s.Cost, s.N, best)
	}
	for _, c := range s.Cheaper {
		if c.Power >= 0.9 || c.Cost >= s.Cost {
			t.Errorf("neighbour %+v of %v (cost %g)", c, s.N, s.Cost)
		}
	}
	t.Logf("%v costs %g, power %.4f; least %g; %d cheaper neighbours", s.N, s.Cost, s.Power, best, len(s.Cheaper))
}

func TestSampleSizeErrors(t *testing.T) {
	good := SizeSearch{Alpha: 0.05, Power: 0.8, Step: []int{1, 1}, Plan: func(n []int) (Plan, error) { return twoMeans(n, 0.5) }}
	for _, c := range []struct {
		name string
		edit func(q *SizeSearch)
		want error
	}{
		{"alpha", func(q *SizeSearch) { q.Alpha = 0 }, ErrInvalid},
		{"power below alpha", func(q *SizeSearch) { q.Power = 0.01 }, ErrInvalid},
		{"no step", func(q *SizeSearch) { q.Step = nil }, ErrInvalid},
		{"zero step", func(q *SizeSearch) { q.Step = []int{1, 0} }, ErrInvalid},
		{"lengths", func(q *SizeSearch) { q.Cost = []float64{1} }, ErrInvalid},
		{"free units", func(q *SizeSearch) { q.Cost = []float64{1, 0} }, ErrInvalid},
		{"limit", func(q *SizeSearch) { q.Most = 20 }, ErrTooSmall},
		{"no effect", func(q *SizeSearch) { q.Plan = func(n []int) (Plan, error) { return twoMeans(n, 0) } }, ErrTooSmall},
	} {
		t.Run(c.name, func(t *testing.T) {
			q := good
			c.edit(&q)
			if _, err := q.Solve(bg); !errors.Is(err, c.want) {
				t.Errorf("error %v, want %v", err, c.want)
			}
		})
	}
	ctx, cancel := context.WithCancel(bg)
	cancel()
	if _, err := good.Solve(ctx); !errors.Is(err, context.Canceled) {
		t.Errorf("%v", err)
	}
	q := good
	q.Least = []int{40, 1}
	s, err := q.Solve(bg)
	if err != nil || s.N[0] < 40 {
		t.Errorf("%v, %v", s.N, err)
	}
}

func TestPlanEdges(t *testing.T) {
	p, err := PlanF(2, 20, 0)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "power without an effect", p.Power(0.05), 0.05, 1e-12)
	for _, a := range []float64{0, 1, -1, math.NaN()} {
		if !math.IsNaN(p.Power(a)) {
			t.Errorf("Power(%g) = %g", a, p.Power(a))
		}
	}
	if _, err := p.Detectable(0.05, 0.05); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	if _, err := PlanF(2, 0, 1); !errors.Is(err, ErrNoErrorDF) {
		t.Errorf("%v", err)
	}
	if _, err := PlanF(2, 5, -1); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	if _, err := PlanF(2, 5, math.NaN()); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	if _, err := (Plan{Null: dist.F{D1: 1, D2: 1}}).Detectable(0.05, 0.9); err != nil {
		t.Errorf("%v", err)
	}
	var none Plan
	if !math.IsNaN(none.Power(0.05)) || none.Validate() == nil {
		t.Error("the zero plan has a power")
	}
	if _, err := PlanPair(Comparison{}, Pair{Linear: Linear{RankS: 1, RankB: 3, RankE0: 3, RankE1: 10, M: 10, Certified: true, Numerator: 8}}, 0); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	plan, err := PlanPair(Comparison{}, Pair{Linear: Linear{RankS: 1, RankB: 3, RankE0: 3, RankE1: 10, M: 10, Certified: true, Numerator: 8, Scale: 3}}, 16)
	if err != nil || plan.Noncentrality != 32 || !plan.Exact || plan.Truth != (dist.NoncentralF{D1: 2, D2: 7, Lambda: 32}) {
		t.Errorf("%v, %v", plan, err)
	}
}

// Expected counts in place of data: the noncentrality of a declared pair, by
// its closed form 2 Σ μ log(μ/mean).
func TestPlanOfDeclaredPair(t *testing.T) {
	mu := []float64{8, 8, 12.5, 12.5}
	m := Model[[]float64]{
		Params: Block(4, Positive("rate")),
		LogLikelihood: func(y, th []float64) float64 {
			s := 0.0
			for i, v := range y {
				s += xlogy(v, th[i]) - th[i]
			}
			return s
		},
		Start: func(y []float64) []float64 { return []float64{1, 1, 1, 1} },
	}
	full := mustBind(t, m, mu, 4)
	small := mustRestrict(t, full, Equate(Names("rate", 4)...))
	plan, err := Comparison{Restricted: small, Full: full}.Plan(bg, 0, nil)
	if err != nil {
		t.Fatal(err)
	}
	want := 0.0
	for _, v := range mu {
		want += 2 * v * math.Log(v/10.25)
	}
	near(t, "noncentrality", plan.Noncentrality, want, 1e-8)
	if plan.Exact || plan.Null != (dist.ChiSquared{K: 3}) {
		t.Errorf("%v", plan)
	}
}
