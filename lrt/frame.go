package lrt

import (
	"fmt"
	"math"
	"strings"
)

// frame is a layer of coordinates with the restrictions imposed on it. It
// holds no data, so a redraw puts the same frame on new data. Frames are
// immutable; Restrict makes new ones.
type frame struct {
	params []Param
	index  map[string]int
	layer  *layer // how params give those of the frame below; nil: they are the root's

	eq           echelon
	lower, upper []float64 // imposed bounds, nil: none
	redundant    []string  // restrictions that said nothing new
}

// layer maps the coordinates of one frame to those of the frame below it.
type layer struct {
	below *frame
	m     Map
}

func indexOf(ps []Param) map[string]int {
	ix := make(map[string]int, len(ps))
	for i, p := range ps {
		ix[p.Name] = i
	}
	return ix
}

func (f *frame) clone() *frame {
	g := *f
	g.lower = append([]float64(nil), f.lower...)
	g.upper = append([]float64(nil), f.upper...)
	g.redundant = append([]string(nil), f.redundant...)
	return &g
}

// RestrictionError says which restriction cannot be imposed, and why.
type RestrictionError struct {
	Restriction string // in words
	Err         error
}

// Error returns the text "lrt: restriction WORDS: CAUSE".
func (e *RestrictionError) Error() string {
	return fmt.Sprintf("lrt: restriction %s: %v", e.Restriction, e.Err)
}

// Unwrap returns the cause.
func (e *RestrictionError) Unwrap() error { return e.Err }

// equation returns the dense form, scaled to a largest coefficient of 1.
func (f *frame) equation(e Equation) ([]float64, float64, error) {
	words := e.words()
	if len(e.Names) == 0 || len(e.Names) != len(e.Coef) {
		return nil, 0, &RestrictionError{words, fmt.Errorf("%w: %d names and %d coefficients", ErrInvalid, len(e.Names), len(e.Coef))}
	}
	a := make([]float64, len(f.params))
	for i, name := range e.Names {
		j, ok := f.index[name]
		if !ok {
			return nil, 0, &RestrictionError{words, f.unknown(name)}
		}
		a[j] += e.Coef[i]
	}
	if !finite(a) || math.IsNaN(e.Value) || math.IsInf(e.Value, 0) {
		return nil, 0, &RestrictionError{words, fmt.Errorf("%w: coefficients and value must be finite", ErrInvalid)}
	}
	big := 0.0
	for _, v := range a {
		big = math.Max(big, math.Abs(v))
	}
	if big == 0 {
		return nil, 0, &RestrictionError{words, fmt.Errorf("%w: every coefficient is 0", ErrInvalid)}
	}
	for j := range a {
		a[j] /= big
	}
	return a, e.Value / big, nil
}

func (f *frame) unknown(name string) error {
	var names []string
	for _, p := range f.params {
		names = append(names, p.Name)
	}
	return fmt.Errorf("%w: no parameter is named %q; there are %s", ErrInvalid, name, strings.Join(names, ", "))
}

func (e Equation) words() string {
	ps := make([]Param, len(e.Names))
	for i, n := range e.Names {
		ps[i].Name = n
	}
	if len(e.Names) == 0 || len(e.Coef) != len(e.Names) {
		return "equation"
	}
	if len(e.Names) == 1 && e.Coef[0] == 0 {
		return fmt.Sprintf("0·%s = %g", e.Names[0], e.Value)
	}
	return equationWords(e.Coef, e.Value, ps)
}

// restrict returns the frame with one more restriction.
func (f *frame) restrict(r Restriction) (*frame, error) {
	if len(r.Equations) == 0 && len(r.Bounds) == 0 && r.Via == nil {
		return nil, &RestrictionError{"(empty)", fmt.Errorf("%w: it restricts nothing (Equate needs at least two names)", ErrInvalid)}
	}
	g := f.clone()
	for _, e := range r.Equations {
		a, b, err := g.equation(e)
		if err != nil {
			return nil, err
		}
		eq, st := g.eq.add(a, b)
		switch st {
		case contradicted:
			return nil, &RestrictionError{e.words(), fmt.Errorf("%w: it cannot hold together with %s", ErrContradiction, g.said())}
		case implied:
			g.redundant = append(g.redundant, e.words())
		}
		g.eq = eq
	}
	for _, b := range r.Bounds {
		if err := g.bound(b); err != nil {
			return nil, err
		}
	}
	if _, err := newCoordinates(g, nil); err != nil {
		return nil, err
	}
	if r.Via == nil {
		return g, nil
	}
	m := *r.Via
	if m.To == nil {
		return nil, &RestrictionError{"map", fmt.Errorf("%w: no function To", ErrInvalid)}
	}
	if err := checkParams(m.Params); err != nil {
		return nil, &RestrictionError{"map", err}
	}
	if len(m.Params) > len(g.params) {
		return nil, &RestrictionError{"map", fmt.Errorf("%w: %d parameters cannot restrict %d", ErrInvalid, len(m.Params), len(g.params))}
	}
	m.Params = append([]Param(nil), m.Params...)
	return &frame{params: m.Params, index: indexOf(m.Params), layer: &layer{g, m}}, nil
}

func (f *frame) bound(b Bound) error {
	words := b.words()
	j, ok := f.index[b.Name]
	if !ok {
		return &RestrictionError{words, f.unknown(b.Name)}
	}
	if math.IsNaN(b.Lower) || math.IsNaN(b.Upper) || math.IsInf(b.Lower, 1) || math.IsInf(b.Upper, -1) {
		return &RestrictionError{words, fmt.Errorf("%w: the bound is not a number", ErrInvalid)}
	}
	if f.lower == nil {
		f.lower, f.upper = make([]float64, len(f.params)), make([]float64, len(f.params))
		for i := range f.lower {
			f.lower[i], f.upper[i] = -inf, inf
		}
	}
	lo, hi := math.Max(f.lower[j], b.Lower), math.Min(f.upper[j], b.Upper)
	p := f.params[j]
	if lo > hi || lo > p.Upper || hi < p.Lower {
		return &RestrictionError{words, fmt.Errorf("%w: nothing is left of the range of %s", ErrContradiction, p.Name)}
	}
	if b.Lower <= math.Max(f.lower[j], p.Lower) && b.Upper >= math.Min(f.upper[j], p.Upper) {
		f.redundant = append(f.redundant, words)
	}
	f.lower[j], f.upper[j] = lo, hi
	if lo == hi {
		a := make([]float64, len(f.params))
		a[j] = 1
		eq, st := f.eq.add(a, lo)
		if st == contradicted {
			return &RestrictionError{words, fmt.Errorf("%w: it cannot hold together with %s", ErrContradiction, f.said())}
		}
		f.eq = eq
	}
	return nil
}

func (b Bound) words() string {
	switch {
	case math.IsInf(b.Upper, 1):
		return fmt.Sprintf("%s ≥ %g", b.Name, b.Lower)
	case math.IsInf(b.Lower, -1):
		return fmt.Sprintf("%s ≤ %g", b.Name, b.Upper)
	}
	return fmt.Sprintf("%g ≤ %s ≤ %g", b.Lower, b.Name, b.Upper)
}

// bounds returns the imposed bounds in force as a list.
func (f *frame) bounds() []Bound {
	var bs []Bound
	for j := range f.lower {
		b := Bound{f.params[j].Name, f.lower[j], f.upper[j]}
		if b.Lower <= f.params[j].Lower {
			b.Lower = -inf
		}
		if b.Upper >= f.params[j].Upper {
			b.Upper = inf
		}
		if b.Lower < b.Upper && (!math.IsInf(b.Lower, -1) || !math.IsInf(b.Upper, 1)) {
			bs = append(bs, b)
		}
	}
	return bs
}

// said lists in words what is imposed on this frame alone.
func (f *frame) said() string {
	var parts []string
	for i := range f.eq.rows {
		parts = append(parts, f.eq.words(i, f.params))
	}
	for _, b := range f.bounds() {
		parts = append(parts, b.words())
	}
	if len(parts) == 0 {
		return "the parameters' ranges"
	}
	return strings.Join(parts, ", ")
}

// words lists what is imposed from the root upwards.
func (f *frame) words() string {
	if f.layer == nil {
		if len(f.eq.rows) == 0 && len(f.bounds()) == 0 {
			return "all parameters free"
		}
		return f.said()
	}
	var names []string
	for _, p := range f.params {
		names = append(names, p.Name)
	}
	w := fmt.Sprintf("parameters through %s", strings.Join(names, ", "))
	if below := f.layer.below; below.layer != nil || len(below.eq.rows) > 0 || len(below.bounds()) > 0 {
		w = below.words() + "; " + w
	}
	if len(f.eq.rows) > 0 || len(f.bounds()) > 0 {
		w += "; " + f.said()
	}
	return w
}

// within reports whether f lies inside g: nil, ErrNotNested naming what breaks
// it, or ErrNestingUnknown.
func (f *frame) within(g *frame) error {
	for x := f; x != nil; x = x.down() {
		if x.layer == nil && g.layer == nil || x.layer != nil && g.layer != nil && x.layer == g.layer {
			return x.rowsWithin(g)
		}
	}
	return fmt.Errorf("%w: the full space is made by a map that the restricted space does not go through", ErrNestingUnknown)
}

func (f *frame) down() *frame {
	if f.layer == nil {
		return nil
	}
	return f.layer.below
}

func (f *frame) rowsWithin(g *frame) error {
	for i, row := range g.eq.rows {
		if f.eq.status(row, g.eq.rhs[i]) != implied {
			return fmt.Errorf("%w: the full space demands %s, which the restricted one (%s) does not", ErrNotNested, g.eq.words(i, g.params), f.said())
		}
	}
	for _, b := range g.bounds() {
		j := g.index[b.Name]
		lo, hi := f.reach(j)
		slack := 1e-12 * math.Max(math.Abs(b.Lower), 1)
		if !math.IsInf(b.Lower, -1) && lo < b.Lower-slack || !math.IsInf(b.Upper, 1) && hi > b.Upper+1e-12*math.Max(math.Abs(b.Upper), 1) {
			return fmt.Errorf("%w: the full space demands %s, which the restricted one (%s) does not", ErrNotNested, b.words(), f.said())
		}
	}
	return nil
}

// reach returns an interval that holds every value of parameter j under the
// equations and bounds.
func (f *frame) reach(j int) (lo, hi float64) {
	lo, hi = f.params[j].Lower, f.params[j].Upper
	if f.lower != nil {
		lo, hi = math.Max(lo, f.lower[j]), math.Min(hi, f.upper[j])
	}
	one := make([]float64, len(f.params))
	one[j] = 1
	left, rest, _ := f.eq.reduce(one, 0)
	// x_j = −rest + Σ left·x over free coordinates.
	l, h := -rest, -rest
	for k, c := range left {
		if c == 0 {
			continue
		}
		if k == j {
			return lo, hi // a free coordinate
		}
		kl, kh := f.params[k].Lower, f.params[k].Upper
		if f.lower != nil {
			kl, kh = math.Max(kl, f.lower[k]), math.Min(kh, f.upper[k])
		}
		if c < 0 {
			kl, kh = kh, kl
		}
		l, h = l+c*kl, h+c*kh
	}
	return math.Max(lo, l), math.Min(hi, h)
}
