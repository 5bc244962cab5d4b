package glm_test

import (
	"context"
	"errors"
	"math"
	"slices"
	"testing"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// TestCertificateByCoordinates: what nesting decides is what the identities say.
func TestCertificateByCoordinates(t *testing.T) {
	for _, l := range layouts {
		r, err := l.comparison(t).Run(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		got := r.Pair.Certificate
		want, err := glm.CertifyByCoordinates(l.comparison(t))
		if err != nil {
			t.Fatal(err)
		}
		if got.Exact != want.Exact {
			t.Errorf("%s: %+v, computed %+v", l.name, got, want)
			continue
		}
		for i := range min(len(got.C), len(want.C)) {
			if math.Abs(got.C[i]-want.C[i]) > 1e-9*(1+want.C[i]) && got.Exact {
				t.Errorf("%s: constants %v, computed %v", l.name, got.C, want.C)
			}
		}
	}
}

// TestCertificateConstants: the constants are the coefficients of the variances in the
// expected mean squares: rows per plot, 2; per block, 6.
func TestCertificateConstants(t *testing.T) {
	for _, c := range []struct {
		name string
		want []float64
	}{
		{"split plot, A", []float64{1, 0, 2}},
		{"nested, A, B random", []float64{1, 3}},
		{"mixed, A, B random", []float64{1, 0, 2}},
		{"strip plot, A", []float64{1, 0, 2, 0}},
		{"repeated, times", []float64{1, 0}},
		{"mixed, B variance", []float64{1, 2}},
	} {
		i := slices.IndexFunc(layouts, func(l layout) bool { return l.name == c.name })
		r, err := layouts[i].comparison(t).Run(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		got := r.Pair.Certificate.C
		if len(got) != len(c.want) {
			t.Errorf("%s: constants %v, want %v", c.name, got, c.want)
			continue
		}
		for k := range got {
			if math.Abs(got[k]-c.want[k]) > 1e-12 {
				t.Errorf("%s: constants %v, want %v", c.name, got, c.want)
			}
		}
	}
}

// TestManySubjects: strata of thousands of units are certified by nesting, on a
// factorization that eliminates them.
func TestManySubjects(t *testing.T) {
	d := subjects(2, 1500, 3, false)
	d.rows = d.rows[:len(d.rows):len(d.rows)]
	for i, r := range d.rows { // subjects numbered through
		r[3] = i / 3
	}
	for _, l := range []layout{
		{name: "groups", design: d, s: "1", b: "1 g", e0: "1 g", e1: "s", fixed: "1 g t g:t", random: "s", d1: 1, d2: 2998},
		{name: "times", design: d, s: "s", b: "s t", e0: "s g:t", fixed: "1 g t g:t", random: "s", d1: 2, d2: 5996},
		{name: "groups against the rows", design: d, s: "1", b: "1 g", e0: "s g:t", fixed: "1 g t g:t", random: "s", d1: 1, d2: 5996, breaks: "s", identity: "one constant c for numerator and error"},
	} {
		r, err := l.comparison(t).Run(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		c := r.Pair.Certificate
		if d1, d2 := r.Pair.Linear.DF(); d1 != l.d1 || d2 != l.d2 {
			t.Errorf("%s: degrees of freedom %g and %g, want %g and %g", l.name, d1, d2, l.d1, l.d2)
		}
		if c.Exact != (l.breaks == "") || c.Term != l.breaks || c.Identity != l.identity {
			t.Errorf("%s: %+v", l.name, c)
		}
	}
}

// TestCertificateRefusals: offsets and columns made from the response that an error
// pair cannot carry.
func TestCertificateRefusals(t *testing.T) {
	ctx := context.Background()
	d := crossing("a b", 3, 4).data(t)
	m := func(o *glm.Options, s string) *glm.Model { return model(t, d, o, terms(s)...) }
	// An error pair about another origin: x is no error.
	off := &glm.Options{Offset: "w"}
	c := lrt.Comparison{Restricted: m(nil, "1 b"), Full: m(nil, "1 a b"),
		Error: &lrt.ErrorPair{Smaller: m(off, "1 b"), Larger: m(off, "1 a b")}}
	r, err := c.Run(ctx, nil)
	if err != nil {
		t.Fatal(err)
	}
	if k := r.Pair.Certificate; k.Exact || k.Identity != "one origin for all spaces" {
		t.Errorf("offsets: %+v", k)
	}
	// All spaces about one offset: exact.
	c = lrt.Comparison{Restricted: m(off, "1 b"), Full: m(off, "1 a b"), Effects: &lrt.Effects{Fixed: m(nil, "1 a"), Random: []lrt.RandomTerm{{Name: "b", Space: m(nil, "b")}}}}
	if r, err = c.Run(ctx, nil); err != nil || !r.Pair.Certificate.Exact {
		t.Errorf("one offset: %v %+v", err, r.Pair.Certificate)
	}
	// A restricted random term is no random term.
	z, err := m(nil, "b").Restrict(lrt.Equate("b=1", "b=2"))
	if err != nil {
		t.Fatal(err)
	}
	c.Effects.Random[0].Space = z
	if _, err = c.Run(ctx, nil); !errors.Is(err, lrt.ErrInvalid) {
		t.Errorf("restricted random term: %v", err)
	}
	// A hypothesis by equations on cell means, A random columns beside it.
	full := m(nil, "1 a b")
	equal, err := full.Restrict(lrt.Equate("a=1", "a=2", "a=3"))
	if err != nil {
		t.Fatal(err)
	}
	c = lrt.Comparison{Restricted: equal, Full: full, Effects: &lrt.Effects{Fixed: m(nil, "1 a"), Random: []lrt.RandomTerm{{Name: "b", Space: m(nil, "b")}}}}
	if r, err = c.Run(ctx, nil); err != nil || !r.Pair.Certificate.Exact || r.Pair.DF != 2 {
		t.Errorf("by equations: %v %+v", err, r.Pair.Certificate)
	}
	// Dense columns of one variance: their scale counts.
	for _, k := range []struct {
		term glm.Term
		want bool
	}{
		{glm.Covariate{Field: "x"}, false},
		{glm.Factor{Field: "b"}, true},
	} {
		c.Effects.Random[0] = lrt.RandomTerm{Name: "z", Space: model(t, d, nil, k.term)}
		if r, err = c.Run(ctx, nil); err != nil || r.Pair.Certificate.Exact != k.want {
			t.Errorf("random %s: %v %+v", k.term.Name(), err, r.Pair.Certificate)
		}
	}
}

// echo is a term made from the response, as Tukey's one degree of freedom is.
type echo struct{}

func TestFromResponse(t *testing.T) {
	d := crossing("a b", 3, 4).data(t)
	s := model(t, d, nil, terms("1 a b")...)
	b, err := s.With(context.Background(), echo{})
	if err != nil {
		t.Fatal(err)
	}
	r := compare(t, s, b)
	if c := r.Pair.Certificate; c.Exact || c.Term != "echo" || r.Exact.Kind != lrt.Approximate {
		t.Errorf("%+v", c)
	}
	// Also where it stands in the error pair only.
	r, err = lrt.Comparison{Restricted: model(t, d, nil, terms("1")...), Full: model(t, d, nil, terms("1 a")...), Error: &lrt.ErrorPair{Smaller: b}}.Run(context.Background(), nil)
	if err != nil || r.Pair.Certificate.Exact {
		t.Errorf("%v %+v", err, r.Pair.Certificate)
	}
}
