package noncentral

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// The tests of this file compute the same number in two ways over the whole
// domain: another path and another step, the mixture beside the contour, the
// sum of normal tails beside noncentral F. None of the ways shares more than the
// exponent's formula with the other, so that agreement measures truncation,
// discretization and rounding together.

// distance returns |a/b - 1|, beyond 1e-300 per unit of the logarithm.
func distance(a, b special.Scaled) float64 {
	la := a.LogDD()
	d := math.Abs(la.Sub(b.LogDD()).Float64())
	if math.IsNaN(d) {
		return math.Inf(1)
	}
	if l := -la.Hi; l > 700 {
		d *= 700 / l
	}
	return math.Abs(math.Expm1(d))
}

type draw struct{ *rand.Rand }

func (r draw) log(a, b float64) float64 {
	return a * math.Exp(r.Float64()*math.Log(b/a))
}

// point draws degrees of freedom in 1e-3 ... 1e12, λ in 1e-8 ... 1e8 and a x near the law
// or within e^±15 of it, in units of the mean of the numerator.
func (r draw) point() (d1, d2, lambda, x float64) {
	d1, d2, lambda = r.log(1e-3, 1e12), r.log(1e-3, 1e12), r.log(1e-8, 1e8)
	if r.IntN(2) == 0 {
		d1, d2, lambda = r.log(0.1, 1e4), r.log(0.1, 1e4), r.log(1e-3, 1e4)
	}
	x = 1 + lambda/d1
	if r.IntN(2) == 0 {
		x *= math.Exp(r.NormFloat64() * 5)
	} else {
		x *= math.Exp(r.NormFloat64() * 4 * math.Sqrt(2*d1+4*lambda) / (d1 + lambda))
	}
	return
}

type worst struct {
	err  float64
	what string
	n    int
}

func (w *worst) add(err float64, format string, a ...any) {
	w.n++
	if !(err <= w.err) {
		w.err, w.what = err, fmt.Sprintf(format, a...)
	}
}

func (w *worst) check(t *testing.T, name string, bound float64) {
	t.Helper()
	t.Logf("%s: %d points, largest difference %.2g at %s", name, w.n, w.err, w.what)
	if !(w.err <= bound) || w.n < 100 {
		t.Errorf("%s: %d points, largest difference %.3g above %.3g at %s", name, w.n, w.err, bound, w.what)
	}
}

func rounds(n int) int {
	if os.Getenv("SUBSUME_LONG") != "" {
		return 30 * n
	}
	return n
}

func TestChiSquaredOtherPath(t *testing.T) {
	r := draw{rand.New(rand.NewPCG(7, 1))}
	var tail, kernel, slope, mix, quick, rough worst
	for range rounds(20000) {
		k, _, lambda, x := r.point()
		x *= k
		a, b := chi2Saddle(k, lambda, x)
		if a+b < chi2Few || x > 1e35*max(1, k, lambda) {
			continue
		}
		p := newChi2Path(k, lambda, dd.From(x), b)
		q := newChi2Path(k, lambda, dd.From(x), b*(1+0.3*(r.Float64()-0.5)/math.Sqrt(p.s)))
		q.n *= 1.25
		q.h /= 1.25
		t1, u1, k1, s1 := p.result(x)
		t2, u2, k2, s2 := q.result(x)
		if u1 == u2 {
			tail.add(distance(t1, t2), "k=%v λ=%v x=%v", k, lambda, x)
		}
		kernel.add(distance(k1, k2), "k=%v λ=%v x=%v", k, lambda, x)
		slope.add(distance(s1, s2), "k=%v λ=%v x=%v", k, lambda, x)
		if a+b < 2*chi2Few {
			m := chi2Mixture(k, lambda, dd.From(x))
			mix.add(distance(t1, m.fullTail(u1)), "k=%v λ=%v x=%v", k, lambda, x)
			mix.add(distance(k1, m.fullKernel()), "k=%v λ=%v x=%v", k, lambda, x)
			mix.add(distance(s1, m.slope()), "k=%v λ=%v x=%v", k, lambda, x)
			if v, ok := m.quickKernel(); ok {
				quick.add(distance(k1, special.Scaled{M: v}), "k=%v λ=%v x=%v", k, lambda, x)
			}
			if r, ok := m.quick(u1); ok {
				quick.add(distance(t1, special.Scaled{M: r.tail}), "k=%v λ=%v x=%v", k, lambda, x)
				rough.add(distance(k1, special.Scaled{M: dd.From(r.kernel)}), "k=%v λ=%v x=%v", k, lambda, x)
				rough.add(distance(s1, special.Scaled{M: dd.From(r.slope)}), "k=%v λ=%v x=%v", k, lambda, x)
			}
		}
	}
	tail.check(t, "tail", 3e-15)
	kernel.check(t, "kernel", 3e-15)
	slope.check(t, "slope", 3e-15)
	mix.check(t, "mixture", 3e-15)
	quick.check(t, "quick mixture", 4e-15)
	rough.check(t, "quick kernel and slope", 3e-14)
}

func TestFOtherPath(t *testing.T) {
	r := draw{rand.New(rand.NewPCG(7, 2))}
	var tail, smallB, kernel, slope, mix, quick, rough worst
	for range rounds(20000) {
		d1, d2, lambda, x := r.point()
		if r.IntN(2) == 0 {
			x *= math.Exp(min(600, r.ExpFloat64()/d2))
		}
		p := AtF(d1, d2, lambda, x)
		if !p.contour {
			continue
		}
		g := newFArg(d1, d2, dd.From(x), 0)
		c := &p.path
		shift := (r.Float64() - 0.5) * 0.3 * min(1, (1+c.rho)/math.Sqrt(c.bigA+c.b*c.rho*(1+c.rho)))
		q := newFPath(d1/2, d2/2, dd.From(lambda/2), &g, c.rho*(1+shift), c.bent)
		q.n *= 1.25
		q.h /= 1.25
		t1, u1, k1, s1 := p.All()
		t2, u2, k2, s2 := q.result()
		if u1 == u2 {
			tail.add(distance(t1, t2), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
		}
		kernel.add(distance(k1, k2), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
		w := &slope
		if d2 < 0.5 {
			w = &smallB
		}
		w.add(distance(s1, s2), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
		if c.bigA+c.b*math.Log1p(c.rho) < 1.3*fFew {
			m := fMixture(d1/2, d2/2, dd.From(lambda/2), &g)
			mix.add(distance(k1, m.fullKernel()), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
			mix.add(distance(s1, m.slope()), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
			if d2 >= 0.5 {
				mix.add(distance(t1, m.fullTail(u1)), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
				if v, ok := m.quickKernel(); ok {
					quick.add(distance(k1, special.Scaled{M: v}), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
				}
				if r, ok := m.quick(u1); ok {
					quick.add(distance(t1, special.Scaled{M: r.tail}), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
					rough.add(distance(k1, special.Scaled{M: dd.From(r.kernel)}), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
					rough.add(distance(s1, special.Scaled{M: dd.From(r.slope)}), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
				}
			}
		}
	}
	tail.check(t, "tail", 8e-15)
	// For tiny d2 the derivative is the small sum, about d2, of terms of order 1.
	smallB.check(t, "slope, d2 < 0.5", 3e-13)
	kernel.check(t, "kernel", 5e-15)
	slope.check(t, "slope", 5e-15)
	mix.check(t, "mixture", 8e-15)
	quick.check(t, "quick mixture", 4e-15)
	rough.check(t, "quick kernel and slope", 3e-14)
}

// TestFBentAndCircle takes the other kind of path where both converge.
func TestFBentAndCircle(t *testing.T) {
	r := draw{rand.New(rand.NewPCG(7, 5))}
	var tail, kernel worst
	for range rounds(20000) {
		d1, _, lambda, x := r.point()
		d2 := r.log(24, 60)
		if r.IntN(2) == 0 {
			d1, lambda = r.log(1, 1e3), r.log(1, 1e3)
			x = (1 + lambda/d1) * math.Exp(r.NormFloat64())
		}
		p := AtF(d1, d2, lambda, x)
		if !p.contour {
			continue
		}
		g := newFArg(d1, d2, dd.From(x), 0)
		q := newFPath(d1/2, d2/2, dd.From(lambda/2), &g, p.path.rho, !p.path.bent)
		t1, u1, k1, _ := p.path.result()
		t2, u2, k2, _ := q.result()
		if u1 == u2 {
			tail.add(distance(t1, t2), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
		}
		kernel.add(distance(k1, k2), "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
	}
	tail.check(t, "tail", 5e-15)
	kernel.check(t, "kernel", 5e-15)
}

func TestTOtherSum(t *testing.T) {
	r := draw{rand.New(rand.NewPCG(7, 3))}
	var tail, density, slope, viaF worst
	for range rounds(5000) {
		nu := r.log(1e-3, 1e12)
		if r.IntN(2) == 0 {
			nu = r.log(0.5, 1e4)
		}
		delta := -r.log(1e-6, 1e4)
		if r.IntN(2) == 0 {
			delta = r.Float64() * tClose
		}
		x := r.log(1e-3, 1e3)
		if r.IntN(4) == 0 {
			x = r.log(1e-30, 1e30)
		}
		coarser := func(m tMix) tMix {
			m.h /= 1.3
			m.scale.M = m.scale.M.DivF(1.3)
			return m
		}
		m := newTTail(nu, x, delta)
		q := coarser(m)
		tail.add(distance(m.sum(true), q.sum(true)), "ν=%v δ=%v t=%v", nu, delta, x)
		for _, d := range [2]float64{delta, -delta} {
			m = newTGauss(nu, x, d, 1)
			q = coarser(m)
			density.add(distance(m.sum(false), q.sum(false)), "ν=%v δ=%v t=%v", nu, d, x)
			m = newTGauss(nu, x, d, 0)
			q = coarser(m)
			slope.add(distance(m.sum(false), q.sum(false)), "ν=%v δ=%v t=%v", nu, d, x)
		}
		if nu > 1 {
			d := 2 + 2*r.Float64()
			v, upper := TTail(nu, x, d)
			w := tSum(nu, x, d)
			if !upper {
				w = tSum(nu, -x, -d)
			}
			viaF.add(distance(v, w), "ν=%v δ=%v t=%v", nu, d, x)
		}
	}
	tail.check(t, "tail", 5e-15)
	density.check(t, "density", 5e-15)
	slope.check(t, "slope", 1e-10) // a derivative for Newton steps: for tiny ν the step is long at the left end
	viaF.check(t, "by F", 5e-15)
}
