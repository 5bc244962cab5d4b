package dist

import (
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"sort"
	"strings"
	"testing"
)

func equalDunnett(k int, lambda, nu float64, two bool) Dunnett {
	d := Dunnett{make([]float64, k), nu, two}
	for i := range d.Lambda {
		d.Lambda[i] = lambda
	}
	return d
}

// TestDunnettTable holds critical values of Dunnett (JASA 50, 1955; Biometrics
// 20, 1964) for equal numbers, typed from memory and confirmed by recomputing.
func TestDunnettTable(t *testing.T) {
	for name, p := range percentagePoints(t, "table-dunnett-a.json") {
		nu := dfOf(t, name)
		two := strings.HasPrefix(name, "two")
		for i, want := range p.exact {
			d := DunnettFor(7, make([]float64, i+1), nu, two)
			for j := range d.Lambda {
				d.Lambda[j] = math.Sqrt(0.5)
			}
			x := d.UpperQuantile(0.05)
			if math.Abs(x-want) > 1e-9 || math.Round(x*100)/100 != p.published[i] {
				t.Errorf("%v: 5%% point %v, want %v, published %v", d, x, want, p.published[i])
			}
		}
	}
}

// TestDunnettSpecialCases compares with laws that it contains: Student's t,
// independent values, orthant probabilities.
func TestDunnettSpecialCases(t *testing.T) {
	inf := math.Inf(1)
	check := func(name string, got, want, tol float64) {
		t.Helper()
		if relErr(got, want) > tol {
			t.Errorf("%s: %v, want %v, error %.2g", name, got, want, relErr(got, want))
		}
	}
	for _, nu := range []float64{0.3, 1, 4.5, 20, 1e4, inf} {
		one := Dunnett{[]float64{0.6}, nu, false}
		two := Dunnett{[]float64{-0.6}, nu, true}
		modulus := equalDunnett(5, 0, nu, true)
		for _, x := range []float64{-40, -3, -0.5, -1e-8, 1e-8, 0.01, 0.5, 1.7, 3, 9, 40, 1e5} {
			st := StudentT{nu}
			check("one-sided CDF", one.CDF(x), st.CDF(x), 2e-13)
			check("one-sided Survival", one.Survival(x), st.Survival(x), 2e-13)
			check("one-sided LogCDF", one.LogCDF(x), st.LogCDF(x), 2e-13)
			check("one-sided Prob", one.Prob(x), st.Prob(x), 3e-13)
			if x > 0 {
				check("two-sided Survival", two.Survival(x), 2*st.Survival(x), 2e-13)
				m := MaximumModulus{5, nu}
				check("modulus Survival", modulus.Survival(x), m.Survival(x), 2e-13)
				check("modulus LogCDF", modulus.LogCDF(x), m.LogCDF(x), 2e-13)
				check("modulus LogSurvival", modulus.LogSurvival(x), m.LogSurvival(x), 2e-13)
				check("modulus LogProb", modulus.LogProb(x), m.LogProb(x), 2e-13)
			}
		}
	}
	// P(Z₁ <= 0, Z₂ <= 0) = 1/4 + arcsin(ρ)/2π, and the three-value analogue.
	for _, l := range []float64{0.1, 0.5, math.Sqrt(0.5), 0.9, 0.99, 0.9999} {
		check("quadrant", Dunnett{[]float64{l, l}, 5, false}.CDF(0), 0.25+math.Asin(l*l)/(2*math.Pi), 1e-12)
		check("quadrant of opposite signs", Dunnett{[]float64{l, -l}, 5, false}.CDF(0), 0.25-math.Asin(l*l)/(2*math.Pi), 1e-11)
		check("octant", Dunnett{[]float64{l, l / 2, l / 3}, 5, false}.CDF(0),
			0.125+(math.Asin(l*l/2)+math.Asin(l*l/3)+math.Asin(l*l/6))/(4*math.Pi), 1e-12)
	}
}

func dunnettLaws() []Dunnett {
	inf := math.Inf(1)
	return []Dunnett{
		DunnettFor(12, []float64{5, 6, 7, 30}, 20, false),
		DunnettFor(12, []float64{5, 6, 7, 30}, 20, true),
		DunnettFor(4, []float64{4, 4, 4}, inf, true),
		DunnettFor(4, []float64{4, 4, 4}, inf, false),
		equalDunnett(100, 0.7, 3, true),
		equalDunnett(100, 0.7, 1e6, false),
		{[]float64{0.3, -0.9, 0.99}, 0.5, false},
		{[]float64{0.3, -0.9, 0.99}, 0.01, true},
		equalDunnett(1000, 0.1, 30, true),
	}
}

func TestDunnettQuantiles(t *testing.T) {
	worst := 0.0
	for _, d := range dunnettLaws() {
		for _, p := range []float64{1e-300, 1e-30, 1e-6, 0.01, 0.3, 0.49, 0.7, 0.95} {
			for side := range 2 {
				if p < 1e-100 && len(d.Lambda) > 50 {
					continue
				}
				x, log := d.Quantile(p), d.LogCDF
				if side == 1 {
					x, log = d.UpperQuantile(p), d.LogSurvival
				}
				if math.Abs(x) > 1e305 || x == 0 {
					if d.Nu >= 1 {
						t.Errorf("%v: quantile of %g = %v", d, p, x)
					}
					continue
				}
				back := log(x)
				cond := math.Abs(x) * math.Exp(d.LogProb(x)-back)
				e := math.Abs(back-math.Log(p)) / math.Max(1, cond) / math.Max(1, -math.Log(p)/30)
				worst = math.Max(worst, e)
				if !(e < 1e-12) {
					t.Errorf("%v: log tail at the quantile %v of %g (side %d) = %v, off by %.2g", d, x, p, side, back, e)
				}
			}
		}
	}
	t.Logf("worst %.2g", worst)
}

// TestDunnettTails: complement, monotone, density as the derivative.
func TestDunnettTails(t *testing.T) {
	for _, d := range dunnettLaws() {
		if err := d.Validate(); err != nil {
			t.Fatal(err)
		}
		last := 0.0
		for _, x := range []float64{-1e3, -20, -4, -1, -0.1, 0, 0.1, 0.7, 1.5, 2.5, 4, 9, 30, 1e4} {
			lo, up := d.CDF(x), d.Survival(x)
			if math.Abs(lo+up-1) > 1e-12 || lo < last || lo < 0 || up < 0 {
				t.Errorf("%v at %v: tails %v and %v, last %v", d, x, lo, up, last)
			}
			last = lo
			if lo > 0 && relErr(math.Exp(d.LogCDF(x)), lo) > 1e-12 || up > 1e-300 && relErr(math.Exp(d.LogSurvival(x)), up) > 1e-12 {
				t.Errorf("%v at %v: logs %v and %v of %v and %v", d, x, d.LogCDF(x), d.LogSurvival(x), lo, up)
			}
			p := d.Prob(x)
			h := 1e-4 * math.Max(math.Abs(x), 0.01)
			log, sign := d.LogCDF, 1.0
			if up < lo {
				log, sign = d.LogSurvival, -1
			}
			want := sign * (8*(log(x+h)-log(x-h)) - (log(x+2*h) - log(x-2*h))) / (12 * h) * math.Exp(log(x))
			if p > 1e-280 && relErr(p, want) > 1e-7 {
				t.Errorf("%v at %v: density %v, difference %v", d, x, p, want)
			}
			if p > 1e-280 && relErr(math.Exp(d.LogProb(x)), p) > 1e-12 {
				t.Errorf("%v at %v: log density %v of %v", d, x, d.LogProb(x), p)
			}
		}
	}
	// Logs far beyond underflow.
	for _, x := range []float64{100, 1e4, 1e8} {
		d := equalDunnett(4, 0.7, math.Inf(1), true)
		want := StudentT{math.Inf(1)}.LogSurvival(x) + math.Log(8)
		if got := d.LogSurvival(x); relErr(got, want) > 1e-13 {
			t.Errorf("LogSurvival(%v) = %v, want %v", x, got, want)
		}
	}
}

func TestDunnettMomentsAndRand(t *testing.T) {
	for _, d := range dunnettLaws() {
		if d.Nu < 2.5 || len(d.Lambda) > 200 {
			continue
		}
		src := rand.NewPCG(21, 22)
		const n = 1500
		x := make([]float64, n)
		mean := 0.0
		for i := range x {
			x[i] = d.Rand(src)
			mean += x[i] / n
		}
		sort.Float64s(x)
		worst := 0.0
		for i := 0; i < n; i += 5 {
			f := d.CDF(x[i])
			worst = math.Max(worst, math.Max(f-float64(i)/n, float64(i+1)/n-f))
		}
		if ks := worst * math.Sqrt(n); ks > 2.1 {
			t.Errorf("%v: Kolmogorov-Smirnov %v", d, ks)
		}
		if z := (mean - d.Mean()) / math.Sqrt(d.Variance()/n); !(math.Abs(z) < 4.5) {
			t.Errorf("%v: mean of draws %v, Mean %v, Variance %v", d, mean, d.Mean(), d.Variance())
		}
	}
	// Two correlated normals: E max = sqrt((1-ρ)/π) (Clark 1961), E max² = 1.
	d := Dunnett{[]float64{0.6, 0.5}, math.Inf(1), false}
	if m := math.Sqrt(0.7 / math.Pi); relErr(d.Mean(), m) > 1e-12 || relErr(d.Variance(), 1-m*m) > 1e-12 {
		t.Errorf("mean %v, variance %v, want %v, %v", d.Mean(), d.Variance(), m, 1-m*m)
	}
	st := Dunnett{[]float64{0.6}, 5, false}
	if math.Abs(st.Mean()) > 1e-13 || relErr(st.Variance(), 5.0/3) > 1e-12 {
		t.Errorf("mean %v, variance %v of Student's t", st.Mean(), st.Variance())
	}
}

func TestDunnettLimits(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	one, two := equalDunnett(3, 0.5, 7, false), equalDunnett(3, 0.5, 7, true)
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"CDF(-Inf)", one.CDF(-inf), 0}, {"CDF(+Inf)", one.CDF(inf), 1}, {"Survival(-Inf)", one.Survival(-inf), 1}, {"Survival(+Inf)", one.Survival(inf), 0},
		{"two CDF(0)", two.CDF(0), 0}, {"two Survival(-1)", two.Survival(-1), 1}, {"two LogCDF(0)", two.LogCDF(0), -inf},
		{"Quantile(0)", one.Quantile(0), -inf}, {"two Quantile(0)", two.Quantile(0), 0}, {"Quantile(1)", one.Quantile(1), inf},
		{"UpperQuantile(0)", one.UpperQuantile(0), inf}, {"UpperQuantile(1)", one.UpperQuantile(1), -inf},
		{"LogSurvival(+Inf)", one.LogSurvival(inf), -inf}, {"Prob(-Inf)", one.Prob(-inf), 0},
	} {
		if c.got != c.want {
			t.Errorf("%s = %v, want %v", c.name, c.got, c.want)
		}
	}
	for _, bad := range []Dunnett{{nil, 5, true}, {[]float64{1}, 5, true}, {[]float64{nan}, 5, true}, {[]float64{0.5}, 0, true},
		{[]float64{0.5}, nan, false}, DunnettFor(0, []float64{3}, 5, true), DunnettFor(3, []float64{3, -1}, 5, true), {make([]float64, 1001), 5, true}} {
		var pe *ParamError
		if err := bad.Validate(); !errors.As(err, &pe) || !errors.Is(err, ErrParam) {
			t.Errorf("%v", err)
		}
		for i, v := range []float64{bad.CDF(1), bad.Survival(0), bad.LogCDF(1), bad.LogSurvival(1), bad.Prob(1), bad.LogProb(1), bad.Quantile(0.5),
			bad.UpperQuantile(0.5), bad.Mean(), bad.Variance(), bad.Rand(rand.NewPCG(1, 2))} {
			if !math.IsNaN(v) {
				t.Errorf("%v: case %d is %v, want NaN", bad.Nu, i, v)
			}
		}
	}
	if s := (Dunnett{[]float64{0.5, 0.25}, 9, true}).String(); s != "Dunnett([0.5 0.25], 9, two-sided)" {
		t.Error(s)
	}
}

// TestDunnettSweep looks for NaN over the domain.
func TestDunnettSweep(t *testing.T) {
	n := 150
	if os.Getenv("SUBSUME_LONG") == "1" {
		n = 10000
	}
	rng := rand.New(rand.NewPCG(31, 4))
	for range n {
		checkDunnett(t, rng.IntN(2) == 0, rng.Float64(), rng.Float64(), rng.Float64(), rng.Float64())
	}
}

func checkDunnett(t *testing.T, two bool, a, b, c, e float64) {
	k := int(math.Exp(a*math.Log(300))) + 1
	nu := math.Exp(math.Log(1e-3) + b*math.Log(1e15)*1.02)
	if nu > 1e12 {
		nu = math.Inf(1)
	}
	d := Dunnett{make([]float64, k), nu, two}
	for i := range d.Lambda {
		d.Lambda[i] = 0.999 * (2*c - 1)
		if i%3 == 2 {
			d.Lambda[i] *= -a
		}
	}
	x := math.Exp(3 * (e - 0.3))
	if !two && int(e*1000)%2 == 0 {
		x = -x
	}
	if int(c*1000)%5 == 0 {
		x *= math.Exp(650 * (2*e - 1))
	}
	lo, up, llo, lup, f, lf := d.CDF(x), d.Survival(x), d.LogCDF(x), d.LogSurvival(x), d.Prob(x), d.LogProb(x)
	for _, v := range []float64{lo, up, llo, lup, f, lf} {
		if math.IsNaN(v) {
			t.Fatalf("k=%d λ=%v nu=%v two=%v at %v: %v %v %v %v %v %v", k, d.Lambda[0], nu, two, x, lo, up, llo, lup, f, lf)
		}
	}
	if lo < 0 || lo > 1 || up < 0 || up > 1 || math.Abs(lo+up-1) > 1e-12 || llo > 0 || lup > 0 || f < 0 {
		t.Fatalf("k=%d λ=%v nu=%v two=%v at %v: tails %v and %v, logs %v and %v, density %v", k, d.Lambda[0], nu, two, x, lo, up, llo, lup, f)
	}
}

func FuzzDunnett(f *testing.F) {
	f.Add(true, 0.3, 0.5, 0.1, 0.5)
	f.Add(false, 1.0, 0.0, 0.5, 1.0)
	f.Fuzz(func(t *testing.T, two bool, a, b, c, e float64) {
		for _, v := range []float64{a, b, c, e} {
			if !(v >= 0 && v <= 1) {
				return
			}
		}
		checkDunnett(t, two, a, b, c, e)
	})
}

func TestDunnettNoAllocation(t *testing.T) {
	d := DunnettFor(12, []float64{5, 6, 7, 30}, 20, false)
	var s float64
	if n := testing.AllocsPerRun(5, func() { s += d.Survival(2) + d.CDF(-1) + d.LogCDF(0.5) + d.Prob(1) + d.UpperQuantile(0.05) }); n != 0 {
		t.Errorf("%v allocations", n)
	}
}

func BenchmarkDunnett(b *testing.B) {
	var s float64
	for _, c := range []struct {
		name string
		d    Dunnett
	}{
		{"equal/k=5/nu=20/two", equalDunnett(5, math.Sqrt(0.5), 20, true)},
		{"equal/k=5/nu=20/one", equalDunnett(5, math.Sqrt(0.5), 20, false)},
		{"unequal/k=4/nu=20/two", DunnettFor(12, []float64{5, 6, 7, 30}, 20, true)},
		{"equal/k=100/nu=3/two", equalDunnett(100, math.Sqrt(0.5), 3, true)},
	} {
		x := c.d.UpperQuantile(0.05)
		for _, f := range []struct {
			name string
			f    func(float64) float64
			x    float64
		}{{"upper/5%", c.d.Survival, x}, {"upper/far", c.d.Survival, 10 * x}, {"lower", c.d.CDF, 0.3}, {"quantile/5%", c.d.UpperQuantile, 0.05}} {
			b.Run(c.name+"/"+f.name, func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					s += f.f(f.x)
				}
			})
		}
	}
	_ = s
}
