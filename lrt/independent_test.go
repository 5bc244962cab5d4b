package lrt

import (
	"math"
	"os"
	"testing"
)

// The ready-made families against a second route that shares none of their code
// but the maximiser: a model declared here from the density alone, without
// derivatives, or the root of the profile's score by bisection. The log
// likelihoods must agree to 1e-8 and to rounding: 4 epsilon of their size, or of
// that of the terms where these are larger (counts of a million, 1e7). A
// data set has scale 1, 1e-8 or 1e8 and every other one has three observations.

// route is one fit of one data set by both ways.
type route struct {
	space     string
	got, want float64
	terms     float64 // their size, where it is more than that of the sum
}

func independently(t *testing.T, check func(t *testing.T, seed uint64, scale float64, three bool) []route) {
	t.Helper()
	sets := 40
	if os.Getenv("SUBSUME_LONG") == "1" {
		sets = 1000
	}
	scales := []float64{1, 1e-8, 1e8}
	worst, worstThree, fits := 0.0, 0.0, 0
	for i := range sets {
		scale, three := scales[i%3], i/3%2 == 0
		for _, r := range check(t, uint64(i)+1, scale, three) {
			fits++
			miss := math.Abs(r.got - r.want)
			if three {
				worstThree = math.Max(worstThree, miss)
			} else {
				worst = math.Max(worst, miss)
			}
			if !(miss <= 1e-8+4*epsilon*math.Max(r.terms, math.Abs(r.want))) {
				t.Errorf("data set %d, scale %g, three %v, %s: %.14g, independently %.14g, off by %.3g", i, scale, three, r.space, r.got, r.want, r.got-r.want)
			}
		}
	}
	t.Logf("%d data sets, %d fits, worst miss %.2g, of three observations %.2g", sets, fits, worst, worstThree)
}

// both fits s and the independent u.
func both(t *testing.T, space string, s, u Space) route {
	t.Helper()
	a, err := s.Maximize(bg)
	if err != nil {
		t.Errorf("%s: %v", space, err)
		return route{space, nan, nan, 0}
	}
	b, err := u.Maximize(bg)
	if err != nil {
		t.Errorf("%s, independently: %v", space, err)
	}
	return route{space, a.LogLikelihood, b.LogLikelihood, 0}
}

// closedBoth is both, where s must have a closed form that is not refused.
func closedBoth(t *testing.T, space string, s, u *Declared) route {
	t.Helper()
	if s.closedForm() == nil {
		t.Errorf("%s: no closed form", space)
	}
	return both(t, space, s, u)
}

// bisect finds where f, which falls through zero, does so; x is positive.
func bisect(f func(x float64) float64) float64 {
	lo, hi := -60.0, 60.0
	for range 200 {
		if mid := 0.5 * (lo + hi); f(math.Exp(mid)) > 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return math.Exp(0.5 * (lo + hi))
}

func sizes(three bool) (n, k int) {
	if three {
		return 3, 1
	}
	return 24, 2
}

func TestIndependentNormalAndLognormal(t *testing.T) {
	for _, name := range []string{"normal", "lognormal"} {
		t.Run(name, func(t *testing.T) {
			independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
				n, k := sizes(three)
				d := normalGroups(n, k, 2, scale, seed)
				declare, m := NormalSamples, normalModel(k, withStart)
				if name == "lognormal" {
					d = normalGroups(n, k, 2, 1, seed)
					for i, v := range d.y {
						d.y[i] = scale * math.Exp(v)
					}
					declare = LognormalSamples
					inner := m.LogLikelihood
					m.LogLikelihood = func(d grouped, th []float64) float64 {
						logs, j := grouped{logsOf(d.y), d.g, d.k}, 0.0
						for _, v := range logs.y {
							j += v
						}
						return inner(logs, th) - j
					}
					start := m.Start
					m.Start = func(d grouped) []float64 { return start(grouped{logsOf(d.y), d.g, d.k}) }
				}
				s, err := declare(d.samples(false))
				full, own := mustSpace(t, s, err), mustBind(t, m, d, n)
				out := []route{closedBoth(t, "free", full, own)}
				if k > 1 {
					sd := Equate(Names("sd", k)...)
					mean := Equate(Names("mean", k)...)
					out = append(out, closedBoth(t, "equal sd", mustRestrict(t, full, sd), mustRestrict(t, own, sd)),
						closedBoth(t, "equal", mustRestrict(t, full, sd, mean), mustRestrict(t, own, sd, mean)))
				}
				return out
			})
		})
	}
}

// positiveRoutes compares the numerical fits of a family on the half line, free
// and of one shape, with the profile of best over the samples that share a shape.
func positiveRoutes(t *testing.T, d *Declared, err error, s Samples, best func(Samples) float64) []route {
	t.Helper()
	full := mustSpace(t, d, err)
	want := 0.0
	for _, x := range s {
		want += best(Samples{x})
	}
	fit, err := full.Maximize(bg)
	if err != nil {
		t.Errorf("%v: %v", s, err)
		return nil
	}
	out := []route{{"free", fit.LogLikelihood, want, 0}}
	if len(s) > 1 {
		fit, err = mustRestrict(t, full, Equate(Names("shape", len(s))...)).Maximize(bg)
		if err != nil {
			t.Errorf("%v, one shape: %v", s, err)
			return out
		}
		out = append(out, route{"one shape", fit.LogLikelihood, best(s), 0})
	}
	return out
}

// The gamma shape solves Σ n (log a − ψ(a)) = Σ n (log mean − mean log).
func gammaBest(s Samples) float64 {
	want, total := 0.0, 0.0
	means := make([]float64, len(s))
	for g, x := range s {
		n := float64(len(x))
		means[g] = sum(x) / n
		for _, v := range x {
			want -= math.Log1p((v - means[g]) / means[g])
		}
		total += n
	}
	a := bisect(func(a float64) float64 { return total*(math.Log(a)-digammaForTest(a)) - want })
	// Nearly equal values have shapes of a million: nothing of that size may be left in the sum.
	lg, _ := math.Lgamma(a)
	top := a*math.Log(a) - a - lg
	if a > 200 {
		top = 0.5*math.Log(a/2/math.Pi) - 1/(12*a) + 1/(360*a*a*a)
	}
	l := total*top - a*want
	for _, x := range s {
		l -= sum(logsOf(x))
	}
	return l
}

// The Weibull shape solves Σ (n/c + Σ log x − n Σ x^c log x / Σ x^c) = 0.
func weibullBest(s Samples) float64 {
	logs := make([][]float64, len(s)) // about the largest, so that powers stay in [0, 1]
	tops := make([]float64, len(s))
	for g, x := range s {
		logs[g] = logsOf(x)
		tops[g] = logs[g][0]
		for _, v := range logs[g] {
			tops[g] = math.Max(tops[g], v)
		}
		for i := range logs[g] {
			logs[g][i] -= tops[g]
		}
	}
	powers := func(z []float64, c float64) (p, pz, all float64) {
		for _, v := range z {
			w := math.Exp(c * v)
			p, pz, all = p+w, pz+w*v, all+v
		}
		return p, pz, all
	}
	c := bisect(func(c float64) float64 {
		f := 0.0
		for _, z := range logs {
			n := float64(len(z))
			p, pz, all := powers(z, c)
			f += n/c + all - n*pz/p
		}
		return f
	})
	l := 0.0
	for g, z := range logs {
		n := float64(len(z))
		p, _, all := powers(z, c)
		// x/b = e^z/(p/n)^(1/c), density (c/x) (x/b)^c exp(−(x/b)^c)
		l += n*(math.Log(c)-tops[g]) - all + c*all - n*math.Log(p/n) - n
	}
	return l
}

func TestIndependentGammaAndWeibull(t *testing.T) {
	for _, f := range []struct {
		name    string
		declare func(Samples) (*Declared, error)
		best    func(Samples) float64
	}{{"gamma", GammaSamples, gammaBest}, {"Weibull", WeibullSamples, weibullBest}} {
		t.Run(f.name, func(t *testing.T) {
			independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
				n, k := sizes(three)
				s := gammaGroups(n, k, scale, seed).samples(false)
				d, err := f.declare(s)
				return positiveRoutes(t, d, err, s, f.best)
			})
		})
	}
}

// Spread and few values: two groups of three, the second of nearly equal ones.
func TestIndependentGammaAndWeibullOfTwoThrees(t *testing.T) {
	for _, f := range []struct {
		name    string
		declare func(Samples) (*Declared, error)
		best    func(Samples) float64
	}{{"gamma", GammaSamples, gammaBest}, {"Weibull", WeibullSamples, weibullBest}} {
		t.Run(f.name, func(t *testing.T) {
			independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
				s := gammaGroups(6, 2, scale, seed).samples(false)
				if !three {
					for i, v := range s[1] {
						s[1][i] = scale + 0.01*(v-scale)
					}
				}
				d, err := f.declare(s)
				return positiveRoutes(t, d, err, s, f.best)
			})
		})
	}
}

// plainRates is the likelihood of events in time from the formula, and a start
// that pools all groups.
func plainRates(k int, mean bool) Model[Exposure] {
	m := Model[Exposure]{Name: "rates", Params: Block(k, Positive("rate"))}
	if mean {
		m.Params = Block(k, Positive("mean"))
	}
	m.LogLikelihood = func(e Exposure, th []float64) float64 {
		l := 0.0
		for i, y := range e.Events {
			if mean {
				l -= y*math.Log(th[i]) + e.Time[i]/th[i]
				continue
			}
			lg, _ := math.Lgamma(y + 1)
			l += y*math.Log(th[i]*e.Time[i]) - th[i]*e.Time[i] - lg
		}
		return l
	}
	m.Start = func(e Exposure) []float64 {
		th := make([]float64, k)
		d, time := e.totals()
		for i := range th {
			th[i] = d / time
			if mean {
				th[i] = time / d
			}
		}
		return th
	}
	return m
}

func TestIndependentRates(t *testing.T) {
	for _, mean := range []bool{true, false} {
		name := map[bool]string{true: "mean", false: "rate"}[mean]
		t.Run(name, func(t *testing.T) {
			independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
				r := draw(seed)
				k := 3 + r.IntN(3)
				if three {
					k = 3 // one event in each
				}
				e := Exposure{make([]float64, k), make([]float64, k)}
				for i := range k {
					e.Events[i], e.Time[i] = 1, scale*r.ExpFloat64()
					if !three {
						e.Events[i] = float64(1 + r.IntN(20))
						e.Time[i] *= math.Exp(2 * r.NormFloat64())
					}
				}
				declare, n := PoissonRates, k
				if mean {
					declare = func(e Exposure) (*Declared, error) { return ExponentialMeans(e, true) }
				}
				d, err := declare(e)
				full, own := mustSpace(t, d, err), mustBind(t, plainRates(k, mean), e, n)
				names := Names(name, k)
				at := 1 / scale
				if mean {
					at = scale
				}
				out := []route{closedBoth(t, "free", full, own)}
				for _, c := range []struct {
					space string
					rs    []Restriction
				}{
					{"two equal", []Restriction{Equate(names[:2]...)}}, {"all equal", []Restriction{Equate(names...)}},
					{"one fixed", []Restriction{Fix(names[1], at)}}, {"fixed and equal", []Restriction{Fix(names[1], at), Equate(names[0], names[2])}},
				} {
					out = append(out, closedBoth(t, c.space, mustRestrict(t, full, c.rs...), mustRestrict(t, own, c.rs...)))
				}
				return out
			})
		})
	}
}

// Counts of a million make terms of 1e7 whose rounding hides the maximum from any
// search; the routes take y log(p n/y) instead, and add the maximum itself.
func ownMaximum(y []float64) float64 {
	l, n := 0.0, sum(y)
	for _, v := range y {
		lg, _ := math.Lgamma(v + 1)
		l -= lg
		if v > 0 {
			l += v * math.Log(v/n)
		}
	}
	lg, _ := math.Lgamma(n + 1)
	return l + lg
}

// sized notes the size of the terms of a likelihood of counts.
func sized(y []float64, out []route) []route {
	terms := 0.0
	for _, v := range y {
		terms += v * math.Log(sum(y))
	}
	for i := range out {
		out[i].terms = terms
	}
	return out
}

// plainCells is the multinomial in log odds against the last cell.
func plainCells(k int) Model[[]float64] {
	return Model[[]float64]{
		Name: "cells", Params: Block(k-1, Real("odds")),
		LogLikelihood: func(y, th []float64) float64 { return logOddsLikelihood(y, append(append([]float64(nil), th...), 0)) },
		Start:         func([]float64) []float64 { return make([]float64, k-1) },
	}
}

func logOddsLikelihood(y, odds []float64) float64 {
	all, l, top, n := 0.0, ownMaximum(y), odds[0], sum(y)
	for _, v := range odds {
		top = math.Max(top, v)
	}
	for _, v := range odds {
		all += math.Exp(v - top)
	}
	for i, v := range odds {
		if y[i] > 0 {
			l += y[i] * math.Log(math.Exp(v-top)/all*(n/y[i]))
		}
	}
	return l
}

// plainSimplex is the multinomial in probabilities that add up to one: it
// takes empty cells, which have no log odds.
func plainSimplex(t *testing.T, y []float64) *Declared {
	ones := make([]float64, len(y))
	n := 0.0
	for i, v := range y {
		ones[i] = 1
		n += v
	}
	d := mustBind(t, Model[[]float64]{
		Name: "simplex", Params: Block(len(y), Unit("p")),
		LogLikelihood: func(y, th []float64) float64 {
			l, n := ownMaximum(y), sum(y)
			for i, v := range y {
				if v > 0 {
					l += v * math.Log(th[i]*(n/v))
				}
			}
			return l
		},
		Start: func(y []float64) []float64 {
			th := make([]float64, len(y))
			for i := range th {
				th[i] = 1 / float64(len(y))
			}
			return th
		},
	}, y, int(n))
	return mustRestrict(t, d, Equations(Equation{Names("p", len(y)), ones, 1}))
}

func TestIndependentMultinomial(t *testing.T) {
	independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
		r := draw(seed)
		k := 3 + r.IntN(3)
		y := make([]float64, k)
		empty := false
		if three { // three events anywhere
			for range 3 {
				y[r.IntN(k)]++
			}
			empty = true
		} else {
			for i := range y { // the scale of a count is its size
				top := map[float64]float64{1: 20, 1e-8: 3, 1e8: 1e6}[scale]
				y[i] = math.Floor(r.Float64()*top) + 1
			}
		}
		d, err := Multinomial(y)
		full := mustSpace(t, d, err)
		simplex := plainSimplex(t, y)
		names := Names("p", k)
		out := []route{closedBoth(t, "free", full, simplex)}
		for _, c := range []struct {
			space string
			rs    []Restriction
		}{{"two equal", []Restriction{Equate(names[:2]...)}}, {"three equal", []Restriction{Equate(names[:3]...)}}, {"one fixed", []Restriction{Fix(names[1], 0.125)}}} {
			if k == 3 && c.space == "three equal" {
				continue // nothing is free
			}
			s := mustRestrict(t, full, c.rs...)
			if s.closedForm() == nil {
				// No event tells the free cells apart: there is no closed form.
				if three && c.space == "one fixed" && y[1] == 3 {
					continue
				}
				t.Errorf("%v, %s: no closed form", y, c.space)
				continue
			}
			out = append(out, both(t, c.space, s, mustRestrict(t, simplex, c.rs...)))
		}
		if !empty {
			own := mustBind(t, plainCells(k), y, int(sum(y)))
			out = append(out, closedBoth(t, "log odds", full, own),
				closedBoth(t, "log odds, two equal", mustRestrict(t, full, Equate(names[:2]...)), mustRestrict(t, own, Equate("odds[1]", "odds[2]"))))
		}
		return sized(y, out)
	})
}

// Independence: log odds of rows and of columns.
func TestIndependentTables(t *testing.T) {
	independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
		r := draw(seed)
		rows, cols := 2+r.IntN(3), 2+r.IntN(3)
		if three {
			rows, cols = 2, 2
		}
		table := make([][]float64, rows)
		for i := range table {
			table[i] = make([]float64, cols)
			for j := range table[i] {
				top := map[float64]float64{1: 20, 1e-8: 3, 1e8: 1e6}[scale]
				table[i][j] = math.Floor(r.Float64()*top) + 1
			}
		}
		if three { // one cell of four is empty
			for i := range 4 {
				table[i/2][i%2] = 1
			}
			e := r.IntN(4)
			table[e/2][e%2] = 0
		}
		tab, err := NewCrossTable(table)
		if err != nil {
			t.Fatal(err)
		}
		s, err := tab.Independent()
		if err != nil {
			t.Fatal(err)
		}
		var y []float64
		for _, v := range table {
			y = append(y, v...)
		}
		own := mustBind(t, Model[[]float64]{
			Name: "margins", Params: append(Block(rows-1, Real("row")), Block(cols-1, Real("column"))...),
			LogLikelihood: func(y, th []float64) float64 {
				odds := make([]float64, len(y))
				for i := range rows {
					for j := range cols {
						if i < rows-1 {
							odds[i*cols+j] += th[i]
						}
						if j < cols-1 {
							odds[i*cols+j] += th[rows-1+j]
						}
					}
				}
				return logOddsLikelihood(y, odds)
			},
			Start: func([]float64) []float64 { return make([]float64, rows+cols-2) },
		}, y, int(sum(y)))
		return sized(y, []route{closedBoth(t, "independent", s, own), closedBoth(t, "free", tab.Full(), plainSimplex(t, y))})
	})
}

// A log likelihood of −22 that is left of terms of 1e7: its rounding is a million times
// what its size suggests, and the search must find that out.
func TestLikelihoodOfCancellingTerms(t *testing.T) {
	for _, y := range [][]float64{{512345, 723456, 34567, 999999, 1}, {940893, 958731, 184057, 727686}, {224679, 36942, 344146, 112338, 306829}} {
		m := plainCells(len(y))
		m.LogLikelihood = func(y, th []float64) float64 {
			all, n, l := 1.0, 0.0, 0.0
			for i, v := range y {
				lg, _ := math.Lgamma(v + 1)
				l, n = l-lg, n+v
				if i < len(th) {
					l += v * th[i]
					all += math.Exp(th[i])
				}
			}
			lg, _ := math.Lgamma(n + 1)
			return l + lg - n*math.Log(all)
		}
		fit, err := mustBind(t, m, y, int(sum(y))).Maximize(bg)
		if want := ownMaximum(y); err != nil || !(math.Abs(fit.LogLikelihood-want) <= 1e-6) {
			t.Errorf("%v: %.10g, want %.10g, %v", y, fit.LogLikelihood, want, err)
		}
	}
}

// Two groups whose own shapes are 3 and some thousands start with a shape between, where
// the log likelihood is −1e38 and its curvature as large: what is taken there must
// not make the end of the search look level.
func TestNumericalWeibullFromFar(t *testing.T) {
	failed, all := 0, 0
	independently(t, func(t *testing.T, seed uint64, _ float64, _ bool) []route {
		all++
		if seed <= 3 {
			seed = []uint64{228, 816, 954}[seed-1]
		}
		s := gammaGroups(6, 2, 1e8, seed).samples(false)
		for i, v := range s[1] {
			s[1][i] = 1e8 + 0.01*(v-1e8)
		}
		d, err := WeibullSamples(s)
		full := mustSpace(t, d, err)
		bare := *full.core
		bare.closedAt = nil
		fit, err := mustRestrict(t, &Declared{core: &bare, frame: full.frame}, Equate("shape[1]", "shape[2]")).Maximize(bg)
		if err != nil { // an error says so; a wrong maximum does not
			failed++
			return nil
		}
		return []route{{"one shape", fit.LogLikelihood, weibullBest(s), 0}}
	})
	if t.Logf("%d of %d refused", failed, all); failed > 2+all/30 {
		t.Errorf("%d searches failed", failed)
	}
}
