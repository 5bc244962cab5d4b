package dist_test

import (
	"strings"
	"testing"

	"subsume.example/internal/accuracy"
)

// bounds of the errors over a table: median, largest in the everyday region (degrees of
// freedom 0.5 to 1e4, tails at least 1e-10), largest overall.
type bounds struct{ median, everyday, all float64 }

// TestCentralReference judges every row of the tables of the central laws
// (testdata/README.md says how they were made).
func TestCentralReference(t *testing.T) {
	want := map[string]bounds{
		"tail":       {1e-16, 2e-15, 4e-15},
		"other":      {1e-16, 1e-15, 2e-15},
		"log":        {1e-16, 2e-15, 4e-15},
		"density":    {6e-17, 2.3e-16, 2.3e-16},
		"logdensity": {6e-17, 1e-13, 1e-13},
		"quantile":   {2e-16, 2e-14, 1e-12},
	}
	inverse, err := accuracy.LoadInverse("testdata")
	if err != nil {
		t.Fatal(err)
	}
	central := map[string]bool{"chi2": true, "f": true, "t": true, "betainc": true, "chi2_wide": true, "f_wide": true, "t_wide": true}
	for _, table := range accuracy.Tables {
		if !central[table.File] {
			continue
		}
		t.Run(table.File, func(t *testing.T) {
			rows, err := accuracy.Load("testdata", table)
			if err != nil {
				t.Fatal(err)
			}
			m := accuracy.Measure(table, rows)
			m["quantile"] = accuracy.MeasureInverse(table, inverse)
			for kind, b := range want {
				s := accuracy.Summarize(m[kind])
				if s.N == 0 && (kind != "quantile" || !strings.HasSuffix(table.File, "_wide")) {
					t.Errorf("%s: no rows", kind)
				}
				w := s.Worst
				if s.N > 0 && !(s.Median <= b.median && s.MaxEveryday <= b.everyday && s.Max <= b.all) {
					t.Errorf("%s: median %.2g, everyday max %.2g, max %.2g, want at most %v; worst: row %d %v x=%v: %s = %v, want %s",
						kind, s.Median, s.MaxEveryday, s.Max, b, w.Row.Line, w.Row.P, w.Row.X, w.What, w.Got, w.Want)
				}
			}
		})
	}
}
