package dist_test

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"subsume.example/dist"
	"subsume.example/dist/lawtest"
)

// TestNoncentralLaws runs the generic checks of a law.
func TestNoncentralLaws(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	chi := []lawtest.Law{
		dist.NoncentralChiSquared{K: 0, Lambda: 1}, dist.NoncentralChiSquared{K: inf, Lambda: 1},
		dist.NoncentralChiSquared{K: 3, Lambda: -1}, dist.NoncentralChiSquared{K: 3, Lambda: inf},
		dist.NoncentralChiSquared{K: nan, Lambda: 1}, dist.NoncentralChiSquared{K: 3, Lambda: nan}, dist.NoncentralChiSquared{K: -1},
	}
	f := []lawtest.Law{
		dist.NoncentralF{D1: 0, D2: 5, Lambda: 1}, dist.NoncentralF{D1: 2, D2: -5, Lambda: 1}, dist.NoncentralF{D1: inf, D2: 5, Lambda: 1},
		dist.NoncentralF{D1: 2, D2: 5, Lambda: -1}, dist.NoncentralF{D1: 2, D2: nan, Lambda: 1}, dist.NoncentralF{D1: 2, D2: 5, Lambda: nan}, dist.NoncentralF{},
	}
	nt := []lawtest.Law{
		dist.NoncentralT{Nu: 0, Delta: 1}, dist.NoncentralT{Nu: nan, Delta: 1}, dist.NoncentralT{Nu: 4, Delta: nan}, dist.NoncentralT{Nu: 4, Delta: inf}, dist.NoncentralT{Nu: -1},
	}
	for _, c := range []struct {
		law lawtest.Law
		bad []lawtest.Law
		tol float64
	}{
		{dist.NoncentralChiSquared{K: 3, Lambda: 5}, chi, 0},
		{dist.NoncentralChiSquared{K: 2, Lambda: 0.3}, nil, 0},
		{dist.NoncentralChiSquared{K: 0.4, Lambda: 2}, nil, 0},
		{dist.NoncentralChiSquared{K: 1, Lambda: 1e-9}, nil, 0},
		{dist.NoncentralChiSquared{K: 4.7, Lambda: 800}, nil, 0},
		{dist.NoncentralChiSquared{K: 1e5, Lambda: 3}, nil, 0},
		{dist.NoncentralChiSquared{K: 0.01, Lambda: 1e6}, nil, 0},
		{dist.NoncentralChiSquared{K: 6, Lambda: 0}, nil, 0},
		{dist.NoncentralF{D1: 3, D2: 20, Lambda: 5}, f, 0},
		{dist.NoncentralF{D1: 2, D2: 7, Lambda: 0.1}, nil, 0},
		{dist.NoncentralF{D1: 1.3, D2: 4.5, Lambda: 60}, nil, 0},
		{dist.NoncentralF{D1: 4, D2: inf, Lambda: 9}, nil, 0},
		{dist.NoncentralF{D1: 0.5, D2: 1e4, Lambda: 3}, nil, 0},
		{dist.NoncentralF{D1: 100, D2: 150, Lambda: 1e5}, nil, 0},
		{dist.NoncentralF{D1: 1e6, D2: 0.8, Lambda: 40}, nil, 0},
		{dist.NoncentralF{D1: 3, D2: 8, Lambda: 0}, nil, 0},
		{dist.NoncentralT{Nu: 10, Delta: 1}, nt, 0},
		{dist.NoncentralT{Nu: 3.5, Delta: -4}, nil, 0},
		{dist.NoncentralT{Nu: 0.7, Delta: 0.3}, nil, 0},
		{dist.NoncentralT{Nu: 200, Delta: 1e-5}, nil, 0},
		{dist.NoncentralT{Nu: inf, Delta: 2}, nil, 0},
		{dist.NoncentralT{Nu: 1e7, Delta: -60}, nil, 0},
		{dist.NoncentralT{Nu: 6, Delta: 0}, nil, 0},
	} {
		t.Run(c.law.String(), func(t *testing.T) {
			t.Parallel()
			lawtest.Check(t, c.law, &lawtest.Settings{Tolerance: 1e-14, Invalid: c.bad, Draws: 5000})
		})
	}
}

// TestNoncentralAtZero wants the central law bit for bit.
func TestNoncentralAtZero(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 3))
	for range 2000 {
		k, d2 := logUniform(r, 1e-3, 1e12), logUniform(r, 1e-3, 1e12)
		if r.IntN(5) == 0 {
			d2 = math.Inf(1)
		}
		x := math.Exp(r.NormFloat64() * 10)
		for _, c := range [][2]fullLaw{
			{dist.NoncentralChiSquared{K: k}, dist.ChiSquared{K: k}},
			{dist.NoncentralF{D1: k, D2: d2}, dist.F{D1: k, D2: d2}},
			{dist.NoncentralT{Nu: d2}, dist.StudentT{Nu: d2}},
		} {
			n, z := c[0], c[1]
			for name, v := range map[string][2]float64{
				"CDF": {n.CDF(x), z.CDF(x)}, "Survival": {n.Survival(x), z.Survival(x)},
				"LogCDF": {n.LogCDF(x), z.LogCDF(x)}, "LogSurvival": {n.LogSurvival(x), z.LogSurvival(x)},
				"Prob": {n.Prob(x), z.Prob(x)}, "LogProb": {n.LogProb(x), z.LogProb(x)},
				"Quantile": {n.Quantile(0.2), z.Quantile(0.2)}, "UpperQuantile": {n.UpperQuantile(1e-9), z.UpperQuantile(1e-9)},
			} {
				if math.Float64bits(v[0]) != math.Float64bits(v[1]) {
					t.Fatalf("%v and %v: %s(%v) = %v and %v", n, z, name, x, v[0], v[1])
				}
			}
		}
	}
}

// TestNoncentralTSquare checks P(T² <= x) = P(F <= x) in double precision.
func TestNoncentralTSquare(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 3000 {
		nu, delta := logUniform(r, 0.3, 1e6), r.NormFloat64()*3
		x := math.Exp(r.NormFloat64() * 2)
		n, f := dist.NoncentralT{Nu: nu, Delta: delta}, dist.NoncentralF{D1: 1, D2: nu, Lambda: delta * delta}
		// Rounding δ² and x² moves F's tails a little.
		want := f.Survival(x * x)
		bound := 1e-14*want + 4e-16*x*x*f.Prob(x*x) + 1e-15*delta*delta
		if got := n.Survival(x) + n.CDF(-x); !(math.Abs(got-want) <= bound) {
			t.Errorf("%v: outside ±%v %v, by F %v", n, x, got, want)
		}
	}
}

// TestNoncentralMoments compares Mean and Variance with the integrals of tails, and with each
// law's own formula at a point known in closed form.
func TestNoncentralMoments(t *testing.T) {
	for _, c := range []struct {
		law            fullLaw
		mean, variance float64
	}{
		{dist.NoncentralChiSquared{K: 3, Lambda: 5}, 8, 26},
		// 10/8 (3+5)/3; 2 (10/3)² (64 + 13·8)/(64·6)
		{dist.NoncentralF{D1: 3, D2: 10, Lambda: 5}, 10.0 / 3, 9.722222222222221},
		{dist.NoncentralF{D1: 4, D2: math.Inf(1), Lambda: 6}, 2.5, 2},
		// Γ(1.5)/Γ(2) sqrt(2) δ = 1.2533141373155 δ, 4/2·(1+δ²) - mean²
		{dist.NoncentralT{Nu: 4, Delta: 2}, 2.5066282746310002, 10 - 2*math.Pi},
		{dist.NoncentralT{Nu: 2, Delta: 1}, math.Sqrt(math.Pi), math.Inf(1)},
	} {
		if !near(c.law.Mean(), c.mean, 1e-15) || !near(c.law.Variance(), c.variance, 2e-15) {
			t.Errorf("%v: mean %v, want %v; variance %v, want %v", c.law, c.law.Mean(), c.mean, c.law.Variance(), c.variance)
		}
	}
	// The two forms of the t law's moments meet at Nu = 200.
	lo, hi := dist.NoncentralT{Nu: 200, Delta: 3}, dist.NoncentralT{Nu: math.Nextafter(200, 300), Delta: 3}
	if !near(lo.Mean(), hi.Mean(), 1e-15) || !near(lo.Variance(), hi.Variance(), 1e-13) {
		t.Errorf("at Nu = 200: %v %v, %v %v", lo.Mean(), hi.Mean(), lo.Variance(), hi.Variance())
	}
}

func near(got, want, tol float64) bool {
	return got == want || math.Abs(got-want) <= tol*math.Abs(want)
}

func TestNoncentralityErrors(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	chi := func(k, x, s float64) func() (float64, error) {
		return func() (float64, error) { return dist.NoncentralityChiSquared(k, x, s) }
	}
	f := func(d1, d2, x, s float64) func() (float64, error) {
		return func() (float64, error) { return dist.NoncentralityF(d1, d2, x, s) }
	}
	nt := func(nu, x, s float64) func() (float64, error) {
		return func() (float64, error) { return dist.NoncentralityT(nu, x, s) }
	}
	for i, c := range []struct {
		call func() (float64, error)
		err  error
		want float64
	}{
		{chi(0, 1, 0.5), dist.ErrParam, nan}, {chi(3, -1, 0.5), dist.ErrParam, nan}, {chi(3, inf, 0.5), dist.ErrParam, nan},
		{chi(3, 1, 1), dist.ErrParam, nan}, {chi(3, 1, nan), dist.ErrParam, nan}, {chi(3, 1, -0.1), dist.ErrParam, nan},
		{chi(3, 1, 0.5), dist.ErrCentralTail, 0}, {chi(3, 0, 0.5), dist.ErrCentralTail, 0}, {chi(3, 5, 0), dist.ErrCentralTail, 0},
		{chi(2, 2, math.Exp(-1)), nil, 0},
		{f(0, 1, 1, 0.5), dist.ErrParam, nan}, {f(1, 0, 1, 0.5), dist.ErrParam, nan}, {f(1, nan, 1, 0.5), dist.ErrParam, nan},
		{f(3, 10, 0.1, 0.2), dist.ErrCentralTail, 0}, {f(3, inf, 0.1, 0.2), dist.ErrCentralTail, 0},
		{nt(0, 1, 0.5), dist.ErrParam, nan}, {nt(3, inf, 0.5), dist.ErrParam, nan}, {nt(3, 1, 0), dist.ErrParam, nan}, {nt(3, 1, 1), dist.ErrParam, nan},
		{nt(inf, 1.5, 0.5), nil, 1.5}, {nt(7, 0, 0.5), nil, 0},
	} {
		got, err := c.call()
		if !errors.Is(err, c.err) || got != c.want && !(math.IsNaN(got) && math.IsNaN(c.want)) {
			t.Errorf("case %d: %v, %v, want %v, %v", i, got, err, c.want, c.err)
		}
		var p *dist.ParamError
		if c.err == dist.ErrParam && !errors.As(err, &p) {
			t.Errorf("case %d: %T is no *ParamError", i, err)
		}
	}
}

// TestNoncentralityRoundTrip puts the found noncentrality back.
func TestNoncentralityRoundTrip(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 5))
	for range 3000 {
		d1, d2, x := logUniform(r, 1e-2, 1e6), logUniform(r, 0.1, 1e8), math.Exp(r.NormFloat64()*2)
		if r.IntN(8) == 0 {
			d2 = math.Inf(1)
		}
		s := r.Float64()
		switch r.IntN(4) {
		case 0:
			s = math.Exp(-300 * r.Float64())
		case 1:
			s = 1 - 1e-9*s
		}
		check := func(name string, lambda, got, slack float64, err error) {
			if errors.Is(err, dist.ErrCentralTail) || errors.Is(err, dist.ErrParam) && d1 > 1e3 {
				return
			}
			tail, want := got, s
			if s > 0.5 {
				tail, want = 1-got, 1-s
				slack += 2e-16 / want
			}
			if err != nil || !(math.Abs(tail/want-1) <= 1e-12+slack) {
				t.Errorf("%s(%v, %v, %v, %v) = %v, %v: the tail is %v", name, d1, d2, x, s, lambda, err, got)
			}
		}
		l, err := dist.NoncentralityF(d1, d2, x, s)
		n := dist.NoncentralF{D1: d1, D2: d2, Lambda: l}
		check("NoncentralityF", l, n.Survival(x), ulpSlack(l, s, func(l float64) float64 {
			return dist.NoncentralF{D1: d1, D2: d2, Lambda: l}.LogSurvival(x)
		}), err)
		l, err = dist.NoncentralityChiSquared(d1, x*d1, s)
		check("NoncentralityChiSquared", l, dist.NoncentralChiSquared{K: d1, Lambda: l}.Survival(x*d1), ulpSlack(l, s, func(l float64) float64 {
			return dist.NoncentralChiSquared{K: d1, Lambda: l}.LogSurvival(x * d1)
		}), err)
		if r.IntN(2) == 0 {
			x = -x
		}
		l, err = dist.NoncentralityT(d2, x, s)
		check("NoncentralityT", l, dist.NoncentralT{Nu: d2, Delta: l}.Survival(x), ulpSlack(l, s, func(l float64) float64 {
			return dist.NoncentralT{Nu: d2, Delta: l}.LogSurvival(x)
		}), err)
	}
}

// ulpSlack is what one ulp of the noncentrality is worth in the tail, relatively.
func ulpSlack(l, s float64, logTail func(float64) float64) float64 {
	d := 1e-6 * max(math.Abs(l), 1e-6)
	slope := math.Abs(logTail(l+d)-logTail(l)) / d
	if s > 0.5 {
		slope *= s / (1 - s)
	}
	return 4e-16 * math.Abs(l) * slope
}

// TestNoncentralAllocations wants none in tails and densities, whatever the region.
func TestNoncentralAllocations(t *testing.T) {
	for _, c := range []struct {
		law fullLaw
		x   float64
	}{
		{dist.NoncentralChiSquared{K: 3, Lambda: 5}, 17}, {dist.NoncentralChiSquared{K: 3, Lambda: 5}, 1e-260},
		{dist.NoncentralChiSquared{K: 50, Lambda: 1e6}, 1e6}, {dist.NoncentralChiSquared{K: 0.1, Lambda: 700}, 1e-200},
		{dist.NoncentralF{D1: 3, D2: 20, Lambda: 5}, 2}, {dist.NoncentralF{D1: 3, D2: 20, Lambda: 900}, 300},
		{dist.NoncentralF{D1: 3, D2: 200, Lambda: 900}, 300}, {dist.NoncentralF{D1: 1e9, D2: 1, Lambda: 5}, 0.02},
		{dist.NoncentralF{D1: 3, D2: math.Inf(1), Lambda: 5}, 2}, {dist.NoncentralF{D1: 3, D2: 0.1, Lambda: 5}, 1e200},
		{dist.NoncentralT{Nu: 10, Delta: 1}, 2}, {dist.NoncentralT{Nu: 10, Delta: -1}, 2}, {dist.NoncentralT{Nu: 10, Delta: 8}, 9}, {dist.NoncentralT{Nu: 1e8, Delta: 1}, 0.5},
	} {
		if n := testing.AllocsPerRun(20, func() {
			sink = c.law.CDF(c.x) + c.law.Survival(c.x) + c.law.LogCDF(c.x) + c.law.LogSurvival(c.x) + c.law.Prob(c.x) + c.law.LogProb(c.x)
		}); n != 0 {
			t.Errorf("%v at %v: %v allocations", c.law, c.x, n)
		}
	}
}
