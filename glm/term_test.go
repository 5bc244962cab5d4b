package glm_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"testing"

	"subsume.example/glm"
)

// seasons is a user's own term: a yearly wave in a numeric field.
type seasons struct{ Field string }

func (s seasons) Name() string { return "seasons of " + s.Field }

func (s seasons) Bind(_ context.Context, src glm.Source) (glm.Columns, error) {
	at := slices.IndexFunc(src.Schema(), func(f glm.Field) bool { return f.Name == s.Field && f.Numeric() })
	if at < 0 {
		return glm.Columns{}, &glm.TermError{Term: s.Name(), Err: glm.ErrUnknownColumn}
	}
	return glm.Columns{
		Names: []string{"cos " + s.Field, "sin " + s.Field},
		Key:   "seasons " + s.Field,
		Fill: func(w glm.Window, hi, lo [][]float64) error {
			for i, x := range w.Hi[at][:w.Rows] {
				hi[1][i], hi[0][i] = math.Sincos(2 * math.Pi * x)
				lo[0][i], lo[1][i] = 0, 0
			}
			return nil
		},
	}, nil
}

// Fields says what the term reads, so that new rows need nothing else.
func (s seasons) Fields() []string { return []string{s.Field} }

// TestOwnTerm: a user's columns are fitted as the same columns handed in ready made, in
// any cut of the rows, and bound again to new rows.
func TestOwnTerm(t *testing.T) {
	p := field(83, 1300)
	cos, sin := make([]float64, len(p.x)), make([]float64, len(p.x))
	for i, x := range p.x {
		sin[i], cos[i] = math.Sincos(2 * math.Pi * x)
	}
	d, err := p.data(t).With(glm.Numbers("c", cos), glm.Numbers("s", sin))
	if err != nil {
		t.Fatal(err)
	}
	f := fitted(t, model(t, d, nil, one, seasons{"x"}, fa))
	g := fitted(t, model(t, streamed{d}, nil, one, glm.Covariate{Field: "c"}, glm.Covariate{Field: "s"}, fa))
	if relative(f.RSS, g.RSS) > 1e-13 || f.Rank != g.Rank || f.Coefficients[1].Name != "cos x" || relative(f.Coefficients[1].Estimate, g.Coefficients[1].Estimate) > 1e-11 {
		t.Errorf("RSS %g, want %g; %+v", f.RSS, g.RSS, f.Coefficients[1])
	}
	ps, _ := predict(t, f, newData(t, glm.Labels("a", []string{"q"}), glm.Numbers("x", []float64{0.25})))
	e, err := f.Combination(glm.Weight{Name: "constant", Coef: 1}, glm.Weight{Name: "sin x", Coef: 1}, glm.Weight{Name: "a=q", Coef: 1})
	if err != nil || math.Abs(ps[0].Value-e.Value) > 1e-12 {
		t.Errorf("%g, want %g (%v)", ps[0].Value, e.Value, err)
	}
}

// badTerm breaks one rule at a time.
type badTerm struct {
	what string
}

func (b badTerm) Bind(context.Context, glm.Source) (glm.Columns, error) {
	fill := func(w glm.Window, hi, lo [][]float64) error {
		for i := range w.Rows {
			switch hi[0][i], lo[0][i] = 1, 0; b.what {
			case "NaN":
				hi[0][i] = math.NaN()
			case "Inf":
				hi[0][i] = math.Inf(1)
			case "error":
				return errors.New("no tide table")
			}
		}
		return nil
	}
	index := func(w glm.Window, column []int32) error {
		for i := range w.Rows {
			column[i] = 7
		}
		return nil
	}
	switch b.what {
	case "bind":
		return glm.Columns{}, errors.New("no tide table")
	case "no names":
		return glm.Columns{Fill: fill}, nil
	case "both":
		return glm.Columns{Names: []string{"c"}, Fill: fill, Index: index}, nil
	case "neither":
		return glm.Columns{Names: []string{"c"}}, nil
	case "value alone":
		return glm.Columns{Names: []string{"c"}, Fill: fill, Value: func(glm.Window, []float64, []float64) error { return nil }}, nil
	case "index":
		return glm.Columns{Names: []string{"c", "d"}, Index: index}, nil
	}
	return glm.Columns{Names: []string{"c"}, Fill: fill}, nil
}

// TestBadTerms: what a user's term does wrong is a typed error that names it.
func TestBadTerms(t *testing.T) {
	ctx := context.Background()
	d := field(84, 10).data(t)
	for _, what := range []string{"bind", "no names", "both", "neither", "value alone", "index", "error", "NaN", "Inf"} {
		m, err := glm.Normal(ctx, d, "y", []glm.Term{one, badTerm{what}}, nil)
		if err == nil {
			_, err = m.Fit(ctx, nil)
		}
		var te *glm.TermError
		var ce *glm.ColumnError
		if !(errors.As(err, &te) && te.Term == "bad" || errors.As(err, &ce) && ce.Column == "c") {
			t.Errorf("%s: %v", what, err)
		}
		if testing.Verbose() {
			fmt.Println(what+":", err)
		}
	}
}

// TestTwoTermsOfOneName: Without does not guess which of two terms is meant.
func TestTwoTermsOfOneName(t *testing.T) {
	p := field(85, 20)
	for i := range p.x {
		p.x[i] = math.Round(p.x[i])
	}
	m := model(t, p.data(t), nil, one, cx, glm.Factor{Field: "x"})
	if _, err := m.Without("x"); !errors.Is(err, glm.ErrTerm) {
		t.Errorf("%v", err)
	}
	if w, err := m.Without("constant"); err != nil || len(w.Terms()) != 2 {
		t.Errorf("%v", err)
	}
}

// TestConstantField: a field of one value is one with the constant: the later of
// them is set aside, and called collinear, not empty.
func TestConstantField(t *testing.T) {
	p := field(89, 30)
	five, moved := make([]float64, 30), make([]float64, 30)
	for i := range five {
		five[i], moved[i] = 5, p.x[i]+3
	}
	for i := range moved {
		moved[i] = math.Round(p.x[i]*64)/64 + 1000
		p.x[i] = moved[i] - 3
	}
	d, err := p.data(t).With(glm.Numbers("five", five), glm.Numbers("moved", moved))
	if err != nil {
		t.Fatal(err)
	}
	c5, cm := glm.Covariate{Field: "five"}, glm.Covariate{Field: "moved"}
	for _, c := range []struct {
		terms []glm.Term
		aside string
	}{
		{[]glm.Term{one, c5, cx}, "five"},
		{[]glm.Term{c5, one, cx}, "constant"},
		{[]glm.Term{cx, c5, one}, "constant"},
		{[]glm.Term{one, cx, cm}, "moved"},
		{[]glm.Term{cx, cm, one}, "constant"},
		{[]glm.Term{cx, one, cm}, "moved"},
		{[]glm.Term{glm.Powers{Field: "x", Degree: 2}, c5, one}, "constant"},
	} {
		f := fitted(t, model(t, d, nil, c.terms...))
		mean := fitted(t, model(t, d, nil, one))
		if relative(f.TotalSS, mean.RSS) > 1e-12 || !(f.RSquared > 0 && f.RSquared < 1) {
			t.Errorf("%s: total %g, want %g; R² %g", f.Model, f.TotalSS, mean.RSS, f.RSquared)
		}
		var aside []string
		for _, co := range f.Coefficients {
			if co.Aliased {
				aside = append(aside, co.Name)
			}
		}
		if !slices.Equal(aside, []string{c.aside}) || hasCode(f.Warnings, "empty") || hasCode(f.Warnings, "collinear") != (c.aside != "constant") {
			t.Errorf("%s: %v set aside, want %s; warnings %v", f.Model, aside, c.aside, f.Warnings)
		}
	}
}
