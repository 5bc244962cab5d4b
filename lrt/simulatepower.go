package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
)

// SimulatedPower is the power of a comparison by simulation, with its Monte
// Carlo error.
type SimulatedPower struct {
	Power, StdErr float64
	Lower, Upper  float64 // 95 % limits (Clopper and Pearson 1934)
	Draws         int
	Rejected      int
	Failed        int // draws whose fit failed; they count as not rejected
}

// SimulatePower draws data of the comparison's design at the parameters at (root
// parameters of a declared model: the effect worth finding), tests each draw at
// level alpha by the recommended test of Conclude with the settings'
// references, and counts rejections. It serves where Plan is only
// asymptotic, or has no law at all. draws 0 means 1000. The full space must be a Simulator. More than
// one failed draw in twenty is an error wrapping ErrSimulation.
func (c Comparison) SimulatePower(ctx context.Context, at []float64, alpha float64, draws int, s *Settings) (SimulatedPower, error) {
	if draws == 0 {
		draws = 1000
	}
	if !(alpha > 0 && alpha < 1) || draws < 1 {
		return SimulatedPower{}, c.fail("simulated power", fmt.Errorf("%w: alpha %g, %d draws", ErrInvalid, alpha, draws))
	}
	if err := s.validate(); err != nil {
		return SimulatedPower{}, err
	}
	if err := c.guard(); err != nil {
		return SimulatedPower{}, err
	}
	sim, ok := c.Full.(Simulator)
	if !ok {
		return SimulatedPower{}, c.fail("simulated power", fmt.Errorf("%w: %w: the full space %T cannot redraw its data", ErrSimulation, ErrInvalid, c.Full))
	}
	inner := Settings{Workers: 1}
	if s != nil {
		inner = *s
		inner.Workers, inner.Progress = 1, nil
	}
	var p SimulatedPower
	err := drawn(ctx, s, draws, func(ctx context.Context, i int) (float64, error) {
		d, err := sim.Redraw(ctx, Fit{Estimate: at}, drawSource(inner.Seed, i), c)
		if err != nil {
			if ctx.Err() != nil {
				return 0, ctx.Err()
			}
			return 0, fmt.Errorf("%w: draw %d: %w", ErrSimulation, i, err)
		}
		own := inner
		own.Seed = inner.Seed + uint64(i) + 1
		r, err := d.Run(ctx, &own)
		if err != nil {
			if ctx.Err() != nil {
				return 0, ctx.Err()
			}
			if errors.Is(err, ErrPanic) || errors.Is(err, ErrInvalid) || errors.Is(err, ErrNotNested) {
				return 0, fmt.Errorf("%w: draw %d: %w", ErrSimulation, i, err)
			}
			return nan, nil
		}
		return r.P(), nil
	}, func(_ int, v float64) bool {
		p.Draws++
		switch {
		case math.IsNaN(v):
			p.Failed++
		case v <= alpha:
			p.Rejected++
		}
		return true
	})
	if err != nil {
		return SimulatedPower{}, c.fail("simulated power", err)
	}
	if 20*p.Failed > p.Draws && p.Failed > 1 {
		return SimulatedPower{}, c.fail("simulated power", fmt.Errorf("%w: %d of %d draws could not be fitted or tested", ErrSimulation, p.Failed, p.Draws))
	}
	n := float64(p.Draws)
	p.Power = float64(p.Rejected) / n
	p.StdErr = math.Sqrt(p.Power * (1 - p.Power) / n)
	p.Lower, p.Upper = clopperPearson(p.Rejected, p.Draws)
	return p, nil
}
