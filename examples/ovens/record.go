package main

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"math"
	"os"

	"subsume.example/anova"
	"subsume.example/lrt"
)

// saveRecord writes the record of the analysis to a file, or after the report.
func (s *study) saveRecord(ctx context.Context, path string, out io.Writer) error {
	r, err := s.makeRecord(ctx)
	if err != nil {
		return err
	}
	var b bytes.Buffer
	if err := r.WriteJSON(&b); err != nil {
		return err
	}
	if path == "-" {
		_, err = fmt.Fprintf(out, "\n%s", b.Bytes())
	} else {
		err = os.WriteFile(path, b.Bytes(), 0o644)
	}
	if err != nil {
		return &outputError{err}
	}
	return nil
}

// makeRecord makes the record, with what only this program knows declared in it.
func (s *study) makeRecord(ctx context.Context) (anova.Record, error) {
	d := anova.Declaration{
		Question: s.question(), Units: "rows of the file", Blocks: "none declared", Strata: "none declared", Randomization: "not declared",
		Fixed: []string{s.group}, MissingRule: "rows complete in every column used; the empty field is missing",
		Decomposition: "sequential", Checks: s.recordChecks(), ChecksNotMade: notChecked,
	}
	for _, word := range s.missing {
		d.MissingRule += fmt.Sprintf(", and so is %q", word)
	}
	reports := []anova.Report{s.groupMeans.Report()}
	if s.family != nil {
		reports = append(reports, s.family.Report())
	}
	reports = append(reports, s.table.Effects())
	if q := s.planned; q != nil {
		d.Plan = fmt.Sprintf("to find a difference of %v between two groups, with standard deviation %v within groups, at level %.10g with power %v", q.difference, q.sd, q.alpha, q.wanted)
		reports = append(reports, q.power.Report())
		if q.each > 0 {
			reports = append(reports, q.size.Report())
		}
	}
	return anova.NewRecord(ctx, s.table, s.data, d, s.settings(), reports...)
}

// recordChecks lists the checks with their results; those that could not be made say why.
func (s *study) recordChecks() []anova.RecordCheck {
	var out []anova.RecordCheck
	add := func(name, statistic string, value, p float64, reference, note string) {
		out = append(out, anova.RecordCheck{Name: name, Statistic: statistic, Value: value, P: p, Reference: reference, Note: note})
	}
	skip := func(name, why string) { add(name, "", math.NaN(), math.NaN(), "", "not made: "+why) }
	if s.residuals != "" {
		skip("outlying row", s.residuals)
		skip("file order", s.residuals)
	} else {
		s.recordResiduals(add)
	}
	add("leverage", "largest leverage", s.byRow[s.leverage].Leverage, math.NaN(), "no test", s.place(s.leverage))
	likelihood := func(name string, q lrt.Result, not string) {
		if not != "" {
			skip(name, not)
			return
		}
		t := q.Test()
		law := t.Kind.String()
		switch {
		case t.Law != nil:
			law += ", " + t.Law.String()
		case t.Simulation != nil:
			law += fmt.Sprintf(", %d draws", t.Simulation.Draws)
		}
		add(name, t.Name, t.Statistic, t.P, law, t.Why)
	}
	likelihood("equal spread", s.spread, s.noSpread)
	if len(s.covariates) > 0 {
		likelihood("equal slopes", s.slopes, s.noSlopes)
	}
	return out
}

// recordResiduals records the checks of residuals.
func (s *study) recordResiduals(add func(name, statistic string, value, p float64, reference, note string)) {
	const largest, steps = "largest absolute studentized residual", "squared steps between neighbouring residuals over squared residuals"
	law := fmt.Sprintf("%d simulated sets of normal residuals of this design", s.outlying.draws)
	if s.outlying.draws == 0 {
		law = "too many rows to simulate"
	}
	add("outlying row", largest, s.outlying.value, s.outlying.p, law, s.place(s.worst))
	add("outlying row, bound", largest, s.outlying.value, s.outlying.bound, "Bonferroni's inequality: p is not above this", s.place(s.worst))
	if w := s.without; w != nil {
		t := w.result.Test()
		add("answer without the outlying row", t.Name, t.Statistic, t.P, t.Kind.String(), s.place(s.worst)+"; the row was not left out of the answer")
	}
	add("file order", steps, s.serial.value, s.serial.p, law+", two-sided", "")
}
