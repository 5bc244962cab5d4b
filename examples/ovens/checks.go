package main

import (
	"context"
	"errors"
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
