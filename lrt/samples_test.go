package lrt

import (
	"errors"
	"math"
	"os"
	"strings"
	"testing"

	"subsume.example/dist"
)

func (d grouped) samples(positive bool) Samples {
	s := make(Samples, d.k)
	for i, v := range d.y {
		if positive {
			v = math.Exp(v)
		}
		s[d.g[i]] = append(s[d.g[i]], v)
	}
	return s
}

func mustSpace(t testing.TB, d *Declared, err error) *Declared {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// n = 4 and 20, variance ratio 3.5: both tails of λ give 0.241.
func TestNormalSamplesVarianceRatio(t *testing.T) {
	spread := func(n int, v float64) []float64 { // n values with variance v
		x := make([]float64, n)
		for i := range x {
			x[i] = float64(i)
		}
		_, _, ss := Samples{x}.moments()
		for i := range x {
			x[i] *= math.Sqrt(v / (ss[0] / float64(n-1)))
		}
		return x
	}
	d, err := NormalSamples(Samples{spread(4, 3.5), spread(20, 1)})
	full := mustSpace(t, d, err)
	r, err := Compare(bg, mustRestrict(t, full, Equate("sd[1]", "sd[2]")), full, nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "ratio", r.Exact.Statistic, 3.5, 1e-13)
	if math.Abs(r.Exact.P-0.241) > 5e-4 || r.Recommended != Exact {
		t.Errorf("%+v", r.Exact)
	}
}

// Equal means under equal spread is the one-way F.
func TestNormalSamplesF(t *testing.T) {
	g := normalGroups(17, 3, 5, 1e4, 8)
	d, err := NormalSamples(g.samples(false))
	full := mustSpace(t, d, err)
	means := mustRestrict(t, full, Equate(Names("sd", 3)...))
	one := mustRestrict(t, means, Equate(Names("mean", 3)...))
	rs, err := Chain(bg, []Space{one, means, full}, false, &Settings{References: []Reference{Bartlett{}}})
	if err != nil {
		t.Fatal(err)
	}
	n, s, ss := g.sums()
	grand, total := 0.0, 0.0
	for j := range n {
		grand += s[j] / 17
	}
	for j := range n {
		total += n[j] * (s[j]/n[j] - grand) * (s[j]/n[j] - grand)
	}
	near(t, "F", rs[0].Exact.Statistic, total/2/((ss[0]+ss[1]+ss[2])/14), 1e-11)
	if rs[0].Exact.Law != (dist.F{D1: 2, D2: 14}) {
		t.Errorf("%v", rs[0].Exact)
	}
	if rs[1].Exact.Kind != None || rs[1].Others[0].Kind != Approximate || !strings.Contains(rs[1].Others[0].Why, "analytic") {
		t.Errorf("%+v %+v", rs[1].Exact, rs[1].Others[0])
	}
	near(t, "−2 log λ of equal spread", rs[1].Statistic, 17*math.Log((ss[0]+ss[1]+ss[2])/17)-n[0]*math.Log(ss[0]/n[0])-n[1]*math.Log(ss[1]/n[1])-n[2]*math.Log(ss[2]/n[2]), 1e-10)
}

// The lognormal λ is that of the logarithms.
func TestLognormalSamples(t *testing.T) {
	g := normalGroups(20, 2, 0, 1, 8)
	a, err := NormalSamples(g.samples(false))
	normal := mustSpace(t, a, err)
	b, err := LognormalSamples(g.samples(true))
	logn := mustSpace(t, b, err)
	var stats []float64
	for _, full := range []*Declared{normal, logn} {
		r, err := Compare(bg, mustRestrict(t, full, Equate("sd[1]", "sd[2]")), full, nil)
		if err != nil {
			t.Fatal(err)
		}
		stats = append(stats, r.Statistic)
	}
	near(t, "−2 log λ", stats[1], stats[0], 1e-10)
	fit, err := logn.Maximize(bg)
	if err != nil {
		t.Fatal(err)
	}
	want := 0.0
	for i, x := range g.y {
		z := (x - fit.Estimate[g.g[i]]) / fit.Estimate[2+g.g[i]]
		want -= 0.5*z*z + math.Log(fit.Estimate[2+g.g[i]]*math.Sqrt(2*math.Pi)) + x
	}
	near(t, "log likelihood", fit.LogLikelihood, want, 1e-12)
}

// Gamma and Weibull: scale equivariance, gradients accepted, maxima that no
// neighbour beats, n = 3, ugly scales, and the same maximum by differences.
func TestPositiveSamples(t *testing.T) {
	for name, declare := range map[string]func(Samples) (*Declared, error){"gamma": GammaSamples, "Weibull": WeibullSamples} {
		t.Run(name, func(t *testing.T) {
			trials := 40
			if os.Getenv("SUBSUME_LONG") == "1" {
				trials = 1000
			}
			for trial := range trials {
				n := 3
				if trial%2 == 1 {
					n = 12
				}
				g := gammaGroups(2*n, 2, 1, uint64(trial))
				var base float64
				for _, scale := range []float64{1, 1e-8, 1e8} {
					s := g.samples(false)
					for i := range s {
						for j := range s[i] {
							s[i][j] *= scale
						}
					}
					d, err := declare(s)
					full := mustSpace(t, d, err)
					r, err := Compare(bg, mustRestrict(t, full, Equate("shape[1]", "shape[2]")), full, nil)
					if err != nil {
						t.Fatalf("trial %d, scale %g: %v", trial, scale, err)
					}
					if hasWarning(r.Warnings, "gradient-disagrees") || hasWarning(r.Warnings, "loose-maximum") {
						t.Errorf("trial %d, scale %g: %v", trial, scale, r.Warnings)
					}
					if scale == 1 {
						base = r.Statistic
						bare := *full.core
						bare.gradient, bare.start, bare.closedAt = nil, nil, nil
						fit, err := (&Declared{core: &bare, frame: full.frame}).Maximize(bg)
						if err != nil || math.Abs(fit.LogLikelihood-r.Pair.Full.LogLikelihood) > 1e-8 {
							t.Errorf("trial %d: by differences %.12g, by gradient %.12g, %v", trial, fit.LogLikelihood, r.Pair.Full.LogLikelihood, err)
						}
					} else if math.Abs(r.Statistic-base) > 1e-7 {
						t.Errorf("trial %d, scale %g: −2 log λ = %.12g, want %.12g", trial, scale, r.Statistic, base)
					}
				}
			}
		})
	}
}

// Exponential laws inside gamma and Weibull ones: shape 1 has the exponential maximum.
func TestExponentialInsideGammaAndWeibull(t *testing.T) {
	g := gammaGroups(15, 1, 3, 2)
	s := g.samples(false)
	want := -15 * (math.Log(sum(g.y)/15) + 1)
	for _, declare := range []func(Samples) (*Declared, error){GammaSamples, WeibullSamples} {
		d, err := declare(s)
		full := mustSpace(t, d, err)
		fit, err := mustRestrict(t, full, Fix("shape[1]", 1)).Maximize(bg)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "log likelihood", fit.LogLikelihood, want, 1e-11)
	}
}

func TestSamplesBadData(t *testing.T) {
	for name, declare := range map[string]func(Samples) (*Declared, error){"gamma": GammaSamples, "Weibull": WeibullSamples, "normal": NormalSamples, "lognormal": LognormalSamples} {
		for _, s := range []Samples{nil, {}, {{}}, {{1, math.NaN()}}, {{1, math.Inf(1)}}} {
			if _, err := declare(s); !errors.Is(err, ErrInvalid) {
				t.Errorf("%s of %v: %v", name, s, err)
			}
		}
		if name != "normal" {
			if _, err := declare(Samples{{1, 0}}); !errors.Is(err, ErrInvalid) {
				t.Errorf("%s: %v", name, err)
			}
		}
		// One value in a group has no spread.
		d, err := declare(Samples{{1, 2, 4}, {3}})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := d.Maximize(bg); !errors.Is(err, ErrUnbounded) {
			t.Errorf("%s with a group of one: %v", name, err)
		}
	}
}

// A bootstrap of Weibull shapes declares itself exact.
func TestWeibullPivotal(t *testing.T) {
	d, err := WeibullSamples(gammaGroups(20, 2, 1, 3).samples(false))
	full := mustSpace(t, d, err)
	r, err := Compare(bg, mustRestrict(t, full, Equate("shape[1]", "shape[2]")), full, &Settings{Seed: 1, References: []Reference{Bootstrap{Draws: 99}}})
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(r.Others[0].Why, "exact") {
		t.Errorf("%s", r.Others[0].Why)
	}
	if p := r.Others[0]; math.Abs(p.P-r.ChiSquared.P) > 0.25 {
		t.Errorf("bootstrap %g, χ² %g", p.P, r.ChiSquared.P)
	}
}

// Gear diameters (NIST/SEMATECH e-Handbook 1.3.5.7): Bartlett's test.
func TestPublishedGear(t *testing.T) {
	f := load(t, "variances-gear")
	y, batch := f.column(t, "y"), f.column(t, "batch")
	s := make(Samples, 10)
	for i, v := range y {
		s[int(batch[i])-1] = append(s[int(batch[i])-1], v)
	}
	d, err := ResidualVariances(s)
	full := mustSpace(t, d, err)
	r, err := Compare(bg, mustRestrict(t, full, Equate(Names("sd", 10)...)), full, &Settings{References: []Reference{Bartlett{}}})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "−2 log λ", r.Statistic, f.exact(t, "bartlett_uncorrected")[0], 1e-12)
	near(t, "corrected", r.Others[0].Statistic, f.exact(t, "bartlett_chi2")[0], 1e-12)
	near(t, "p", r.Others[0].P, f.exact(t, "bartlett_p")[0], 1e-12)
	near(t, "df", r.Pair.DF, f.exact(t, "bartlett_df")[0], 0)
	// Residual and full likelihoods are never compared with each other.
	n, err := NormalSamples(s)
	other := mustSpace(t, n, err)
	if _, err := Compare(bg, full, other, nil); !errors.Is(err, ErrDifferentObservations) {
		t.Errorf("%v", err)
	}
}

func TestResidualVarianceRatio(t *testing.T) {
	g := normalGroups(9, 2, 0, 1, 3)
	d, err := ResidualVariances(g.samples(false))
	full := mustSpace(t, d, err)
	r, err := Compare(bg, mustRestrict(t, full, Equate("sd[1]", "sd[2]")), full, &Settings{Seed: 1, References: []Reference{Bootstrap{Draws: 799}}})
	if err != nil {
		t.Fatal(err)
	}
	if sim := r.Others[0].Simulation; r.Exact.P < sim.Lower || r.Exact.P > sim.Upper {
		t.Errorf("exact %g, simulated %g to %g", r.Exact.P, sim.Lower, sim.Upper)
	}
	if _, err := ResidualVariances(Samples{{1, 2}, {3}}); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	tied, err := ResidualVariances(Samples{{1, 2}, {3, 3}})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := tied.Maximize(bg); !errors.Is(err, ErrUnbounded) {
		t.Errorf("%v", err)
	}
}
