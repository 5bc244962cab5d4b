package main

import (
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"runtime"

	"subsume.example"
	"subsume.example/dist"
	"subsume.example/glm"
	"subsume.example/internal/canon"
	"subsume.example/lrt"
)

// saveRecord writes the record to a file, or after the report.
func (s *study) saveRecord(path string, out io.Writer) error {
	r, err := s.recorded()
	if err != nil {
		return err
	}
	b, err := canon.Indent(r)
	if err != nil {
		return err
	}
	if path == "-" {
		_, err = out.Write(append([]byte("\n"), b...))
	} else {
		err = os.WriteFile(path, b, 0o644)
	}
	if err != nil {
		return &outputError{err}
	}
	return nil
}

// recorded fills the record.
func (s *study) recorded() (*record, error) {
	r := &record{Schema: "ovens/1", NotChecked: notChecked, Conclusion: s.conclusion()}
	r.Hypothesis = recHypothesis{
		Words:      s.question(),
		Restricted: s.small.String(), Full: s.full.String(),
		ErrorPair: []string{s.full.String(), "all rows"},
	}
	r.Hypothesis.Null = s.result.Comparison.Hypothesis()
	for _, c := range s.fullFit.Coefficients {
		if c.Term == s.group && !c.Aliased {
			r.Hypothesis.Tested = append(r.Hypothesis.Tested, c.Name)
		}
	}
	s.recordDesign(r)
	if err := s.recordData(r); err != nil {
		return nil, err
	}
	s.recordNumbers(r)
	s.recordEstimates(r)
	s.recordChecks(r)
	s.recordPlan(r)
	f := s.fullFit
	r.Reproduction = recReproduction{
		Library: subsume.Version, Go: runtime.Version(), Arch: runtime.GOARCH, Seed: s.seed, Draws: s.outlying.draws,
		RankTolerance: f.Tolerance, SmallestKept: f.SmallestKept, LargestAside: f.LargestAside,
		Fitting: "orthogonal factorization, no iterations; the check of equal spread is iterated to a checked maximum",
	}
	return r, nil
}

func (s *study) recordDesign(r *record) {
	d := recDesign{Unit: "row", Factor: s.group, Kind: "fixed", Covariates: append([]string{}, s.covariates...),
		EmptyCells: []string{}, Blocks: []string{}, Randomization: "not declared"}
	for i, g := range s.groups {
		d.Groups = append(d.Groups, recGroup{g, s.counts[i]})
	}
	r.Design = d
}

func (s *study) recordData(r *record) error {
	a := s.data.Account()
	o := s.data.Observations(s.response)
	rows, err := o.Rows.Digest()
	if err != nil {
		return err
	}
	response, err := o.Response.Digest()
	if err != nil {
		return err
	}
	d := recData{Source: filepath.Base(a.Source), RowsRead: a.Read, RowsUsed: a.Used, Dropped: []recDrop{}, Emptied: []recLevel{}, Levels: s.groups,
		MissingRule: "rows complete in every column used", MissingWords: append([]string{""}, s.missing...),
		Digest: fmt.Sprintf("%x", rows), ResponseDigest: fmt.Sprintf("%x", response)}
	for _, drop := range a.Dropped {
		q := recDrop{Column: drop.Column, Reason: drop.Reason}
		for _, row := range drop.Rows {
			q.Lines = append(q.Lines, s.all.Line(row))
		}
		d.Dropped = append(d.Dropped, q)
	}
	for _, e := range a.Emptied {
		d.Emptied = append(d.Emptied, recLevel{e.Column, e.Level})
	}
	r.Data = d
	return nil
}

func (s *study) recordNumbers(r *record) {
	q, l := s.result, s.result.Pair.Linear
	t := q.Test()
	d1, d2 := l.DF()
	ss := sumOfSquares(l)
	r.Method = recMethod{Statistic: t.Name, Kind: t.Kind.String(), Why: q.Why, Certified: l.Certified, Side: "upper tail: a larger statistic speaks against the restricted model",
		Level: s.level, Dispersion: "error variance estimated from the full model", Weights: "none", Offset: "none", Link: "identity",
		Coding: "one indicator a group; tests do not depend on the coding"}
	if t.Law != nil {
		r.Method.Reference = t.Law.String()
	}
	r.Numbers = recNumbers{
		Restricted: recorded(s.smallFit), Full: recorded(s.fullFit),
		NumeratorDF: d1, DenominatorDF: d2, NumeratorSS: ss, NumeratorMS: ss / d1,
		DenominatorMS: s.fullFit.RSS / float64(s.fullFit.DFError),
		F:             q.Exact.Statistic, P: q.Exact.P, LogP: q.Exact.LogP,
		Critical:      dist.F{D1: d1, D2: d2}.UpperQuantile(1 - s.level),
		Noncentrality: q.Exact.Statistic*d1*(d2-2)/d2 - d1,
		LogLambda:     q.LogLambda, Lambda: q.Lambda, LambdaOf: q.Stratum(),
		ChiSquared: q.ChiSquared.Statistic, ChiSquaredDF: q.Pair.DF, ChiSquaredP: q.ChiSquared.P, ChiSquaredLogP: q.ChiSquared.LogP,
		ChiSquaredTrue: q.TrueSize(1 - s.level),
	}
	for _, row := range s.table.Rows() {
		d1, _ := row.DF()
		t := row.Test()
		r.Table = append(r.Table, recRow{Name: row.Name(), Hypothesis: row.Hypothesis(), SS: row.SS(), DF: d1, MS: row.MeanSquare(), F: t.Statistic, P: t.P, LogP: t.LogP, Kind: t.Kind.String()})
	}
}

func recorded(f *glm.Fit) recFit {
	return recFit{f.N, f.Rank, f.DFError, f.RSS, f.SD, f.LogLikelihood}
}

func (s *study) recordEstimates(r *record) {
	e := recEstimates{At: []recValue{}}
	for i, c := range s.covariates {
		e.At = append(e.At, recValue{c, s.at[i]})
	}
	for _, m := range s.means {
		a := m.Adjusted
		e.Means = append(e.Means, recMean{m.Name, m.N, m.Raw.Mean, m.Raw.SD, a.Value, a.SE, a.Lower, a.Upper})
	}
	for _, q := range s.pairs {
		d := q.Estimate
		e.Pairs = append(e.Pairs, recPair{q.over, q.under, q.Row.Hypothesis(), d.Value, d.SE, d.T, q.P, q.LogP, q.AdjustedP, q.AdjustedLogP, q.Lower, q.Upper})
	}
	r.Estimates = e
	r.Multiplicity = recMultiplicity{"all pairs of groups", len(s.pairs), "Bonferroni", "Bonferroni"}
}

func (s *study) recordChecks(r *record) {
	add := func(c recCheck) { r.Checks = append(r.Checks, c) }
	skip := func(name, why string) {
		add(recCheck{Name: name, Value: math.NaN(), P: math.NaN(), Note: "not made: " + why})
	}
	if s.residuals != "" {
		skip("outlying row", s.residuals)
		skip("file order", s.residuals)
	} else {
		law := fmt.Sprintf("%d simulated sets of normal residuals of this design", s.outlying.draws)
		add(recCheck{"outlying row", "largest absolute studentized residual", s.outlying.value, s.outlying.p, law, s.data.Line(s.worst), ""})
		add(recCheck{"outlying row, bound", "largest absolute studentized residual", s.outlying.value, s.outlying.bound, "Bonferroni's inequality: p is not above this", s.data.Line(s.worst), ""})
		if w := s.without; w != nil {
			add(recCheck{"answer without the outlying row", w.result.Test().Name, w.result.Test().Statistic, w.result.P(), w.result.Recommended.String(), s.data.Line(s.worst), "the row was not left out of the answer"})
		}
		add(recCheck{"file order", "squared steps between neighbouring residuals over squared residuals", s.serial.value, s.serial.p, law + ", two-sided", 0, ""})
	}
	add(recCheck{"leverage", "largest leverage", s.byRow[s.leverage].Leverage, math.NaN(), "no test", s.data.Line(s.leverage), ""})
	s.recordLikelihood(r, "equal spread", s.spread, s.noSpread)
	if len(s.covariates) > 0 {
		s.recordLikelihood(r, "equal slopes", s.slopes, s.noSlopes)
	}
	r.Warnings = []recWarning{}
	for _, list := range [][]lrt.Warning{s.result.Warnings, s.fullFit.Warnings, s.spread.Warnings} {
		for _, w := range list {
			r.Warnings = append(r.Warnings, recWarning{w.Code, w.Text})
		}
	}
}

func (s *study) recordLikelihood(r *record, name string, q lrt.Result, not string) {
	c := recCheck{Name: name, Value: math.NaN(), P: math.NaN(), Note: "not made: " + not}
	if not == "" {
		t := q.Test()
		c = recCheck{Name: name, Statistic: t.Name, Value: t.Statistic, P: t.P, Reference: t.Kind.String()}
		if t.Law != nil {
			c.Reference += " " + t.Law.String()
		}
	}
	r.Checks = append(r.Checks, c)
}

func (s *study) recordPlan(r *record) {
	if q := s.planned; q != nil {
		r.Plan = &recPlan{q.difference, q.sd, q.alpha, q.here.Noncentrality, q.here.Power(q.alpha), q.wanted, q.detectable, q.each}
	}
}
