package lrt

import (
	"errors"
	"math"
	"testing"
)

// The fifteen p-values of the example of Benjamini and Hochberg (1995),
// section 4 (from memory): at 0.05 their procedure rejects four hypotheses,
// Bonferroni's three.
func TestAdjustOnPublishedExample(t *testing.T) {
	p := []float64{0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344, 0.0459, 0.3240, 0.4262, 0.5719, 0.6528, 0.7590, 1.0000}
	for _, c := range []struct {
		a    Adjustment
		want int
	}{{Bonferroni, 3}, {Holm, 3}, {Hochberg, 3}, {Sidak, 3}, {BenjaminiHochberg, 4}} {
		adj, err := Adjust(c.a, p)
		if err != nil {
			t.Fatal(err)
		}
		n := 0
		for _, v := range adj {
			if v <= 0.05 {
				n++
			}
		}
		if n != c.want {
			t.Errorf("%v rejects %d, want %d: %v", c.a, n, c.want, adj)
		}
	}
}

// Each adjustment against its definition: the smallest level at which the
// procedure rejects, found by running the procedure.
func TestAdjustAgainstProcedures(t *testing.T) {
	rejects := func(a Adjustment, p []float64, i int, alpha float64) bool {
		m := float64(len(p))
		rank := func(v float64) float64 { // number of p-values at or below v
			n := 0.0
			for _, w := range p {
				if w <= v {
					n++
				}
			}
			return n
		}
		h := 0.0
		for j := 1.0; j <= m; j++ {
			h += 1 / j
		}
		switch a {
		case Bonferroni:
			return m*p[i] <= alpha
		case Sidak:
			return 1-math.Pow(1-p[i], m) <= alpha
		case Holm: // all smaller ones must be rejected, too
			for _, v := range p {
				if v <= p[i] {
					below := 0.0
					for _, w := range p {
						if w < v {
							below++
						}
					}
					if (m-below)*v > alpha {
						return false
					}
				}
			}
			return true
		}
		for _, v := range p { // step-up: some p at or above it meets its bound
			if v < p[i] {
				continue
			}
			var ok bool
			switch a {
			case Hochberg:
				ok = (m-rank(v)+1)*v <= alpha
			case BenjaminiHochberg:
				ok = v*m/rank(v) <= alpha
			case BenjaminiYekutieli:
				ok = v*m*h/rank(v) <= alpha
			}
			if ok {
				return true
			}
		}
		return false
	}
	r := draw(77)
	for range 30 {
		p := make([]float64, 1+r.IntN(8))
		for i := range p {
			p[i] = r.Float64() * 0.3
		}
		for a := Bonferroni; a <= BenjaminiYekutieli; a++ {
			adj, err := Adjust(a, p)
			if err != nil {
				t.Fatal(err)
			}
			for i, v := range adj {
				if v < 1 && (!rejects(a, p, i, v*(1+1e-9)) || rejects(a, p, i, v*(1-1e-9))) {
					t.Fatalf("%v of %v: [%d] = %g is not where rejection begins", a, p, i, v)
				}
			}
		}
	}
}

func TestAdjustEdges(t *testing.T) {
	nan := math.NaN()
	for a := Bonferroni; a <= BenjaminiYekutieli; a++ {
		in := []float64{0.2, nan, 0.01, 0.2, 0}
		adj, err := Adjust(a, in)
		if err != nil {
			t.Fatal(err)
		}
		if !math.IsNaN(adj[1]) || adj[0] != adj[3] || adj[4] != 0 || in[0] != 0.2 {
			t.Errorf("%v: %v", a, adj)
		}
		// Far below the smallest float64: only the factor is added.
		logs, err := AdjustLog(a, []float64{-2000, -1000, nan, math.Inf(-1), -0.5})
		if err != nil {
			t.Fatal(err)
		}
		if !(logs[0] > -2000 && logs[0] < -1990) || !(logs[1] > -1000 && logs[1] < -990) || !math.IsInf(logs[3], -1) || !math.IsNaN(logs[2]) {
			t.Errorf("%v: %v", a, logs)
		}
		p, err := Adjust(a, []float64{0.03, 0.004, 0.5})
		if err != nil {
			t.Fatal(err)
		}
		l, err := AdjustLog(a, []float64{math.Log(0.03), math.Log(0.004), math.Log(0.5)})
		if err != nil {
			t.Fatal(err)
		}
		for i := range p {
			near(t, a.String(), math.Exp(l[i]), p[i], 1e-14)
		}
		if out, err := Adjust(a, nil); err != nil || len(out) != 0 {
			t.Errorf("%v of nothing: %v, %v", a, out, err)
		}
		one, err := Adjust(a, []float64{0.03})
		if err != nil || math.Abs(one[0]-0.03) > 1e-16 {
			t.Errorf("%v of one: %v, %v", a, one, err)
		}
	}
	for _, bad := range [][]float64{{0.1, -0.1}, {1.1}, {math.Inf(1)}} {
		if _, err := Adjust(Holm, bad); !errors.Is(err, ErrInvalid) {
			t.Errorf("%v: %v", bad, err)
		}
	}
	if _, err := AdjustLog(Holm, []float64{0.1}); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	if _, err := Adjust(Adjustment(99), []float64{0.1}); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
}

func TestByInformation(t *testing.T) {
	d := normalGroups(30, 2, 0, 1, 2)
	full := mustBind(t, normalModel(2, withStart), d, 30)
	means := mustRestrict(t, full, Equate("mean[1]", "mean[2]"))
	spreads := mustRestrict(t, full, Equate("sd[1]", "sd[2]")) // neither is inside the other
	is, err := ByInformation(bg, means, spreads, full)
	if err != nil {
		t.Fatal(err)
	}
	best := 0
	for i, in := range is {
		near(t, "AIC", in.AIC, -2*in.Fit.LogLikelihood+2*float64(in.Fit.Dim), 1e-14)
		near(t, "BIC", in.BIC, -2*in.Fit.LogLikelihood+math.Log(30)*float64(in.Fit.Dim), 1e-14)
		if in.AICAbove == 0 {
			best++
		}
		if in.AICAbove < 0 || in.BICAbove < 0 {
			t.Errorf("space %d: %+v", i, in)
		}
	}
	if best != 1 {
		t.Errorf("%d best spaces", best)
	}
	other := mustBind(t, normalModel(2, withStart), d, 30)
	if _, err := ByInformation(bg, full, other); !errors.Is(err, ErrDifferentObservations) {
		t.Errorf("%v", err)
	}
	if _, err := ByInformation(bg, full, nil); !errors.Is(err, ErrInvalid) {
		t.Errorf("%v", err)
	}
	if _, err := Compare(bg, means, spreads, nil); !errors.Is(err, ErrNotNested) {
		t.Errorf("%v", err)
	}
}
