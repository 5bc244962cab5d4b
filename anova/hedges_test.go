package anova

import (
	"math"
	"testing"
)

// TestHedges: mpmath, 20 digits.
func TestHedges(t *testing.T) {
	for _, c := range []struct{ nu, want float64 }{
		{2, 0.56418958354775628695}, {5, 0.8407486824596893049}, {16, 0.95225383480435212636}, {100, 0.9924780549814448666},
		{201, 0.9962632336057739127}, {1000, 0.99924978117971636752}, {1e6, 0.99999924999978124993}, {math.Inf(1), 1},
	} {
		if got := hedges(c.nu); math.Abs(got-c.want) > 3e-14 {
			t.Errorf("J(%g) = %.17g, want %.17g", c.nu, got, c.want)
		}
	}
	for _, nu := range []float64{1, 0, -3, math.NaN()} {
		if got := hedges(nu); !math.IsNaN(got) {
			t.Errorf("J(%g) = %g", nu, got)
		}
	}
}
