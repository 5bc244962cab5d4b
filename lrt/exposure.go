package lrt

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/dist"
)

// Exposure is what events in k groups come down to: the number of events of
// each group and the time (length, area) in which they happened.
type Exposure struct {
	Events []float64
	Time   []float64
}

// ErrCensored: a result holds only for data that are uncensored or stopped at
// fixed numbers of events, which the data were not declared to be.
var ErrCensored = errors.New("needs uncensored data or fixed numbers of events")

func (e Exposure) check(needEvents bool) error {
	if len(e.Events) == 0 || len(e.Events) != len(e.Time) {
		return fmt.Errorf("lrt: exposure: %w: %d numbers of events, %d times", ErrInvalid, len(e.Events), len(e.Time))
	}
	for i, d := range e.Events {
		switch {
		case !(d >= 0) || d != math.Trunc(d) || math.IsInf(d, 1):
			return fmt.Errorf("lrt: exposure: %w: group %d has %g events, want a whole number", ErrInvalid, i+1, d)
		case !(e.Time[i] > 0) || math.IsInf(e.Time[i], 1):
			return fmt.Errorf("lrt: exposure: %w: group %d has the time %g, want a positive number", ErrInvalid, i+1, e.Time[i])
		case needEvents && d == 0:
			return fmt.Errorf("lrt: exposure: %w: group %d has no event, so its mean has no estimate", ErrInvalid, i+1)
		}
	}
	return nil
}

func (e Exposure) totals() (d, t float64) { return sum(e.Events), sum(e.Time) }

// rateClosedFor solves spaces of rates in which some are equal and the rest
// free or fixed: pooled events over pooled time.
func rateClosedFor(e Exposure, s *Declared, invert bool) ([]float64, bool) {
	k := len(e.Events)
	names := make([]string, k)
	for i, p := range s.Params() {
		if i >= k {
			return nil, false
		}
		names[i] = p.Name
	}
	if len(s.Params()) != k || s.frame.lower != nil || s.frame.layer != nil {
		return nil, false
	}
	theta := make([]float64, k)
	done := make([]bool, k)
	free := 0
	for i := range k {
		if done[i] {
			continue
		}
		var d, t float64
		var members []int
		for j := i; j < k; j++ {
			if j == i || !done[j] && s.Implies(Equate(names[i], names[j])) {
				members = append(members, j)
				d, t = d+e.Events[j], t+e.Time[j]
			}
		}
		v := d / t
		if invert {
			v = t / d
		}
		one := make([]float64, k)
		one[i] = 1
		if left, rest, _ := s.frame.eq.reduce(one, 0); zero(left) {
			v = -rest
		} else {
			free++
		}
		for _, j := range members {
			theta[j], done[j] = v, true
		}
	}
	return theta, free == s.Free() // else equations beyond equality
}

// ExponentialMeans declares lifetimes of k groups that follow exponential laws
// with the parameters mean[1] … mean[k]. Events counts the lifetimes seen to
// their end and Time adds up all of them, censored ones included.
//
// fixedCounts declares that no lifetime is censored, or that each group was
// watched until a number of events fixed beforehand. Only then are known: the
// exact law for two groups (the ratio of the means is F with 2d₁ and 2d₂
// degrees of freedom), the law of λ free of nuisance parameters, and the
// Bartlett factor 1 + (Σ 1/dᵢ − 1/Σdᵢ)/(6(k − 1)) of equal means. Otherwise the
// correction is refused with ErrCensored, and no simulator is offered.
// Observations counts events.
func ExponentialMeans(e Exposure, fixedCounts bool) (*Declared, error) {
	if err := e.check(true); err != nil {
		return nil, err
	}
	e = Exposure{append([]float64(nil), e.Events...), append([]float64(nil), e.Time...)}
	k := len(e.Events)
	all := Equate(Names("mean", k)...)
	tested := func(r, f *Declared) bool { return f.Free() == k && r.Implies(all) && r.Free() == 1 }
	m := Model[Exposure]{
		Name:   "exponential means",
		Params: Block(k, Positive("mean")),
		LogLikelihood: func(e Exposure, th []float64) float64 {
			l := 0.0
			for i, d := range e.Events {
				l -= d*math.Log(th[i]) + e.Time[i]/th[i]
			}
			return l
		},
		Gradient: func(e Exposure, th, g []float64) {
			for i, d := range e.Events {
				g[i] = (e.Time[i]/th[i] - d) / th[i]
			}
		},
		Information: func(e Exposure, th, info []float64) {
			clear(info)
			for i, d := range e.Events {
				info[i*k+i] = d / (th[i] * th[i])
			}
		},
		Start: func(e Exposure) []float64 {
			th := make([]float64, k)
			for i, d := range e.Events {
				th[i] = e.Time[i] / d
			}
			return th
		},
		ClosedFor: func(e Exposure, s *Declared) ([]float64, bool) { return rateClosedFor(e, s, true) },
		BartlettFactor: func(e Exposure, r, f *Declared, _ Pair) (float64, error) {
			if !fixedCounts {
				return 0, fmt.Errorf("%w: the Bartlett factor of exponential means", ErrCensored)
			}
			if !tested(r, f) || k < 2 {
				return 0, ErrNoFactor
			}
			s, d := 0.0, 0.0
			for _, v := range e.Events {
				s += 1 / v
				d += v
			}
			return 1 + (s-1/d)/(6*float64(k-1)), nil
		},
		Exact: func(e Exposure, r, f *Declared, p Pair) (Test, error) {
			switch {
			case !tested(r, f) || k != 2:
				return Test{Why: "an exact law is known for the equality of two means"}, nil
			case !fixedCounts:
				return Test{Why: "the exact law " + ErrCensored.Error()}, nil
			}
			n, m := e.Events[0], e.Events[1]
			t := Test{Kind: Exact, Name: "ratio of means", Statistic: e.Time[0] / n / (e.Time[1] / m), Law: dist.F{D1: 2 * n, D2: 2 * m},
				Why: "the ratio of two exponential means has an F law; p is the probability of a λ as small, both tails"}
			t.P, t.LogP = BothTails(t.Law, func(x float64) float64 {
				w := n * x / (n*x + m)
				return n*math.Log(w*(n+m)/n) + m*math.Log((1-w)*(n+m)/m)
			}, t.Statistic)
			return t, nil
		},
	}
	if fixedCounts {
		m.Pivotal = tested
		m.Simulate = func(e Exposure, th []float64, src rand.Source) (Exposure, error) {
			out := Exposure{e.Events, make([]float64, k)}
			for i, d := range e.Events {
				out.Time[i] = th[i] / 2 * dist.ChiSquared{K: 2 * d}.Rand(src)
			}
			return out, nil
		}
	}
	d, _ := e.totals()
	return Bind(m, Observe(e, int(d)))
}

// PoissonRates declares counts of k groups that follow Poisson laws with the
// means rate[i]·Time[i], the times being fixed. The exact test of two equal rates
// is conditional on the total count: given it the first count is binomial, and p
// adds up the probabilities of all counts with a λ as small. Observations
// counts groups.
func PoissonRates(e Exposure) (*Declared, error) {
	if err := e.check(false); err != nil {
		return nil, err
	}
	e = Exposure{append([]float64(nil), e.Events...), append([]float64(nil), e.Time...)}
	k := len(e.Events)
	all := Equate(Names("rate", k)...)
	return Bind(Model[Exposure]{
		Name:   "Poisson rates",
		Params: Block(k, Positive("rate")),
		LogLikelihood: func(e Exposure, th []float64) float64 {
			l := 0.0
			for i, y := range e.Events {
				lg, _ := math.Lgamma(y + 1)
				l += xlogx(y, th[i]*e.Time[i]) - th[i]*e.Time[i] - lg
			}
			return l
		},
		Gradient: func(e Exposure, th, g []float64) {
			for i, y := range e.Events {
				g[i] = -e.Time[i]
				if y > 0 {
					g[i] += y / th[i]
				}
			}
		},
		Information: func(e Exposure, th, info []float64) {
			clear(info)
			for i := range th {
				info[i*k+i] = e.Time[i] / th[i]
			}
		},
		Start: func(e Exposure) []float64 {
			th := make([]float64, k)
			for i, y := range e.Events {
				th[i] = (y + 0.5) / e.Time[i]
			}
			return th
		},
		ClosedFor: func(e Exposure, s *Declared) ([]float64, bool) { return rateClosedFor(e, s, false) },
		Exact: func(e Exposure, r, f *Declared, p Pair) (Test, error) {
			if k != 2 || f.Free() != 2 || !r.Implies(all) || r.Free() != 1 {
				return Test{Why: "an exact law is known for the equality of two rates"}, nil
			}
			return exactPoissonPair(e, p), nil
		},
		Simulate: func(e Exposure, th []float64, src rand.Source) (Exposure, error) {
			out := Exposure{make([]float64, k), e.Time}
			r := rand.New(src)
			for i := range out.Events {
				out.Events[i] = poissonDraw(r, th[i]*e.Time[i])
			}
			return out, nil
		},
	}, Observe(e, k))
}

// xlogx is x log y, 0 for x = 0.
func xlogx(x, y float64) float64 {
	if x == 0 {
		return 0
	}
	return x * math.Log(y)
}

func exactPoissonPair(e Exposure, p Pair) Test {
	n, time := e.totals()
	q := e.Time[0] / time
	t := Test{Kind: Exact, Name: "count given the total", Statistic: e.Events[0],
		Why: fmt.Sprintf("given the total of %g the first count is binomial with probability %.6g under equal rates; p is the probability of a λ as small", n, q)}
	if n > 1e7 {
		return Test{Why: "the total count is too large for an exact sum, and χ² is good there"}
	}
	half := func(y float64) float64 { return xlogx(y, y/(n*q)) + xlogx(n-y, (n-y)/(n*(1-q))) }
	seen := half(e.Events[0]) * (1 - 1e-12)
	ln, _ := math.Lgamma(n + 1)
	// The terms fall on both sides of their top: sum what is as small, from logs.
	top := -inf
	var logs []float64
	for y := 0.0; y <= n; y++ {
		if half(y) < seen {
			continue
		}
		a, _ := math.Lgamma(y + 1)
		b, _ := math.Lgamma(n - y + 1)
		l := ln - a - b + xlogx(y, q) + xlogx(n-y, 1-q)
		logs = append(logs, l)
		top = math.Max(top, l)
	}
	s := 0.0
	for _, l := range logs {
		s += math.Exp(l - top)
	}
	t.LogP = math.Min(0, top+math.Log(s))
	t.P = math.Exp(t.LogP)
	return t
}

// poissonDraw draws a count: by waiting times for small means, by splitting off
// a gamma waiting time (Ahrens and Dieter 1974) for larger ones.
func poissonDraw(r *rand.Rand, mu float64) float64 {
	n := 0.0
	for mu > 15 {
		m := math.Floor(mu * 7 / 8)
		x := dist.ChiSquared{K: 2 * m}.Rand(r) / 2 // the waiting time of the m-th event
		if x > mu {
			for range int(m) - 1 {
				if r.Float64()*x < mu {
					n++
				}
			}
			return n
		}
		n += m
		mu -= x
	}
	for t := r.ExpFloat64(); t < mu; t += r.ExpFloat64() {
		n++
	}
	return n
}
