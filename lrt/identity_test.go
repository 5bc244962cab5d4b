package lrt

import (
	"errors"
	"strings"
	"testing"
)

// TestTwoSamples: two observations of equal data are two samples, and the error
// says what to do about it.
func TestTwoSamples(t *testing.T) {
	a, b := Observe([]float64{1, 2}, 2), Observe([]float64{1, 2}, 2)
	err := a.Observations().Check(b.Observations())
	if !errors.Is(err, ErrDifferentObservations) || !strings.Contains(err.Error(), "one lrt.Observe") {
		t.Errorf("%v", err)
	}
	if err := a.Observations().Check(a.Observations()); err != nil {
		t.Error(err)
	}
}
