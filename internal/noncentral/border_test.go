package noncentral

import (
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// tails returns both tails.
func tails(t special.Scaled, upper bool) (lo, up special.Scaled) {
	c := special.Scaled{M: t.DD().Neg().AddF(1)}
	if upper {
		return c, t
	}
	return t, c
}

// jump returns the relative step of the smaller tail between two neighbours.
func jump(t1 special.Scaled, u1 bool, t2 special.Scaled, u2 bool) float64 {
	lo1, up1 := tails(t1, u1)
	lo2, up2 := tails(t2, u2)
	if lo1.Log() < up1.Log() {
		return distance(lo1, lo2)
	}
	return distance(up1, up2)
}

// TestBorders crosses every border between two regions from one float to the next: no tail may
// step by more than rounding and the step of its argument explain.
func TestBorders(t *testing.T) {
	r := draw{rand.New(rand.NewPCG(9, 1))}
	var chi, f, d2, nt worst
	for range rounds(2000) {
		// χ²: A+B = 22
		k, lambda := r.Float64()*40, r.log(1e-3, 1e5)
		x := (chi2Few*chi2Few - k*k/4) / lambda
		below, above := x*(1-4e-16), x*(1+4e-16)
		p, q := AtChiSquared(k, lambda, dd.From(below)), AtChiSquared(k, lambda, dd.From(above))
		if p.contour == q.contour {
			below, above = x*(1-1e-14), x*(1+1e-14)
			p, q = AtChiSquared(k, lambda, dd.From(below)), AtChiSquared(k, lambda, dd.From(above))
		}
		t1, u1, kern, _ := p.All()
		t2, u2, _, _ := q.All()
		slack := 2 * math.Exp(kern.Log()-t1.Log()) * (above - below) / x
		chi.add(jump(t1, u1, t2, u2)-slack, "k=%v λ=%v x=%v", k, lambda, x)

		// F: contour or mixture, by bisection over x
		a1, b1, l := r.log(0.1, 1e3), r.log(0.5, 1e4), r.log(1e-3, 80)
		lo, hi := 1e-6, 1e6
		at := func(x float64) F { return AtF(a1, b1, l, x) }
		if first, last := at(lo), at(hi); first.contour != last.contour {
			for i := 0; i < 200; i++ {
				m := lo + (hi-lo)/2
				if m == lo || m == hi {
					break
				}
				if g := at(m); g.contour == first.contour {
					lo = m
				} else {
					hi = m
				}
			}
			p, q := at(lo), at(hi)
			t1, u1, kern, _ := p.All()
			t2, u2, _, _ := q.All()
			slack := 2 * math.Exp(kern.Log()-t1.Log()) * (hi - lo) / lo
			f.add(jump(t1, u1, t2, u2)-slack, "d1=%v d2=%v λ=%v x=%v", a1, b1, l, lo)
		}

		// F: circle or bent path at D2 = 50, and the sum for tiny D2 at 1
		l = r.log(1, 1e6)
		x = (1 + l/a1) * math.Exp(r.NormFloat64())
		for _, v := range [2]float64{50, 1} {
			p, q := AtF(a1, v, l, x), AtF(a1, math.Nextafter(v, 0), l, x)
			t1, u1 := p.Tail()
			t2, u2 := q.Tail()
			// one ulp of D2 counts for little unless the tail is far out
			if t1.Log() > -20 {
				d2.add(jump(t1, u1, t2, u2), "d1=%v d2=%v λ=%v x=%v", a1, v, l, x)
			}
		}

		// t: δ = 2
		nu := r.log(0.01, 1e6)
		x = tClose + r.NormFloat64()*2
		v1, w1 := TTail(nu, x, tClose)
		v2, w2 := TTail(nu, x, math.Nextafter(tClose, 0))
		nt.add(jump(v1, w1, v2, w2), "ν=%v t=%v", nu, x)
	}
	chi.check(t, "χ², A+B = 22", 4e-15)
	f.check(t, "F, contour and mixture", 4e-15)
	d2.check(t, "F, D2 = 50 and 1", 4e-15)
	nt.check(t, "t, δ = 2", 4e-15)
}
