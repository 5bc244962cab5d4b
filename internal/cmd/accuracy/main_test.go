package main

import (
	"bytes"
	"strings"
	"testing"
)

// TestRun measures all tables: no row of our laws may be off by more than 1e-12.
func TestRun(t *testing.T) {
	var b bytes.Buffer
	if err := run(&b, "../../../dist/testdata", false, 1e-12, false); err != nil {
		t.Fatal(err)
	}
	out := b.String()
	if strings.Contains(out, "Rows above") {
		t.Errorf("rows above 1e-12:\n%s", out)
	}
	for _, want := range []string{"chi2", "betainc", "ncf", "srange", "smm", "nct", "ncinv", "Errors of gonum"} {
		if !strings.Contains(out, want) {
			t.Errorf("no line %q", want)
		}
	}
	if err := run(&b, "nowhere", false, 1e-12, false); err == nil {
		t.Error("a missing directory is no error")
	}
}
