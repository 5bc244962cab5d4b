package noncentral

import (
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/internal/dd"
	"subsume.example/internal/special"
)

// TestQuickAgainstFull compares the quick form of the mixtures with the full one over their
// whole region, tiny degrees of freedom of both kinds included.
func TestQuickAgainstFull(t *testing.T) {
	r := draw{rand.New(rand.NewPCG(9, 7))}
	var chi, f, kernel, rough worst
	check := func(m *mixture, w *worst, format string, args ...any) {
		for _, upper := range [2]bool{false, true} {
			full := m.fullTail(upper)
			if !(full.Float64() <= 0.7 && full.Float64() > 1e-280) {
				continue // not a tail that is asked for
			}
			q, ok := m.quick(upper)
			if !ok {
				continue
			}
			w.add(distance(full, special.Scaled{M: q.tail}), format, args...)
			k := m.fullKernel()
			rough.add(distance(k, special.Scaled{M: dd.From(q.kernel)}), format, args...)
			if v, ok := m.quickKernel(); ok {
				kernel.add(distance(k, special.Scaled{M: v}), format, args...)
			}
		}
	}
	for range rounds(20000) {
		d1, d2, lambda := r.log(1e-3, 1e3), r.log(1e-3, 1e4), r.log(1e-8, 100)
		x := (1 + lambda/d1) * math.Exp(r.NormFloat64()*3)
		if r.IntN(3) == 0 {
			x *= math.Exp(min(100, r.ExpFloat64()/d2))
		}
		if p := AtChiSquared(d1, lambda, dd.From(x*d1)); !p.contour && !p.far {
			check(&p.mix, &chi, "k=%v λ=%v x=%v", d1, lambda, x*d1)
		}
		if p := AtF(d1, d2, lambda, x); !p.contour {
			check(&p.mix, &f, "d1=%v d2=%v λ=%v x=%v", d1, d2, lambda, x)
		}
	}
	chi.check(t, "χ²", 1e-16)
	f.check(t, "F", 1e-16)
	kernel.check(t, "kernel", 1e-16)
	rough.check(t, "kernel in plain arithmetic", 3e-14)
}
