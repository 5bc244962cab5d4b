package noncentral

import (
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// TestSlopes compares the derivative of the upper tail in the noncentrality with differences of
// the computed tail over the whole domain, to the accuracy of differences.
func TestSlopes(t *testing.T) {
	r := draw{rand.New(rand.NewPCG(9, 11))}
	var chi, f, nt worst
	// at returns the logarithm of the tail on the side of upper at noncentrality l.
	check := func(w *worst, at func(l float64) (special.Scaled, bool), slope special.Scaled, l float64, format string, args ...any) {
		v, upper := at(l)
		k := math.Exp(slope.Log()-v.Log()) * math.Abs(l)
		h := 1e-5 / max(k, 1)
		if h < 1e-10 || v.Log() < -1e6 {
			return
		}
		side := func(l float64) dd.DD {
			s, up := at(l)
			if up == upper {
				return s.LogDD()
			}
			return dd.Log1p(s.DD().Neg())
		}
		got := math.Abs(side(l*(1+h)).Sub(side(l*(1-h))).Float64()) / (2 * h)
		w.add(math.Abs(got-k)/(k+1e8*3e-15/h), format, args...)
	}
	for range rounds(4000) {
		d1, d2, lambda, x := r.point()
		p := AtChiSquared(d1, lambda, dd.From(x*d1))
		if !p.far {
			_, _, _, s := p.All()
			check(&chi, func(l float64) (special.Scaled, bool) {
				p := AtChiSquared(d1, l, dd.From(x*d1))
				return p.Tail()
			}, s, lambda, "k=%v λ=%v x=%v", d1, lambda, x*d1)
		}
		if r.IntN(2) == 0 {
			x *= math.Exp(min(600, r.ExpFloat64()/d2))
		}
		q := AtF(d1, d2, lambda, x)
		_, _, _, s := q.All()
		check(&f, func(l float64) (special.Scaled, bool) {
			q := AtF(d1, d2, l, x)
			return q.Tail()
		}, s, lambda, "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
		delta := math.Sqrt(lambda)
		if r.IntN(2) == 0 {
			delta = -delta
		}
		y := math.Sqrt(x)
		check(&nt, func(l float64) (special.Scaled, bool) { return TTail(d2, y, l) }, TSlope(d2, y, delta), delta, "ν=%v t=%v δ=%v", d2, y, delta)
	}
	chi.check(t, "χ²", 1e-5)
	f.check(t, "F", 1e-5)
	nt.check(t, "t", 1e-5)
}
