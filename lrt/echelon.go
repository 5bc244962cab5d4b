package lrt

import (
	"fmt"
	"math"
	"sort"
	"strings"
)

// echelon holds linear equations A x = b in reduced row echelon form, which is
// the same whatever order they came in. Row i has leading column lead[i], the
// columns ascending. The zero value holds no equation.
type echelon struct {
	rows [][]float64
	rhs  []float64
	lead []int
}

// The tolerance under which what is left of an equation after elimination is
// rounding: coefficients are scaled to a largest of 1.
const equationTol = 1e-11

// reduce returns what is left of the equation after elimination: implied, or
// the size of the terms the right side was made from.
func (e echelon) reduce(a []float64, b float64) (left []float64, rest float64, size float64) {
	left = append([]float64(nil), a...)
	rest, size = b, math.Abs(b)
	for i, l := range e.lead {
		f := left[l]
		if f == 0 {
			continue
		}
		for j, v := range e.rows[i] {
			left[j] -= f * v
		}
		left[l] = 0
		rest -= f * e.rhs[i]
		size = math.Max(size, math.Abs(f*e.rhs[i]))
	}
	for j, v := range left {
		if math.Abs(v) < equationTol {
			left[j] = 0
		}
	}
	return left, rest, size
}

func zero(a []float64) bool {
	for _, v := range a {
		if v != 0 {
			return false
		}
	}
	return true
}

// state of an equation against others.
type state uint8

const (
	independent state = iota
	implied
	contradicted
)

func (e echelon) status(a []float64, b float64) state {
	left, rest, size := e.reduce(a, b)
	switch {
	case !zero(left):
		return independent
	case math.Abs(rest) <= 1e-9*size:
		return implied
	}
	return contradicted
}

// add returns the form with one more equation, scaled to a largest coefficient
// of 1. It does not change the receiver.
func (e echelon) add(a []float64, b float64) (echelon, state) {
	left, rest, _ := e.reduce(a, b)
	if st := e.status(a, b); st != independent {
		return e, st
	}
	lead := 0
	for left[lead] == 0 {
		lead++
	}
	f := left[lead]
	for j := range left {
		left[j] /= f
	}
	rest /= f
	left[lead] = 1
	n := echelon{}
	for i, row := range e.rows {
		r := append([]float64(nil), row...)
		v := e.rhs[i]
		if g := r[lead]; g != 0 {
			for j := range r {
				r[j] -= g * left[j]
				if math.Abs(r[j]) < equationTol {
					r[j] = 0
				}
			}
			r[lead] = 0
			v -= g * rest
		}
		n.rows, n.rhs, n.lead = append(n.rows, r), append(n.rhs, v), append(n.lead, e.lead[i])
	}
	n.rows, n.rhs, n.lead = append(n.rows, left), append(n.rhs, rest), append(n.lead, lead)
	sort.Sort(byLead(n))
	return n, independent
}

type byLead echelon

func (b byLead) Len() int           { return len(b.lead) }
func (b byLead) Less(i, j int) bool { return b.lead[i] < b.lead[j] }
func (b byLead) Swap(i, j int) {
	b.rows[i], b.rows[j] = b.rows[j], b.rows[i]
	b.rhs[i], b.rhs[j] = b.rhs[j], b.rhs[i]
	b.lead[i], b.lead[j] = b.lead[j], b.lead[i]
}

// words writes row i as an equation between parameters.
func (e echelon) words(i int, ps []Param) string {
	return equationWords(e.rows[i], e.rhs[i], ps)
}

func equationWords(row []float64, rhs float64, ps []Param) string {
	var terms []int
	for j, v := range row {
		if v != 0 {
			terms = append(terms, j)
		}
	}
	if len(terms) == 1 {
		return fmt.Sprintf("%s = %g", ps[terms[0]].Name, rhs/row[terms[0]])
	}
	if len(terms) == 2 && rhs == 0 && row[terms[0]] == -row[terms[1]] {
		return fmt.Sprintf("%s = %s", ps[terms[0]].Name, ps[terms[1]].Name)
	}
	var b strings.Builder
	for k, j := range terms {
		v := row[j]
		switch {
		case k == 0 && v < 0:
			b.WriteString("−")
		case k > 0 && v < 0:
			b.WriteString(" − ")
		case k > 0:
			b.WriteString(" + ")
		}
		if a := math.Abs(v); a != 1 {
			fmt.Fprintf(&b, "%g·", a)
		}
		b.WriteString(ps[j].Name)
	}
	fmt.Fprintf(&b, " = %g", rhs)
	return b.String()
}
