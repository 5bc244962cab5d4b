package lrt

import (
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mathext"
	"subsume.example/dist"
)

// Samples are the values of k groups.
type Samples [][]float64

// check copies the samples, refusing what a law on the positive half line
// (positive set) or on the line cannot have.
func (s Samples) check(what string, least int, positive bool) (Samples, int, error) {
	fail := func(format string, args ...any) (Samples, int, error) {
		return nil, 0, fmt.Errorf("lrt: %s: %w: "+format, append([]any{what, ErrInvalid}, args...)...)
	}
	if len(s) == 0 {
		return fail("no groups")
	}
	out, n := make(Samples, len(s)), 0
	for g, x := range s {
		if len(x) < least {
			return fail("group %d has %d values, want at least %d", g+1, len(x), least)
		}
		for i, v := range x {
			if math.IsNaN(v) || math.IsInf(v, 0) || positive && v <= 0 {
				return fail("group %d, value %d is %g", g+1, i+1, v)
			}
		}
		out[g] = append([]float64(nil), x...)
		n += len(x)
	}
	return out, n, nil
}

// equalBlock reports whether the space makes all of name[1] … name[k] equal.
func equalBlock(s *Declared, name string, k int) bool { return s.Implies(Equate(Names(name, k)...)) }

// moments are the sizes, means and sums of squares about the mean.
func (s Samples) moments() (n, mean, ss []float64) {
	for _, x := range s {
		m := x[0]
		d := make([]float64, len(x))
		for i, v := range x {
			d[i] = v - m
		}
		m += sum(d) / float64(len(x))
		for i, v := range x {
			e := v - m
			d[i] = e * e
		}
		n, mean, ss = append(n, float64(len(x))), append(mean, m), append(ss, sum(d))
	}
	return n, mean, ss
}

// NormalSamples declares normal samples with the parameters mean[1] … mean[k] and
// sd[1] … sd[k]. Closed forms: everything free; all sd equal; all mean and all
// sd equal; fixed sd. Exact tests: equal sd for two groups (the variance ratio, both tails of
// λ), equal means where both spaces have equal sd (F). The Bartlett factor of
// equal sd is exact in the mean. Equal means under free sd has no closed form
// and no exact law; it is fitted and simulated. A group needs two different
// values, else its fit is ErrUnbounded.
func NormalSamples(s Samples) (*Declared, error) {
	s, total, err := s.check("normal samples", 1, false)
	if err != nil {
		return nil, err
	}
	k := len(s)
	sdEqual := func(r, f *Declared) bool { // sd equal against sd free, means free in both
		return f.Free() == 2*k && r.Free() == k+1 && equalBlock(r, "sd", k)
	}
	meanEqual := func(r, f *Declared) bool { // under equal sd
		return f.Free() == k+1 && r.Free() == 2 && equalBlock(f, "sd", k) && equalBlock(r, "sd", k) && equalBlock(r, "mean", k)
	}
	return Bind(Model[Samples]{
		Name:   "normal samples",
		Params: append(Block(k, Real("mean")), Block(k, Positive("sd"))...),
		LogLikelihood: func(s Samples, th []float64) float64 {
			l := 0.0
			n, m, ss := s.moments()
			for g := range s {
				e := (m[g] - th[g]) / th[k+g]
				l -= n[g]*(math.Log(th[k+g])+0.5*math.Log(2*math.Pi)) + 0.5*(ss[g]/th[k+g]/th[k+g]+n[g]*e*e)
			}
			return l
		},
		Gradient: func(s Samples, th, grad []float64) {
			n, m, ss := s.moments()
			for g := range s {
				sd := th[k+g]
				e := (m[g] - th[g]) / sd
				grad[g] = n[g] * e / sd
				grad[k+g] = (ss[g]/sd/sd + n[g]*e*e - n[g]) / sd
			}
		},
		Start: func(s Samples) []float64 {
			n, m, ss := s.moments()
			th := make([]float64, 2*k)
			pooled := math.Sqrt(sum(ss) / sum(n))
			if !(pooled > 0) {
				pooled = 1
			}
			for g := range s {
				th[g], th[k+g] = m[g], math.Sqrt(ss[g]/n[g])
				if !(th[k+g] > 0) {
					th[k+g] = pooled
				}
			}
			return th
		},
		ClosedFor: func(s Samples, r *Declared) ([]float64, bool) {
			if r.frame.layer != nil || r.frame.lower != nil || len(r.frame.params) != 2*k {
				return nil, false
			}
			n, m, ss := s.moments()
			th := make([]float64, 2*k)
			copy(th, m)
			switch {
			case r.Free() == 2*k:
				for g := range s {
					if !(ss[g] > 0) {
						return nil, false // the fit says what is unbounded
					}
					th[k+g] = math.Sqrt(ss[g] / n[g])
				}
				return th, true
			case equalBlock(r, "sd", k) && r.Free() == k+1:
			case equalBlock(r, "sd", k) && equalBlock(r, "mean", k) && r.Free() == 2:
				grand := m[0]
				for g := range s {
					grand += n[g] / sum(n) * (m[g] - m[0])
				}
				for g := range s {
					th[g] = grand
					ss[g] += n[g] * (m[g] - grand) * (m[g] - grand)
				}
			default:
				return nil, false
			}
			sd := math.Sqrt(sum(ss) / sum(n))
			for g := range s {
				th[k+g] = sd
			}
			return th, sd > 0
		},
		Exact: func(s Samples, r, f *Declared, p Pair) (Test, error) {
			n, _, ss := s.moments()
			switch {
			case sdEqual(r, f) && k == 2 && n[0] > 1 && n[1] > 1:
				a, b := n[0]-1, n[1]-1
				t := Test{Kind: Exact, Name: "variance ratio", Statistic: ss[0] / a / (ss[1] / b), Law: dist.F{D1: a, D2: b},
					Why: "the ratio of two normal variances has an F law; p is the probability of a λ as small, both tails"}
				t.P, t.LogP = BothTails(t.Law, func(x float64) float64 {
					w := a * x / b // ratio of the sums of squares
					all := n[0] + n[1]
					return 0.5*n[0]*math.Log(w/(1+w)*all/n[0]) + 0.5*n[1]*math.Log(all/n[1]/(1+w))
				}, t.Statistic)
				return t, nil
			case meanEqual(r, f) && k > 1 && sum(n) > float64(k):
				d1, d2 := float64(k-1), sum(n)-float64(k)
				x := math.Expm1(p.statistic()/sum(n)) * d2 / d1
				t := Test{Kind: Exact, Name: "F", Statistic: x, Law: dist.F{D1: d1, D2: d2}, Why: whyF}
				t.P, t.LogP = tails(t.Law.Survival(x), x, t.Law.LogSurvival)
				return t, nil
			}
			return Test{Why: "exact laws are known for equal sd of two groups, and for equal means under equal sd"}, nil
		},
		BartlettFactor: func(s Samples, r, f *Declared, _ Pair) (float64, error) {
			if !sdEqual(r, f) || k < 2 {
				return 0, ErrNoFactor
			}
			// −2 log λ = N log(Σ SS/N) − Σ n log(SS/n); E log χ²(ν) = ψ(ν/2) + log 2.
			n, _, _ := s.moments()
			all := sum(n)
			mean := all * (mathext.Digamma((all-float64(k))/2) - math.Log(all/2))
			for _, v := range n {
				if v < 2 {
					return 0, ErrNoFactor
				}
				mean -= v * (mathext.Digamma((v-1)/2) - math.Log(v/2))
			}
			return mean / float64(k-1), nil
		},
		Pivotal: func(r, f *Declared) bool { return sdEqual(r, f) || meanEqual(r, f) },
		Simulate: func(s Samples, th []float64, src rand.Source) (Samples, error) {
			r := rand.New(src)
			return s.redraw(func(g int) float64 { return th[g] + th[k+g]*r.NormFloat64() }), nil
		},
	}, Observe(s, total))
}

func (s Samples) redraw(f func(g int) float64) Samples {
	out := make(Samples, len(s))
	for g, x := range s {
		out[g] = make([]float64, len(x))
		for i := range x {
			out[g][i] = f(g)
		}
	}
	return out
}

// LognormalSamples declares samples whose logarithms are normal, with the
// parameters of NormalSamples on the log scale; λ is that of the logarithms, and
// so are its exact laws. The log likelihood is that of the values themselves.
func LognormalSamples(s Samples) (*Declared, error) {
	s, _, err := s.check("lognormal samples", 1, true)
	if err != nil {
		return nil, err
	}
	logs, jacobian := make(Samples, len(s)), 0.0
	for g, x := range s {
		for _, v := range x {
			logs[g] = append(logs[g], math.Log(v))
			jacobian -= math.Log(v)
		}
	}
	d, err := NormalSamples(logs)
	if err != nil {
		return nil, err
	}
	c := *d.core
	c.name = "lognormal samples"
	logLik := c.logLik
	c.logLik = func(th []float64) float64 { return logLik(th) + jacobian }
	return &Declared{core: &c, frame: d.frame}, nil
}

// positiveModel is a two-parameter law on the positive half line, in each group.
func positiveModel(name string, params []Param, k int, term func(s Samples, g int, a, b float64) (l, da, db float64), start func(x []float64) (a, b float64), draw func(r *rand.Rand, a, b float64) float64) Model[Samples] {
	return Model[Samples]{
		Name:   name,
		Params: params,
		LogLikelihood: func(s Samples, th []float64) float64 {
			l := 0.0
			for g := range s {
				v, _, _ := term(s, g, th[g], th[k+g])
				l += v
			}
			return l
		},
		Gradient: func(s Samples, th, grad []float64) {
			for g := range s {
				_, grad[g], grad[k+g] = term(s, g, th[g], th[k+g])
			}
		},
		Start: func(s Samples) []float64 {
			th := make([]float64, 2*k)
			for g, x := range s {
				th[g], th[k+g] = start(x)
			}
			return th
		},
		Simulate: func(s Samples, th []float64, src rand.Source) (Samples, error) {
			r := rand.New(src)
			return s.redraw(func(g int) float64 { return draw(r, th[g], th[k+g]) }), nil
		},
	}
}

// WeibullSamples declares samples that follow Weibull laws with the parameters
// shape[1] … and scale[1] …: log density log(c/b) + (c − 1) log(x/b) − (x/b)^c.
// Free laws, equal shapes, and equal shapes and scales are solved by the one equation
// that the shape is a root of; other spaces are fitted numerically with their
// gradient. λ of equal shapes, or of equal
// shapes and scales, is pivotal (Thoman and Bain 1969), so that a Bootstrap is
// exact. A group needs two different values.
func WeibullSamples(s Samples) (*Declared, error) {
	s, total, err := s.check("Weibull samples", 1, true)
	if err != nil {
		return nil, err
	}
	k := len(s)
	m := positiveModel("Weibull samples", append(Block(k, Positive("shape")), Block(k, Positive("scale"))...), k,
		func(s Samples, g int, c, b float64) (l, dc, db float64) {
			lc := math.Log(c / b)
			for _, v := range s[g] {
				z := math.Log(v / b)
				w := math.Exp(c * z)
				l += lc + (c-1)*z - w
				dc += 1/c + z - z*w
				db += c / b * (w - 1)
			}
			return l, dc, db
		},
		func(x []float64) (shape, scale float64) { // moments of the logarithm: sd π/(c√6), mean log b − γ/c
			_, mean, ss := Samples{logsOf(x)}.moments()
			sd := math.Sqrt(ss[0] / float64(len(x)))
			if !(sd > 0) {
				sd = 1
			}
			shape = math.Pi / math.Sqrt(6) / sd
			return shape, math.Exp(mean[0] + 0.5772156649015329/shape)
		},
		func(r *rand.Rand, shape, scale float64) float64 {
			return scale * math.Pow(r.ExpFloat64(), 1/shape)
		})
	m.ClosedFor = weibullSolved
	m.Pivotal = func(r, f *Declared) bool {
		return f.Free() == 2*k && equalBlock(r, "shape", k) && (r.Free() == k+1 || r.Free() == 2 && equalBlock(r, "scale", k))
	}
	return Bind(m, Observe(s, total))
}

func logsOf(x []float64) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = math.Log(v)
	}
	return out
}

// GammaSamples declares samples that follow gamma laws with the parameters
// shape[1] … and scale[1] …: log density (a − 1) log x − x/b − a log b − log Γ(a).
// They are fitted numerically with their gradient. A group needs two different values.
func GammaSamples(s Samples) (*Declared, error) {
	s, total, err := s.check("gamma samples", 1, true)
	if err != nil {
		return nil, err
	}
	k := len(s)
	// The data enter through their sums alone.
	m := positiveModel("gamma samples", append(Block(k, Positive("shape")), Block(k, Positive("scale"))...), k,
		func(s Samples, g int, a, b float64) (l, da, db float64) {
			// About the mean and the largest likelihood of a mean, so that terms in a, which
			// can be a million for values that differ little, do not cancel each other.
			n := float64(len(s[g]))
			mean, lx := sum(s[g])/n, sum(logsOf(s[g]))
			r := mean / a / b
			l = gammaTop(a)*n - lx + a*sum(logsAbout(s[g], mean)) + n*a*(math.Log1p(r-1)-(r-1))
			return l, lx - n*(math.Log(b)+mathext.Digamma(a)), n * a * (r - 1) / b
		},
		func(x []float64) (shape, scale float64) { // Thom (1958): from log mean − mean log
			n := float64(len(x))
			mean := sum(x) / n
			d := math.Log(mean) - sum(logsOf(x))/n
			if !(d > 1e-12) {
				return 1, mean // equal values: the climb finds that there is no end
			}
			shape = (1 + math.Sqrt(1+4*d/3)) / (4 * d)
			return shape, mean / shape
		},
		func(r *rand.Rand, shape, scale float64) float64 {
			return scale / 2 * dist.ChiSquared{K: 2 * shape}.Rand(r)
		})
	// Where all values that a shape governs are equal the likelihood grows with it
	// without end, slowly enough for rounding to feign a maximum.
	inner := m.LogLikelihood
	m.LogLikelihood = func(s Samples, th []float64) float64 {
		for g, shape := range th[:k] {
			if shape > 1e10 && s.tied(func(other int) bool { return th[other] == th[g] }) {
				return inf
			}
		}
		return inner(s, th)
	}
	return Bind(m, Observe(s, total))
}

// gammaTop returns a log a − a − log Γ(a), from 16 up by the series DLMF 5.11.1.
func gammaTop(a float64) float64 {
	if a < 16 {
		lg, _ := math.Lgamma(a)
		return a*math.Log(a) - a - lg
	}
	q := 1 / (a * a)
	return 0.5*math.Log(a/(2*math.Pi)) - (1./12-q*(1./360-q*(1./1260-q/1680)))/a
}

// logsAbout returns log(x/m), to the last digits for values near m.
func logsAbout(x []float64, m float64) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		if d := (v - m) / m; math.Abs(d) < 0.5 {
			out[i] = math.Log1p(d)
		} else {
			out[i] = math.Log(v) - math.Log(m)
		}
	}
	return out
}

// tied reports whether in each group that is asked for all values are equal.
func (s Samples) tied(asked func(g int) bool) bool {
	for g, x := range s {
		if !asked(g) {
			continue
		}
		for _, v := range x {
			if v != x[0] {
				return false
			}
		}
	}
	return true
}
