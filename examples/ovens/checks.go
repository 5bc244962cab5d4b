package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"sync"

	"subsume.example/dist"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// checks are about what the exact test takes for granted.
type checks struct {
	byRow     []glm.RowFit
	outlying  simulated // largest studentized residual
	worst     int       // row it stands in
	serial    simulated // squared steps between neighbours over squared residuals
	residuals string    // why there are no checks of residuals; "" when there are
	leverage  int       // row of the largest
	spread    lrt.Result
	sds       []float64
	noSpread  string // why there is no check of spread
	slopes    lrt.Result
	noSlopes  string
	without   *without // what the answer is without the outlying row
}

// simulated is a statistic with its p from simulated residuals of this design.
type simulated struct {
	value float64
	p     float64 // NaN: too much work to simulate
	bound float64 // never below p, by Bonferroni's inequality; NaN: none
	draws int
}

// isOutlying reports whether the largest residual is larger than chance allows.
func (s *study) isOutlying() bool {
	alpha := 1 - s.level
	return s.outlying.p <= alpha || s.outlying.draws == 0 && s.outlying.bound <= alpha
}

// without is the comparison when one row is left out.
type without struct {
	result lrt.Result
	same   bool    // the decision is the same
	spread float64 // p of equal spread; NaN: not made
}

// check makes every check. A check that cannot be made says why and stops nothing.
func (s *study) check(ctx context.Context) error {
	var err error
	if s.byRow, err = rowsOfFit(ctx, s.fullFit); err != nil {
		return err
	}
	for i, r := range s.byRow {
		if r.Leverage > s.byRow[s.leverage].Leverage {
			s.leverage = i
		}
	}
	if err := s.checkResiduals(ctx); err != nil {
		return err
	}
	if s.spread, s.sds, err = s.equalSpread(ctx, s.data); err != nil {
		if ctx.Err() != nil {
			return err
		}
		s.noSpread = err.Error()
	}
	return s.checkSlopes(ctx)
}

// rowsOfFit collects what the fit says about each row.
func rowsOfFit(ctx context.Context, f *glm.Fit) ([]glm.RowFit, error) {
	var rows []glm.RowFit
	for r, err := range f.Each(ctx) {
		if err != nil {
			return nil, err
		}
		rows = append(rows, r)
	}
	return rows, nil
}

// summary of residuals: the largest |studentized residual|, the row it stands in, and the
// serial statistic Σ(eᵢ − eᵢ₋₁)²/Σeᵢ² of von Neumann (1941) and Durbin and Watson (1950).
func summary(rows []glm.RowFit) (largest float64, at int, serial float64) {
	var steps, squares float64
	for i, r := range rows {
		if a := math.Abs(r.Studentized); a > largest {
			largest, at = a, i
		}
		squares += r.Residual * r.Residual
		if i > 0 {
			d := r.Residual - rows[i-1].Residual
			steps += d * d
		}
	}
	return largest, at, steps / squares
}

// Simulation is kept to a few seconds: a draw of n rows costs about
// n·(6 + rank) units of work, a sixth of a microsecond each.
const (
	maxWork    = 40_000_000
	fewestDraw = 99
)

// checkResiduals refers both statistics to their law for this design: residuals of
// normal errors depend on no parameter once they are scaled, so that draws of
// standard normal errors give the law itself.
func (s *study) checkResiduals(ctx context.Context) error {
	if s.fullFit.DFError < 2 || s.result.Pair.Linear.Nil {
		s.residuals = "the residuals leave nothing to look at"
		return nil
	}
	var largest, serial float64
	largest, s.worst, serial = summary(s.byRow)
	n, rank := s.data.Len(), s.fullFit.Rank
	t := dist.StudentT{Nu: float64(s.fullFit.DFError - 1)}
	bound := min(1, 2*float64(n)*t.Survival(largest))
	s.outlying, s.serial = simulated{largest, math.NaN(), bound, 0}, simulated{serial, math.NaN(), math.NaN(), 0}
	draws := min(s.draws, maxWork/(n*(6+rank)))
	if draws < fewestDraw {
		if bound <= 1-s.level {
			return s.leaveOut(ctx)
		}
		return nil
	}
	maxima, steps, err := s.simulate(ctx, draws)
	if err != nil {
		return err
	}
	above, low, high := 0, 0, 0
	for i := range draws {
		if maxima[i] >= largest {
			above++
		}
		if steps[i] <= serial {
			low++
		}
		if steps[i] >= serial {
			high++
		}
	}
	share := func(k int) float64 { return float64(1+k) / float64(draws+1) }
	s.outlying.p, s.outlying.draws = share(above), draws
	s.serial.p, s.serial.draws = min(1, 2*min(share(low), share(high))), draws
	if s.isOutlying() {
		return s.leaveOut(ctx)
	}
	return nil
}

// simulate fits the full model to draws of standard normal responses. Draw i
// has its own source, so that the number of workers does not matter.
func (s *study) simulate(ctx context.Context, draws int) (largest, serial []float64, err error) {
	largest, serial = make([]float64, draws), make([]float64, draws)
	name := "draw"
	for _, taken := s.data.Field(name); taken; _, taken = s.data.Field(name) {
		name += "′"
	}
	one := func(i int) error {
		rng := rand.New(rand.NewPCG(s.seed, uint64(i)))
		z := make([]float64, s.data.Len())
		for r := range z {
			z[r] = rng.NormFloat64()
		}
		data, err := s.data.With(glm.SharedNumbers(name, z))
		if err != nil {
			return err
		}
		_, full, err := s.pair(ctx, data, name)
		if err != nil {
			return err
		}
		f, err := full.Fit(ctx, nil)
		if err != nil {
			return err
		}
		rows, err := rowsOfFit(ctx, f)
		if err != nil {
			return err
		}
		largest[i], _, serial[i] = summary(rows)
		return nil
	}
	workers := min(runtime.GOMAXPROCS(0), draws)
	failed := make([]error, workers)
	var group sync.WaitGroup
	for w := range workers {
		group.Go(func() {
			for i := w; i < draws && failed[w] == nil; i += workers {
				failed[w] = one(i)
			}
		})
	}
	group.Wait()
	return largest, serial, errors.Join(failed...)
}

// leaveOut asks the question again without the outlying row. The row stays in
// the answer: this only says how much hangs on it.
func (s *study) leaveOut(ctx context.Context) error {
	data, err := s.data.Where("outlying", func(row int) bool { return row != s.worst })
	if err != nil {
		return nil
	}
	small, full, err := s.pair(ctx, data, s.response)
	if err != nil {
		return err
	}
	r, err := lrt.Compare(ctx, small, full, s.settings())
	if err != nil {
		return nil
	}
	alpha := 1 - s.level
	s.without = &without{r, (r.P() <= alpha) == (s.result.P() <= alpha), math.NaN()}
	if spread, _, err := s.equalSpread(ctx, data); err == nil {
		s.without.spread = spread.P()
	}
	return ctx.Err()
}

// checkSlopes compares one slope of each covariate for all groups with one for each.
func (s *study) checkSlopes(ctx context.Context) error {
	if len(s.covariates) == 0 {
		return nil
	}
	own := []glm.Term{}
	for _, c := range s.covariates {
		own = append(own, glm.Cross{glm.Factor{Field: s.group}, glm.Covariate{Field: c}})
	}
	larger, err := s.full.With(ctx, own...)
	if err != nil {
		return err
	}
	s.slopes, err = lrt.Comparison{Name: "equal slopes", Restricted: s.full, Full: larger}.Run(ctx, s.settings())
	if err != nil {
		if ctx.Err() != nil {
			return err
		}
		s.noSlopes = err.Error()
	}
	return nil
}

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
		t.row(fmt.Sprintf("%s to %s", s.where(from), s.where(to-1)), string(line)+" "+dec(m, 2))
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
