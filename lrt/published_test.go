package lrt

import (
	"errors"
	"math"
	"strings"
	"testing"

	"subsume.example/dist"
)

// Leukaemia remission (Freireich and others 1963): the likelihood ratio of
// equal exponential means, with the Bartlett keys only where fixed numbers of
// events are declared.
func TestPublishedRemission(t *testing.T) {
	f := load(t, "lrt-exponential-remission")
	weeks, relapse := f.column(t, "weeks"), f.column(t, "relapse")
	var e Exposure
	e.Events, e.Time = make([]float64, 2), make([]float64, 2)
	for i, g := range f.Columns["group"] {
		j := 0
		if g == "6-MP" {
			j = 1
		}
		e.Events[j] += relapse[i]
		e.Time[j] += weeks[i]
	}
	for _, fixed := range []bool{false, true} {
		full, err := ExponentialMeans(e, fixed)
		if err != nil {
			t.Fatal(err)
		}
		small := mustRestrict(t, full, Equate("mean[1]", "mean[2]"))
		r, err := Compare(bg, small, full, nil)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "−2 log λ", r.Statistic, f.exact(t, "lrt")[0], 1e-12)
		near(t, "p", r.ChiSquared.P/f.exact(t, "p")[0], 1, 1e-11)
		for j, m := range f.exact(t, "means") {
			near(t, "mean", r.Pair.Full.Estimate[j], m, 1e-12)
		}
		if len(r.Pair.Full.Warnings)+len(r.Pair.Restricted.Warnings) > 0 {
			t.Errorf("%v", r.Warnings)
		}
		r, err = Compare(bg, small, full, &Settings{References: []Reference{Bartlett{}}})
		if !fixed {
			if !errors.Is(err, ErrCensored) {
				t.Errorf("the correction of censored data is not refused: %v", err)
			}
			if _, err := Compare(bg, small, full, &Settings{References: []Reference{Bootstrap{Draws: 9}}}); !errors.Is(err, ErrSimulation) {
				t.Errorf("%v", err)
			}
			continue
		}
		if err != nil {
			t.Fatal(err)
		}
		near(t, "corrected", r.Others[0].Statistic, f.exact(t, "lrt_bartlett")[0], 1e-12)
		near(t, "p corrected", r.Others[0].P/f.exact(t, "p_bartlett")[0], 1, 1e-11)
		near(t, "factor", r.Statistic/r.Others[0].Statistic, f.exact(t, "bartlett_factor")[0], 1e-13)
		if r.Exact.Kind != Exact || r.Recommended != Exact || r.Exact.Law != (dist.F{D1: 42, D2: 18}) {
			t.Errorf("%+v", r.Exact)
		}
	}
}

// Asbestos fibres (Rice 2007): equal Poisson means.
func TestPublishedAsbestos(t *testing.T) {
	f := load(t, "lrt-poisson-asbestos")
	counts := f.column(t, "count")
	ones := make([]float64, len(counts))
	for i := range ones {
		ones[i] = 1
	}
	full, err := PoissonRates(Exposure{counts, ones})
	if err != nil {
		t.Fatal(err)
	}
	small := mustRestrict(t, full, Equate(Names("rate", len(counts))...))
	r, err := Compare(bg, small, full, &Settings{References: []Reference{ScoreTest{}}})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "−2 log λ", r.Statistic, f.exact(t, "lrt")[0], 1e-12)
	near(t, "df", r.Pair.DF, f.exact(t, "df")[0], 0)
	near(t, "p", r.ChiSquared.P, f.exact(t, "p")[0], 1e-11)
	near(t, "mean", r.Pair.Restricted.Estimate[0], f.exact(t, "mean")[0], 1e-12)
	near(t, "dispersion", r.Others[0].Statistic, f.exact(t, "dispersion_pearson")[0], 1e-11)
}

// Mendel's peas (Rice 2007): probabilities given completely.
func TestPublishedPeas(t *testing.T) {
	f := load(t, "lrt-mendel-peas")
	full, err := Multinomial(f.column(t, "count"))
	if err != nil {
		t.Fatal(err)
	}
	var rs []Restriction
	for i, v := range []float64{9, 3, 3, 1} {
		rs = append(rs, Fix(Names("p", 4)[i], v/16))
	}
	r, err := Compare(bg, mustRestrict(t, full, rs...), full, &Settings{References: []Reference{ScoreTest{}, Bartlett{}}})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "−2 log λ", r.Statistic, f.exact(t, "lrt")[0], 1e-12)
	near(t, "Pearson", r.Others[0].Statistic, f.exact(t, "pearson")[0], 1e-11)
	near(t, "p", r.ChiSquared.P, f.exact(t, "p_lrt")[0], 1e-11)
	near(t, "p of Pearson", r.Others[0].P, f.exact(t, "p_pearson")[0], 1e-11)
	near(t, "df", r.Pair.DF, f.exact(t, "df")[0], 0)
	// Williams (1976): 1 + (16/9 + 16/3 + 16/3 + 16 − 1)/(6·556·3).
	near(t, "factor", r.Statistic/r.Others[1].Statistic, 1+(16./9+32./3+16-1)/(6*556*3), 1e-12)
}

// One-parameter genetic models: Hardy-Weinberg (Rice 2007) and linkage (Rao 1973).
func TestPublishedGenetics(t *testing.T) {
	for _, c := range []struct {
		file string
		cell func(v float64, p []float64)
	}{
		{"lrt-hw-hongkong", func(v float64, p []float64) { p[0], p[1], p[2] = (1-v)*(1-v), 2*v*(1-v), v*v }},
		{"lrt-linkage-rao", func(v float64, p []float64) { p[0], p[1], p[2], p[3] = (2+v)/4, (1-v)/4, (1-v)/4, v/4 }},
	} {
		t.Run(c.file, func(t *testing.T) {
			f := load(t, c.file)
			counts := f.column(t, "count")
			full, err := Multinomial(counts)
			if err != nil {
				t.Fatal(err)
			}
			small := mustRestrict(t, full, Via(Map{Params: []Param{Unit("theta")}, To: func(phi, p []float64) { c.cell(phi[0], p) }}))
			r, err := Compare(bg, small, full, &Settings{References: []Reference{ScoreTest{}}})
			if err != nil {
				t.Fatal(err)
			}
			near(t, "−2 log λ", r.Statistic, f.exact(t, "lrt")[0], 2e-12) // a difference of log likelihoods of about 10
			near(t, "Pearson", r.Others[0].Statistic, f.exact(t, "pearson")[0], 1e-7)
			near(t, "p", r.ChiSquared.P, f.exact(t, "p_lrt")[0], 1e-11)
			near(t, "df", r.Pair.DF, f.exact(t, "df")[0], 0)
			e, err := small.Estimates(bg, r.Pair.Restricted)
			if err != nil {
				t.Fatal(err)
			}
			near(t, "theta", e.Value[0], f.exact(t, "theta")[0], 1e-8)
			key := "se_theta"
			if _, ok := f.Expected["se_theta_observed"]; ok {
				key = "se_theta_observed"
			}
			near(t, "standard error", e.StdErr[0], f.exact(t, key)[0], 1e-7)
			if _, ok := f.Expected["lrt_no_linkage"]; ok {
				r, err := Compare(bg, mustRestrict(t, small, Fix("theta", 0.25)), small, nil)
				if err != nil {
					t.Fatal(err)
				}
				near(t, "no linkage", r.Statistic, f.exact(t, "lrt_no_linkage")[0], 2e-12)
			}
		})
	}
}

// Contingency tables: aspirin (1988) and melanoma (Roberts and others 1981).
func TestPublishedTables(t *testing.T) {
	for _, c := range []struct {
		file string
		rows int
	}{{"table-aspirin-attack", 2}, {"table-melanoma", 4}} {
		t.Run(c.file, func(t *testing.T) {
			f := load(t, c.file)
			counts := f.column(t, "count")
			cols := len(counts) / c.rows
			var table [][]float64
			for i := range c.rows {
				table = append(table, counts[i*cols:i*cols+cols])
			}
			ct, err := NewCrossTable(table)
			if err != nil {
				t.Fatal(err)
			}
			small, err := ct.Independent()
			if err != nil {
				t.Fatal(err)
			}
			r, err := Compare(bg, small, ct.Full(), &Settings{References: []Reference{ScoreTest{}, Bartlett{}}})
			if err != nil {
				t.Fatal(err)
			}
			// The statistic is a difference of log likelihoods near 50 with lgamma constants of 2e5: aspirin keeps 1e-11.
			near(t, "−2 log λ", r.Statistic, f.exact(t, "likelihood_ratio")[0], 1e-11)
			near(t, "Pearson", r.Others[0].Statistic, f.exact(t, "pearson")[0], 1e-10)
			near(t, "df", r.Pair.DF, f.exact(t, "df")[0], 0)
			near(t, "p", r.ChiSquared.P/f.exact(t, "p_likelihood_ratio")[0], 1, 1e-10)
			near(t, "p of Pearson", r.Others[0].P/f.exact(t, "p_pearson")[0], 1, 1e-9)
			for i, want := range f.exact(t, "fitted") {
				near(t, "fitted", r.Pair.Restricted.Estimate[i]*float64(r.Pair.Full.N), want, 1e-12)
			}
			if _, ok := f.Expected["williams_q"]; ok {
				near(t, "corrected", r.Others[1].Statistic, f.exact(t, "likelihood_ratio_williams")[0], 1e-11)
				if r.Exact.Kind != Exact || r.Exact.P > 1e-6 || r.Exact.P < 1e-7 {
					t.Errorf("%+v", r.Exact)
				}
			} else if r.Exact.Kind != None || !strings.Contains(r.Exact.Why, "2×2") {
				t.Errorf("%+v", r.Exact)
			}
		})
	}
}

// The lady tasting tea (Fisher 1935): 3 of 4 cups right each way. Tables with λ as
// small are the diagonal ones: p = (1 + 16 + 16 + 1)/70.
func TestExactTable(t *testing.T) {
	ct, err := NewCrossTable([][]float64{{3, 1}, {1, 3}})
	if err != nil {
		t.Fatal(err)
	}
	small, err := ct.Independent()
	if err != nil {
		t.Fatal(err)
	}
	r, err := Compare(bg, small, ct.Full(), nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "p", r.Exact.P, 34.0/70, 1e-13)
}

// Two Poisson counts, 2 and 9 in equal times: given 11, counts as unlikely are
// 0, 1, 2, 9, 10, 11 of binomial(11, ½).
func TestExactPoissonPair(t *testing.T) {
	full, err := PoissonRates(Exposure{[]float64{2, 9}, []float64{1, 1}})
	if err != nil {
		t.Fatal(err)
	}
	r, err := Compare(bg, mustRestrict(t, full, Equate("rate[1]", "rate[2]")), full, nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "p", r.Exact.P, 2*(1+11+55)/2048.0, 1e-13)
	// No event in a group is a boundary, not a failure.
	full, err = PoissonRates(Exposure{[]float64{0, 9}, []float64{2, 3}})
	if err != nil {
		t.Fatal(err)
	}
	r, err = Compare(bg, mustRestrict(t, full, Equate("rate[1]", "rate[2]")), full, nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "−2 log λ", r.Statistic, -18*math.Log(0.6), 1e-12)
	// All 9 in a time share of 0.6; as unlikely on the other side only counts with a larger λ deficit.
	if !(r.Exact.P >= math.Pow(0.6, 9)) {
		t.Errorf("p = %g", r.Exact.P)
	}
}

func TestLibrarySpacesRefuseBadData(t *testing.T) {
	bad := func(err error) {
		t.Helper()
		if !errors.Is(err, ErrInvalid) {
			t.Errorf("error %v", err)
		}
	}
	nan := math.NaN()
	for _, e := range []Exposure{{}, {[]float64{1}, nil}, {[]float64{-1, 2}, []float64{1, 1}}, {[]float64{1.5, 2}, []float64{1, 1}}, {[]float64{nan, 2}, []float64{1, 1}}, {[]float64{1, 2}, []float64{0, 1}}, {[]float64{1, 2}, []float64{math.Inf(1), 1}}} {
		_, err := PoissonRates(e)
		bad(err)
		_, err = ExponentialMeans(e, true)
		bad(err)
	}
	_, err := ExponentialMeans(Exposure{[]float64{0, 2}, []float64{1, 1}}, true)
	bad(err)
	for _, c := range [][]float64{nil, {1}, {0, 0}, {1, -1}, {1, 1.5}, {1, nan}, {1, math.Inf(1)}} {
		_, err := Multinomial(c)
		bad(err)
	}
	for _, c := range [][][]float64{nil, {{1, 2}}, {{1}, {2}}, {{1, 2}, {3}}, {{1, 0}, {2, 0}}, {{0, 0}, {2, 1}}, {{1, 2}, {3, nan}}} {
		_, err := NewCrossTable(c)
		bad(err)
	}
}

// Closed forms of the library's spaces against numerical fits of the same likelihood.
func TestLibraryClosedForms(t *testing.T) {
	r := draw(8)
	for trial := range 30 {
		k := 3 + r.IntN(3)
		e := Exposure{make([]float64, k), make([]float64, k)}
		for i := range k {
			e.Events[i], e.Time[i] = float64(1+r.IntN(20)), r.ExpFloat64()*math.Pow(10, float64(r.IntN(17)-8))
		}
		m, err := Multinomial(e.Events)
		if err != nil {
			t.Fatal(err)
		}
		exp, err := ExponentialMeans(e, true)
		if err != nil {
			t.Fatal(err)
		}
		poi, err := PoissonRates(e)
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range []struct {
			full *Declared
			name string
		}{{m, "p"}, {exp, "mean"}, {poi, "rate"}} {
			n := Names(c.name, k)
			for _, rs := range [][]Restriction{nil, {Equate(n[0], n[1])}, {Equate(n[:3]...)}, {Fix(n[1], 0.125)}, {Fix(n[1], 0.125), Equate(n[0], n[2])}} {
				s := mustRestrict(t, c.full, rs...)
				solved, err := s.Maximize(bg)
				if err != nil {
					t.Fatal(err)
				}
				if s.closedForm() == nil || len(solved.Warnings) > 0 {
					t.Fatalf("%v: closed form missing or refused: %v", s, solved.Warnings)
				}
				bare := *s.core
				bare.closedAt = nil
				fitted, err := (&Declared{core: &bare, frame: s.frame}).Maximize(bg)
				if err != nil {
					t.Fatalf("%v: %v", s, err)
				}
				if d := math.Abs(fitted.LogLikelihood - solved.LogLikelihood); d > 1e-8+4*epsilon*math.Abs(solved.LogLikelihood) {
					t.Errorf("trial %d, %v: closed %.12g, fitted %.12g", trial, s, solved.LogLikelihood, fitted.LogLikelihood)
				}
			}
		}
	}
}
