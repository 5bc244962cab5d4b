package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// rowsOf is the data of the spread model: a normal law about group mean and
// covariates, with a standard deviation for each group.
type rowsOf struct {
	y     []float64
	x     [][]float64 // covariates, about their means
	group []int32
	k     int
}

// spreadModel declares that likelihood. Its parameters are mean[1..k], the
// slopes, and sd[1..k].
func (s *study) spreadModel() lrt.Model[rowsOf] {
	k, c := len(s.groups), len(s.covariates)
	params := lrt.Block(k, lrt.Real("mean"))
	for _, name := range s.covariates {
		params = append(params, lrt.Real("slope of "+name))
	}
	params = append(params, lrt.Block(k, lrt.Positive("sd"))...)
	fitted := func(d rowsOf, theta []float64, i int) float64 {
		m := theta[d.group[i]]
		for j := range d.x {
			m += theta[k+j] * d.x[j][i]
		}
		return m
	}
	return lrt.Model[rowsOf]{
		Name:   "own standard deviation in each group",
		Params: params,
		Each: func(d rowsOf, theta []float64, each []float64) {
			for i, y := range d.y {
				sd := theta[k+c+int(d.group[i])]
				z := (y - fitted(d, theta, i)) / sd
				each[i] = -0.5*z*z - math.Log(sd) - 0.5*math.Log(2*math.Pi)
			}
		},
		Gradient: func(d rowsOf, theta, g []float64) {
			clear(g)
			for i, y := range d.y {
				at := int(d.group[i])
				sd := theta[k+c+at]
				e := y - fitted(d, theta, i)
				w := e / (sd * sd)
				g[at] += w
				for j := range d.x {
					g[k+j] += w * d.x[j][i]
				}
				g[k+c+at] += (w*e - 1) / sd
			}
		},
		Start: func(rowsOf) []float64 { return s.spreadStart() },
		Simulate: func(d rowsOf, theta []float64, src rand.Source) (rowsOf, error) {
			rng := rand.New(src)
			drawn := d
			drawn.y = make([]float64, len(d.y))
			for i := range drawn.y {
				drawn.y[i] = fitted(d, theta, i) + theta[k+c+int(d.group[i])]*rng.NormFloat64()
			}
			return drawn, nil
		},
	}
}

// spreadStart is the full normal fit.
func (s *study) spreadStart() []float64 {
	theta := make([]float64, 0, 2*len(s.groups)+len(s.covariates))
	for _, m := range s.means {
		theta = append(theta, m.Adjusted.Value)
	}
	for _, name := range s.covariates {
		c, _ := s.fullFit.Coefficient(name) // the model has it
		theta = append(theta, c.Estimate)
	}
	for range s.groups {
		theta = append(theta, s.fullFit.SD)
	}
	return theta
}

// spreadDraws is the largest number of simulated sets for the check of spread.
const spreadDraws = 499

// mostSpreads is the largest number of groups with a standard deviation each.
const mostSpreads = 20

// equalSpread compares one standard deviation for all groups with one for each,
// by likelihood.
func (s *study) equalSpread(ctx context.Context, data *glm.Data) (lrt.Result, []float64, error) {
	index, groups, err := data.LevelIndex(s.group)
	if err != nil {
		return lrt.Result{}, nil, err
	}
	if len(groups) < len(s.groups) {
		return lrt.Result{}, nil, errors.New("a group has no row left")
	}
	if len(groups) > mostSpreads {
		return lrt.Result{}, nil, fmt.Errorf("more than %d groups are too many for this check", mostSpreads)
	}
	counts := make([]int, len(groups))
	for _, g := range index {
		counts[g]++
	}
	for g, n := range counts {
		if n < 2+len(s.covariates) {
			return lrt.Result{}, nil, fmt.Errorf("group %s has only %s", groups[g], rows(n))
		}
	}
	d := rowsOf{group: index, k: len(groups)}
	if d.y, err = data.Values(s.response); err != nil {
		return lrt.Result{}, nil, err
	}
	for j, name := range s.covariates {
		v, err := data.Values(name)
		if err != nil {
			return lrt.Result{}, nil, err
		}
		for i := range v {
			v[i] -= s.at[j]
		}
		d.x = append(d.x, v)
	}
	own, err := lrt.Bind(s.spreadModel(), lrt.Observe(d, len(d.y)))
	if err != nil {
		return lrt.Result{}, nil, err
	}
	one, err := lrt.Restrict(own, lrt.Equate(lrt.Names("sd", len(s.groups))...))
	if err != nil {
		return lrt.Result{}, nil, err
	}
	settings := s.settings()
	if draws := min(s.draws, spreadDraws, maxWork/(len(d.y)*40*len(groups))); draws >= fewestDraw {
		// The law of λ depends on no mean, slope or common standard deviation: the simulated p is exact.
		settings.References = []lrt.Reference{lrt.Bootstrap{Draws: draws, Pivotal: true}}
	}
	r, err := lrt.Comparison{Name: "equal spread", Restricted: one, Full: own}.Run(ctx, settings)
	if err != nil {
		if errors.Is(err, lrt.ErrUnbounded) {
			err = errors.New("a group does not vary about its mean")
		}
		return lrt.Result{}, nil, err
	}
	k := len(s.groups)
	return r, r.Pair.Full.Estimate[k+len(s.covariates):], nil
}
