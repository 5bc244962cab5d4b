package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"sync"

	"subsume.example/dist"
)

// Simulation is what a simulated test rests on.
type Simulation struct {
	Draws   int // drawn data sets that count
	AtLeast int // of them with a statistic at or above the observed one
	Failed  int // of them whose fit failed; they count as at or above
	Stopped bool
	// Lower and Upper bound the p-value of endless simulation with 95 % confidence
	// (Clopper and Pearson 1934).
	Lower, Upper float64
	// Mean is the average of the drawn statistics.
	Mean float64
}

// ErrSimulation is returned when simulated data cannot be had or fitted.
var ErrSimulation = errors.New("simulation failed")

// drawSource is the random source of draw i.
func drawSource(seed uint64, i int) rand.Source {
	// Two rounds of splitmix64 keep neighbouring seeds and draws apart.
	mix := func(x uint64) uint64 {
		x += 0x9e3779b97f4a7c15
		x = (x ^ x>>30) * 0xbf58476d1ce4e5b9
		x = (x ^ x>>27) * 0x94d049bb133111eb
		return x ^ x>>31
	}
	a := mix(seed)
	return rand.NewPCG(a, mix(a^mix(uint64(i))))
}

// drawn runs f for i = 0 … n−1 on the settings' workers. Values are taken in
// the order of i whatever the number of workers; take returns false to stop.
// The first error in that order ends it.
func drawn(ctx context.Context, s *Settings, n int, f func(ctx context.Context, i int) (float64, error), take func(i int, v float64) bool) error {
	workers := runtime.GOMAXPROCS(0)
	var progress func(done, total int)
	if s != nil {
		if s.Workers > 0 {
			workers = s.Workers
		}
		progress = s.Progress
	}
	workers = min(workers, n)
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	var mu sync.Mutex
	var wg sync.WaitGroup
	values, state, errs := make([]float64, n), make([]byte, n), make(map[int]error)
	next, front, stop := 0, 0, false
	var failure error
	for range workers {
		wg.Go(func() {
			for {
				mu.Lock()
				if stop || next >= n {
					mu.Unlock()
					return
				}
				i := next
				next++
				mu.Unlock()
				v, err := unpanicked(func() (float64, error) { return f(ctx, i) })
				mu.Lock()
				values[i], state[i] = v, 1
				if err != nil {
					errs[i] = err
				}
				for !stop && front < n && state[front] == 1 {
					if e := errs[front]; e != nil {
						failure, stop = e, true
						cancel()
						break
					}
					more := take(front, values[front])
					front++
					if progress != nil {
						if _, e := unpanicked(func() (float64, error) { progress(front, n); return 0, nil }); e != nil {
							failure, stop = fmt.Errorf("settings: function Progress: %w", e), true
							cancel()
							break
						}
					}
					if !more {
						stop = true
						cancel() // draws beyond the last that counts
					}
				}
				mu.Unlock()
			}
		})
	}
	wg.Wait()
	return failure
}

// unpanicked calls f; a panic of a user's function becomes an error, for nobody can
// recover those of another goroutine.
func unpanicked(f func() (float64, error)) (v float64, err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("%w: %v", ErrPanic, r)
		}
	}()
	return f()
}

// statistics draws n data sets at the restricted estimate and hands −2 log λ
// of each to take, NaN for a fit that failed.
func (c Comparison) statistics(ctx context.Context, p Pair, s *Settings, n int, take func(i int, v float64) bool) error {
	sim, ok := c.Full.(Simulator)
	if !ok {
		return fmt.Errorf("%w: %w: the full space %T cannot redraw its data", ErrSimulation, ErrInvalid, c.Full)
	}
	var seed uint64
	if s != nil {
		seed = s.Seed
	}
	one := &Settings{Workers: 1}
	return drawn(ctx, s, n, func(ctx context.Context, i int) (float64, error) {
		d, err := sim.Redraw(ctx, p.Restricted, drawSource(seed, i), c)
		if err != nil {
			if ctx.Err() != nil {
				return 0, ctx.Err()
			}
			return 0, fmt.Errorf("%w: draw %d: %w", ErrSimulation, i, err)
		}
		q, err := d.Fit(ctx, one)
		if err != nil {
			if ctx.Err() != nil {
				return 0, ctx.Err()
			}
			if errors.Is(err, ErrPanic) {
				return 0, fmt.Errorf("%w: draw %d: %w", ErrSimulation, i, err)
			}
			return nan, nil
		}
		return q.statistic(), nil
	}, take)
}

// statistic returns −2 log λ of a fitted pair.
func (p Pair) statistic() float64 {
	if p.Linear.M > 0 {
		return math.Abs(2 * p.Linear.LogLambda())
	}
	return math.Max(0, 2*(p.Full.LogLikelihood-p.Restricted.LogLikelihood))
}

// clopperPearson returns the exact 95 % limits of a proportion g of n.
func clopperPearson(g, n int) (lo, hi float64) {
	a, b := float64(g), float64(n-g)
	hi = 1
	if g > 0 {
		f := dist.F{D1: 2 * (b + 1), D2: 2 * a}.UpperQuantile(0.025)
		lo = a / (a + (b+1)*f)
	}
	if g < n {
		f := dist.F{D1: 2 * (a + 1), D2: 2 * b}.UpperQuantile(0.025)
		hi = (a + 1) * f / (b + (a+1)*f)
	}
	return lo, hi
}

// Bootstrap refers −2 log λ to its distribution over data drawn at the
// restricted estimate (parametric bootstrap). The full space must be a
// Simulator; a declared model is one when it has Simulate.
//
// With all N draws p = (1 + g)/(N + 1), g of them being at or above the observed
// statistic, ties within rounding counted; with Stop = h the simulation ends
// at the h-th such draw l, and p = h/l (Besag and Clifford 1991). Both are
// valid for any N where the statistic's law does not depend on the nuisance
// parameters (Pivotal), and calibrated elsewhere. A draw that cannot be fitted
// counts as at or above; more than one in twenty of them is an error. Draw i has
// its own random source made from (Settings.Seed, i), so that workers do not
// change a bit.
type Bootstrap struct {
	Draws int // 0: 999
	Stop  int // 0: never; 10 to 20 are usual
	// Pivotal says that the statistic's null law does not depend on nuisance
	// parameters; the caller vouches for it. A space may declare it itself by
	// the interface Pivot.
	Pivotal bool
}

// Pivot is implemented by a full space whose likelihood ratio against the
// given restricted space has a null law free of nuisance parameters.
type Pivot interface{ PivotalAgainst(restricted Space) bool }

// Refer implements Reference.
func (b Bootstrap) Refer(ctx context.Context, c Comparison, p Pair, s *Settings) (Test, error) {
	n := b.Draws
	if n == 0 {
		n = 999
	}
	if n < 1 || b.Stop < 0 {
		return Test{}, fmt.Errorf("%w: bootstrap of %d draws, stop at %d", ErrInvalid, b.Draws, b.Stop)
	}
	observed := p.statistic()
	t := Test{Kind: Simulated, Name: "bootstrap", Statistic: observed}
	sim := &Simulation{}
	tie := observed - 1e-7*math.Max(1, observed)
	var total float64
	err := c.statistics(ctx, p, s, n, func(_ int, v float64) bool {
		sim.Draws++
		switch {
		case math.IsNaN(v):
			sim.Failed++
			sim.AtLeast++
		default:
			total += v
			if v >= tie {
				sim.AtLeast++
			}
		}
		if b.Stop > 0 && sim.AtLeast >= b.Stop {
			sim.Stopped = true
			return false
		}
		return true
	})
	if err != nil {
		return Test{}, err
	}
	if 20*sim.Failed > sim.Draws && sim.Failed > 1 {
		return Test{}, fmt.Errorf("%w: %d of %d simulated data sets could not be fitted", ErrSimulation, sim.Failed, sim.Draws)
	}
	sim.Mean = total / float64(sim.Draws-sim.Failed)
	if sim.Stopped {
		t.P = float64(sim.AtLeast) / float64(sim.Draws)
	} else {
		t.P = float64(1+sim.AtLeast) / float64(sim.Draws+1)
	}
	t.LogP = math.Log(t.P)
	sim.Lower, sim.Upper = clopperPearson(sim.AtLeast, sim.Draws)
	t.Simulation = sim
	pivotal := b.Pivotal
	if v, ok := c.Full.(Pivot); ok && v.PivotalAgainst(c.Restricted) {
		pivotal = true
	}
	kind := "calibrated: nuisance parameters are replaced by their estimates"
	if pivotal {
		kind = "exact: the law of λ does not depend on nuisance parameters"
	}
	if p.Irregular != "" {
		kind += "; not guaranteed here, since " + p.Irregular
	}
	t.Why = fmt.Sprintf("%d of %d data sets drawn at the restricted estimate reach the observed statistic (endless simulation: p within %.3g to %.3g); %s", sim.AtLeast, sim.Draws, sim.Lower, sim.Upper, kind)
	if sim.Failed > 0 {
		t.Why += fmt.Sprintf("; %d draws could not be fitted and count as reaching it", sim.Failed)
	}
	return t, nil
}

// Bartlett divides −2 log λ by its mean over its degrees of freedom and refers
// it to χ² (Bartlett 1937; Lawley 1956), which makes the error of χ² smaller by
// an order of magnitude. The factor is, in this order: Factor; the full space's
// own by the interface BartlettCorrector; or simulated at the restricted estimate.
type Bartlett struct {
	Factor float64 // 0: not given
	Draws  int     // of the simulation; 0: 400
}

// BartlettCorrector is implemented by a full space that knows the factor E(−2 log λ)/df
// of a comparison. An error wrapping ErrNoFactor sends Bartlett to simulation.
type BartlettCorrector interface {
	BartlettFactor(c Comparison, p Pair) (float64, error)
}

// ErrNoFactor: no analytic correction factor is known.
var ErrNoFactor = errors.New("no Bartlett factor is known")

// Refer implements Reference.
func (b Bartlett) Refer(ctx context.Context, c Comparison, p Pair, s *Settings) (Test, error) {
	t := Test{Kind: Approximate, Name: "Bartlett-corrected χ²"}
	df := p.DF
	if p.Linear.M > 0 {
		df, _ = p.Linear.DF()
	}
	if p.Irregular != "" || p.Cone != nil || df <= 0 {
		t.Kind, t.P, t.LogP, t.Why = None, nan, nan, "−2 log λ has no χ² law to correct"
		return t, nil
	}
	factor, why := b.Factor, "the given factor"
	if b.Factor < 0 || math.IsNaN(b.Factor) || b.Draws < 0 {
		return Test{}, fmt.Errorf("%w: Bartlett factor %g, %d draws", ErrInvalid, b.Factor, b.Draws)
	}
	if factor == 0 {
		if k, ok := c.Full.(BartlettCorrector); ok {
			f, err := k.BartlettFactor(c, p)
			switch {
			case err == nil:
				factor, why = f, "the analytic factor"
			case !errors.Is(err, ErrNoFactor):
				return Test{}, err
			}
		}
	}
	if factor == 0 {
		n := b.Draws
		if n == 0 {
			n = 400
		}
		var m, ss float64
		k, failed := 0, 0
		if err := c.statistics(ctx, p, s, n, func(_ int, v float64) bool {
			if math.IsNaN(v) {
				failed++
				return true
			}
			k++
			e := v - m
			m += e / float64(k)
			ss += e * (v - m)
			return true
		}); err != nil {
			return Test{}, err
		}
		if 20*failed > n || k < 2 {
			return Test{}, fmt.Errorf("%w: %d of %d simulated data sets could not be fitted", ErrSimulation, failed, n)
		}
		factor = m / df
		why = fmt.Sprintf("a factor simulated from %d draws (standard error %.2g)", k, math.Sqrt(ss/float64(k-1)/float64(k))/df)
	}
	if !(factor > 0) || math.IsInf(factor, 1) {
		return Test{}, fmt.Errorf("%w: Bartlett factor %g", ErrInvalid, factor)
	}
	u := chiSquared(p.statistic()/factor, df)
	t.Statistic, t.Law, t.P, t.LogP = u.Statistic, u.Law, u.P, u.LogP
	t.Why = fmt.Sprintf("−2 log λ divided by %s, %.6g, so that its mean is that of χ²", why, factor)
	return t, nil
}
