package anova

import (
	"errors"
	"fmt"
	"io"
	"strings"

	"subsume.example/lrt"
)

// unreached gives the error of a search that found nothing the name of its row.
func unreached(row string, err error) error {
	if errors.Is(err, lrt.ErrTooSmall) {
		return &LayoutError{Place: row, Err: fmt.Errorf("%w: %w", ErrUnreachable, err)}
	}
	return &LayoutError{Place: row, Err: err}
}

// cellTexts lists cells with their means and numbers.
func (d Design) cellTexts(n []int) string {
	parts := make([]string, len(d.Cells))
	for i, c := range d.Cells {
		parts[i] = fmt.Sprintf("%s: %d of mean %s", strings.Join(c.Levels, " × "), n[i], plain(c.Mean))
	}
	return listed(parts)
}

func (d Design) assumptions() []string {
	var o Options
	if d.Options != nil {
		o = *d.Options
	}
	n := []string{
		"noncentrality: squared length of the effect of the row over SD², SD² being the expected error mean square",
		"power is exact for independent normal errors of SD " + plain(d.SD) + " in every cell; it is power at the stated means, not at estimated ones",
	}
	if len(d.Factors) > 1 {
		n = append(n, o.Decomposition.String()+": "+o.Decomposition.Meaning())
	}
	return n
}

// Report returns the plan as a report of schema "anova.power/1". Its facts are
// alpha, sd, units (in total) and cost; its lines have name, df, df_error,
// noncentrality, critical (the F to exceed), power, and note.
func (p Power) Report() Report {
	total, cost := 0, 0.0
	costs := p.design.costs()
	for i, c := range p.design.Cells {
		total += c.Units
		cost += costs[i] * float64(c.Units)
	}
	r := Report{Schema: "anova.power/1", Title: "Power of the design by " + strings.Join(p.design.Factors, " × "),
		Facts: []Fact{
			{"alpha", "alpha", Number(p.alpha)},
			{"sd", "SD", Number(p.design.SD)},
			{"units", "units", Number(float64(total))},
			{"cost", "cost", Number(cost)},
		},
		Columns: []Column{
			{Key: "name", Title: "source"},
			{Key: "df", Title: "df", Numeric: true},
			{Key: "df_error", Title: "error df", Numeric: true},
			{Key: "noncentrality", Title: "noncentrality", Numeric: true},
			{Key: "critical", Title: "F to exceed", Numeric: true},
			{Key: "power", Title: "power", Numeric: true},
			{Key: "note"},
		}}
	r.Facts[0].Value = plainNumber(p.alpha)
	if cost == float64(total) {
		r.Facts[3].Title = ""
	}
	for _, row := range p.rows {
		v := map[string]Value{"name": Text(row.Name), "df": Number(row.D1), "df_error": Number(row.D2)}
		if row.Err != nil {
			v["note"] = Text(row.Err.Error())
			r.Notes = append(r.Notes, row.Name+": "+row.Err.Error())
		} else {
			v["noncentrality"], v["critical"], v["power"] = toDigits(row.Plan.Noncentrality, 5), toDigits(row.Plan.Critical(p.alpha), 5), toDigits(row.Power, 4)
		}
		r.add("not-tested", v)
	}
	r.Notes = append(r.Notes, "units: "+p.design.cellTexts(p.design.units()))
	r.Notes = append(r.Notes, p.design.assumptions()...)
	return r
}

// plainNumber is a number that people see as it was given.
func plainNumber(x float64) Value { return shown(x, strings.Replace(fmt.Sprint(x), "-", "−", 1)) }

// WriteText writes Report as aligned text.
func (p Power) WriteText(w io.Writer) error { return p.Report().WriteText(w) }

// String returns Report as aligned text.
func (p Power) String() string { return p.Report().Text() }

// Report returns the size as a report of schema "anova.size/1". Its facts are
// row, alpha, target_power, power, units, cost, loss and start_units; its lines are
// the cells: cell, mean, units, start and cost (of a unit).
func (s Size) Report() Report {
	start := 0
	for _, n := range s.Start {
		start += n
	}
	r := Report{Schema: "anova.size/1", Title: "Units needed to find the effect of " + s.Row,
		Facts: []Fact{
			{"row", "", Text(s.Row)},
			{"alpha", "alpha", plainNumber(s.Alpha)},
			{"target_power", "power wanted", plainNumber(s.TargetPower)},
			{"power", "power reached", toDigits(s.Power, 6)},
			{"units", "units", Number(float64(s.Total))},
			{"cost", "cost", Number(s.Cost)},
			{"loss", "loss allowed for", percent(s.Loss)},
			{"start_units", "units to start with", Number(float64(start))},
		},
		Columns: []Column{
			{Key: "cell", Title: strings.Join(s.design.Factors, " × ")},
			{Key: "mean", Title: "expected mean", Numeric: true},
			{Key: "units", Title: "units", Numeric: true},
			{Key: "start", Title: "to start with", Numeric: true},
			{Key: "cost", Title: "cost of a unit", Numeric: true},
		}}
	if s.Loss == 0 {
		r.Facts[6].Title, r.Facts[7].Title = "", ""
		r.title("start", "")
	}
	costs := s.design.costs()
	if s.Cost == float64(s.Total) {
		r.Facts[5].Title = ""
		r.title("cost", "")
	}
	for i, c := range s.design.Cells {
		r.add("none", map[string]Value{"cell": Text(strings.Join(c.Levels, " × ")), "mean": Number(c.Mean),
			"units": Number(float64(s.N[i])), "start": Number(float64(s.Start[i])), "cost": Number(costs[i])})
	}
	if len(s.Cheaper) > 0 {
		best := s.Cheaper[0]
		for _, c := range s.Cheaper {
			if c.Power > best.Power {
				best = c
			}
		}
		r.Notes = append(r.Notes, fmt.Sprintf("cheaper neighbours tried: %d; the best of them has power %s, below what is wanted", len(s.Cheaper), plain(best.Power)))
	}
	r.Notes = append(r.Notes, s.design.assumptions()...)
	return r
}

// WriteText writes Report as aligned text.
func (s Size) WriteText(w io.Writer) error { return s.Report().WriteText(w) }

// String returns Report as aligned text.
func (s Size) String() string { return s.Report().Text() }
