package lawtest

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/dist"
)

// Law is the whole method set that the laws of package dist share.
type Law interface {
	dist.Law
	LogCDF(x float64) float64
	Prob(x float64) float64
	LogProb(x float64) float64
	Quantile(p float64) float64
	Mean() float64
	Variance() float64
	Rand(src rand.Source) float64
}

// Settings tunes the checks. Nil and zero fields mean the defaults.
type Settings struct {
	// Points where the law is examined, ascending; default the quantiles of a range of tail
	// probabilities from 1e-12 on both sides.
	Points []float64
	// Tolerance is the relative error that the law claims for its tails; default 1e-13. The
	// density is integrated to 1e-9 or ten times the tolerance if that is more.
	Tolerance float64
	// Smallest tail probability whose quantile is examined; default 1e-300.
	Smallest float64
	// Atom is set for a law that has a point mass at the lower end of its support.
	Atom bool
	// Draws for the moments and the goodness of fit; default 20000.
	Draws int
	// Seed of the draws; default 1.
	Seed uint64
	// Invalid holds values of the law with parameters outside their range.
	Invalid []Law
}

func (s *Settings) defaults() Settings {
	var c Settings
	if s != nil {
		c = *s
	}
	if c.Tolerance == 0 {
		c.Tolerance = 1e-13
	}
	if c.Smallest == 0 {
		c.Smallest = 1e-300
	}
	if c.Draws == 0 {
		c.Draws = 20000
	}
	if c.Seed == 0 {
		c.Seed = 1
	}
	return c
}

// Problem is one broken promise.
type Problem struct {
	Law    string  // String of the law
	Check  string  // name of the check, as in the package documentation
	X      float64 // where, NaN when it is about no point
	Detail string  // what was found and what was wanted
}

// Error says what is wrong.
func (p *Problem) Error() string {
	if math.IsNaN(p.X) {
		return fmt.Sprintf("%s: %s: %s", p.Law, p.Check, p.Detail)
	}
	return fmt.Sprintf("%s at %v: %s: %s", p.Law, p.X, p.Check, p.Detail)
}

// Check runs all checks on law and reports each problem by t.Error.
func Check(t testing.TB, law Law, settings *Settings) {
	t.Helper()
	for _, p := range Problems(law, settings) {
		t.Error(p)
	}
}

// Problems runs all checks on law and returns what is wrong with it, nil when nothing
// is. A law whose Validate fails is examined no further.
func Problems(law Law, settings *Settings) []*Problem {
	c := &checker{law: law, Settings: settings.defaults()}
	c.name = law.String()
	if !c.valid() {
		return c.problems
	}
	c.ends()
	c.choosePoints()
	c.values()
	c.inverses()
	c.extremes()
	c.density()
	c.variates()
	c.parallel()
	return c.problems
}

type checker struct {
	Settings
	law      Law
	name     string
	problems []*Problem
}

func (c *checker) add(check string, x float64, format string, args ...any) {
	const enough = 20 // of one kind
	n := 0
	for _, p := range c.problems {
		if p.Check == check {
			n++
		}
	}
	if n < enough {
		c.problems = append(c.problems, &Problem{c.name, check, x, fmt.Sprintf(format, args...)})
	}
}

func (c *checker) valid() bool {
	if c.name == "" {
		c.add("valid", math.NaN(), "String is empty")
	}
	for _, bad := range c.Invalid {
		if bad.Validate() == nil {
			c.add("valid", math.NaN(), "Validate of %v returned nil", bad)
		}
		for name, v := range map[string]float64{
			"CDF(1)": bad.CDF(1), "Survival(1)": bad.Survival(1), "LogCDF(1)": bad.LogCDF(1), "LogSurvival(1)": bad.LogSurvival(1),
			"Prob(1)": bad.Prob(1), "LogProb(1)": bad.LogProb(1), "Quantile(0.3)": bad.Quantile(0.3), "UpperQuantile(0.3)": bad.UpperQuantile(0.3),
			"Mean": bad.Mean(), "Variance": bad.Variance(), "Rand": bad.Rand(rand.NewPCG(1, 1)),
		} {
			if !math.IsNaN(v) {
				c.add("valid", math.NaN(), "%v: %s = %v, want NaN", bad, name, v)
			}
		}
	}
	if err := c.law.Validate(); err != nil {
		c.add("valid", math.NaN(), "Validate: %v", err)
		return false
	}
	return true
}

func (c *checker) ends() {
	l, inf, nan := c.law, math.Inf(1), math.NaN()
	want := func(check, call string, got, want float64) {
		if got != want && !(math.IsNaN(got) && math.IsNaN(want)) {
			c.add(check, nan, "%s = %v, want %v", call, got, want)
		}
	}
	for _, e := range []struct {
		call      string
		got, want float64
	}{
		{"CDF(-Inf)", l.CDF(-inf), 0}, {"CDF(+Inf)", l.CDF(inf), 1}, {"CDF(NaN)", l.CDF(nan), nan},
		{"Survival(-Inf)", l.Survival(-inf), 1}, {"Survival(+Inf)", l.Survival(inf), 0}, {"Survival(NaN)", l.Survival(nan), nan},
		{"LogCDF(-Inf)", l.LogCDF(-inf), -inf}, {"LogCDF(+Inf)", l.LogCDF(inf), 0}, {"LogCDF(NaN)", l.LogCDF(nan), nan},
		{"LogSurvival(-Inf)", l.LogSurvival(-inf), 0}, {"LogSurvival(+Inf)", l.LogSurvival(inf), -inf}, {"LogSurvival(NaN)", l.LogSurvival(nan), nan},
		{"Prob(-Inf)", l.Prob(-inf), 0}, {"Prob(+Inf)", l.Prob(inf), 0}, {"Prob(NaN)", l.Prob(nan), nan},
		{"LogProb(-Inf)", l.LogProb(-inf), -inf}, {"LogProb(+Inf)", l.LogProb(inf), -inf}, {"LogProb(NaN)", l.LogProb(nan), nan},
		{"Quantile(NaN)", l.Quantile(nan), nan}, {"Quantile(-0.1)", l.Quantile(-0.1), nan}, {"Quantile(1.1)", l.Quantile(1.1), nan},
		{"UpperQuantile(NaN)", l.UpperQuantile(nan), nan}, {"UpperQuantile(-0.1)", l.UpperQuantile(-0.1), nan}, {"UpperQuantile(1.1)", l.UpperQuantile(1.1), nan},
		{"CDF(Quantile(1))", l.CDF(l.Quantile(1)), 1}, {"Survival(UpperQuantile(0))", l.Survival(l.UpperQuantile(0)), 0},
	} {
		want("ends", e.call, e.got, e.want)
	}
	lo := l.Quantile(0)
	if !c.Atom {
		want("ends", "CDF(Quantile(0))", l.CDF(lo), 0)
	}
	want("ends", "UpperQuantile(1)", l.UpperQuantile(1), lo)
	want("ends", "UpperQuantile(0)", l.UpperQuantile(0), l.Quantile(1))
}

// choosePoints fills Points from quantiles.
func (c *checker) choosePoints() {
	if len(c.Points) > 0 {
		return
	}
	tails := []float64{1e-12, 1e-8, 1e-4, 1e-2, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5}
	add := func(x float64) {
		if x != 0 && math.Abs(x) < 1e-290 {
			return // too few bits for the checks of neighbours
		}
		if !math.IsInf(x, 0) && !math.IsNaN(x) && (len(c.Points) == 0 || x > c.Points[len(c.Points)-1]) {
			c.Points = append(c.Points, x)
		}
	}
	for _, p := range tails {
		add(c.law.Quantile(p))
	}
	for i := len(tails) - 2; i >= 0; i-- {
		add(c.law.UpperQuantile(tails[i]))
	}
}

func (c *checker) values() {
	l := c.law
	lastLo, lastUp := 0.0, 1.0
	slack := 1 + 4*c.Tolerance
	for _, x := range c.Points {
		lo, up, llo, lup, d, ld := l.CDF(x), l.Survival(x), l.LogCDF(x), l.LogSurvival(x), l.Prob(x), l.LogProb(x)
		for name, v := range map[string]float64{"CDF": lo, "Survival": up, "LogCDF": llo, "LogSurvival": lup, "Prob": d, "LogProb": ld} {
			if math.IsNaN(v) {
				c.add("range", x, "%s is NaN", name)
			}
		}
		if lo < 0 || lo > 1 || up < 0 || up > 1 || d < 0 || llo > 0 || lup > 0 {
			c.add("range", x, "CDF %v, Survival %v, Prob %v, LogCDF %v, LogSurvival %v", lo, up, d, llo, lup)
		}
		if !(math.Abs(lo+up-1) <= 0x1p-51) {
			c.add("sum", x, "CDF + Survival - 1 = %.3g", lo+up-1)
		}
		for _, p := range []struct {
			name   string
			v, log float64
		}{{"LogCDF", lo, llo}, {"LogSurvival", up, lup}, {"LogProb", d, ld}} {
			if p.v > 1e-300 && p.v < 1e300 {
				want := math.Log(p.v)
				if !(math.Abs(p.log-want) <= 4*c.Tolerance*(1+math.Abs(want))) {
					c.add("logs", x, "%s = %v, the logarithm of the value is %v", p.name, p.log, want)
				}
			}
		}
		if lo*slack < lastLo || up > lastUp*slack {
			c.add("monotone", x, "CDF %v after %v, Survival %v after %v", lo, lastLo, up, lastUp)
		}
		lastLo, lastUp = lo, up
	}
}

func (c *checker) inverses() {
	lo := c.law.Quantile(0)
	for _, x := range c.Points {
		d := c.law.Prob(x)
		if !(d > 0) || math.IsInf(d, 1) || c.Atom && x <= lo {
			continue
		}
		check := func(name string, tail, back float64) {
			if !(tail > 0 && tail <= 0.9) {
				return
			}
			allowed := 4*c.Tolerance*tail/d + 4*0x1p-52*math.Abs(x) + c.Tolerance*math.Abs(x)
			if !(math.Abs(back-x) <= allowed) {
				c.add("inverse", x, "%s(%v) = %v, off by %.3g, allowed %.3g", name, tail, back, back-x, allowed)
			}
		}
		p, q := c.law.CDF(x), c.law.Survival(x)
		check("Quantile", p, c.law.Quantile(p))
		check("UpperQuantile", q, c.law.UpperQuantile(q))
	}
}

func (c *checker) extremes() {
	ends := [2]float64{c.law.Quantile(0), c.law.Quantile(1)}
	for p := 1e-15; p >= c.Smallest; p *= 1e-15 {
		for _, e := range []struct {
			name  string
			x     float64
			tail  func(float64) float64
			upper bool
		}{{"Quantile", c.law.Quantile(p), c.law.CDF, false}, {"UpperQuantile", c.law.UpperQuantile(p), c.law.Survival, true}} {
			if math.IsNaN(e.x) {
				c.add("extremes", p, "%s(%g) is NaN", e.name, p)
				continue
			}
			if math.IsInf(e.x, 0) || math.Abs(e.x) < 1e-300 || c.Atom && !e.upper {
				continue // beyond the floats, or an atom
			}
			if e.x == ends[0] || e.x == ends[1] {
				// Right when no float inside the support has a tail as small.
				if inner := math.Nextafter(e.x, c.law.Quantile(0.5)); e.tail(inner) < p*(1-8*c.Tolerance) {
					c.add("extremes", e.x, "%s(%g) is the end of the support, the tail at %v is %g", e.name, p, inner, e.tail(inner))
				}
				continue
			}
			got := e.tail(e.x)
			// One ulp of x is worth x density/tail ulps of the tail.
			cond := math.Abs(e.x) * math.Exp(c.law.LogProb(e.x)-math.Log(p))
			if !(math.Abs(got/p-1) <= 8*c.Tolerance+4*0x1p-52*cond) {
				c.add("extremes", e.x, "the tail at %s(%g) is %g", e.name, p, got)
			}
		}
	}
}

// density integrates between neighbouring points, both tails below the middle being used so
// that nothing cancels more than it must.
func (c *checker) density() {
	tol := max(1e-9, 10*c.Tolerance)
	for i := 1; i < len(c.Points); i++ {
		a, b := c.Points[i-1], c.Points[i]
		if b-a < 1e-9*math.Abs(b) || math.IsInf(c.law.Prob(a), 1) {
			continue // too near, or a pole at the end of the support
		}
		want := c.law.CDF(b) - c.law.CDF(a)
		if c.law.Survival(b) < 0.5 {
			want = c.law.Survival(a) - c.law.Survival(b)
		}
		if !(want > 0) {
			continue
		}
		var got float64
		if a > 0 && b/a > 2 || b < 0 && a/b > 2 {
			// Steep laws live on a logarithmic scale.
			s := 1.0
			u, v := math.Log(math.Abs(a)), math.Log(math.Abs(b))
			if b < 0 {
				s, u, v = -1, v, u
			}
			got = integrate(func(w float64) float64 { x := s * math.Exp(w); return math.Abs(x) * c.law.Prob(x) }, u, v, want*tol/4)
		} else {
			got = integrate(c.law.Prob, a, b, want*tol/4)
		}
		if !(math.Abs(got-want) <= tol*want) {
			c.add("density", b, "the density from %v integrates to %v, the tails differ by %v", a, got, want)
		}
	}
}

func (c *checker) variates() {
	n := c.Draws
	draw := func() []float64 {
		src := rand.NewPCG(c.Seed, 0x9e3779b97f4a7c15)
		v := make([]float64, n)
		for i := range v {
			v[i] = c.law.Rand(src)
		}
		return v
	}
	v := draw()
	for i, w := range draw() {
		if math.Float64bits(w) != math.Float64bits(v[i]) {
			c.add("variates", math.NaN(), "draw %d differs when repeated from the same seed", i)
			return
		}
	}
	lo := c.law.Quantile(0)
	jitter := rand.New(rand.NewPCG(c.Seed, 3))
	u := make([]float64, n)
	sum := 0.0
	for i, x := range v {
		sum += x
		p := c.law.CDF(x)
		if c.Atom && x == lo {
			p *= jitter.Float64()
		}
		if !(p >= 0 && p <= 1) {
			c.add("variates", x, "draw %d has CDF %v", i, p)
			return
		}
		u[i] = p
	}
	ks, ad := Uniformity(u)
	// Limits of about 0.1 %: Kolmogorov's series, and Marsaglia and Marsaglia (2004) for A².
	if !(ks < 1.95) {
		c.add("variates", math.NaN(), "Kolmogorov-Smirnov √n D = %.3f of %d draws, limit 1.95", ks, n)
	}
	if !(ad < 6) {
		c.add("variates", math.NaN(), "Anderson-Darling A² = %.3f of %d draws, limit 6", ad, n)
	}
	if m, s := c.law.Mean(), c.law.Variance(); s > 0 && !math.IsInf(s, 1) && !math.IsNaN(m) {
		if z := (sum/float64(n) - m) / math.Sqrt(s/float64(n)); !(math.Abs(z) <= 6) {
			c.add("moments", math.NaN(), "the mean of %d draws is %v, Mean %v, Variance %v: %.1f standard errors", n, sum/float64(n), m, s, z)
		}
	}
}

func (c *checker) parallel() {
	if len(c.Points) == 0 {
		return
	}
	want := make([]float64, len(c.Points))
	for i, x := range c.Points {
		want[i] = c.law.Survival(x)
	}
	const workers = 4
	bad := make([]int, workers)
	done := make(chan struct{})
	for w := range workers {
		go func() {
			for i := range c.Points {
				j := (i + w*len(c.Points)/workers) % len(c.Points)
				if math.Float64bits(c.law.Survival(c.Points[j])) != math.Float64bits(want[j]) {
					bad[w]++
				}
			}
			done <- struct{}{}
		}()
	}
	for range workers {
		<-done
	}
	for _, b := range bad {
		if b > 0 {
			c.add("parallel", math.NaN(), "%d of %d values changed when several goroutines ask", b, len(c.Points))
		}
	}
}
