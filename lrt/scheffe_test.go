package lrt

import (
	"context"
	"errors"
	"math"
	"testing"
)

// TestScheffe: Neter, Kutner, Nachtsheim and Wasserman (1996), section 17, package designs: groups of 5, 5, 4
// and 5, MSE 10.546666…; the contrast of the first two designs with the last two has estimate −9.35 (their
// table), and its p-value was recomputed from the data with 40 digits.
func TestScheffe(t *testing.T) {
	const n = 19
	variance := 0.25 * (1./5 + 1./5 + 1./4 + 1./5) // of the estimate, over σ²
	l := Linear{RankS: 3, RankB: 4, RankE0: 4, RankE1: n, Numerator: 9.35 * 9.35 / variance, Denominator: 158.2, M: n, Certified: true}
	got, err := Scheffe{Dimension: 3}.Refer(context.Background(), Comparison{}, Pair{Linear: l}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if want := 0.00018920478045279755; math.Abs(got.P-want) > 1e-9*want || math.Abs(got.LogP-math.Log(want)) > 1e-9 || got.Kind != Exact {
		t.Errorf("p = %.17g (log %g, %v), want %.17g", got.P, got.LogP, got.Kind, want)
	}
	// A family of one dimension adds nothing.
	one, err := Scheffe{Dimension: 1}.Refer(context.Background(), Comparison{}, Pair{Linear: l}, nil)
	if _, p, _ := l.F(); err != nil || one.P != p {
		t.Errorf("one dimension: p = %g, %v; the F test has %g", one.P, err, p)
	}
	for _, d := range []float64{0, math.NaN(), math.Inf(1)} {
		if _, err := (Scheffe{d}).Refer(context.Background(), Comparison{}, Pair{Linear: l}, nil); !errors.Is(err, ErrInvalid) {
			t.Errorf("dimension %g: %v", d, err)
		}
	}
	if _, err := (Scheffe{2}).Refer(context.Background(), Comparison{}, Pair{}, nil); !errors.Is(err, ErrInvalid) {
		t.Errorf("no linear pair: %v", err)
	}
}
