package lrt

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"
)

func constant[D any](names ...string) Model[D] {
	m := Model[D]{Name: "m", LogLikelihood: func(D, []float64) float64 { return 0 }}
	for _, n := range names {
		m.Params = append(m.Params, Real(n))
	}
	return m
}

func TestRestrictionWords(t *testing.T) {
	m := constant[int]("a", "b", "c")
	m.Params = append(m.Params, Positive("s"), Unit("p"))
	root := mustBind(t, m, 0, 1)
	for _, c := range []struct {
		name string
		rs   []Restriction
		want string
	}{
		{"none", nil, "m: all parameters free"},
		{"fix", []Restriction{Fix("b", 2.5)}, "m: b = 2.5"},
		{"equate", []Restriction{Equate("a", "c")}, "m: a = c"},
		{"equate three, order free", []Restriction{Equate("c", "b", "a")}, "m: a = c, b = c"},
		{"equation", []Restriction{Equations(Equation{[]string{"a", "b"}, []float64{2, -4}, 6})}, "m: a − 2·b = 3"},
		{"bounds", []Restriction{AtLeast("a", 1), AtMost("p", 0.5)}, "m: a ≥ 1, p ≤ 0.5"},
		{"two-sided", []Restriction{AtLeast("a", 1), AtMost("a", 2)}, "m: 1 ≤ a ≤ 2"},
		{"map", []Restriction{Fix("c", 0), Via(Map{Params: []Param{Real("u")}, To: func(phi, th []float64) {}})}, "m: c = 0; parameters through u"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := mustRestrict(t, root, c.rs...).String(); got != c.want {
				t.Errorf("String() = %q, want %q", got, c.want)
			}
		})
	}
}

func TestRestrictionErrors(t *testing.T) {
	m := constant[int]("a", "b", "c")
	m.Params = append(m.Params, Positive("s"), Unit("p"))
	root := mustBind(t, m, 0, 1)
	to := func(phi, th []float64) {}
	for _, c := range []struct {
		name string
		rs   []Restriction
		want error
		text string
	}{
		{"unknown name", []Restriction{Fix("d", 1)}, ErrInvalid, `"d"; there are a, b, c, s, p`},
		{"contradiction", []Restriction{Fix("a", 1), Fix("a", 2)}, ErrContradiction, "a = 1"},
		{"contradiction by implication", []Restriction{Equate("a", "b"), Equate("b", "c"), Fix("a", 1), Fix("c", 2)}, ErrContradiction, "c = 2"},
		{"outside range", []Restriction{Fix("s", -1)}, ErrContradiction, "s = -1"},
		{"outside range through an equation", []Restriction{Equate("s", "p"), Fix("s", 3)}, ErrContradiction, "outside [0, 1]"},
		{"empty bounds", []Restriction{AtLeast("a", 1), AtMost("a", 0)}, ErrContradiction, "a ≤ 0"},
		{"bound against range", []Restriction{AtLeast("p", 2)}, ErrContradiction, "p ≥ 2"},
		{"NaN", []Restriction{Fix("a", math.NaN())}, ErrInvalid, "finite"},
		{"zero equation", []Restriction{Equations(Equation{[]string{"a", "a"}, []float64{1, -1}, 0})}, ErrInvalid, "every coefficient is 0"},
		{"equating one", []Restriction{Equate("a")}, ErrInvalid, "at least two names"},
		{"lengths", []Restriction{Equations(Equation{[]string{"a"}, nil, 0})}, ErrInvalid, "1 names and 0 coefficients"},
		{"bad bound", []Restriction{AtLeast("a", math.NaN())}, ErrInvalid, "not a number"},
		{"map without function", []Restriction{Via(Map{Params: []Param{Real("u")}})}, ErrInvalid, "no function"},
		{"map to more", []Restriction{Via(Map{Params: Block(6, Real("u")), To: to})}, ErrInvalid, "cannot restrict"},
		{"old name after a map", []Restriction{Via(Map{Params: []Param{Real("u")}, To: to}), Fix("a", 0)}, ErrInvalid, "there are u"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := root.Restrict(c.rs...)
			var re *RestrictionError
			if !errors.Is(err, c.want) || !errors.As(err, &re) || !strings.Contains(err.Error(), c.text) {
				t.Errorf("error %v, want one of %v with %q", err, c.want, c.text)
			}
		})
	}
}

func TestNestingOfDeclaredSpaces(t *testing.T) {
	root := mustBind(t, constant[int]("a", "b", "c"), 0, 1)
	other := mustBind(t, constant[int]("a", "b", "c"), 0, 1)
	ab := mustRestrict(t, root, Equate("a", "b"))
	abc := mustRestrict(t, root, Equate("c", "a", "b"))
	fixed := mustRestrict(t, root, Fix("b", 1), Fix("a", 1))
	pos := mustRestrict(t, root, AtLeast("a", 0))
	via := mustRestrict(t, ab, Via(Map{Params: []Param{Real("u"), Real("v")}, To: func(phi, th []float64) { th[0], th[1], th[2] = phi[0], phi[0], phi[1] }}))
	viaFixed := mustRestrict(t, via, Fix("u", 0))
	for _, c := range []struct {
		name         string
		small, large *Declared
		want         error
		text         string
	}{
		{"in root", ab, root, nil, ""},
		{"in itself", ab, ab, nil, ""},
		{"root in part", root, ab, ErrNotNested, "a = b"},
		{"implied", abc, ab, nil, ""},
		{"implied by values", fixed, ab, nil, ""},
		{"fixed inside bound", fixed, pos, nil, ""},
		{"free outside bound", ab, pos, ErrNotNested, "a ≥ 0"},
		{"bound in root", pos, root, nil, ""},
		{"map in its base", via, ab, nil, ""},
		{"map in root", via, root, nil, ""},
		{"map restricted", viaFixed, via, nil, ""},
		{"map not in other", via, abc, ErrNotNested, "c"},
		{"base in map", ab, via, ErrNestingUnknown, ""},
		{"two binds", ab, other, ErrNotNested, "two calls of Bind"},
	} {
		t.Run(c.name, func(t *testing.T) {
			err := c.small.NestedIn(c.large)
			if !errors.Is(err, c.want) || err != nil && !strings.Contains(err.Error(), c.text) {
				t.Errorf("%v in %v: %v, want %v with %q", c.small, c.large, err, c.want, c.text)
			}
		})
	}
}

// Whatever the order of equations, the reduced form is the same.
func TestEchelonOrderFree(t *testing.T) {
	r := draw(5)
	for trial := range 200 {
		p := 2 + r.IntN(6)
		n := 1 + r.IntN(p)
		var rows [][]float64
		var rhs []float64
		for range n {
			row := make([]float64, p)
			for j := range row {
				row[j] = float64(r.IntN(5) - 2)
			}
			if zero(row) {
				row[0] = 1
			}
			rows, rhs = append(rows, row), append(rhs, float64(r.IntN(7)))
		}
		build := func(order []int) string {
			var e echelon
			for _, i := range order {
				e, _ = e.add(rows[i], rhs[i])
			}
			var b strings.Builder
			for i := range e.rows {
				for j, v := range e.rows[i] {
					fmt.Fprintf(&b, "%.9f ", v+0*float64(j))
				}
				fmt.Fprintf(&b, "= %.9f;", e.rhs[i])
			}
			return strings.ReplaceAll(b.String(), "-0.000000000", "0.000000000")
		}
		var consistent echelon
		ok := true
		for i := range rows {
			var st state
			if consistent, st = consistent.add(rows[i], rhs[i]); st == contradicted {
				ok = false
			}
		}
		if !ok {
			continue // which one is refused depends on the order
		}
		a, b := build(r.Perm(n)), build(r.Perm(n))
		if a != b {
			t.Fatalf("trial %d: %s and %s", trial, a, b)
		}
		for i := range rows {
			if st := consistent.status(rows[i], rhs[i]); st != implied {
				t.Fatalf("trial %d: row %d is %v of its own form", trial, i, st)
			}
		}
	}
}

func FuzzRestrict(f *testing.F) {
	f.Add(1.0, 2.0, 0.5, "a", "b", uint8(0))
	f.Add(math.Inf(1), -1.0, math.NaN(), "p", "s", uint8(3))
	f.Add(1e300, 1e-300, 1.0, "s", "s", uint8(2))
	m := constant[int]("a", "b")
	m.Params = append(m.Params, Positive("s"), Unit("p"))
	root, err := Bind(m, Observe(0, 1))
	if err != nil {
		f.Fatal(err)
	}
	f.Fuzz(func(t *testing.T, x, y, z float64, n1, n2 string, kind uint8) {
		rs := []Restriction{Fix(n1, x), Equate(n1, n2), Equations(Equation{[]string{n1, n2}, []float64{x, y}, z}), AtLeast(n2, y), AtMost(n1, z)}
		k := int(kind)
		s, err := root.Restrict(rs[k%5], rs[(k/5)%5], rs[(k/25)%5])
		if err != nil {
			var re *RestrictionError
			if !errors.As(err, &re) {
				t.Fatalf("%T: %v", err, err)
			}
			return
		}
		d := s.(*Declared)
		if err := d.NestedIn(root); err != nil {
			t.Fatal(err)
		}
		if err := d.NestedIn(d); err != nil {
			t.Fatalf("%v is not inside itself: %v", d, err)
		}
	})
}
