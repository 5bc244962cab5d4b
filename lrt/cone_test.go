package lrt

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"subsume.example/dist"
)

// pairOfMeans is a bivariate normal mean with known covariance [1 ρ; ρ 1]/n.
func pairOfMeans(rho float64, lower float64) Model[[2]float64] {
	return Model[[2]float64]{
		Name:   "pair",
		Params: []Param{Between("a", lower, inf), Between("b", lower, inf)},
		LogLikelihood: func(y [2]float64, th []float64) float64 {
			u, v := y[0]-th[0], y[1]-th[1]
			return -0.5 * 10 * (u*u - 2*rho*u*v + v*v) / (1 - rho*rho)
		},
		Start: func([2]float64) []float64 { return []float64{0.5, 0.5} },
	}
}

func weights(t *testing.T, r Result) []float64 {
	t.Helper()
	law, ok := r.Boundary.Law.(dist.ChiBarSquared)
	if !ok {
		t.Fatalf("law %v; %s; warnings %v", r.Boundary.Law, r.ChiSquared.Why, r.Warnings)
	}
	return law.Weights
}

// Two means at or above 0: weights arccos(ρ)/2π, ½, the rest, whether the
// bound is the range's own or imposed; reversed where the null is the cone.
func TestConeOfTwoMeans(t *testing.T) {
	for _, rho := range []float64{-0.6, 0, 0.5, 0.9} {
		w0 := math.Acos(rho) / (2 * math.Pi)
		want := []float64{w0, 0.5, 0.5 - w0}
		for _, y := range [][2]float64{{0.4, 0.3}, {0.4, -0.1}, {-0.2, -0.5}} {
			free := mustBind(t, pairOfMeans(rho, -inf), y, 10)
			own := mustBind(t, pairOfMeans(rho, 0), y, 10)
			cone := mustRestrict(t, free, AtLeast("a", 0), AtLeast("b", 0))
			zeroOf := func(s *Declared) *Declared { return mustRestrict(t, s, Fix("a", 0), Fix("b", 0)) }
			for i, c := range []struct{ small, large *Declared }{{zeroOf(own), own}, {zeroOf(cone), cone}, {zeroOf(free), cone}, {cone, free}} {
				r, err := Compare(bg, c.small, c.large, nil)
				if err != nil {
					t.Fatal(err)
				}
				got := weights(t, r)
				for j := range 3 {
					k := j
					if i == 3 {
						k = 2 - j
					}
					if math.Abs(got[j]-want[k]) > 1e-5 {
						t.Errorf("ρ %g, y %v, case %d: weights %v, want %v", rho, y, i, got, want)
						break
					}
				}
				if r.ChiSquared.Kind != None || r.Recommended != Asymptotic || math.IsNaN(r.P()) {
					t.Errorf("χ² %v, recommended %v, p %g", r.ChiSquared, r.Recommended, r.P())
				}
			}
		}
	}
}

// An interior restriction beside one at the boundary adds a degree of freedom.
func TestConeWithInteriorRestriction(t *testing.T) {
	m := pairOfMeans(0.3, 0)
	m.Params[1].Lower = -inf
	full := mustBind(t, m, [2]float64{0.3, 0.4}, 10)
	r, err := Compare(bg, mustRestrict(t, full, Fix("a", 0), Fix("b", 0)), full, nil)
	if err != nil {
		t.Fatal(err)
	}
	if w := weights(t, r); len(w) != 3 || w[0] != 0 || math.Abs(w[1]-0.5) > 1e-12 {
		t.Errorf("weights %v, want 0, ½, ½", w)
	}
}

// randomGroups: a random effect of the groups in a normal one-way layout; the
// variance component may be 0.
func randomGroups(k, m int) Model[[]float64] {
	return Model[[]float64]{
		Name:   "random groups",
		Params: []Param{Real("mean"), Positive("between"), Positive("within")},
		LogLikelihood: func(y, th []float64) float64 {
			l := 0.0
			v, w := th[2], th[1]
			for g := range k {
				var s, ss float64
				for _, x := range y[g*m : g*m+m] {
					s += x - th[0]
				}
				for _, x := range y[g*m : g*m+m] {
					e := x - th[0] - s/float64(m)
					ss += e * e
				}
				total := v + float64(m)*w
				l -= 0.5 * (ss/v + s*s/float64(m)/total + float64(m-1)*math.Log(v) + math.Log(total) + float64(m)*math.Log(2*math.Pi))
			}
			return l
		},
		Start: func(y []float64) []float64 { return []float64{0, 1, 1} },
		Simulate: func(y, th []float64, src rand.Source) ([]float64, error) {
			r := rand.New(src)
			out := make([]float64, len(y))
			for g := range k {
				e := math.Sqrt(th[1]) * r.NormFloat64()
				for i := range m {
					out[g*m+i] = th[0] + e + math.Sqrt(th[2])*r.NormFloat64()
				}
			}
			return out, nil
		},
	}
}

func TestVarianceComponentAtZero(t *testing.T) {
	k, m := 6, 5
	boundary := 0
	for seed := range uint64(20) {
		r := draw(seed)
		y := make([]float64, k*m)
		for i := range y {
			y[i] = r.NormFloat64()
		}
		full := mustBind(t, randomGroups(k, m), y, k*m)
		small := mustRestrict(t, full, Fix("between", 0))
		res, err := Compare(bg, small, full, nil)
		if err != nil {
			t.Fatal(err)
		}
		if w := weights(t, res); w[0] != 0.5 || w[1] != 0.5 {
			t.Errorf("weights %v", w)
		}
		// Closed form (balanced layout, maximum likelihood): between > 0 iff SSB/k > SSW/(k(m−1)).
		var ssb, ssw, grand float64
		for _, v := range y {
			grand += v / float64(k*m)
		}
		for g := range k {
			var mean float64
			for _, v := range y[g*m : g*m+m] {
				mean += v / float64(m)
			}
			ssb += float64(m) * (mean - grand) * (mean - grand)
			for _, v := range y[g*m : g*m+m] {
				ssw += (v - mean) * (v - mean)
			}
		}
		n := float64(k * m)
		want := 0.0
		if a, b := ssb/float64(k), ssw/float64(k*(m-1)); a > b {
			want = n*math.Log((ssb+ssw)/n) - float64(k)*math.Log(a) - float64(k*(m-1))*math.Log(b)
		} else {
			boundary++
			if res.P() != 1 {
				t.Errorf("seed %d: p = %g at a statistic of 0", seed, res.P())
			}
			if !hasWarning(res.Pair.Full.Warnings, "boundary") {
				t.Errorf("seed %d: no boundary warning: %v", seed, res.Pair.Full.Warnings)
			}
		}
		if math.Abs(res.Statistic-want) > 1e-8 {
			t.Errorf("seed %d: −2 log λ = %.12g, want %.12g", seed, res.Statistic, want)
		}
	}
	if boundary < 5 || boundary > 18 {
		t.Errorf("%d of 20 at the boundary", boundary)
	}
}

func TestNuisanceOnBoundaryMakesNoClaim(t *testing.T) {
	// The between variance is estimated as 0 under both; the question is the mean.
	y := []float64{1, 2, 3, 1.5, 2.5, 2, 2.1, 1.9, 2, 3, 1, 2}
	full := mustBind(t, randomGroups(4, 3), y, 12)
	r, err := Compare(bg, mustRestrict(t, full, Fix("mean", 2.2)), full, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(r.Pair.Irregular, "nuisance parameter between") || r.ChiSquared.Kind != None || !math.IsNaN(r.P()) {
		t.Errorf("irregular %q, χ² %+v", r.Pair.Irregular, r.ChiSquared)
	}
}

// Critical values of ½χ²(k − 1) + ½χ²(k) (Kodde and Palm 1986, Table I).
func TestPublishedMixture(t *testing.T) {
	f := load(t, "lrt-chibar-a")
	for i, k := range f.column(t, "k") {
		law, _, err := (&Cone{Names: []string{"a"}, Covariance: []float64{1}, Interior: int(k) - 1}).law(bg, nil)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "5 %", law.UpperQuantile(0.05), f.exact(t, "critical_0.05")[i], 1e-10)
		near(t, "1 %", law.UpperQuantile(0.01), f.exact(t, "critical_0.01")[i], 1e-10)
	}
}

// Two bounds on one parameter, and bounds on parameters that are equal, are one edge.
func TestDependentEdges(t *testing.T) {
	free := mustBind(t, pairOfMeans(0.3, -inf), [2]float64{-0.2, 0.4}, 10)
	equal := mustRestrict(t, free, Equate("a", "b"))
	for _, c := range []struct{ small, full *Declared }{
		{mustRestrict(t, free, AtLeast("a", 0), AtMost("a", 3)), free},
		{mustRestrict(t, equal, AtLeast("a", 0), AtLeast("b", 0)), equal},
		{mustRestrict(t, equal, AtLeast("a", 0), AtLeast("b", 0.1)), equal},
	} {
		r, err := Compare(bg, c.small, c.full, nil)
		if err != nil {
			t.Fatal(err)
		}
		if w := weights(t, r); len(w) != 2 || w[0] != 0.5 {
			t.Errorf("%v: weights %v", c.small, w)
		}
	}
}
