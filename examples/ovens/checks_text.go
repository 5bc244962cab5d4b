package main

import (
	"fmt"
	"math"
)

// notChecked lists what a reader might take for checked.
var notChecked = []string{"whether residuals are normal beyond outlying ones", "the shape of the dependence on covariates", "how the rows came about"}

// writeChecks writes what the checks found.
func (s *study) writeChecks(p *page) {
	p.title("Checks")
	alpha := 1 - s.level
	if s.residuals != "" {
		p.text("Residuals: not checked, %s.", s.residuals)
	} else {
		r := s.byRow[s.worst]
		law := fmt.Sprintf("Among %d simulated sets of normal residuals of this design p = %s (at most %s by Bonferroni's inequality)", s.outlying.draws, prob(s.outlying.p, 0), prob(s.outlying.bound, 0))
		if s.outlying.draws == 0 {
			law = fmt.Sprintf("p is at most %s by Bonferroni's inequality (too many rows to simulate)", prob(s.outlying.bound, 0))
		}
		p.text("Outlying row: the largest studentized residual is %s, %s (%s %s in %s, expected %s). %s%s",
			dec(r.Studentized, 2), s.place(s.worst), s.response, fig(r.Response, 5), s.groups[s.index[s.worst]], fig(r.Fitted, 5), law, verdict(s.isOutlying(), ": look at it.", "."))
		if w := s.without; w != nil {
			same := "the answer stays the same"
			if !w.same {
				same = "the answer CHANGES"
			}
			p.text("Without that row: %s = %s, p = %s; %s. It was not left out: only a known cause is a reason to.", w.result.Test().Name, fig(w.result.Test().Statistic, 5), prob(w.result.P(), w.result.LogP()), same)
		}
		p.gap()
		law = "simulated two-sided p = " + prob(s.serial.p, 0)
		if s.serial.draws == 0 {
			law = "too many rows to simulate a p"
		}
		p.text("File order: the steps between neighbouring residuals give %s where independent rows give about 2; %s%s",
			fig(s.serial.value, 4), law, verdict(s.serial.p <= alpha, ": neighbours are related, and every p above is then doubtful.", "."))
		p.gap()
		s.strip(p)
	}
	r := s.byRow[s.leverage]
	average := float64(s.fullFit.Rank) / float64(len(s.byRow))
	p.text("Leverage: the largest is %s, %s; the average is %s%s", fig(r.Leverage, 3), s.place(s.leverage), fig(average, 3),
		verdict(r.Leverage > 0.5, ": the fit follows that row.", "."))
	p.gap()
	s.writeSpread(p, alpha)
	if s.noSlopes != "" {
		p.text("Equal slopes: not checked, %s.", s.noSlopes)
	} else if len(s.covariates) > 0 {
		t := s.slopes.Test()
		p.text("Equal slopes: %s = %s, p = %s%s", t.Name, fig(t.Statistic, 4), prob(t.P, t.LogP),
			verdict(t.P <= alpha, ": the groups differ by more at some values of "+and(s.covariates)+" than at others, and one difference does not describe them.", "."))
	}
	p.gap()
	p.text("Not checked: %s.", and(notChecked))
}

// writeSpread writes the check of equal standard deviations.
func (s *study) writeSpread(p *page, alpha float64) {
	if s.noSpread != "" {
		p.text("Equal spread: not checked, %s.", s.noSpread)
		p.gap()
		return
	}
	r := s.spread
	t := r.Test()
	law := ""
	if t.Simulation != nil {
		law = fmt.Sprintf("; among %d simulated normal sets p = %s", t.Simulation.Draws, prob(t.P, t.LogP))
	}
	p.text("Equal spread: one standard deviation against one for each group, by likelihood: −2 log λ = %s, χ² with %g df, p = %s (asymptotic)%s%s",
		fig(r.Statistic, 4), r.Pair.DF, prob(r.ChiSquared.P, r.ChiSquared.LogP), law, verdict(t.P <= alpha, ": spreads differ, and the F test above may mislead.", "."))
	if w := s.without; w != nil && !math.IsNaN(w.spread) {
		p.text("Without %s: p = %s.", s.place(s.worst), prob(w.spread, math.Log(w.spread)))
	}
	words := make([]string, len(s.groups))
	for g, name := range s.groups {
		words[g] = fmt.Sprintf("%s %s", name, fig(s.sds[g], 3))
	}
	p.text("Standard deviations (maximum likelihood): %s.", and(words))
	p.gap()
}

// strip draws the mean residual of each twelfth of the file, on a scale of residual SDs.
func (s *study) strip(p *page) {
	const most, half = 12, 20
	n := len(s.byRow)
	blocks := min(most, n/4)
	if blocks < 2 {
		return
	}
	p.line("Mean residual by part of the file, in residual SDs (each dot; the bars are ±2 standard errors):")
	p.gap()
	t := p.table("rl")
	for b := range blocks {
		from, to := b*n/blocks, (b+1)*n/blocks
		sum := 0.0
		for _, r := range s.byRow[from:to] {
			sum += r.Residual
		}
		m := sum / float64(to-from) / s.fullFit.SD
		reach := 2 / math.Sqrt(float64(to-from))
		line := []rune(fmt.Sprintf("%*s", 2*half+1, ""))
		put := func(x float64, c rune) {
			at := half + int(math.Round(x*half))
			line[min(max(at, 0), 2*half)] = c
		}
		put(0, '·')
		put(-reach, '|')
		put(reach, '|')
		put(m, '●')
		t.row(fmt.Sprintf("lines %s to %s", s.where(from), s.where(to-1)), string(line)+" "+dec(m, 2))
	}
	t.end()
}

// where is the line of a row in the file.
func (s *study) where(row int) string { return fmt.Sprint(s.data.Line(row)) }

// place is the line of a row in words.
func (s *study) place(row int) string { return "line " + s.where(row) }

// verdict chooses between two ends of a sentence.
func verdict(doubt bool, yes, no string) string {
	if doubt {
		return yes
	}
	return no
}
