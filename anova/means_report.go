package anova

import (
	"fmt"
	"io"
	"strings"
)

// Report returns the means as a report of schema "anova.means/1". Its facts are
// response, factors, n, df_error, ms_error and level; its lines have
//
//	group                       the levels
//	n                           observations
//	mean, sd                    of the observations of the group
//	mean_se, mean_lower, mean_upper  from the group alone
//	adjusted, se, lower, upper  by the model, with its error mean square
//	note                        why there is no adjusted mean
//
// A mean that does not exist has the reason "not-estimable", a spread "too-few".
// The notes say what was held at which value and averaged over what.
func (g *Groups) Report() Report {
	f := g.fit
	r := Report{Schema: "anova.means/1", Title: "Means of " + g.model.Response() + " by " + strings.Join(g.factors, " × "),
		Facts: []Fact{
			{"response", "", Text(g.model.Response())},
			{"factors", "", Text(strings.Join(g.factors, " × "))},
			{"n", "n =", Number(float64(f.N))},
			{"df_error", "error df =", Number(float64(f.DFError))},
			{"ms_error", "error mean square =", Number(f.Variance).because("no-error-df")},
			{"level", "level", percent(f.Level)},
		},
		Columns: []Column{
			{Key: "group", Title: strings.Join(g.factors, " × ")},
			{Key: "n", Title: "n", Numeric: true},
			{Key: "mean", Title: "mean", Numeric: true, Even: true},
			{Key: "sd", Title: "SD", Numeric: true, Even: true},
			{Key: "mean_se", Numeric: true},
			{Key: "mean_lower", Numeric: true},
			{Key: "mean_upper", Numeric: true},
			{Key: "adjusted", Title: "by the model", Numeric: true, Even: true},
			{Key: "se", Title: "SE", Numeric: true, Even: true},
			{Key: "lower", Title: "lower", Numeric: true, Even: true},
			{Key: "upper", Title: "upper", Numeric: true, Even: true},
			{Key: "note", Title: "note"},
		},
		Warnings: f.Warnings,
	}
	for _, q := range g.list {
		v := map[string]Value{"group": Text(q.Name), "n": Number(q.N), "mean": Number(q.Raw.Mean),
			"sd": Number(q.Raw.SD).because("too-few"), "mean_se": Number(q.Raw.SE).because("too-few"),
			"mean_lower": Number(q.Raw.Lower).because("too-few"), "mean_upper": Number(q.Raw.Upper).because("too-few")}
		if q.Err != nil {
			v["note"] = Text("not estimable")
			r.Notes = append(r.Notes, q.Name+": "+strings.TrimPrefix(q.Err.Error(), "glm: "))
		} else {
			v["adjusted"], v["se"] = Number(q.Adjusted.Value), Number(q.Adjusted.SE).because("no-error-df")
			v["lower"], v["upper"] = Number(q.Adjusted.Lower).because("no-error-df"), Number(q.Adjusted.Upper).because("no-error-df")
		}
		r.add("not-estimable", v)
	}
	r.Notes = append(r.Notes, "model: "+clip(bare(g.model)))
	r.Notes = append(r.Notes, g.held()...)
	return r
}

// held says what the means by the model hold alike.
func (g *Groups) held() []string {
	var n []string
	for _, h := range g.at {
		s := fmt.Sprintf("%s held at %s", h.Field, plain(h.Value))
		if !h.Stated {
			s += ", its mean over the observations"
		}
		n = append(n, s)
	}
	if len(g.others) > 0 {
		how := "every combination of levels counting equally"
		if g.observed {
			how = "combinations of levels weighted as observed"
		}
		n = append(n, "averaged over "+strings.Join(g.others, ", ")+", "+how)
	}
	return n
}

// WriteText writes Report as aligned text.
func (g *Groups) WriteText(w io.Writer) error { return g.Report().WriteText(w) }

// String returns Report as aligned text.
func (g *Groups) String() string { return g.Report().Text() }

// Report returns the family as a report of schema "anova.contrasts/1". Its facts
// are response, factors, method, tests (how many count), level, dimension, and of
// the comparison of all groups having one mean all_equal_f, all_equal_df,
// df_error and all_equal_p; its lines have
//
//	contrast       name
//	estimate, se   of the contrast
//	null           the value tested
//	t, df_error    t² is the F of the comparison
//	lower, upper   raw interval
//	p, log_p       of the comparison
//	adjusted_p, adjusted_log_p              accounting for the family
//	simultaneous_lower, simultaneous_upper  holding for all contrasts at once
//	reading        exact or approximate; "not estimable"
//	hypothesis     the equation
//
// A number that does not exist has the reason "not-estimable".
func (f Family) Report() Report {
	counted := 0
	for _, l := range f.lines {
		if l.Row.err == nil {
			counted++
		}
	}
	g := f.groups
	d1, d2 := f.all.DF()
	t := f.all.Test()
	r := Report{Schema: "anova.contrasts/1", Title: "Contrasts of " + g.model.Response() + " by " + strings.Join(g.factors, " × "),
		Facts: []Fact{
			{"response", "", Text(g.model.Response())},
			{"factors", "", Text(strings.Join(g.factors, " × "))},
			{"method", "adjusted:", Text(f.method.String())},
			{"tests", "tests:", Number(float64(counted))},
			{"level", "level", percent(f.level)},
			{"dimension", "", Number(f.dimension).because("not-tested")},
			{"all_equal_f", "all equal: " + t.Name + " =", Number(t.Statistic).because("not-tested")},
			{"all_equal_df", "", Number(d1).because("not-tested")},
			{"df_error", "", Number(d2).because("not-tested")},
			{"all_equal_p", "p =", probability(t.P, t.LogP).because("not-tested")},
		},
		Columns: []Column{
			{Key: "contrast", Title: "contrast"},
			{Key: "estimate", Title: "estimate", Numeric: true, Even: true},
			{Key: "se", Title: "SE", Numeric: true, Even: true},
			{Key: "null", Numeric: true},
			{Key: "t", Title: "t", Numeric: true},
			{Key: "df_error", Numeric: true},
			{Key: "lower", Numeric: true},
			{Key: "upper", Numeric: true},
			{Key: "p", Title: "p", Numeric: true},
			{Key: "log_p", Numeric: true},
			{Key: "adjusted_p", Title: "adjusted p", Numeric: true},
			{Key: "adjusted_log_p", Numeric: true},
			{Key: "simultaneous_lower", Title: "lower", Numeric: true, Even: true},
			{Key: "simultaneous_upper", Title: "upper", Numeric: true, Even: true},
			{Key: "reading", Title: "reading"},
			{Key: "hypothesis"},
		},
	}
	for _, l := range f.lines {
		v := map[string]Value{"contrast": Text(l.Name), "null": Number(l.Null), "hypothesis": Text(l.Row.Hypothesis())}
		if l.Null != 0 {
			r.title("null", "null value")
		}
		if l.Row.err != nil {
			v["reading"] = Text(l.Row.failure())
			v["estimate"] = Number(l.Estimate.Value)
			r.Notes = append(r.Notes, l.Name+": "+l.Row.note())
		} else {
			v["estimate"], v["se"], v["df_error"] = Number(l.Estimate.Value), Number(l.Estimate.SE), Number(f.errorDF())
			v["t"] = toDigits(l.Estimate.T, 5)
			v["lower"], v["upper"] = Number(l.Estimate.Lower), Number(l.Estimate.Upper)
			v["p"], v["log_p"] = probability(l.P, l.LogP), Number(l.LogP)
			v["adjusted_p"], v["adjusted_log_p"] = probability(l.AdjustedP, l.AdjustedLogP), Number(l.AdjustedLogP)
			v["simultaneous_lower"], v["simultaneous_upper"] = Number(l.Lower), Number(l.Upper)
			v["reading"] = Text(l.Row.Test().Kind.String())
		}
		r.add("not-estimable", v)
	}
	r.Notes = append(r.Notes, f.intervals())
	r.Notes = append(r.Notes, g.held()...)
	return r
}

// intervals says what the intervals hold for.
func (f Family) intervals() string {
	percent := percent(f.level).Text
	switch f.method {
	case Holm:
		return "intervals hold at once at " + percent + " (by Bonferroni: Holm has none of its own, so that an interval may hold the null value where the adjusted p is small)"
	case Scheffe:
		return fmt.Sprintf("intervals hold at once at %s for every contrast of the groups (%s dimensions)", percent, plain(f.dimension))
	case Tukey:
		if f.approximate {
			return "intervals hold at once at " + percent + " or more for all pairs, by Kramer's approximation: the differences have different variances"
		}
		return "intervals hold at once at " + percent + " for all pairs, exactly: the differences have one variance"
	case Unadjusted:
		return "intervals hold at " + percent + " each, not at once"
	}
	return "intervals hold at once at " + percent
}

// WriteText writes Report as aligned text.
func (f Family) WriteText(w io.Writer) error { return f.Report().WriteText(w) }

// String returns Report as aligned text.
func (f Family) String() string { return f.Report().Text() }
