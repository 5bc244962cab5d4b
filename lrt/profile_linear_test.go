package lrt

import (
	"context"
	"fmt"
	"math"
	"testing"

	"subsume.example/dist"
)

// line is a hand-made linear space: intercept and slope, or a fixed slope.
type line struct {
	sample Sample[[2][]float64] // x, y
	fixed  bool
	slope  float64
}

func (l line) Observations() Observations { return l.sample.Observations() }

func (l line) sums() (b, sxx, rss float64) {
	x, y := l.sample.Value[0], l.sample.Value[1]
	n := float64(len(x))
	mx, my := sum(x)/n, sum(y)/n
	var sxy, syy float64
	for i := range x {
		sxx += (x[i] - mx) * (x[i] - mx)
		sxy += (x[i] - mx) * (y[i] - my)
	}
	b = sxy / sxx
	for i := range x {
		e := y[i] - my - b*(x[i]-mx)
		syy += e * e
	}
	return b, sxx, syy
}

func (l line) Maximize(context.Context) (Fit, error) {
	b, sxx, rss := l.sums()
	dim := 3
	if l.fixed {
		rss += (b - l.slope) * (b - l.slope) * sxx
		dim = 2
	}
	n := float64(l.sample.N)
	return Fit{N: l.sample.N, Dim: dim, Deviance: rss, LogLikelihood: -0.5 * n * (math.Log(2*math.Pi*rss/n) + 1)}, nil
}

func (l line) Restrict(rs ...Restriction) (Space, error) {
	if len(rs) != 1 || len(rs[0].Equations) != 1 || rs[0].Equations[0].Names[0] != "slope" {
		return nil, fmt.Errorf("%w: only the slope", ErrInvalid)
	}
	l.fixed, l.slope = true, rs[0].Equations[0].Value
	return l, nil
}

func (l line) FitPair(ctx context.Context, c Comparison) (Pair, error) {
	b, sxx, rss := l.sums()
	v := c.Restricted.(line).slope
	var p Pair
	p.Restricted, _ = c.Restricted.Maximize(ctx)
	p.Full, _ = l.Maximize(ctx)
	p.DF, p.Nesting = 1, "by construction"
	p.Linear = Linear{RankS: 1, RankB: 2, RankE0: 2, RankE1: l.sample.N, Numerator: (b - v) * (b - v) * sxx, Denominator: rss, M: float64(l.sample.N), Certified: true}
	return p, nil
}

// The exact F of a slope inverted by the same search is b ± t s/√Sxx.
func TestProfileInvertsExactF(t *testing.T) {
	for _, scale := range []float64{1e-6, 1, 1e6} {
		x := []float64{1, 2, 3, 4, 5, 6, 7, 8}
		y := []float64{2.1, 3.9, 6.2, 7.8, 10.1, 12.2, 13.8, 16.1}
		for i := range y {
			y[i] *= scale
		}
		l := line{sample: Observe([2][]float64{x, y}, 8)}
		i, err := Profile(bg, l, "slope", 0.95, nil)
		if err != nil {
			t.Fatal(err)
		}
		b, sxx, rss := l.sums()
		half := dist.StudentT{Nu: 6}.UpperQuantile(0.025) * math.Sqrt(rss/6/sxx)
		near(t, "lower", i.Lower/scale, (b-half)/scale, 1e-9)
		near(t, "upper", i.Upper/scale, (b+half)/scale, 1e-9)
		near(t, "estimate", i.Estimate/scale, b/scale, 1e-9)
		if !i.Exact {
			t.Errorf("%v", i)
		}
	}
}
