package anova

import (
	"context"
	"encoding/hex"
	"errors"
	"fmt"
	"math"
	"runtime"
	"slices"
	"strings"

	subsume "subsume.example"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// NewRecord makes the record of a table. The data must be those that the models of the
// table are bound to; s are the settings the table was made with. Reports of means,
// contrasts, effects and plans are taken along as they are. The model is fitted
// once more for its pivots.
//
// The error wraps lrt.ErrDifferentObservations for other data, ErrLayout for a
// table without linear rows.
func NewRecord(ctx context.Context, t Table, d *glm.Data, declared Declaration, s *lrt.Settings, reports ...Report) (Record, error) {
	m := t.Model()
	if m == nil {
		return Record{}, &LayoutError{Err: fmt.Errorf("%w: no row compares linear models", ErrLayout)}
	}
	if d == nil {
		return Record{}, &LayoutError{Err: fmt.Errorf("%w: no data", ErrLayout)}
	}
	if err := m.Source().Observations(m.Response()).Check(d.Observations(m.Response())); err != nil {
		return Record{}, fmt.Errorf("anova: record: %w", err)
	}
	r := Record{Schema: "anova.record/1", Declared: declared, Reports: slices.Clone(reports)}
	var err error
	if r.Design, err = recordDesign(ctx, m); err != nil {
		return Record{}, err
	}
	if r.Data, err = recordData(d, m); err != nil {
		return Record{}, err
	}
	r.Method = recordMethod(t, m)
	for _, row := range t.rows {
		r.Rows = append(r.Rows, row.record(t.level))
	}
	r.Warnings = []RecordWarning{}
	for _, w := range t.Warnings() {
		r.Warnings = append(r.Warnings, RecordWarning{w.Code, w.Text})
	}
	fit, err := m.Fit(ctx, nil)
	if err != nil {
		return Record{}, err
	}
	r.Reproduction = RecordReproduction{Library: subsume.Version, Go: runtime.Version(), Arch: runtime.GOARCH,
		RankTolerance: fit.Tolerance, SmallestKept: fit.SmallestKept, LargestAside: fit.LargestAside,
		Fitting: "orthogonal factorization in the order of the terms, no iterations; same bits for any number of workers"}
	if s != nil {
		r.Reproduction.Seed = s.Seed
	}
	return r, nil
}

// maxRecordCells is how many cells a record lists one by one.
const maxRecordCells = 10000

func recordDesign(ctx context.Context, m *glm.Model) (RecordDesign, error) {
	d := RecordDesign{Factors: []RecordFactor{}, Covariates: []RecordCovariate{}, Cells: []RecordCell{}, EmptyCells: []string{}}
	v, err := takeSurvey(ctx, m)
	if errors.Is(err, ErrLayout) {
		return d, nil // terms of a caller's own: their fields are not known, or too many cells
	}
	if err != nil {
		return d, err
	}
	for f, name := range v.cells.Factors {
		d.Factors = append(d.Factors, RecordFactor{name, v.cells.Levels[f]})
	}
	for i, name := range v.covariates {
		d.Covariates = append(d.Covariates, RecordCovariate{name, v.mean[i]})
	}
	d.CellCount = len(v.cells.Count)
	if d.CellCount > maxRecordCells {
		return d, nil
	}
	for i, n := range v.cells.Count {
		d.Cells = append(d.Cells, RecordCell{v.cells.Name(i), n})
	}
	d.EmptyCells = append(d.EmptyCells, v.cells.Empty()...)
	return d, nil
}

func recordData(d *glm.Data, m *glm.Model) (RecordData, error) {
	a := d.Account()
	out := RecordData{Source: baseName(a.Source), RowsRead: a.Read, RowsUsed: a.Used, Dropped: []RecordDrop{}, Emptied: []string{}, ColumnDigests: []RecordDigest{}}
	for _, drop := range a.Dropped {
		out.Dropped = append(out.Dropped, RecordDrop{Column: drop.Column, Reason: drop.Reason, Rows: drop.Rows, Lines: drop.Lines})
	}
	for _, e := range a.Emptied {
		out.Emptied = append(out.Emptied, e.Column+"="+e.Level)
	}
	rows, err := d.Observations(m.Response()).Rows.Digest()
	if err != nil {
		return out, err
	}
	out.RowsDigest = hex.EncodeToString(rows[:])
	add := func(column, role string) {
		if err != nil || column == "" || slices.ContainsFunc(out.ColumnDigests, func(x RecordDigest) bool { return x.Column == column }) {
			return
		}
		var sum [32]byte
		sum, err = d.Observations(column).Response.Digest()
		out.ColumnDigests = append(out.ColumnDigests, RecordDigest{column, role, hex.EncodeToString(sum[:])})
	}
	add(m.Response(), "response")
	for _, f := range m.Factors() {
		add(f, "factor")
	}
	for _, c := range m.Covariates() {
		add(c, "covariate")
	}
	add(m.Options().Weights.Field, "weights")
	add(m.Options().Offset, "offset")
	return out, err
}

// baseName is the last part of a path, whatever its separators.
func baseName(s string) string { return s[strings.LastIndexAny(s, `/\`)+1:] }

func recordMethod(t Table, m *glm.Model) RecordMethod {
	o := m.Options()
	r := RecordMethod{Response: m.Response(), Model: m.String(), Family: "normal", Link: "identity", Level: t.level,
		Side:       "upper tail: a large statistic speaks against the restricted space",
		Dispersion: "error mean square of each row's error pair", WeightsKind: o.Weights.Kind.String(), Weights: o.Weights.Field, Offset: o.Offset,
		Coding: "one indicator for each level; no test depends on the coding"}
	if o.KnownVariance > 0 {
		r.Dispersion = fmt.Sprintf("known variance %v", o.KnownVariance)
	}
	return r
}

// record returns the row with its numbers.
func (r Row) record(level float64) RecordRow {
	restricted, full := r.Spaces()
	test, l, n := r.Test(), r.pair.Linear, math.NaN()
	d1, d2 := r.DF()
	out := RecordRow{Name: r.Name(), Restricted: restricted, Full: full, ErrorSpace: r.ErrorSpace(), Hypothesis: r.Hypothesis(),
		Statistic: test.Name, Reading: test.Kind.String(), Why: r.result.Why,
		RankRestricted: l.RankS, RankFull: l.RankB, RankErrorLess: l.RankE0, RankErrorMore: l.RankE1,
		RSSRestricted: r.pair.Restricted.Deviance, RSSFull: r.pair.Full.Deviance,
		LogLRestricted: r.pair.Restricted.LogLikelihood, LogLFull: r.pair.Full.LogLikelihood,
		SS: r.SS(), DF: d1, MS: r.MeanSquare(), DFError: d2, MSError: r.ErrorMeanSquare(),
		Value: test.Statistic, P: test.P, LogP: test.LogP, Critical: n, Noncentrality: n,
		LogLambda: n, Lambda: n, ChiSquaredP: n, ChiSquaredSize: n, Violation: n, Allowed: n, Certified: l.Certified, Nesting: r.pair.Nesting}
	if r.pair.Full.N == 0 { // nothing was fitted
		out.RSSRestricted, out.RSSFull, out.LogLRestricted, out.LogLFull = n, n, n, n
	}
	if k := r.pair.Certificate; k != nil {
		out.Violation, out.Allowed = k.Residual, k.Tol
		if !k.Exact {
			out.Failed = strings.TrimSuffix(k.Term+": "+k.Identity, ": ")
		}
	}
	if r.err != nil {
		out.Reading, out.Why, out.Statistic = r.failure(), r.note(), ""
		return out
	}
	res := r.result
	out.LogLambda, out.Lambda, out.LambdaOf = res.LogLambda, res.Lambda, res.Stratum()
	out.ChiSquaredP, out.ChiSquaredSize = res.ChiSquared.P, res.TrueSize(1-level)
	if test.Law != nil {
		out.Reference = test.Law.String()
		out.Critical = test.Law.UpperQuantile(1 - level)
	}
	if l.M > 0 && l.Known <= 0 && d2 > 2 {
		out.Noncentrality = test.Statistic*d1*(d2-2)/d2 - d1
	}
	return out
}
