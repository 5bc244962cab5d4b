// Package certified measures how many digits the fits of package glm share with
// the certificates of the NIST Statistical Reference Datasets.
package certified

import (
	"context"
	"fmt"
	"math"

	"subsume.example/glm"
	"subsume.example/internal/published"
	"subsume.example/lrt"
)

// Row is one data set read one way.
type Row struct {
	Set string
	// Decimals: every digit of the text was kept; otherwise inputs were rounded to float64.
	Decimals bool
	Figures  []Figure
	// Perfect is set when the certificate is a perfect fit and the comparison said so.
	Perfect bool
}

// Figure is the number of digits reached, its worst over a list, and what is wanted: for float64 inputs
// half a digit below what exact arithmetic on them gives, for decimals 13.
type Figure struct {
	Name          string
	Digits, Limit float64
}

// spec is a data set with its model and the digits that rounded inputs allow, less
// half a digit, as the file of each set states them.
type spec struct {
	id    string
	terms []glm.Term
	limit map[string]float64
}

func polynomial(k int) []glm.Term {
	return []glm.Term{glm.Constant{}, glm.Powers{Field: "x", Degree: k}}
}

func plane(k int) []glm.Term {
	terms := []glm.Term{glm.Constant{}}
	for i := 1; i <= k; i++ {
		terms = append(terms, glm.Covariate{Field: fmt.Sprintf("x%d", i)})
	}
	return terms
}

func regression(coef, se, sd, f float64) map[string]float64 {
	return map[string]float64{"coefficients": coef, "standard errors": se, "residual SD": sd, "F": f}
}

func oneWay(sd, f, ssb, ssw float64) map[string]float64 {
	return map[string]float64{"residual SD": sd, "F": f, "SS between": ssb, "SS within": ssw}
}

var specs = []spec{
	{"nist-norris", []glm.Term{glm.Constant{}, glm.Covariate{Field: "x"}}, regression(13.6, 13.4, 13.5, 13.2)},
	{"nist-noint1", []glm.Term{glm.Covariate{Field: "x"}}, regression(14.2, 14.5, 14.5, 14.5)},
	{"nist-noint2", []glm.Term{glm.Covariate{Field: "x"}}, regression(14.5, 14.4, 14.5, 14.5)},
	{"nist-filip", polynomial(10), regression(13.5, 14.3, 14.3, 14.3)},
	{"nist-longley", plane(6), regression(14.1, 14.4, 14.5, 14.5)},
	{"nist-wampler1", polynomial(5), regression(14.5, 14.5, 14.5, 0)},
	{"nist-wampler2", polynomial(5), regression(12.7, 14.5, 14.5, 0)},
	{"nist-wampler3", polynomial(5), regression(14.5, 14.0, 14.3, 14.5)},
	{"nist-wampler5", polynomial(5), regression(14.5, 14.0, 14.3, 14.5)},
	{"nist-sirstv", nil, oneWay(12.9, 12.6, 13.5, 12.6)},
	{"nist-smls01", nil, oneWay(14.5, 14.5, 14.5, 14.5)},
	{"nist-smls02", nil, oneWay(14.5, 14.5, 14.5, 14.5)},
	{"nist-smls03", nil, oneWay(14.5, 14.5, 14.5, 14.5)},
	{"nist-smls04", nil, oneWay(10.1, 9.9, 9.6, 9.8)},
	{"nist-smls06", nil, oneWay(10.1, 9.7, 9.4, 9.8)},
	{"nist-smls07", nil, oneWay(4.1, 3.9, 3.5, 3.8)},
	{"nist-smls08", nil, oneWay(4.1, 3.7, 3.4, 3.8)},
	{"nist-smls09", nil, oneWay(4.1, 3.7, 3.4, 3.8)},
}

// Run fits every set, from inputs rounded to float64 and from decimal text.
func Run(ctx context.Context) ([]Row, error) {
	var rows []Row
	for _, s := range specs {
		for _, decimals := range []bool{false, true} {
			r, err := s.run(ctx, decimals)
			if err != nil {
				return nil, fmt.Errorf("%s: %w", s.id, err)
			}
			rows = append(rows, r)
		}
	}
	return rows, nil
}

// Data returns a published set as data; decimals keep their digits or are rounded to float64.
func Data(s *published.Set, decimals bool) (*glm.Data, error) {
	var cols []glm.Column
	for _, name := range s.Order {
		switch {
		case s.ColumnTypes[name] == "label":
			cols = append(cols, glm.Labels(name, s.Texts(name)))
		case decimals:
			cols = append(cols, glm.Decimals(name, s.Texts(name)))
		default:
			cols = append(cols, glm.Numbers(name, s.Numbers(name)))
		}
	}
	return glm.NewData(cols...)
}

func (s spec) run(ctx context.Context, decimals bool) (Row, error) {
	row := Row{Set: s.id, Decimals: decimals}
	set, err := published.Load(s.id)
	if err != nil {
		return row, err
	}
	d, err := Data(set, decimals)
	if err != nil {
		return row, err
	}
	terms, base := s.terms, []glm.Term(nil)
	if terms == nil {
		group := set.Order[0]
		if group == "y" {
			group = set.Order[1]
		}
		terms = []glm.Term{glm.Constant{}, glm.Factor{Field: group}}
	}
	if terms[0] == (glm.Term)(glm.Constant{}) {
		base = terms[:1]
	}
	full, err := glm.Normal(ctx, d, "y", terms, nil)
	if err != nil {
		return row, err
	}
	restricted, err := glm.Normal(ctx, d, "y", base, nil)
	if err != nil {
		return row, err
	}
	fit, err := full.Fit(ctx, nil)
	if err != nil {
		return row, err
	}
	r, err := lrt.Compare(ctx, restricted, full, nil)
	if err != nil {
		return row, err
	}
	add := func(name string, got []float64, field string) {
		limit := s.limit[name]
		if limit == 0 {
			return
		}
		if decimals {
			limit = math.Max(limit, 13)
		}
		worst := 15.0
		for i, x := range got {
			worst = math.Min(worst, published.Digits(x, set.Exact(field, i), 1))
		}
		row.Figures = append(row.Figures, Figure{name, worst, limit})
	}
	var beta, se []float64
	for _, c := range fit.Coefficients {
		beta, se = append(beta, c.Estimate), append(se, c.SE)
	}
	l := r.Pair.Linear
	if s.terms != nil {
		add("coefficients", beta, "coefficients")
		add("standard errors", se, "standard_errors")
	}
	add("SS between", []float64{math.Ldexp(l.Numerator, 2*l.Scale)}, "ss_between")
	add("SS within", []float64{fit.RSS}, "ss_within")
	add("residual SD", []float64{fit.SD}, "residual_sd")
	add("F", []float64{r.Exact.Statistic}, "F")
	row.Perfect = math.IsInf(r.Exact.Statistic, 1) && r.Exact.P == 0 && math.IsInf(r.LogLambda, -1) && r.HasWarning("nil-residual")
	return row, nil
}
