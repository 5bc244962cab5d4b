package main

import (
	"bytes"
	"context"
	"errors"
	"flag"
	"math"
	"os"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"subsume.example/glm"
	"subsume.example/lrt"
	"subsume.example/lrt/spacetest"
)

var update = flag.Bool("update", false, "rewrite the golden file")

func TestOutput(t *testing.T) {
	var b bytes.Buffer
	if err := run(context.Background(), &b); err != nil {
		t.Fatal(err)
	}
	const path = "testdata/seals.txt"
	if *update {
		if err := os.WriteFile(path, b.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), b.String()); diff != "" {
		t.Errorf("-want +got, -update rewrites it:\n%s", diff)
	}
}

// TestPublished compares equality of two exponential means with a published
// example: weeks of remission of Freireich et al. (1963), Blood 21, 699-716, as
// analysed by Cox and Oakes (1984), Analysis of Survival Data. Published: total
// times 182 and 359, mean 8.67 of the first group, likelihood ratio statistic 16.49;
// to 17 digits from the same data, by exact rational sums and 40-digit logarithms, 16.485214757480859.
func TestPublished(t *testing.T) {
	d := lifetimes{
		sites: []string{"untreated", "treated"},
		time: []float64{1, 1, 2, 2, 3, 4, 4, 5, 5, 8, 8, 8, 8, 11, 11, 12, 12, 15, 17, 22, 23,
			6, 6, 6, 6, 7, 9, 10, 10, 11, 13, 16, 17, 19, 20, 22, 23, 25, 32, 32, 34, 35},
		failed: []float64{1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1,
			1, 1, 1, 0, 1, 0, 1, 0, 0, 1, 1, 0, 0, 0, 1, 1, 0, 0, 0, 0, 0},
	}
	d.site, d.until = make([]int32, len(d.time)), d.time
	for i := 21; i < len(d.site); i++ {
		d.site[i] = 1
	}
	if _, failures, time := d.count(0); time != 182 || math.Round(100*time/failures) != 867 {
		t.Errorf("first group: %v failures in %v", failures, time)
	}
	if _, failures, time := d.count(1); time != 359 || failures != 9 {
		t.Errorf("second group: %v failures in %v", failures, time)
	}
	q, err := spaces(d)
	if err != nil {
		t.Fatal(err)
	}
	r, err := lrt.Compare(context.Background(), q.oneRate, q.constant, nil)
	if err != nil {
		t.Fatal(err)
	}
	const want = 16.485214757480859
	if math.Abs(r.Statistic/want-1) > 1e-12 || r.Pair.DF != 1 {
		t.Errorf("−2 log λ = %.17g with %g df, want %.17g with 1", r.Statistic, r.Pair.DF, want)
	}
}

// TestClosedForms: the closed forms reach what the numerical fit reaches.
func TestClosedForms(t *testing.T) {
	ctx := context.Background()
	d, err := read(ctx, bytes.NewReader(seals))
	if err != nil {
		t.Fatal(err)
	}
	q, err := spaces(d)
	if err != nil {
		t.Fatal(err)
	}
	numeric, err := lrt.Restrict(q.oneShape, lrt.Fix("shape at ridge", 1))
	if err != nil {
		t.Fatal(err)
	}
	numericOne, err := lrt.Restrict(numeric, lrt.Equate(rates(d.sites)...))
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ closed, numeric lrt.Space }{{q.constant, numeric}, {q.oneRate, numericOne}} {
		a, err := c.closed.Maximize(ctx)
		if err != nil {
			t.Fatal(err)
		}
		b, err := c.numeric.Maximize(ctx)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(a.LogLikelihood-b.LogLikelihood) > 1e-9 || len(a.Warnings) > 0 {
			t.Errorf("closed form %v, numerical %v, warnings %v", a.LogLikelihood, b.LogLikelihood, a.Warnings)
		}
	}
}

// TestSpaces checks the declared spaces by the library's own checks for any space.
func TestSpaces(t *testing.T) {
	d, err := read(context.Background(), bytes.NewReader(seals))
	if err != nil {
		t.Fatal(err)
	}
	q, err := spaces(d)
	if err != nil {
		t.Fatal(err)
	}
	spacetest.Check(t, q.oneShape, q.free)
	spacetest.Check(t, q.oneRate, q.constant)
}

func TestBadData(t *testing.T) {
	for _, c := range []struct {
		name, text string
		want       error
		words      string
	}{
		{"text", "site,until,hours,failed\na,10,x,1\n", glm.ErrNotNumber, "seals.csv:2:6"},
		{"missing", "site,until,hours,failed\na,10,,1\n", glm.ErrNoCompleteRows, "hours"},
		{"column", "site,hours,failed\na,10,1\n", glm.ErrUnknownColumn, "until"},
		{"late", "site,until,hours,failed\na,10,11,1\n", nil, "seals.csv:2"},
		{"sound before the end", "site,until,hours,failed\na,10,9,0\n", nil, "seals.csv:2"},
	} {
		_, err := read(context.Background(), strings.NewReader(c.text))
		if err == nil || c.want != nil && !errors.Is(err, c.want) || !strings.Contains(err.Error(), c.words) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
}
