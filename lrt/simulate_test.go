package lrt

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"sync/atomic"
	"testing"

	"subsume.example/dist"
)

// Bits do not depend on workers, with and without early stopping.
func TestBootstrapSameBits(t *testing.T) {
	d := normalGroups(20, 2, 0, 1, 31)
	full := mustBind(t, normalModel(2, withClosed), d, 20)
	small := mustRestrict(t, full, Equate("sd[1]", "sd[2]"))
	for _, b := range []Bootstrap{{Draws: 99}, {Draws: 400, Stop: 10}} {
		var first Result
		for i, w := range []int{1, 2, 5} {
			var calls atomic.Int64
			s := &Settings{Workers: w, Seed: 9, References: []Reference{b, Bartlett{Draws: 50}}, Progress: func(done, total int) {
				calls.Add(1)
				if done > total {
					t.Errorf("progress %d of %d", done, total)
				}
			}}
			r, err := Compare(bg, small, full, s)
			if err != nil {
				t.Fatal(err)
			}
			if calls.Load() == 0 {
				t.Error("no progress")
			}
			if i == 0 {
				first = r
				continue
			}
			for k := range r.Others {
				a, b := r.Others[k], first.Others[k]
				if math.Float64bits(a.P) != math.Float64bits(b.P) || a.Simulation != nil && *a.Simulation != *b.Simulation {
					t.Errorf("%d workers: %+v and %+v", w, a, b)
				}
			}
		}
		if first.Recommended != Simulated || first.Test().Name != "bootstrap" {
			t.Errorf("recommended %v", first.Recommended)
		}
		if sim := first.Others[0].Simulation; b.Stop > 0 && (!sim.Stopped || sim.AtLeast != 10 || first.Others[0].P != 10/float64(sim.Draws)) {
			t.Errorf("stopped: %+v, p %g", sim, first.Others[0].P)
		}
	}
}

// Equal variances of two normal samples have an exact law that is pivotal: the
// simulated p must agree with it within its own interval.
func TestBootstrapAgainstExactLaw(t *testing.T) {
	n1, n2 := 5.0, 9.0
	miss := 0
	for seed := range uint64(10) {
		r := draw(seed + 100)
		d := grouped{k: 2}
		for i := range 14 {
			g := 0
			if i >= 5 {
				g = 1
			}
			d.y, d.g = append(d.y, r.NormFloat64()*(1+0.5*float64(g))), append(d.g, g)
		}
		full := mustBind(t, normalModel(2, withClosed), d, 14)
		small := mustRestrict(t, full, Equate("sd[1]", "sd[2]"))
		solved, err := SolveBy(small, func(d grouped) ([]float64, error) {
			n, s, ss := d.sums()
			sd := math.Sqrt((ss[0] + ss[1]) / (n[0] + n[1]))
			return []float64{s[0] / n[0], s[1] / n[1], sd, sd}, nil
		})
		if err != nil {
			t.Fatal(err)
		}
		res, err := Compare(bg, solved, full, &Settings{Seed: seed, References: []Reference{Bootstrap{Draws: 400, Pivotal: true}}})
		if err != nil {
			t.Fatal(err)
		}
		_, _, ss := d.sums()
		x := ss[0] / (n1 - 1) / (ss[1] / (n2 - 1))
		want, _ := BothTails(dist.F{D1: n1 - 1, D2: n2 - 1}, func(x float64) float64 {
			w := (n1 - 1) * x / (n2 - 1)
			return 0.5*n1*math.Log(w/(1+w)*(n1+n2)/n1) + 0.5*n2*math.Log((n1+n2)/n2/(1+w))
		}, x)
		sim := res.Others[0].Simulation
		if want < sim.Lower || want > sim.Upper {
			miss++
		}
		if !strings.Contains(res.Others[0].Why, "exact") {
			t.Errorf("%s", res.Others[0].Why)
		}
	}
	if miss > 2 { // ten 95 % intervals
		t.Errorf("%d of 10 intervals miss the exact p", miss)
	}
}

// The mean correction of Bartlett's test of variances by maximum likelihood, simulated, against the mean of
// the exact law: E(−2 log λ) by digamma functions.
func TestBartlettSimulatedFactor(t *testing.T) {
	d := normalGroups(12, 3, 0, 1, 5)
	full := mustBind(t, normalModel(3, withClosed), d, 12)
	small := mustRestrict(t, full, Equate("sd[1]", "sd[2]", "sd[3]"))
	r, err := Compare(bg, small, full, &Settings{Seed: 3, References: []Reference{Bartlett{Draws: 600}}})
	if err != nil {
		t.Fatal(err)
	}
	// −2 log λ = 12 log(SS/12) − Σ 4 log(SSᵢ/4), SSᵢ/σ² ~ χ²(3), E log χ²(ν) = ψ(ν/2) + log 2.
	want := 12*(digammaForTest(4.5)-math.Log(12)) - 12*(digammaForTest(1.5)-math.Log(4))
	got := r.Statistic / r.Others[0].Statistic * 2
	if math.Abs(got-want) > 0.5 { // standard error of 600 draws about 0.15
		t.Errorf("mean %.3f, want %.3f", got, want)
	}
	if r.Others[0].Kind != Approximate || r.Recommended != Approximate {
		t.Errorf("%+v", r.Others[0])
	}
	r, err = Compare(bg, small, full, &Settings{References: []Reference{Bartlett{Factor: 2}}})
	if err != nil || r.Others[0].Statistic != r.Statistic/2 {
		t.Errorf("given factor: %v, %v", r.Others, err)
	}
}

func TestSimulationErrors(t *testing.T) {
	d := normalGroups(20, 2, 0, 1, 31)
	m := normalModel(2, withClosed)
	compare := func(m Model[grouped], ctx context.Context, refs ...Reference) error {
		full := mustBind(t, m, d, 20)
		_, err := Compare(ctx, mustRestrict(t, full, Equate("mean[1]", "mean[2]")), full, &Settings{References: refs})
		return err
	}
	none := m
	none.Simulate = nil
	if err := compare(none, bg, Bootstrap{}); !errors.Is(err, ErrSimulation) || !strings.Contains(err.Error(), "Simulate") {
		t.Errorf("%v", err)
	}
	bad := m
	bad.Simulate = func(grouped, []float64, rand.Source) (grouped, error) { panic("no") }
	if err := compare(bad, bg, Bootstrap{}); !errors.Is(err, ErrPanic) {
		t.Errorf("%v", err)
	}
	failing := m
	failing.Simulate = func(grouped, []float64, rand.Source) (grouped, error) { return grouped{}, errors.New("broken") }
	if err := compare(failing, bg, Bootstrap{}); !errors.Is(err, ErrSimulation) || !strings.Contains(err.Error(), "broken") {
		t.Errorf("%v", err)
	}
	constant := m
	constant.Simulate = func(d grouped, _ []float64, _ rand.Source) (grouped, error) {
		return grouped{make([]float64, len(d.y)), d.g, d.k}, nil // no spread: unbounded likelihood
	}
	if err := compare(constant, bg, Bootstrap{Draws: 30}); !errors.Is(err, ErrSimulation) {
		t.Errorf("%v", err)
	}
	if err := compare(m, bg, Bootstrap{Draws: -1}); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	if err := compare(m, bg, Bartlett{Factor: -1}); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	ctx, cancel := context.WithCancel(bg)
	n := atomic.Int64{}
	slow := m
	sim := m.Simulate
	slow.Simulate = func(d grouped, th []float64, src rand.Source) (grouped, error) {
		if n.Add(1) == 10 {
			cancel()
		}
		return sim(d, th, src)
	}
	if err := compare(slow, ctx, Bootstrap{Draws: 100000}); !errors.Is(err, context.Canceled) {
		t.Errorf("%v", err)
	}
	if k := n.Load(); k > 50 {
		t.Errorf("%d draws after cancelling at 10", k)
	}
}

func TestClopperPearson(t *testing.T) {
	// Clopper and Pearson (1934): 10 of 100 gives 0.049 to 0.176 (their chart; digits by beta quantiles).
	lo, hi := clopperPearson(10, 100)
	near(t, "lower", lo, 0.049005, 1e-5)
	near(t, "upper", hi, 0.176222, 1e-5)
	lo, hi = clopperPearson(0, 20)
	if lo != 0 {
		t.Errorf("lower %g", lo)
	}
	near(t, "upper", hi, 1-math.Pow(0.025, 1.0/20), 1e-10)
	if _, hi = clopperPearson(20, 20); hi != 1 {
		t.Errorf("upper %g", hi)
	}
}

// Score and Wald tests of equal Poisson rates against their closed forms: Σ(y − m)²/m
// (expected equals observed information only for the score in the canonical
// parameter), and of a normal mean: n(ȳ−μ)²/s² at both ends.
func TestScoreAndWald(t *testing.T) {
	d := normalGroups(15, 1, 0.3, 1, 12)
	n, s, ss := d.sums()
	mean := s[0] / n[0]
	for _, with := range []parts{withStart, withStart | withEach, withStart | withGradient} {
		full := mustBind(t, normalModel(1, with), d, 15)
		small := mustRestrict(t, full, Fix("mean[1]", 0))
		r, err := Compare(bg, small, full, &Settings{References: []Reference{ScoreTest{}, WaldTest{}, SignedRoot{Name: "mean[1]"}, SignedRoot{Name: "mean[1]", Less: true}}})
		if err != nil {
			t.Fatal(err)
		}
		score, wald, up, down := r.Others[0], r.Others[1], r.Others[2], r.Others[3]
		near(t, "Wald", wald.Statistic, n[0]*mean*mean/(ss[0]/n[0]), 1e-6)
		// Observed information at (0, s₀): mean-mean n/s₀², mean-sd 2nȳ/s₀³, sd-sd 2n/s₀²; slope nȳ/s₀² in the mean alone.
		v0 := ss[0]/n[0] + mean*mean
		a, b, c := n[0]/v0, 2*n[0]*mean/math.Pow(v0, 1.5), 2*n[0]/v0
		g := n[0] * mean / v0
		near(t, "score", score.Statistic, g*g*c/(a*c-b*b), 1e-5)
		near(t, "signed root", up.Statistic, math.Copysign(math.Sqrt(r.Statistic), mean), 1e-12)
		near(t, "one-sided p", up.P+down.P, 1, 1e-12)
		near(t, "two-sided p", 2*math.Min(up.P, down.P), r.ChiSquared.P, 1e-12)
		if wald.Law != r.ChiSquared.Law || score.Law != r.ChiSquared.Law {
			t.Errorf("laws %v, %v", wald.Law, score.Law)
		}
	}
	// With the information of a canonical parameter the score statistic is Pearson's.
	counts := []float64{3, 7, 12, 20}
	m := Model[[]float64]{
		Params: Block(4, Real("log rate")),
		LogLikelihood: func(y, th []float64) float64 {
			l := 0.0
			for i, v := range y {
				l += v*th[i] - math.Exp(th[i])
			}
			return l
		},
	}
	full := mustBind(t, m, counts, 4)
	r, err := Compare(bg, mustRestrict(t, full, Equate(Names("log rate", 4)...)), full, &Settings{References: []Reference{ScoreTest{}, SignedRoot{Name: "log rate[1]"}}})
	if err != nil {
		t.Fatal(err)
	}
	pearson := 0.0
	for _, v := range counts {
		pearson += (v - 10.5) * (v - 10.5) / 10.5
	}
	near(t, "Pearson", r.Others[0].Statistic, pearson, 1e-5)
	if r.Others[1].Kind != None || !strings.Contains(r.Others[1].Why, "one degree of freedom") {
		t.Errorf("%+v", r.Others[1])
	}
}
