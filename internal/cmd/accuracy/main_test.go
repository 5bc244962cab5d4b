package main

import (
	"bytes"
	"os"
	"strconv"
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

// TestDocumented holds the table in the documentation of package dist to what is measured:
// no figure may be better than the truth by more than rounding and other processors explain.
func TestDocumented(t *testing.T) {
	raw, err := os.ReadFile("../../../dist/doc.go")
	if err != nil {
		t.Fatal(err)
	}
	type figures struct{ median, max float64 }
	doc := map[string]figures{}
	for _, l := range strings.Split(string(raw), "\n") {
		f := strings.Fields(strings.TrimPrefix(l, "//"))
		if len(f) != 6 {
			continue
		}
		med, err1 := strconv.ParseFloat(f[3], 64)
		worst, err2 := strconv.ParseFloat(f[5], 64)
		if err1 == nil && err2 == nil {
			doc[f[0]+" "+f[1]] = figures{med, worst}
		}
	}
	if len(doc) < 50 {
		t.Fatalf("%d lines in the documented table", len(doc))
	}
	lines, err := docLines("../../../dist/testdata")
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range lines {
		d, ok := doc[l.table+" "+l.kind]
		if !ok {
			t.Logf("%s %s is not documented: put in the output of -doc", l.table, l.kind)
			continue
		}
		if l.Median > 1.5*d.median || l.Max > 2*d.max {
			t.Errorf("%s %s: median %.1e, max %.1e, documented are %.1e and %.1e", l.table, l.kind, l.Median, l.Max, d.median, d.max)
		}
	}
}
