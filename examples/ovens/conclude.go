package main

import (
	"fmt"
	"math"
	"strings"

	"subsume.example/lrt"
)

// writeConclusion says in plain words what was found, how sure it is, and what it does not show.
func (s *study) writeConclusion(p *page) {
	p.title("Conclusion")
	for i, t := range s.conclusion() {
		if i > 0 {
			p.line("")
		}
		p.text("%s", t)
	}
}

// conclusion is the answer in paragraphs.
func (s *study) conclusion() []string {
	alpha := 1 - s.level
	t := s.result.Test()
	differ := t.P <= alpha
	var law string
	if t.Kind == lrt.Exact {
		d1, d2 := s.result.Pair.Linear.DF()
		law = fmt.Sprintf("F(%g, %g) = %s, ", d1, d2, fig(t.Statistic, 4))
	} else {
		law = fmt.Sprintf("%s = %s, ", t.Name, fig(t.Statistic, 4))
	}
	var out []string
	if differ {
		out = append(out, fmt.Sprintf("Yes: with %d rows the mean %s differs between the groups of %s%s by more than chance allows at level %s (%sp = %s).",
			s.data.Len(), s.response, s.group, s.atEqual(), percent(alpha), law, prob(t.P, t.LogP)))
	} else {
		out = append(out, fmt.Sprintf("No difference is shown: with %d rows the mean %s does not differ between the groups of %s%s by more than chance allows at level %s (%sp = %s). That is not evidence that the groups are equal: see the intervals.",
			s.data.Len(), s.response, s.group, s.atEqual(), percent(alpha), law, prob(t.P, t.LogP)))
	}
	if s.result.Pair.Linear.Nil {
		out = append(out, "The groups explain every value without any rest, which measured values do not do: find out how the values came about before anything is made of them.")
	}
	out = append(out, s.pairsInWords(alpha)...)
	if q := s.planned; q != nil && len(s.pairs) > 0 {
		out = append(out, s.againstPlan(q))
	}
	out = append(out, s.doubts())
	out = append(out, "What this does not show: why the groups differ. Unless rows were given to the groups by lot, whatever else differs between them may be the cause, and another plant, time or batch may behave otherwise. Where a decision from these figures could hurt someone, it needs qualified review and the rules of the field.")
	return out
}

// mostShown is the largest number of pairs named in a sentence.
const mostShown = 10

// pairsInWords names the pairs that differ.
func (s *study) pairsInWords(alpha float64) (out []string) {
	if len(s.pairs) == 0 {
		return nil
	}
	places := placesFor(s.fullFit.SD)
	var shown, open []string
	widest := s.pairs[0]
	for _, q := range s.pairs {
		if q.Estimate.Value > widest.Estimate.Value {
			widest = q
		}
		if q.AdjustedP <= alpha {
			shown = append(shown, fmt.Sprintf("%s over %s by %s (%s to %s)", q.over, q.under, dec(q.Estimate.Value, places), dec(q.Lower, places), dec(q.Upper, places)))
		} else {
			open = append(open, q.over+" and "+q.under)
		}
	}
	switch {
	case len(shown) > mostShown:
		out = append(out, fmt.Sprintf("%d of %d pairs differ, all pairs considered together; the table lists them. For the others no difference is shown, which does not make them equal.", len(shown), len(s.pairs)))
	case len(shown) > 0 && len(open) > 0:
		out = append(out, fmt.Sprintf("Pairs that differ, all pairs considered together: %s. For the other %d of %d pairs no difference is shown, which does not make them equal.", strings.Join(shown, "; "), len(open), len(s.pairs)))
	case len(shown) > 0 && len(s.pairs) > 1:
		out = append(out, fmt.Sprintf("All pairs differ: %s.", strings.Join(shown, "; ")))
	case len(shown) > 0:
		out = append(out, fmt.Sprintf("The difference is %s.", shown[0]))
	default:
		out = append(out, fmt.Sprintf("No single pair is shown to differ; the widest difference is %s over %s by %s (%s to %s).", widest.over, widest.under, dec(widest.Estimate.Value, places), dec(widest.Lower, places), dec(widest.Upper, places)))
	}
	return out
}

// againstPlan compares the intervals with the difference of interest.
func (s *study) againstPlan(q *plan) string {
	least, most := 0, 0
	for _, r := range s.pairs {
		if r.Lower >= q.difference {
			least++
		}
		if math.Max(math.Abs(r.Lower), math.Abs(r.Upper)) < q.difference {
			most++
		}
	}
	return fmt.Sprintf("Against the difference of interest, %s: %d of %d intervals lie wholly above it, %d wholly below, and %d leave it open.", fig(q.difference, 3), least, len(s.pairs), most, len(s.pairs)-least-most)
}

// doubts says what the checks put in question.
func (s *study) doubts() string {
	alpha := 1 - s.level
	var d []string
	if s.residuals == "" && s.isOutlying() {
		w := "look at " + s.place(s.worst) + ", which is outlying"
		if s.without != nil && s.without.same {
			w += " (the answer does not hang on it)"
		} else if s.without != nil {
			w += " (the answer HANGS on it)"
		}
		d = append(d, w)
	}
	if s.residuals == "" && s.serial.p <= alpha {
		d = append(d, "neighbouring rows are related")
	}
	if s.noSpread == "" && s.spread.P() <= alpha {
		w := "spreads differ between groups"
		if s.without != nil && s.without.spread > alpha {
			w += fmt.Sprintf(" (not without %s)", s.place(s.worst))
		}
		d = append(d, w)
	}
	if len(s.covariates) > 0 && s.noSlopes == "" && s.slopes.P() <= alpha {
		d = append(d, "slopes differ between groups")
	}
	text := "The checks that were made put nothing in doubt."
	if len(d) > 0 {
		text = "The checks say: " + strings.Join(d, "; ") + "."
	}
	var not []string
	for _, c := range []struct{ name, why string }{{"residuals", s.residuals}, {"equal spread", s.noSpread}, {"equal slopes", s.noSlopes}} {
		if c.why != "" {
			not = append(not, c.name)
		}
	}
	if len(not) > 0 {
		text += " Not checked here: " + and(not) + "."
	}
	return text
}
