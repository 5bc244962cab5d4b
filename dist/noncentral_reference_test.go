package dist_test

import (
	"strings"
	"testing"

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
