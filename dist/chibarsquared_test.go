package dist

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"sort"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// TestChiBarSquaredTable holds the critical values of ½χ²_{k-1} + ½χ²_k of
// Kodde and Palm (Econometrica 54, 1986, table I), typed from memory and
// confirmed by recomputing.
func TestChiBarSquaredTable(t *testing.T) {
	for name, p := range percentageLists(t, "table-chibar-a.json", 2) {
		alpha := 0.05
		if strings.HasSuffix(name, "0.01") {
			alpha = 0.01
		}
		for i, want := range p.exact {
			d := NewChiBarSquared(0.5, 0.5).Shift(i)
			x := d.UpperQuantile(alpha)
			if relErr(x, want) > 1e-14 || math.Abs(x-p.published[i]) > 1.01e-3 {
				t.Errorf("%v: upper %v point %v, want %v, published %v", d, alpha, x, want, p.published[i])
			}
			if s := d.Survival(want); relErr(s, alpha) > 1e-13 {
				t.Errorf("%v: Survival(%v) = %v, want %v", d, want, s, alpha)
			}
		}
	}
}

func chiBarLaws() []ChiBarSquared {
	return []ChiBarSquared{
		NewChiBarSquared(0.5, 0.5),
		NewChiBarSquared(0.25, 0.5, 0.25),
		NewChiBarSquared(0, 0, 1),
		NewChiBarSquared(0.9, 0, 0, 0.1),
		NewChiBarSquared(0.999999, 1e-6),
		NewChiBarSquared(1e-9, 0.3, 0, 0, 0.7-1e-9),
		NewChiBarSquared(0, 0.5, 0.5),
		NewChiBarSquared(1.0/12, 0.25, 0.3, 0.2, 1.0/6),
	}
}

// TestChiBarSquaredTails compares with the plain sums of the tails, looks at
// logs beyond underflow, and inverts.
func TestChiBarSquaredTails(t *testing.T) {
	for _, d := range chiBarLaws() {
		if err := d.Validate(); err != nil {
			t.Fatal(err)
		}
		for _, x := range []float64{0, 1e-300, 1e-10, 0.01, 1, 5, 30, 300, 1400, 5000} {
			lo, up := d.Weights[0], 0.0
			for j, w := range d.Weights[1:] {
				lo += w * ChiSquared{float64(j + 1)}.CDF(x)
				up += w * ChiSquared{float64(j + 1)}.Survival(x)
			}
			if relErr(d.CDF(x), math.Min(lo, 1)) > 1e-15 || relErr(d.Survival(x), up) > 1e-15 {
				t.Errorf("%v at %v: %v and %v, want %v and %v", d, x, d.CDF(x), d.Survival(x), lo, up)
			}
			if math.Abs(d.CDF(x)+d.Survival(x)-1) > 3e-16 {
				t.Errorf("%v at %v: tails add to %v", d, x, d.CDF(x)+d.Survival(x))
			}
			if lo > 0 && relErr(math.Exp(d.LogCDF(x)), lo) > 1e-13 || up > 1e-300 && relErr(math.Exp(d.LogSurvival(x)), up) > 1e-12 {
				t.Errorf("%v at %v: logs %v and %v of %v and %v", d, x, d.LogCDF(x), d.LogSurvival(x), lo, up)
			}
			if p := d.Prob(x); x > 0 && p > 1e-300 && relErr(math.Exp(d.LogProb(x)), p) > 1e-12 {
				t.Errorf("%v at %v: density %v, log %v", d, x, p, d.LogProb(x))
			}
		}
		// Far out the law with most degrees of freedom decides.
		k := len(d.Weights) - 1
		want := ChiSquared{float64(k)}.LogSurvival(1e6) + math.Log(d.Weights[k])
		if got := d.LogSurvival(1e6); math.Abs(got-want) > 1 {
			t.Errorf("%v: LogSurvival(1e6) = %v, near %v", d, got, want)
		}
		for _, q := range []float64{1e-300, 1e-30, 1e-9, 0.01, 0.05, 0.2, 0.4, 0.8} {
			x := d.UpperQuantile(q)
			if q >= 1-d.Weights[0] {
				if x != 0 {
					t.Errorf("%v: UpperQuantile(%v) = %v inside the atom", d, q, x)
				}
			} else if s := d.Survival(x); relErr(s, q) > 1e-13*math.Max(1, x/10) {
				t.Errorf("%v: Survival(UpperQuantile(%v)) = %v", d, q, s)
			}
			p := q
			x = d.Quantile(p)
			if p <= d.Weights[0] {
				if x != 0 {
					t.Errorf("%v: Quantile(%v) = %v inside the atom", d, p, x)
				}
			} else if s := d.CDF(x); relErr(s, p) > 1e-13 && !(x == 0 && d.CDF(math.SmallestNonzeroFloat64) > p) {
				t.Errorf("%v: CDF(Quantile(%v) = %v) = %v", d, p, x, s)
			}
		}
		// Density against the CDF.
		sum := 0.0
		for u := -60.0; u < 8; u += 0.02 {
			x := math.Exp(u)
			sum += d.Prob(x) * x * 0.02
		}
		if math.Abs(sum-(1-d.Weights[0])) > 1e-11 {
			t.Errorf("%v: density integrates to %v", d, sum)
		}
	}
}

func TestChiBarSquaredLimits(t *testing.T) {
	inf := math.Inf(1)
	d := NewChiBarSquared(0.5, 0.5)
	point := NewChiBarSquared(1)
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"CDF(-1)", d.CDF(-1), 0}, {"CDF(0)", d.CDF(0), 0.5}, {"CDF(+Inf)", d.CDF(inf), 1}, {"LogCDF(-1)", d.LogCDF(-1), -inf},
		{"Survival(-1)", d.Survival(-1), 1}, {"Survival(0)", d.Survival(0), 0.5}, {"Survival(+Inf)", d.Survival(inf), 0},
		{"LogSurvival(+Inf)", d.LogSurvival(inf), -inf}, {"LogSurvival(-1)", d.LogSurvival(-1), 0}, {"LogSurvival(0)", d.LogSurvival(0), math.Log(0.5)},
		{"Prob(0)", d.Prob(0), inf}, {"Prob(-1)", d.Prob(-1), 0}, {"Quantile(1)", d.Quantile(1), inf}, {"Quantile(0)", d.Quantile(0), 0},
		{"UpperQuantile(0)", d.UpperQuantile(0), inf}, {"UpperQuantile(1)", d.UpperQuantile(1), 0},
		{"Mean", d.Mean(), 0.5}, {"Variance", d.Variance(), 1.25},
		{"point Survival(0)", point.Survival(0), 0}, {"point Quantile", point.Quantile(1), 0}, {"point UpperQuantile", point.UpperQuantile(0), 0},
		{"point LogSurvival(1)", point.LogSurvival(1), -inf}, {"point CDF(0)", point.CDF(0), 1},
		{"limit of Prob(0)", NewChiBarSquared(0, 0, 1).Prob(0), 0.5},
	} {
		if c.got != c.want {
			t.Errorf("%s = %v, want %v", c.name, c.got, c.want)
		}
	}
	for _, bad := range []ChiBarSquared{{}, NewChiBarSquared(0.5, 0.4), NewChiBarSquared(1.5, -0.5), NewChiBarSquared(math.NaN(), 1),
		NewChiBarSquared(inf), d.Shift(-1)} {
		var pe *ParamError
		if err := bad.Validate(); !errors.As(err, &pe) || !errors.Is(err, ErrParam) {
			t.Errorf("%v: %v", bad, err)
		}
		for i, v := range []float64{bad.CDF(1), bad.Survival(1), bad.LogCDF(1), bad.LogSurvival(1), bad.Prob(1), bad.LogProb(1), bad.Quantile(0.5),
			bad.UpperQuantile(0.5), bad.Mean(), bad.Variance(), bad.Rand(rand.NewPCG(1, 2))} {
			if !math.IsNaN(v) {
				t.Errorf("%v: case %d is %v, want NaN", bad, i, v)
			}
		}
	}
	if got := d.Shift(2).Reverse().String(); got != "ChiBarSquared(0.5, 0.5, 0, 0)" {
		t.Error(got)
	}
	w := []float64{0.5, 0.5}
	e := NewChiBarSquared(w...)
	w[0] = 7
	if e.Weights[0] != 0.5 {
		t.Error("NewChiBarSquared kept the caller's slice")
	}
}

func TestChiBarSquaredRand(t *testing.T) {
	for _, d := range chiBarLaws() {
		src := rand.NewPCG(5, 6)
		const n = 4000
		x := make([]float64, n)
		for i := range x {
			x[i] = d.Rand(src)
		}
		sort.Float64s(x)
		worst := 0.0
		for i, v := range x {
			if i+1 < n && x[i+1] == v {
				continue // inside the atom
			}
			worst = math.Max(worst, math.Abs(d.CDF(v)-float64(i+1)/n))
		}
		if ks := worst * math.Sqrt(n); ks > 2 {
			t.Errorf("%v: Kolmogorov-Smirnov %v", d, ks)
		}
	}
}

func symmetric(rows ...[]float64) *mat.SymDense {
	s := mat.NewSymDense(len(rows), nil)
	for i, r := range rows {
		for j, v := range r {
			if j >= i {
				s.SetSym(i, j, v)
			}
		}
	}
	return s
}

// differences is the covariance of successive differences of q+1 independent
// means: the cone of a simple order.
func differences(q int) *mat.SymDense {
	s := mat.NewSymDense(q, nil)
	for i := range q {
		s.SetSym(i, i, 2)
		if i > 0 {
			s.SetSym(i-1, i, -1)
		}
	}
	return s
}

func TestBoundaryWeights(t *testing.T) {
	ctx := context.Background()
	third := math.Acos(0.5) / (2 * math.Pi)
	for _, c := range []struct {
		name string
		cov  mat.Symmetric
		want []float64
	}{
		{"one", symmetric([]float64{7}), []float64{0.5, 0.5}},
		{"two independent", symmetric([]float64{4, 0}, []float64{0, 1}), []float64{0.25, 0.5, 0.25}},
		{"two, correlation 1/2", symmetric([]float64{4, 1}, []float64{1, 1}), []float64{third, 0.5, 0.5 - third}},
		{"three independent", symmetric([]float64{1, 0, 0}, []float64{0, 2, 0}, []float64{0, 0, 3}), []float64{0.125, 0.375, 0.375, 0.125}},
		// Level probabilities of the simple order of four means, |s(4, l)|/4!
		// (Barlow, Bartholomew, Bremner and Brunk 1972, table A.5).
		{"order of four", differences(3), []float64{6. / 24, 11. / 24, 6. / 24, 1. / 24}},
		{"order of three", differences(2), []float64{2. / 6, 3. / 6, 1. / 6}},
	} {
		w, err := BoundaryWeights(ctx, c.cov, nil)
		if err != nil || !w.Exact() {
			t.Fatal(c.name, err, w)
		}
		for j, v := range c.want {
			if math.Abs(w.Value[j]-v) > 2e-16 {
				t.Errorf("%s: weights %v, want %v", c.name, w.Value, c.want)
				break
			}
		}
		if err := w.Law().Validate(); err != nil {
			t.Error(c.name, err)
		}
	}
}

// TestBoundaryWeightsSimulated: simple order of six means, |s(6, l)|/6!, five
// independent parameters (binomial), and the same bits for 1 and 3 workers.
func TestBoundaryWeightsSimulated(t *testing.T) {
	ctx := context.Background()
	unit := mat.NewSymDense(5, nil)
	for i := range 5 {
		unit.SetSym(i, i, float64(i+1))
	}
	for _, c := range []struct {
		name string
		cov  mat.Symmetric
		want []float64
	}{
		{"order of six", differences(5), []float64{120. / 720, 274. / 720, 225. / 720, 85. / 720, 15. / 720, 1. / 720}},
		{"five independent", unit, []float64{1. / 32, 5. / 32, 10. / 32, 10. / 32, 5. / 32, 1. / 32}},
	} {
		w, err := BoundaryWeights(ctx, c.cov, &WeightSettings{Draws: 50000, Seed: 9, Workers: 1})
		if err != nil {
			t.Fatal(err)
		}
		again, _ := BoundaryWeights(ctx, c.cov, &WeightSettings{Draws: 50000, Seed: 9, Workers: 3})
		for j, v := range c.want {
			if z := (w.Value[j] - v) / w.StdError[j]; math.Abs(z) > 4 {
				t.Errorf("%s: weight %d = %v, want %v, %v standard errors", c.name, j, w.Value[j], v, z)
			}
			if w.Value[j] != again.Value[j] {
				t.Errorf("%s: weight %d depends on workers", c.name, j)
			}
		}
		if w.Exact() || w.Law().Validate() != nil {
			t.Error(c.name, w)
		}
	}
	// The exact weights of three, by simulation.
	cov := symmetric([]float64{1, 0.6, -0.3}, []float64{0.6, 1, 0.2}, []float64{-0.3, 0.2, 1})
	exact, err := BoundaryWeights(ctx, cov, nil)
	if err != nil {
		t.Fatal(err)
	}
	r, _ := correlationOf("", cov)
	sim, err := simulateWeights(ctx, r, &WeightSettings{Draws: 50000, Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	for j, v := range exact.Value {
		if math.Abs(sim.Value[j]-v) > 4*sim.StdError[j] {
			t.Errorf("three parameters: weight %d simulated %v ± %v, exact %v", j, sim.Value[j], sim.StdError[j], v)
		}
	}
	gone, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := BoundaryWeights(gone, unit, nil); !errors.Is(err, context.Canceled) {
		t.Error(err)
	}
}

func TestBoundaryWeightsErrors(t *testing.T) {
	for _, c := range []struct {
		name string
		cov  mat.Symmetric
		row  int
	}{
		{"zero variance", symmetric([]float64{1, 0}, []float64{0, 0}), 1},
		{"NaN", symmetric([]float64{1, math.NaN()}, []float64{0, 1}), 0},
		{"singular", symmetric([]float64{1, 1}, []float64{1, 1}), 1},
		{"indefinite", symmetric([]float64{1, 2}, []float64{2, 1}), 1},
		{"infinite", symmetric([]float64{math.Inf(1), 0}, []float64{0, 1}), 0},
	} {
		_, err := BoundaryWeights(context.Background(), c.cov, nil)
		var me *MatrixError
		if !errors.As(err, &me) || !errors.Is(err, ErrCovariance) || me.Row != c.row {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	big := mat.NewSymDense(MaxBoundary+1, nil)
	if _, err := BoundaryWeights(context.Background(), big, nil); !errors.Is(err, ErrParam) {
		t.Error(err)
	}
}

func FuzzChiBarSquared(f *testing.F) {
	f.Add(0.5, 0.5, 0.0, 1.0)
	f.Add(0.0, 0.2, 0.8, 1e-300)
	f.Fuzz(func(t *testing.T, a, b, c, x float64) {
		d := NewChiBarSquared(a, b, c)
		lo, up := d.CDF(x), d.Survival(x)
		if d.Validate() != nil || math.IsNaN(x) {
			if !math.IsNaN(lo) || !math.IsNaN(up) {
				t.Fatalf("%v at %v: %v and %v", d, x, lo, up)
			}
			return
		}
		if !(math.Abs(lo+up-1) < 1e-15) || !(lo >= 0 && up >= 0) {
			t.Fatalf("%v at %v: %v and %v", d, x, lo, up)
		}
		if q := d.UpperQuantile(up); math.IsNaN(q) || q < 0 {
			t.Fatalf("%v: UpperQuantile(%v) = %v", d, up, q)
		}
	})
}

func BenchmarkChiBarSquared(b *testing.B) {
	d := NewChiBarSquared(0.25, 0.5, 0.25)
	var s float64
	for _, c := range []struct {
		name string
		f    func(float64) float64
		x    float64
	}{{"upper/5%", d.Survival, 4.23}, {"upper/far", d.Survival, 200}, {"quantile/5%", d.UpperQuantile, 0.05}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				s += c.f(c.x)
			}
		})
	}
	_ = s
}

func BenchmarkBoundaryWeights(b *testing.B) {
	for _, q := range []int{3, 5, 20} {
		b.Run(fmt.Sprintf("q=%d", q), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := BoundaryWeights(context.Background(), differences(q), &WeightSettings{Draws: 10000}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
