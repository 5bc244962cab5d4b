package glm_test

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// csv reads a table for the tests below; a table that cannot be read is an error of the case.
func csv(text string) (*glm.Data, error) {
	return glm.ReadCSV(context.Background(), strings.NewReader(text), &glm.CSVOptions{Name: "f.csv", Kinds: map[string]glm.Kind{"y": glm.Numeric}})
}

const ordinary = "y,x,g,w,f\n1.5,1,a,1,1\n2.5,2,a,2,1\n2.0,3,b,1,2\n4.5,4,b,0.5,1\n3.5,5,c,1,3\n6.0,6,c,1,1\n"

// TestBadInput walks from the text of a table to the answer with everything
// that can be wrong on the way: a typed error, in whose text the place is named.
func TestBadInput(t *testing.T) {
	ctx := context.Background()
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	g, x := glm.Factor{Field: "g"}, glm.Covariate{Field: "x"}
	// ask compares two models of y over the rows complete in what is used.
	ask := func(text string, o, p *glm.Options, small, large []glm.Term) error {
		d, err := csv(text)
		if err != nil {
			return err
		}
		s, err := glm.Normal(ctx, d, "y", small, o)
		if err != nil {
			return err
		}
		b, err := glm.Normal(ctx, d, "y", large, p)
		if err != nil {
			return err
		}
		_, err = lrt.Compare(ctx, s, b, nil)
		return err
	}
	means := func(text string) error { return ask(text, nil, nil, []glm.Term{one}, []glm.Term{one, g}) }
	both := func(first, second string, response string) error {
		d, err := csv(first)
		if err != nil {
			return err
		}
		e, err := csv(second)
		if err != nil {
			return err
		}
		s, err := glm.Normal(ctx, d, "y", []glm.Term{one}, nil)
		if err != nil {
			return err
		}
		b, err := glm.Normal(ctx, e, response, []glm.Term{one, g}, nil)
		if err != nil {
			return err
		}
		_, err = lrt.Compare(ctx, s, b, nil)
		return err
	}
	weights := func(kind glm.WeightKind, field string) *glm.Options {
		return &glm.Options{Weights: glm.Weights{Kind: kind, Field: field}}
	}
	for _, c := range []struct {
		name  string
		err   error
		want  error
		place []string // parts of the text
	}{
		{"empty", means(""), glm.ErrEmpty, []string{"f.csv"}},
		{"no rows", means("y,g\n"), glm.ErrEmpty, []string{"f.csv"}},
		{"all rows missing", func() error {
			d, err := csv("y,g\n,a\n,b\n")
			if err != nil {
				return err
			}
			_, err = d.Complete("y", "g")
			return err
		}(), glm.ErrNoCompleteRows, []string{`"y"`, "2 missing"}},
		{"a value missing", means("y,g\n1,a\n,b\n3,b\n"), glm.ErrMissing, []string{`"y"`, "row 1"}},
		{"a label missing", means("y,g\n1,a\n2,\n3,b\n"), glm.ErrMissing, []string{`"g"`, "row 1"}},
		{"NaN", means("y,g\n1,a\nNaN,b\n"), glm.ErrNotFinite, []string{"f.csv:3:1", `"y"`}},
		{"infinite", means("y,g\n1,a\n2,b\n-Inf,b\n"), glm.ErrNotFinite, []string{"f.csv:4:1", `"y"`}},
		{"NaN in memory", func() error {
			_, err := glm.NewData(glm.Numbers("y", []float64{1, math.NaN()}))
			return err
		}(), glm.ErrNotFinite, []string{`"y"`, "row 1"}},
		{"lengths", func() error {
			_, err := glm.NewData(glm.Numbers("y", []float64{1, 2}), glm.Labels("g", []string{"a"}))
			return err
		}(), glm.ErrLengths, []string{`"g"`, "1 rows", "2"}},
		{"unknown column", ask(ordinary, nil, nil, []glm.Term{one}, []glm.Term{one, glm.Factor{Field: "h"}}), glm.ErrUnknownColumn, []string{`"h"`, `"g"`}},
		{"unknown response", both(ordinary, ordinary, "z"), glm.ErrUnknownColumn, []string{`"z"`, `"y"`}},
		{"unknown weights", ask(ordinary, weights(glm.Precision, "v"), nil, []glm.Term{one}, []glm.Term{one, g}), glm.ErrUnknownColumn, []string{`"v"`}},
		{"unknown offset", ask(ordinary, &glm.Options{Offset: "o"}, nil, []glm.Term{one}, []glm.Term{one, g}), glm.ErrUnknownColumn, []string{`"o"`}},
		{"text for a number", means("y,g\n1,a\ntwo,b\n"), glm.ErrNotNumber, []string{"f.csv:3:1", `"two"`}},
		{"labels for a covariate", ask(ordinary, nil, nil, []glm.Term{one}, []glm.Term{one, glm.Covariate{Field: "g"}}), glm.ErrNotNumeric, []string{`"g"`, "f.csv:2:7"}},
		{"negative weight", ask(strings.Replace(ordinary, "a,2,1", "a,-2,1", 1), weights(glm.Precision, "w"), weights(glm.Precision, "w"), []glm.Term{one}, []glm.Term{one, g}), glm.ErrWeight, []string{`"w"`, "row 1", "-2"}},
		{"fractional frequency", ask(ordinary, weights(glm.Frequency, "w"), weights(glm.Frequency, "w"), []glm.Term{one}, []glm.Term{one, g}), glm.ErrWeight, []string{`"w"`, "row 3", "0.5"}},
		{"swapped", ask(ordinary, nil, nil, []glm.Term{one, g}, []glm.Term{one}), lrt.ErrNotNested, []string{"swapped"}},
		{"equal", ask(ordinary, nil, nil, []glm.Term{one, g}, []glm.Term{one, g}), lrt.ErrNothingTested, nil},
		{"not nested", ask(ordinary, nil, nil, []glm.Term{one, x}, []glm.Term{one, g}), lrt.ErrNotNested, []string{"x"}},
		{"different rows", both(ordinary, strings.Replace(ordinary, "6.0,6,c,1,1\n", "", 1), "y"), lrt.ErrDifferentObservations, []string{"rows"}},
		{"different response", both(ordinary, ordinary, "x"), lrt.ErrDifferentObservations, []string{"response"}},
		{"different weights", ask(ordinary, weights(glm.Precision, "w"), weights(glm.Precision, "f"), []glm.Term{one}, []glm.Term{one, g}), lrt.ErrDifferentObservations, []string{"weights"}},
		{"offsets apart", ask(ordinary, &glm.Options{Offset: "x"}, nil, []glm.Term{one}, []glm.Term{one, g}), lrt.ErrNotNested, []string{"offset"}},
		{"no error df", means("y,g\n1,a\n2,b\n3,c\n"), lrt.ErrNoErrorDF, nil},
		{"constant response", means("y,g\n4,a\n4,a\n4,b\n4,b\n"), lrt.ErrNoVariation, nil},
		{"one group", means("y,g\n4,a\n5,a\n6,a\n"), lrt.ErrNothingTested, nil},
		{"cancelled while reading", func() error {
			_, err := glm.ReadCSV(cancelled, strings.NewReader(ordinary), nil)
			return err
		}(), context.Canceled, nil},
		{"cancelled while comparing", func() error {
			d, err := csv(ordinary)
			if err != nil {
				return err
			}
			_, err = lrt.Compare(cancelled, model(t, d, nil, one), model(t, d, nil, one, g), nil)
			return err
		}(), context.Canceled, nil},
	} {
		if !errors.Is(c.err, c.want) {
			t.Errorf("%s: %v, want an error wrapping %v", c.name, c.err, c.want)
			continue
		}
		for _, p := range c.place {
			if !strings.Contains(c.err.Error(), p) {
				t.Errorf("%s: %q does not name %s", c.name, c.err, p)
			}
		}
		if c.want == context.Canceled {
			continue
		}
		var column *glm.ColumnError
		var text *glm.CSVError
		var term *glm.TermError
		var comparison *lrt.ComparisonError
		if !errors.As(c.err, &column) && !errors.As(c.err, &text) && !errors.As(c.err, &term) && !errors.As(c.err, &comparison) {
			t.Errorf("%s: untyped error %v", c.name, c.err)
		}
	}
}

// TestZeroWeights: rows of weight zero are no observations, and that is said.
func TestZeroWeights(t *testing.T) {
	ctx := context.Background()
	d, err := csv(ordinary + "99,7,a,0,0\n")
	if err != nil {
		t.Fatal(err)
	}
	without, err := csv(ordinary)
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range []glm.Weights{{Kind: glm.Precision, Field: "w"}, {Kind: glm.Frequency, Field: "f"}} {
		o := &glm.Options{Weights: w}
		g := glm.Factor{Field: "g"}
		r, err := lrt.Compare(ctx, model(t, d, o, one), model(t, d, o, one, g), nil)
		if err != nil {
			t.Fatal(err)
		}
		want, err := lrt.Compare(ctx, model(t, without, o, one), model(t, without, o, one, g), nil)
		if err != nil {
			t.Fatal(err)
		}
		if r.Pair.Full.N != want.Pair.Full.N || math.Abs(r.LogLambda-want.LogLambda) > 1e-12 || !r.HasWarning("zero-weight") || want.HasWarning("zero-weight") {
			t.Errorf("%v: n = %d, log λ = %v, warnings %v; without the row n = %d, log λ = %v", w.Kind, r.Pair.Full.N, r.LogLambda, r.Warnings, want.Pair.Full.N, want.LogLambda)
		}
	}
}

// TestDataInParallel: one Data serves many goroutines (run with -race).
func TestDataInParallel(t *testing.T) {
	ctx := context.Background()
	d, err := csv(ordinary)
	if err != nil {
		t.Fatal(err)
	}
	e, err := csv(ordinary)
	if err != nil {
		t.Fatal(err)
	}
	g := glm.Factor{Field: "g"}
	want := compare(t, model(t, d, nil, one), model(t, d, nil, one, g)).LogLambda
	done := make(chan float64)
	const workers = 8
	for i := range workers {
		go func() {
			s, err := glm.Normal(ctx, []*glm.Data{d, e}[i%2], "y", []glm.Term{one}, nil)
			if err != nil {
				t.Error(err)
			}
			b, err := glm.Normal(ctx, d, "y", []glm.Term{one, g}, nil)
			if err != nil {
				t.Error(err)
			}
			r, err := lrt.Compare(ctx, s, b, nil) // the same observations, for half of them by digest
			if err != nil {
				t.Error(err)
			}
			done <- r.LogLambda
		}()
	}
	for range workers {
		if got := <-done; got != want {
			t.Errorf("log λ = %v, alone %v", got, want)
		}
	}
}
