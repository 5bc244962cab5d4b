package lrt

import (
	"fmt"
	"math"
	"sort"
	"testing"
	"time"

	"gonum.org/v1/gonum/diff/fd"
	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/optimize"
)

// gammaRace is one shape and scale for all against one each in k groups of
// equal size, with the logarithms taken beforehand.
type gammaRace struct {
	x, lx []float64
	calls *int
}

func newGammaRace(n int) gammaRace {
	d := gammaGroups(n, 5, 1, 42)
	r := gammaRace{calls: new(int)}
	for g := range 5 {
		for i, v := range d.y {
			if d.g[i] == g {
				r.x, r.lx = append(r.x, v), append(r.lx, math.Log(v))
			}
		}
	}
	return r
}

// each fills the terms (nil: only the sum) at natural shapes and scales.
func (d gammaRace) each(th, each []float64) float64 {
	*d.calls++
	k := len(th) / 2
	per := len(d.x) / k
	var s float64
	for j := range k {
		al, sc := th[j], th[k+j]
		ls := math.Log(sc)
		lg, _ := math.Lgamma(al)
		if each == nil {
			for i := j * per; i < (j+1)*per; i++ {
				s += (al-1)*d.lx[i] - d.x[i]/sc - al*ls - lg
			}
			continue
		}
		for i := j * per; i < (j+1)*per; i++ {
			each[i] = (al-1)*d.lx[i] - d.x[i]/sc - al*ls - lg
		}
	}
	return s
}

func (d gammaRace) gradient(th, g []float64) {
	k := len(th) / 2
	per := len(d.x) / k
	for j := range k {
		al, sc := th[j], th[k+j]
		ls, dg := math.Log(sc), mathext.Digamma(al)
		var a, b float64
		for i := j * per; i < (j+1)*per; i++ {
			a += d.lx[i] - ls - dg
			b += d.x[i]/sc - al
		}
		g[j], g[k+j] = a, b/sc
	}
}

func (d gammaRace) start(k int) []float64 {
	th := make([]float64, 2*k)
	per := len(d.x) / k
	for j := range k {
		th[j] = 1
		for _, v := range d.x[j*per : (j+1)*per] {
			th[k+j] += v / float64(per)
		}
	}
	return th
}

// peer is the plain route: gonum's BFGS on logarithms from the same start.
func (d gammaRace) peer(analytic bool) float64 {
	var best [2]float64
	for i, k := range []int{1, 5} {
		th := make([]float64, 2*k)
		natural := func(t []float64) []float64 {
			for j, v := range t {
				th[j] = math.Exp(v)
			}
			return th
		}
		f := func(t []float64) float64 { return -d.each(natural(t), nil) }
		p := optimize.Problem{Func: f, Grad: func(g, t []float64) { fd.Gradient(g, f, t, nil) }}
		if analytic {
			p.Grad = func(g, t []float64) {
				d.gradient(natural(t), g)
				for j := range g {
					g[j] *= -th[j]
				}
			}
		}
		t0 := d.start(k)
		for j, v := range t0 {
			t0[j] = math.Log(v)
		}
		r, err := optimize.Minimize(p, t0, &optimize.Settings{GradientThreshold: 1e-5}, &optimize.BFGS{})
		if err != nil && r == nil {
			panic(err)
		}
		best[i] = r.F
	}
	return 2 * (best[0] - best[1])
}

func (d gammaRace) model(with parts) Model[gammaRace] {
	m := Model[gammaRace]{
		Params:        append(Block(5, Positive("shape")), Block(5, Positive("scale"))...),
		LogLikelihood: func(d gammaRace, th []float64) float64 { return d.each(th, nil) },
		Start:         func(d gammaRace) []float64 { return d.start(5) },
	}
	if with&withEach != 0 {
		m.LogLikelihood = nil
		m.Each = func(d gammaRace, th, each []float64) { d.each(th, each) }
	}
	if with&withGradient != 0 {
		m.Gradient = func(d gammaRace, th, g []float64) { d.gradient(th, g) }
	}
	return m
}

// A declared comparison at default settings (both fits, curvature and
// degrees of freedom examined) beside gonum's BFGS on the two likelihoods alone.
func BenchmarkDeclaredGamma(b *testing.B) {
	d := newGammaRace(1000)
	want := d.peer(true)
	for _, c := range []struct {
		name string
		with parts
		peer bool
	}{{"each", withEach, false}, {"plain", 0, false}, {"gonum BFGS differences", 0, true}, {"gradient", withGradient, false}, {"gonum BFGS gradient", withGradient, true}} {
		b.Run(c.name, func(b *testing.B) {
			full := mustBind(b, d.model(c.with), d, 1000)
			small := mustRestrict(b, full, Equate(Names("shape", 5)...), Equate(Names("scale", 5)...))
			b.ReportAllocs()
			*d.calls = 0
			for b.Loop() {
				var got float64
				if c.peer {
					got = d.peer(c.with != 0)
				} else {
					r, err := Compare(bg, small, full, nil)
					if err != nil {
						b.Fatal(err)
					}
					got = r.Statistic
				}
				if math.Abs(got-want) > 1e-6 {
					b.Fatalf("%g, want %g", got, want)
				}
			}
			b.ReportMetric(float64(*d.calls)/float64(b.N), "calls/op")
		})
	}
}

// The same two routes turn by turn, so that a busy machine slows both: the
// metric x is the peer's time over ours.
func BenchmarkDeclaredRace(b *testing.B) {
	d := newGammaRace(1000)
	for _, c := range []struct {
		name     string
		with     parts
		analytic bool
	}{{"each against differences", withEach, false}, {"plain against differences", 0, false}, {"gradient against gradient", withGradient, true}} {
		b.Run(c.name, func(b *testing.B) {
			full := mustBind(b, d.model(c.with), d, 1000)
			small := mustRestrict(b, full, Equate(Names("shape", 5)...), Equate(Names("scale", 5)...))
			var ours, theirs []float64
			for b.Loop() {
				t := time.Now()
				if _, err := Compare(bg, small, full, nil); err != nil {
					b.Fatal(err)
				}
				u := time.Now()
				d.peer(c.analytic)
				ours, theirs = append(ours, u.Sub(t).Seconds()), append(theirs, time.Since(u).Seconds())
			}
			sort.Float64s(ours)
			sort.Float64s(theirs)
			b.ReportMetric(theirs[len(theirs)/2]/ours[len(ours)/2], "x")
		})
	}
}

// The bootstrap's draws are spread over workers.
func BenchmarkBootstrap(b *testing.B) {
	d := gammaGroups(200, 2, 1, 3)
	m := gammaModel(2, withStart|withEach)
	m.Simulate = simulateGamma(2)
	full := mustBind(b, m, d, 200)
	small := mustRestrict(b, full, Equate("shape[1]", "shape[2]"))
	for _, w := range []int{1, 2} {
		b.Run(fmt.Sprintf("workers=%d", w), func(b *testing.B) {
			for b.Loop() {
				if _, err := Compare(bg, small, full, &Settings{Workers: w, References: []Reference{Bootstrap{Draws: 199}}}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
