package dist_test

import (
	"errors"
	"math"
	"strings"
	"testing"

	"subsume.example/dist"
	"subsume.example/internal/accuracy"
)

// TestNoncentralReference judges every row of the tables of the noncentral laws
// (the comments of the files and testdata/README.md say how they were made).
func TestNoncentralReference(t *testing.T) {
	want := map[string]bounds{
		"tail":       {2e-16, 2e-15, 2e-15},
		"other":      {1e-16, 1e-15, 2e-15},
		"log":        {1e-16, 2e-15, 2e-15},
		"density":    {2e-16, 2e-15, 2e-15},
		"logdensity": {1e-16, 1e-13, 1e-13}, // some logs are near 0
		"quantile":   {2e-16, 1e-14, 1e-14},
	}
	inverse, err := accuracy.LoadInverse("testdata")
	if err != nil {
		t.Fatal(err)
	}
	for _, table := range accuracy.Tables {
		if !strings.HasPrefix(table.File, "nc") {
			continue
		}
		t.Run(table.File, func(t *testing.T) {
			rows, err := accuracy.Load("testdata", table)
			if err != nil {
				t.Fatal(err)
			}
			m := accuracy.Measure(table, rows)
			if q := accuracy.MeasureInverse(table, inverse); len(q) > 0 {
				m["quantile"] = q
			}
			for kind, rs := range m {
				b := want[kind]
				s := accuracy.Summarize(rs)
				w := s.Worst
				t.Logf("%s: %d rows, median %.2g, everyday max %.2g, max %.2g", kind, s.N, s.Median, s.MaxEveryday, s.Max)
				if !(s.Median <= b.median && s.MaxEveryday <= b.everyday && s.Max <= b.all) {
					t.Errorf("%s: median %.2g, everyday max %.2g, max %.2g, want at most %v; worst: row %d %v x=%v: %s = %v, want %s",
						kind, s.Median, s.MaxEveryday, s.Max, b, w.Row.Line, w.Row.P, w.Row.X, w.What, w.Got, w.Want)
				}
			}
		})
	}
}

func TestNoncentralityReference(t *testing.T) {
	rs, err := accuracy.MeasureFinders("testdata")
	if err != nil {
		t.Fatal(err)
	}
	if s := accuracy.Summarize(rs); s.N < 100 || !(s.Max <= 2e-15) {
		t.Errorf("%d rows, max %.2g: %v", s.N, s.Max, s.Worst)
	}
}

// TestNoncentralityRange: beyond the range that the kernels stand the parameter is
// refused and every value is NaN; at its end tails are probabilities.
func TestNoncentralityRange(t *testing.T) {
	for _, law := range []fullLaw{
		dist.NoncentralF{D1: 3, D2: 20, Lambda: 1e154},
		dist.NoncentralChiSquared{K: 3, Lambda: 1e300},
		dist.NoncentralT{Nu: 20, Delta: 1e100},
	} {
		var pe *dist.ParamError
		if err := law.Validate(); !errors.As(err, &pe) || !math.IsNaN(law.Survival(1)) {
			t.Errorf("%v: %v, Survival(1) = %g", law, err, law.Survival(1))
		}
	}
	for _, law := range []fullLaw{
		dist.NoncentralF{D1: 3, D2: 20, Lambda: 1e100},
		dist.NoncentralChiSquared{K: 3, Lambda: 1e100},
		dist.NoncentralT{Nu: 20, Delta: 1e50},
	} {
		if p := law.Survival(1); p != 1 || law.Validate() != nil {
			t.Errorf("%v: Survival(1) = %g", law, p)
		}
	}
}
