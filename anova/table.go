package anova

import (
	"math"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Table is a set of comparisons on the same observations, with what they share.
// It is made by Tabulate, immutable, and safe for concurrent use.
type Table struct {
	rows  []Row
	whole Row // the error space of the rows against the constant
	level float64
}

// Rows returns the rows in the order of the comparisons.
func (t Table) Rows() []Row { return append([]Row(nil), t.rows...) }

// Row returns the row of a name.
func (t Table) Row(name string) (Row, bool) {
	for _, r := range t.rows {
		if r.Name() == name {
			return r, true
		}
	}
	return Row{}, false
}

// Level returns the confidence level of the settings.
func (t Table) Level() float64 { return t.level }

// Whole returns the row that compares the model whose residual is the error
// with the constant: all terms together. It reports false where the rows have
// errors of their own (or are not linear), so that there is no such model.
func (t Table) Whole() (Row, bool) { return t.whole, t.shared() }

// shared reports whether all tested rows are judged against the residual of one model.
func (t Table) shared() bool {
	w := t.whole.pair.Linear
	if w.M == 0 || w.Known > 0 {
		return false
	}
	for _, r := range t.rows {
		l := r.pair.Linear
		if l.M == 0 {
			if r.err == nil {
				return false
			}
			continue
		}
		if l.RankE0 != w.RankE0 || l.RankE1 != w.RankE1 || l.Denominator != w.Denominator {
			return false
		}
	}
	return true
}

// Line is a line of a table that is no comparison: error or total.
type Line struct {
	SS, DF, MeanSquare float64
}

// Error returns the error line that all rows share: the residual of the largest
// model. It reports false where there is none.
func (t Table) Error() (Line, bool) {
	if !t.shared() {
		return Line{math.NaN(), math.NaN(), math.NaN()}, false
	}
	l := t.whole.pair.Linear
	_, d2 := l.DF()
	return Line{math.Ldexp(l.Denominator, 2*l.Scale), d2, math.Ldexp(l.Denominator/d2, 2*l.Scale)}, true
}

// Total returns the total line: squares about the mean, or about zero (or the
// offset) where the largest model holds no constant.
func (t Table) Total() (Line, bool) {
	if !t.shared() {
		return Line{math.NaN(), math.NaN(), math.NaN()}, false
	}
	l := t.whole.pair.Linear
	d1, d2 := l.DF()
	n, d := l.Numerator+l.Denominator, d1+d2
	return Line{math.Ldexp(n, 2*l.Scale), d, math.Ldexp(n/d, 2*l.Scale)}, true
}

// RSquared returns the part of the total that all terms together explain; NaN
// where there is no total or it is nil.
func (t Table) RSquared() float64 {
	l := t.whole.pair.Linear
	if !t.shared() || l.Nil && l.NilNumerator {
		return math.NaN()
	}
	return l.Numerator / (l.Numerator + l.Denominator)
}

// N returns the number of observations, 0 where no row was fitted.
func (t Table) N() int {
	for _, r := range append([]Row{t.whole}, t.rows...) {
		if n := r.pair.Full.N; n > 0 {
			return n
		}
	}
	return 0
}

// Dropped returns the number of rows left out before for missing values.
func (t Table) Dropped() int { return t.whole.pair.Full.Dropped }

// Response returns the name of the response of linear rows.
func (t Table) Response() string {
	if m := t.model(); m != nil {
		return m.Response()
	}
	return ""
}

// model returns the model whose residual is the error of the first linear row; nil
// where no row is linear.
func (t Table) model() *glm.Model {
	m, _ := t.whole.comparison.Full.(*glm.Model)
	return m
}

// Warnings returns the warnings of all rows, each once, in order of appearance.
func (t Table) Warnings() []lrt.Warning {
	var ws []lrt.Warning
	seen := map[lrt.Warning]bool{}
	for _, r := range append(append([]Row(nil), t.rows...), t.whole) {
		list := r.result.Warnings
		if r.err != nil {
			list = r.pair.Warnings
		}
		for _, w := range list {
			if !seen[w] {
				seen[w] = true
				ws = append(ws, w)
			}
		}
	}
	return ws
}

// Model returns the model whose residual is the error of the first row: the
// largest model of a layout, and the one to ask for Means. It is nil where no row
// compares linear models.
func (t Table) Model() *glm.Model { return t.model() }
