package main

import (
	"math"
	"math/rand/v2"

	"subsume.example/lrt"
)

// weibull declares the model: at site s a seal lives longer than t with
// probability exp(−(rate[s]·t)^shape[s]). A seal that failed at t has the density
// there, one that did not has that probability.
func weibull(sites []string) lrt.Model[lifetimes] {
	k := len(sites)
	var params []lrt.Param
	for _, name := range append(shapes(sites), rates(sites)...) {
		params = append(params, lrt.Positive(name))
	}
	return lrt.Model[lifetimes]{
		Name:   "lifetimes",
		Params: params,
		Each: func(d lifetimes, theta, each []float64) {
			for i, t := range d.time {
				shape, rate := theta[d.site[i]], theta[k+int(d.site[i])]
				z := rate * t
				each[i] = -math.Pow(z, shape)
				if d.failed[i] == 1 {
					each[i] += math.Log(shape) + shape*math.Log(z) - math.Log(t)
				}
			}
		},
		Gradient: func(d lifetimes, theta, g []float64) {
			clear(g)
			for i, t := range d.time {
				s := int(d.site[i])
				shape, rate := theta[s], theta[k+s]
				z := rate * t
				p, l := math.Pow(z, shape), math.Log(z)
				g[s] += d.failed[i]*(1/shape+l) - p*l
				g[k+s] += shape / rate * (d.failed[i] - p)
			}
		},
		Start: func(d lifetimes) []float64 { return constantRates(d) },
		// A drawn seal fails when its life ends before its planned time does.
		Simulate: func(d lifetimes, theta []float64, src rand.Source) (lifetimes, error) {
			rng := rand.New(src)
			drawn := d
			drawn.time, drawn.failed = make([]float64, len(d.time)), make([]float64, len(d.time))
			for i, s := range d.site {
				life := math.Pow(rng.ExpFloat64(), 1/theta[s]) / theta[k+int(s)]
				drawn.time[i] = d.until[i]
				if life <= d.until[i] {
					drawn.time[i], drawn.failed[i] = life, 1
				}
			}
			return drawn, nil
		},
	}
}

// shapes and rates name the parameters.
func shapes(sites []string) []string { return each("shape at ", sites) }
func rates(sites []string) []string  { return each("rate at ", sites) }

func each(prefix string, sites []string) []string {
	names := make([]string, len(sites))
	for i, s := range sites {
		names[i] = prefix + s
	}
	return names
}

// questions are the spaces of the three comparisons, each inside the one before.
type questions struct{ free, oneShape, constant, oneRate lrt.Space }

// spaces binds the model once and restricts it step by step.
func spaces(d lifetimes) (q questions, err error) {
	if q.free, err = lrt.Bind(weibull(d.sites), lrt.Observe(d, len(d.time))); err != nil {
		return q, err
	}
	if q.oneShape, err = lrt.Restrict(q.free, lrt.Equate(shapes(d.sites)...)); err != nil {
		return q, err
	}
	constant, err := lrt.Restrict(q.oneShape, lrt.Fix(shapes(d.sites)[0], 1))
	if err != nil {
		return q, err
	}
	oneRate, err := lrt.Restrict(constant, lrt.Equate(rates(d.sites)...))
	if err != nil {
		return q, err
	}
	// With a constant rate the estimate is failures over time, site by site or in all.
	if q.constant, err = lrt.SolveBy(constant, func(d lifetimes) ([]float64, error) { return constantRates(d), nil }); err != nil {
		return q, err
	}
	q.oneRate, err = lrt.SolveBy(oneRate, func(d lifetimes) ([]float64, error) { return commonRate(d), nil })
	return q, err
}

// constantRates is the maximum likelihood estimate for shapes of 1.
func constantRates(d lifetimes) []float64 {
	k := len(d.sites)
	theta := make([]float64, 2*k)
	for s := range k {
		_, failures, time := d.count(s)
		theta[s], theta[k+s] = 1, failures/time
	}
	return theta
}

// commonRate is that for shapes of 1 and one rate.
func commonRate(d lifetimes) []float64 {
	k := len(d.sites)
	var failures, time float64
	for i, t := range d.time {
		failures += d.failed[i]
		time += t
	}
	theta := make([]float64, 2*k)
	for s := range k {
		theta[s], theta[k+s] = 1, failures/time
	}
	return theta
}
