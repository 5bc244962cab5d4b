package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// models are the two spaces, both fits, and the answers about them.
type models struct {
	small, full       *glm.Model
	smallFit, fullFit *glm.Fit
	result            lrt.Result
	table             anova.Table
}

// terms are those of the small model: the constant and the covariates.
func (s *study) terms() []glm.Term {
	terms := []glm.Term{glm.Constant{}}
	for _, c := range s.covariates {
		terms = append(terms, glm.Covariate{Field: c})
	}
	return terms
}

// pair binds both models to data: without the group, and with it.
func (s *study) pair(ctx context.Context, data *glm.Data, response string) (small, full *glm.Model, err error) {
	if small, err = glm.Normal(ctx, data, response, s.terms(), nil); err != nil {
		return nil, nil, err
	}
	full, err = small.With(ctx, glm.Factor{Field: s.group})
	return small, full, err
}

// settings are those of every comparison.
func (s *study) settings() *lrt.Settings { return &lrt.Settings{Level: s.level, Seed: s.seed} }

// compare fits both models and compares them, and makes the table.
func (s *study) compare(ctx context.Context) error {
	var err error
	if s.small, s.full, err = s.pair(ctx, s.data, s.response); err != nil {
		return err
	}
	question := lrt.Comparison{Name: s.group, Restricted: s.small, Full: s.full}
	if s.result, err = question.Run(ctx, s.settings()); err != nil {
		return s.explain(err)
	}
	if s.smallFit, err = s.small.Fit(ctx, s.settings()); err != nil {
		return err
	}
	if s.fullFit, err = s.full.Fit(ctx, s.settings()); err != nil {
		return err
	}
	return s.tabulate(ctx)
}

// tabulate compares each term with what stands before it, all on one factorization.
func (s *study) tabulate(ctx context.Context) error {
	rows, err := anova.OneWay(ctx, s.data, s.response, s.group, &anova.Options{Covariates: s.covariates})
	if err != nil {
		return err
	}
	s.table, err = anova.Tabulate(ctx, rows, s.settings())
	return err
}

// explain says in the words of the file what a refused comparison means.
func (s *study) explain(err error) error {
	switch {
	case errors.Is(err, lrt.ErrNoErrorDF):
		return fmt.Errorf("%s: every group of %q has too few rows to tell chance from difference: %w", s.name(), s.group, err)
	case errors.Is(err, lrt.ErrNoVariation):
		return fmt.Errorf("%s: %q does not vary in the rows used: %w", s.name(), s.response, err)
	case errors.Is(err, lrt.ErrNothingTested):
		return fmt.Errorf("%s: the covariates already tell the groups of %q apart: %w", s.name(), s.group, err)
	}
	return err
}

// question is what is asked, in words.
func (s *study) question() string {
	return fmt.Sprintf("Does the mean of %s differ between the groups of %s%s by more than chance allows?", s.response, s.group, s.atEqual())
}

// writeQuestion says what is asked.
func (s *study) writeQuestion(p *page) {
	p.title("Question")
	p.text("%s", s.question())
	p.line("")
	p.line("  restricted model: %s", s.small)
	p.line("  full model:       %s", s.full)
}

// writeComparison gives both fits and what follows from them.
func (s *study) writeComparison(p *page) {
	p.title("Comparison")
	t := p.table("lrrrrr")
	t.row("model", "rank", "error df", "residual sum of squares", "residual SD", "log likelihood")
	for _, f := range []struct {
		name string
		fit  *glm.Fit
	}{{"restricted", s.smallFit}, {"full", s.fullFit}} {
		t.row(f.name, fmt.Sprint(f.fit.Rank), fmt.Sprint(f.fit.DFError), fig(f.fit.RSS, 7), fig(f.fit.SD, 5), dec(f.fit.LogLikelihood, 4))
	}
	t.end()
	r := s.result
	t = p.table("lrl")
	t.row("likelihood ratio λ", fig(r.Lambda, 4), fmt.Sprintf("log λ = %s (%s)", dec(r.LogLambda, 4), r.Stratum()))
	if c := r.ChiSquared; c.Kind != lrt.None {
		size := ""
		if x := r.TrueSize(1 - r.Level); !math.IsNaN(x) {
			size = fmt.Sprintf("; asymptotic: at nominal %s its true size here is %s", percent(1-r.Level), percent(x))
		}
		t.row("−2 log λ", fig(c.Statistic, 5), fmt.Sprintf("χ² with %g df, p = %s%s", r.Pair.DF, prob(c.P, c.LogP), size))
	}
	if e := r.Exact; e.Kind != lrt.None {
		d1, d2 := r.Pair.Linear.DF()
		t.row(e.Name, fig(e.Statistic, 5), fmt.Sprintf("F with %g and %g df, p = %s; %s", d1, d2, prob(e.P, e.LogP), e.Kind))
	}
	t.end()
	p.text("Read the %s test: %s.", r.Recommended, r.Why)
	for _, w := range r.Warnings {
		p.text("Warning (%s): %s.", w.Code, w.Text)
	}
}

// writeTable writes the sequential table.
func (s *study) writeTable(p *page) {
	p.title("Table")
	_, body, _ := strings.Cut(s.table.String(), "\n") // without its title
	p.b.WriteString(body)
	p.gap()
	p.b.WriteString(s.table.Effects().Text())
}

// atEqual adds the covariates to a sentence.
func (s *study) atEqual() string {
	if len(s.covariates) == 0 {
		return ""
	}
	return " at equal " + and(s.covariates)
}
