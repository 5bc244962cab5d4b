package anova

import (
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"unicode/utf8"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// tableColumns are the columns of Table.Report.
var tableColumns = []Column{
	{Key: "line"},
	{Key: "name", Title: "source"},
	{Key: "ss", Title: "sum of squares", Numeric: true, Even: true},
	{Key: "df", Title: "df", Numeric: true},
	{Key: "ms", Title: "mean square", Numeric: true, Even: true},
	{Key: "statistic", Title: "F", Numeric: true},
	{Key: "statistic_name"},
	{Key: "df_error", Numeric: true},
	{Key: "ms_error", Numeric: true, Even: true},
	{Key: "p", Title: "p", Numeric: true},
	{Key: "log_p", Numeric: true},
	{Key: "reading", Title: "reading"},
	{Key: "log_lambda", Title: "log λ", Numeric: true},
	{Key: "lambda_of"},
	{Key: "chi_squared_p", Numeric: true},
	{Key: "chi_squared_size", Numeric: true},
	{Key: "restricted"},
	{Key: "full"},
	{Key: "error_space"},
	{Key: "hypothesis"},
	{Key: "note"},
}

// Report returns the table as a report of schema "anova.table/1". Its facts are
// response, n, dropped, level and r_squared; its lines have
//
//	line          "row", "error" or "total"
//	name          name of the comparison
//	ss, df, ms    sum of squares, degrees of freedom, mean square
//	statistic     F, χ² or −2 log λ, and statistic_name which of them
//	df_error      degrees of freedom of the error; ms_error its mean square
//	p, log_p      p-value and its natural logarithm, which does not underflow
//	reading       exact, approximate, asymptotic or simulated; "not tested"
//	log_lambda    log likelihood ratio, and lambda_of what it is a ratio over
//	chi_squared_p asymptotic p of −2 log λ; chi_squared_size: true size of that test at 1 − level
//	restricted, full, error_space, hypothesis   the question in words
//	note          why the row was not tested, or why it is not exact
//
// A number of a row that was not tested has the reason "not-tested", one that
// does not belong to an error or total line "not-a-row".
func (t Table) Report() Report {
	rsq := t.RSquared()
	r := Report{Schema: "anova.table/1", Title: t.title(), Columns: append([]Column(nil), tableColumns...), Warnings: t.Warnings(),
		Facts: []Fact{
			{"response", "", Text(t.Response())},
			{"n", "n =", Number(float64(t.N()))},
			{"dropped", "", Number(float64(t.Dropped()))},
			{"level", "", Number(t.level)},
			{"r_squared", "R² =", toDigits(rsq, 4).because("no-total")},
		}}
	if t.Dropped() > 0 {
		r.Facts[2].Title = "rows left out:"
	}
	shared := t.shared()
	if !shared { // each row then shows its own error
		r.title("df_error", "error df")
		if m := t.model(); m == nil || m.Options().KnownVariance == 0 {
			r.title("ms_error", "error mean square")
		}
	}
	for _, row := range t.rows {
		if row.err == nil && row.Test().Name != "F" {
			r.title("statistic", "statistic")
		}
	}
	for _, row := range t.rows {
		r.add("not-tested", row.values(t.level))
	}
	if e, ok := t.Error(); ok && e.DF > 0 {
		r.add("not-a-row", map[string]Value{"line": Text("error"), "name": Text("error"),
			"ss": Number(e.SS), "df": Number(e.DF), "ms": Number(e.MeanSquare)})
	}
	if l, ok := t.Total(); ok {
		r.add("not-a-row", map[string]Value{"line": Text("total"), "name": Text("total"), "ss": Number(l.SS), "df": Number(l.DF)})
	}
	r.Notes = t.notes(shared)
	return r
}

// title gives a column a title.
func (r *Report) title(key, title string) {
	for i := range r.Columns {
		if r.Columns[i].Key == key {
			r.Columns[i].Title = title
		}
	}
}

func (t Table) title() string {
	m := t.model()
	if m == nil {
		return "Comparisons"
	}
	return "What explains " + m.Response()
}

// values returns the line of a row.
func (r Row) values(level float64) map[string]Value {
	restricted, full := r.Spaces()
	d1, d2 := r.DF()
	v := map[string]Value{
		"line": Text("row"), "name": Text(r.Name()),
		"df": Number(d1), "df_error": Number(d2), "ms_error": Number(r.ErrorMeanSquare()),
		"restricted": Text(restricted), "full": Text(full), "error_space": Text(r.ErrorSpace()),
		"hypothesis": Text(r.Hypothesis()), "note": Text(r.note()),
	}
	v["ss"], v["ms"] = Number(r.SS()), Number(r.MeanSquare())
	if r.err != nil {
		v["reading"] = Text(r.failure())
		return v
	}
	test, res := r.Test(), r.result
	v["statistic"] = statistic(test)
	v["statistic_name"] = Text(test.Name)
	v["p"], v["log_p"] = probability(test.P, test.LogP), Number(test.LogP)
	v["reading"] = Text(test.Kind.String())
	v["log_lambda"] = toDigits(res.LogLambda, 5)
	v["lambda_of"] = Text(res.Stratum())
	v["chi_squared_p"] = Number(res.ChiSquared.P).because("no-chi-squared")
	v["chi_squared_size"] = Number(res.TrueSize(1 - level)).because("no-exact-law")
	return v
}

func statistic(t lrt.Test) Value {
	v := Number(t.Statistic)
	if t.Name != "F" {
		v.Text = t.Name + " = " + v.String()
	}
	return v
}

// failure says in a word why a row was not tested.
func (r Row) failure() string {
	var e *EmptyCellsError
	switch {
	case errors.As(r.err, &e), errors.Is(r.err, glm.ErrNotEstimable):
		return "not estimable"
	case errors.Is(r.err, lrt.ErrNothingTested):
		return "nothing to test"
	case errors.Is(r.err, lrt.ErrNoErrorDF):
		return "no error df"
	case errors.Is(r.err, lrt.ErrNoVariation):
		return "nothing varies"
	}
	return "not tested"
}

// notes say what each row asks.
func (t Table) notes(shared bool) []string {
	var n []string
	for _, r := range t.rows {
		n = append(n, r.question(shared))
	}
	if m := t.model(); m != nil {
		if e, _ := t.Error(); shared && e.DF > 0 {
			n = append(n, "error: what "+clip(bare(m))+" leaves")
		}
		if t.strata() {
			n = append(n, "log λ is a ratio over all rows where the error of the row is what its own larger model leaves, else over the stratum of the row and its error")
		}
		o := m.Options()
		if o.Weights.Kind != glm.NoWeights {
			n = append(n, fmt.Sprintf("%s weights: %s", o.Weights.Kind, o.Weights.Field))
		}
		if o.KnownVariance > 0 {
			n = append(n, fmt.Sprintf("known variance: %g", o.KnownVariance))
		}
	}
	return n
}

// strata reports whether some λ is that of a stratum.
func (t Table) strata() bool {
	for _, r := range t.rows {
		if r.err == nil && r.pair.Linear.Stratum && r.pair.Linear.Known <= 0 {
			return true
		}
	}
	return false
}

// question states a row: the two spaces, or the equations between them.
func (r Row) question(shared bool) string {
	restricted, full := bare(r.comparison.Restricted), bare(r.comparison.Full)
	s := r.Name() + ": "
	if _, ok := r.comparison.Full.(*refused); ok {
		return s + r.note()
	}
	if eqs, ok := equations(restricted, full); ok {
		s += "hypothesis " + firstEquation(eqs) + " inside " + briefly(full)
	} else if added := r.added(); added != "" && briefly(full) != full {
		s += clip(restricted) + " against the same with " + added
	} else {
		s += clip(restricted) + " inside " + clip(full)
	}
	if e := r.ErrorSpace(); e != "" && !shared {
		if e == spaceName(r.comparison.Full) {
			s += "; error: what that leaves"
		} else if m := responseOf(r); m != "" {
			s += "; error: what " + clip(strings.ReplaceAll(e, m+" by ", "")) + " leaves"
		} else {
			s += "; error: what " + clip(e) + " leaves"
		}
	}
	if n := r.note(); n != "" {
		s += "; " + n
	}
	return s
}

// briefly names a model of many terms by what it is.
func briefly(full string) string {
	if utf8.RuneCountInString(full) > 56 {
		return "the model of all terms"
	}
	return full
}

// added returns the term that the full model of a row has beyond the restricted one;
// "" where it is not just one term.
func (r Row) added() string {
	a, ok1 := r.comparison.Restricted.(*glm.Model)
	b, ok2 := r.comparison.Full.(*glm.Model)
	if !ok1 || !ok2 || len(b.Terms()) != len(a.Terms())+1 {
		return ""
	}
	added := ""
	for _, t := range b.Terms() {
		if !slices.Contains(a.Terms(), t) {
			if added != "" {
				return ""
			}
			added = t
		}
	}
	return added
}

// responseOf returns the name of the response of a linear row.
func responseOf(r Row) string {
	if m, ok := r.comparison.Full.(*glm.Model); ok {
		return m.Response()
	}
	return ""
}

// firstEquation shortens a list of equations to the first.
func firstEquation(eqs string) string {
	left, rest, _ := strings.Cut(eqs, " = ")
	value, _, _ := strings.Cut(rest, " and ")
	s := clip(left) + " = " + value
	if more := strings.Count(rest, " = "); more == 1 {
		s += " and 1 more equation"
	} else if more > 1 {
		s += fmt.Sprintf(" and %d more equations", more)
	}
	return s
}

// bare names a space without the response.
func bare(s lrt.Space) string {
	name := spaceName(s)
	if m, ok := s.(*glm.Model); ok {
		name = strings.TrimPrefix(name, m.Response()+" by ")
	}
	if r, ok := s.(*refused); ok {
		name = strings.TrimPrefix(name, r.model.Response()+" by ")
	}
	return name
}

// clip shortens a long text for people.
func clip(s string) string {
	const most = 240
	if len(s) <= most {
		return s
	}
	cut := most
	for cut > 0 && s[cut]&0xC0 == 0x80 {
		cut--
	}
	return s[:cut] + "…"
}

// WriteText writes Report as aligned text.
func (t Table) WriteText(w io.Writer) error { return t.Report().WriteText(w) }

// WriteMarkdown writes Report as Markdown.
func (t Table) WriteMarkdown(w io.Writer) error { return t.Report().WriteMarkdown(w) }

// WriteCSV writes the lines of Report as comma-separated values.
func (t Table) WriteCSV(w io.Writer) error { return t.Report().WriteCSV(w) }

// WriteJSON writes Report as JSON.
func (t Table) WriteJSON(w io.Writer) error { return t.Report().WriteJSON(w) }

// String returns Report as aligned text.
func (t Table) String() string { return t.Report().Text() }
