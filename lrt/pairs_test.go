package lrt

import (
	"context"
	"errors"
	"math"
	"testing"
)

// TestPairs: etch rates (Montgomery, 6th ed., Table 3-1), 180 less 160 W: F = 36.2²/(333.7·2/5), 16 degrees of
// freedom; the p-value was recomputed with relative accuracy 1e-10.
func TestPairs(t *testing.T) {
	ctx := context.Background()
	l := Linear{RankS: 3, RankB: 4, RankE0: 4, RankE1: 20, Numerator: 36.2 * 36.2 / 0.4, Denominator: 5339.2, M: 20, Certified: true}
	got, err := Pairs{Groups: 4, Balanced: true}.Refer(ctx, Comparison{}, Pair{Linear: l}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if want := 0.029427945616; math.Abs(got.P-want) > 1e-9*want || got.Kind != Exact || math.Abs(got.LogP-math.Log(want)) > 1e-9 {
		t.Errorf("p = %.12g (%v), want %.12g", got.P, got.Kind, want)
	}
	if q := (Pairs{Groups: 4}).Critical(16, 0.05) * math.Sqrt2; math.Abs(q-4.04609306063) > 1e-9 {
		t.Errorf("q(0.05; 4, 16) = %.12g, want 4.04609306063", q)
	}
	// Two means have one difference.
	two, err := Pairs{Groups: 2, Balanced: true}.Refer(ctx, Comparison{}, Pair{Linear: l}, nil)
	if _, p, _ := l.F(); err != nil || math.Abs(two.P-p) > 1e-12*p {
		t.Errorf("two groups: p = %.15g, F has %.15g, %v", two.P, p, err)
	}
	l.Known = 333.7
	known, err := Pairs{Groups: 2, Balanced: true}.Refer(ctx, Comparison{}, Pair{Linear: l}, nil)
	if _, p, _ := l.F(); err != nil || math.Abs(known.P-p) > 1e-12*p {
		t.Errorf("known variance: p = %.15g, χ² has %.15g, %v", known.P, p, err)
	}
	if u, err := (Pairs{Groups: 4}).Refer(ctx, Comparison{}, Pair{Linear: l}, nil); err != nil || u.Kind != Approximate {
		t.Errorf("unbalanced: %v, %v", u.Kind, err)
	}
	for _, k := range []int{-1, 0, 1, 2000} {
		if _, err := (Pairs{Groups: k}).Refer(ctx, Comparison{}, Pair{Linear: l}, nil); !errors.Is(err, ErrInvalid) {
			t.Errorf("%d groups: %v", k, err)
		}
		if c := (Pairs{Groups: k}).Critical(10, 0.05); !math.IsNaN(c) {
			t.Errorf("%d groups: critical %g", k, c)
		}
	}
	l.RankS = 2
	if _, err := (Pairs{Groups: 4}).Refer(ctx, Comparison{}, Pair{Linear: l}, nil); !errors.Is(err, ErrInvalid) {
		t.Errorf("two degrees of freedom: %v", err)
	}
}
