package glm

import (
	"fmt"
	"math"
	"strings"

	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// The fit is computed for y' on columns b, with y = 2^E y' + c·1 and asked
// columns x that are polynomials in the b. So the asked coefficients are
//
//	β = 2^E V γ + c at the carrier of the constant,
//
// where column i of V writes basis column i in the asked columns, the constant
// going to the carrier: b = 2^−e x − 2^−e shift·1, and likewise for powers.

// weight is the weight of one asked coefficient in a linear function.
type weight struct {
	term, column int
	coef         dd.DD
}

// pulled is a function of the asked coefficients as one of the basis: 2^exp c.
type pulled struct {
	c linalg.Vec
	// exp is 0 unless squares of c would leave the range: columns near 1e300 or 1e-300.
	exp int
	// carried is the sum of the weights at the carrier, not scaled.
	carried dd.DD
}

// scaleOf returns the power of two to take out of a function of the asked coefficients.
func (j *joint) scaleOf(m *Model, ws []weight) int {
	top := math.MinInt
	for _, w := range ws {
		b := m.cols[w.term]
		if w.coef.Hi == 0 {
			continue
		}
		e := math.Ilogb(w.coef.Hi)
		switch g := j.group(b); {
		case j.basis.powers[g] != nil:
			e -= (w.column + 1) * j.basis.powers[g].exp
		case b.dense():
			e -= j.exp[j.denseColumn(g)+w.column]
		default:
			e -= j.scales[g]
		}
		top = max(top, e)
	}
	if top > -400 && top < 400 || top == math.MinInt {
		return 0
	}
	return top
}

// pullback returns Vᵀ of a function of the asked coefficients of m.
func (j *joint) pullback(m *Model, ws []weight) pulled {
	c := j.gram.NewVec()
	var carried dd.DD
	exp := j.scaleOf(m, ws)
	carrier := m.carrier()
	add := func(at int, x dd.DD) { c.Set(at, c.At(at).Add(x)) }
	for _, w := range ws {
		b := m.cols[w.term]
		g := j.group(b)
		at := j.gram.Offset(g)
		if w.term == carrier {
			carried = carried.Add(w.coef)
		}
		switch p := j.basis.powers[g]; {
		case p != nil:
			v, back := p.inverse(), -(w.column+1)*p.exp-exp
			for i := range p.degree {
				add(at+i, w.coef.Mul(v[w.column+1][i+1]).Scale(back))
			}
		case b.dense():
			add(at+w.column, w.coef.Scale(-j.exp[j.denseColumn(g)+w.column]-exp))
		default:
			add(at+w.column, w.coef.Scale(-j.scales[g]-exp))
		}
	}
	if carried.Hi == 0 || !j.shifted {
		return pulled{c, exp, carried}
	}
	// What the shifts of the other columns of m moved into the constant.
	for _, b := range m.cols {
		g := j.group(b)
		at := j.gram.Offset(g)
		switch p := j.basis.powers[g]; {
		case p != nil:
			v := p.inverse()
			for i := range p.degree {
				add(at+i, carried.Mul(v[0][i+1]).Scale(-exp))
			}
		case b.dense():
			for k := range b.Names {
				d := j.denseColumn(g) + k
				if s := j.shift[d]; s != 0 {
					add(at+k, carried.MulF(-s).Scale(-j.exp[d]-exp))
				}
			}
		}
	}
	return pulled{c, exp, carried}
}

// denseColumn returns the number of a group's first dense column.
func (j *joint) denseColumn(g int) int {
	n := 0
	for _, b := range j.cols[:g] {
		if b.dense() {
			n += len(b.Names)
		}
	}
	return n
}

// inverse returns V with u^i = Σ_k V[k][i] (2^−exp x)^k, u = (x − centre)·2^−exp.
func (p *powers) inverse() [][]dd.DD {
	n := p.degree + 1
	centre := math.Ldexp(p.centre, -p.exp)
	v := make([][]dd.DD, n)
	for k := range v {
		v[k] = make([]dd.DD, n)
	}
	v[0][0] = dd.From(1)
	for i := 1; i < n; i++ {
		for k := 0; k <= i; k++ {
			v[k][i] = v[k][i-1].MulF(-centre)
			if k > 0 {
				v[k][i] = v[k][i].Add(v[k-1][i-1])
			}
		}
	}
	return v
}

// yShift returns the provisional mean of the response.
func (j *joint) yShift() float64 { return j.shift[len(j.shift)-1] }

// functional brings an equation between asked coefficients to the basis: the
// function of γ and its value.
func (j *joint) functional(m *Model, e lrt.Equation) (linalg.Vec, dd.DD, error) {
	ws, err := m.weights(e.Names, e.Coef)
	if err != nil {
		return linalg.Vec{}, dd.DD{}, err
	}
	c := j.pullback(m, ws)
	v := dd.From(e.Value).Sub(c.carried.MulF(j.yShift()))
	return c.c, v.Scale(-j.yExp() - c.exp), nil
}

func (m *Model) weights(names []string, coef []float64) ([]weight, error) {
	ws := make([]weight, len(names))
	for i, n := range names {
		t, c, ok := m.coefficient(n)
		if !ok {
			return nil, m.unknown(n)
		}
		ws[i] = weight{t, c, dd.From(coef[i])}
	}
	if ws = m.asDisplayed(ws); nothing(ws) {
		return nil, &CoefficientError{Name: strings.Join(names, ", "), Err: fmt.Errorf("%w: it is 0 by the choice of the reference level", ErrNotEstimable)}
	}
	return ws, nil
}

// asked returns the value of a function of the asked coefficients from its value on the basis.
func (j *joint) asked(onBasis dd.DD, c pulled) float64 {
	x := onBasis.Scale(j.yExp() + c.exp)
	if math.IsInf(x.Hi, 0) {
		return x.Hi
	}
	return x.Add(c.carried.MulF(j.yShift())).Float64()
}

// mappable reports whether asked coefficients can be read off the basis with
// columns set aside at zero: the carrier is whole, of no polynomial is
// a power set aside below one that is kept, and no column was set aside for a
// constant that stands after it.
func (j *joint) mappable(m *Model, f *linalg.Factor) bool {
	if !j.shifted {
		return true
	}
	carrier := j.group(m.cols[m.carrier()])
	moved := j.movedBefore(m)
	lowest := make(map[int]int)
	gone := make(map[int]int)
	for _, a := range f.Aside {
		if a.Group == carrier && !a.Empty {
			return false
		}
		if moved && j.cols[a.Group].dense() && !j.blank(a) {
			return false
		}
		if j.basis.powers[a.Group] != nil {
			if k, ok := lowest[a.Group]; !ok || a.Column < k {
				lowest[a.Group] = a.Column
			}
			gone[a.Group]++
		}
	}
	for g, k := range lowest {
		if j.basis.powers[g].degree-k != gone[g] {
			return false
		}
	}
	return true
}

// movedBefore reports whether a dense column before the carrier was shifted.
func (j *joint) movedBefore(m *Model) bool {
	for _, b := range m.cols[:m.carrier()] {
		g := j.group(b)
		if p := j.basis.powers[g]; p != nil && p.centre != 0 {
			return true
		}
		if !b.dense() {
			continue
		}
		d := j.denseColumn(g)
		for k := range b.Names {
			if j.shift[d+k] != 0 {
				return true
			}
		}
	}
	return false
}

// blank reports whether a column set aside is zero as it was asked for, not only
// less its shift.
func (j *joint) blank(a linalg.Aside) bool {
	switch p := j.basis.powers[a.Group]; {
	case !a.Empty || !j.cols[a.Group].dense():
		return a.Empty
	case p != nil:
		return p.centre == 0
	}
	return j.shift[j.denseColumn(a.Group)+a.Column] == 0
}

// fromBasis returns x·2^exp + shift, ±Inf where that leaves the range.
func fromBasis(x dd.DD, exp int, shift float64) float64 {
	v := x.Scale(exp).AddF(shift).Float64()
	if math.IsNaN(v) {
		return math.Ldexp(x.Float64(), exp) + shift
	}
	return v
}

func ldexp(x dd.DD, k int) float64 { return math.Ldexp(x.Float64(), k) }
