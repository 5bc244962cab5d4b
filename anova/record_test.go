package anova_test

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"math"
	"slices"
	"strings"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// recordOf reads a file of tiles with a missing value and makes the record of everything.
func recordOf(t *testing.T, workers int) (anova.Record, *glm.Data) {
	t.Helper()
	ctx := context.Background()
	file := strings.Replace(tiles, "south,birch,7.6,39.4", "south,birch,,39.4", 1)
	all, err := glm.ReadCSV(ctx, strings.NewReader(file), &glm.CSVOptions{Name: "/some/where/tiles.csv", Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	d, err := all.Complete()
	if err != nil {
		t.Fatal(err)
	}
	o := &anova.Options{Covariates: []string{"moisture"}, Decomposition: anova.Partial, Model: &glm.Options{Workers: workers}}
	cs, err := anova.Crossed(ctx, d, "strength", []string{"press", "resin"}, o)
	if err != nil {
		t.Fatal(err)
	}
	s := &lrt.Settings{Seed: 7, Workers: workers}
	tab, err := anova.Tabulate(ctx, cs, s)
	if err != nil {
		t.Fatal(err)
	}
	g := means(t, tab.Model(), nil, "press")
	f := family(t, g, g.Pairs(), anova.Holm, 0.95)
	r, err := anova.NewRecord(ctx, tab, d, anova.Declaration{Question: "does strength depend on press and resin?", Units: "tiles", Decomposition: o.Decomposition.String(),
		MissingRule: "complete rows", Checks: []anova.RecordCheck{{Name: "leverage", Statistic: "largest", Value: 0.7, P: math.NaN()}},
		ChecksNotMade: []string{"independence"}}, s, g.Report(), f.Report(), tab.Effects())
	if err != nil {
		t.Fatal(err)
	}
	return r, d
}

func TestRecord(t *testing.T) {
	r, d := recordOf(t, 1)
	first, err := r.CanonicalJSON()
	if err != nil {
		t.Fatal(err)
	}
	for _, workers := range []int{1, 2, 5} {
		again, _ := recordOf(t, workers)
		b, err := again.CanonicalJSON()
		if err != nil || !bytes.Equal(first, b) {
			t.Errorf("%d workers: %v, another record:\n%s\n%s", workers, err, first, b)
		}
	}
	var doc map[string]any
	if err := json.Unmarshal(first, &doc); err != nil {
		t.Fatal(err)
	}
	get := func(path ...any) any {
		var v any = doc
		for _, p := range path {
			switch k := p.(type) {
			case string:
				v = v.(map[string]any)[k]
			case int:
				v = v.([]any)[k]
			}
		}
		return v
	}
	id := d.Observations("strength")
	rows, _ := id.Rows.Digest()
	for _, c := range []struct {
		want any
		path []any
	}{
		{"tiles.csv", []any{"data", "source"}},
		{12.0, []any{"data", "rows_read"}},
		{11.0, []any{"data", "rows_used"}},
		{"moisture", []any{"data", "dropped", 0, "column"}},
		{10.0, []any{"data", "dropped", 0, "rows", 0}},
		{hexOf(rows[:]), []any{"data", "rows_sha256"}},
		{"response", []any{"data", "columns", 0, "role"}},
		{"amber", []any{"design", "factors", 1, "levels", 0}},
		{3.0, []any{"design", "cells", 0, "count"}},
		{"holds", []any{"rows", 0, "certified"}},
		{"moisture", []any{"rows", 0, "name"}},
		{"partial", []any{"declared", "decomposition"}},
		{nil, []any{"declared", "checks", 0, "p"}},
		{"not-a-number", []any{"declared", "checks", 0, "p_reason"}},
		{7.0, []any{"reproduction", "seed"}},
		{"anova.contrasts/1", []any{"reports", 1, "schema"}},
		{0.95, []any{"method", "level"}},
	} {
		got := get(c.path...)
		if got == true {
			got = "holds"
		}
		if got != c.want {
			t.Errorf("%v = %v, want %v", c.path, got, c.want)
		}
	}
	if tol := get("reproduction", "rank_tolerance").(float64); !(tol > 0 && tol < get("reproduction", "smallest_pivot_kept").(float64)) {
		t.Errorf("rank tolerance %g beside the smallest pivot %v", tol, get("reproduction", "smallest_pivot_kept"))
	}
	if s := string(first); strings.Contains(s, "/some/") || strings.Contains(s, "NaN") {
		t.Errorf("a path or NaN in %s", s)
	}
	var b strings.Builder
	if err := r.WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	var compact bytes.Buffer
	if err := json.Compact(&compact, []byte(b.String())); err != nil || !bytes.Equal(compact.Bytes(), first) {
		t.Errorf("%v: the indented form holds something else", err)
	}
	// Another value changes the digests.
	other, err := glm.ReadCSV(context.Background(), strings.NewReader(strings.Replace(tiles, "31.2", "31.3", 1)), nil)
	if err != nil {
		t.Fatal(err)
	}
	sum, _ := other.Observations("strength").Rows.Digest()
	if slices.Equal(sum[:], rows[:]) {
		t.Error("other data, same digest")
	}
}

func hexOf(b []byte) string {
	const digits = "0123456789abcdef"
	var s []byte
	for _, x := range b {
		s = append(s, digits[x>>4], digits[x&15])
	}
	return string(s)
}

func TestRecordErrors(t *testing.T) {
	ctx := context.Background()
	d := newTrial(1, 20).data(t)
	cs, err := anova.OneWay(ctx, d, "y", "a", nil)
	tab := tabulate(t, cs, err)
	if _, err := anova.NewRecord(ctx, tab, newTrial(2, 20).data(t), anova.Declaration{}, nil); !errors.Is(err, lrt.ErrDifferentObservations) {
		t.Errorf("other data: %v", err)
	}
	if _, err := anova.NewRecord(ctx, tab, nil, anova.Declaration{}, nil); !errors.Is(err, anova.ErrLayout) {
		t.Errorf("no data: %v", err)
	}
	if _, err := anova.NewRecord(ctx, anova.Table{}, d, anova.Declaration{}, nil); !errors.Is(err, anova.ErrLayout) {
		t.Errorf("empty table: %v", err)
	}
	// Rows that could not be tested are recorded with the reason.
	some, err := d.Where("a2 b1 left out", func(i int) bool { return newTrial(1, 20).a[i] != "a2" || newTrial(1, 20).b[i] != "b1" })
	if err != nil {
		t.Fatal(err)
	}
	cs, err = anova.Crossed(ctx, some, "y", []string{"a", "b"}, &anova.Options{Decomposition: anova.Partial})
	r, err := anova.NewRecord(ctx, tabulate(t, cs, err), some, anova.Declaration{}, nil)
	if err != nil {
		t.Fatal(err)
	}
	b, err := r.CanonicalJSON()
	if err != nil || r.Rows[0].Reading != "not estimable" || !strings.Contains(r.Rows[0].Why, "a=a2 × b=b1") || !json.Valid(b) {
		t.Errorf("%v: %+v", err, r.Rows[0])
	}
}
