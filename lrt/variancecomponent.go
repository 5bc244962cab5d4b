package lrt

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"
	"subsume.example/dist"
)

// VarianceComponent is the exact finite-sample law of −2 log λ for a variance
// component at 0 in a normal model y = Xβ + Zb + e with one random effect b, both
// spaces with the same fixed columns (Crainiceanu and Ruppert 2004, theorem 1).
// It depends on the design alone, through eigenvalues, and is simulated from
// them without fitting anything: thousands of times faster than a bootstrap. The mixture of χ² laws at
// the boundary is only its limit for many independent groups, and is far from it for few.
//
// It is a Reference, to be asked for in the comparison of between = 0 with
// between ≥ 0, and says nothing about other comparisons.
type VarianceComponent struct {
	// Mu are the eigenvalues of ZᵀPZ, P projecting off the fixed columns; Xi those of ZᵀZ.
	Mu, Xi []float64
	// N and P are the numbers of rows and of independent fixed columns.
	N, P int
	// Residual says that the likelihoods are residual ones.
	Residual bool
	// Draws of the simulation; 0: 9999.
	Draws int
}

// OneWayVariance is the VarianceComponent of groups of the given sizes about a
// common mean.
func OneWayVariance(sizes []int, residual bool) (VarianceComponent, error) {
	n := 0
	for g, s := range sizes {
		if s < 1 {
			return VarianceComponent{}, fmt.Errorf("lrt: variance component: %w: group %d has %d rows", ErrInvalid, g+1, s)
		}
		n += s
	}
	if len(sizes) < 2 || n == len(sizes) {
		return VarianceComponent{}, fmt.Errorf("lrt: variance component: %w: %d rows in %d groups say nothing about the variance between them", ErrInvalid, n, len(sizes))
	}
	k := len(sizes)
	a := mat.NewSymDense(k, nil)
	v := VarianceComponent{N: n, P: 1, Residual: residual}
	for i, s := range sizes {
		v.Xi = append(v.Xi, float64(s))
		for j := range i + 1 {
			x := -float64(s) * float64(sizes[j]) / float64(n)
			if i == j {
				x += float64(s)
			}
			a.SetSym(i, j, x)
		}
	}
	return v, v.eigen(a)
}

// NewVarianceComponent takes the fixed and the random columns of a design, each
// of one length. Dependent fixed columns are set aside.
func NewVarianceComponent(fixed, random [][]float64, residual bool) (VarianceComponent, error) {
	fail := func(format string, args ...any) (VarianceComponent, error) {
		return VarianceComponent{}, fmt.Errorf("lrt: variance component: %w: "+format, append([]any{ErrInvalid}, args...)...)
	}
	if len(random) == 0 || len(random[0]) == 0 {
		return fail("no random columns")
	}
	n := len(random[0])
	for _, set := range [][][]float64{fixed, random} {
		for j, c := range set {
			if len(c) != n || !finite(c) {
				return fail("column %d has %d finite values, want %d", j+1, len(c), n)
			}
		}
	}
	v := VarianceComponent{N: n, Residual: residual}
	// Orthonormal fixed columns by twice repeated projection.
	var q [][]float64
	for _, c := range fixed {
		w := append([]float64(nil), c...)
		norm := math.Sqrt(dot(w, w))
		for range 2 {
			for _, u := range q {
				f := dot(u, w)
				for i := range w {
					w[i] -= f * u[i]
				}
			}
		}
		left := math.Sqrt(dot(w, w))
		if left <= 100*float64(len(fixed))*epsilon*norm || norm == 0 {
			continue
		}
		for i := range w {
			w[i] /= left
		}
		q = append(q, w)
	}
	v.P = len(q)
	k := len(random)
	z, pz := mat.NewSymDense(k, nil), mat.NewSymDense(k, nil)
	var off [][]float64
	for _, c := range random {
		w := append([]float64(nil), c...)
		for range 2 {
			for _, u := range q {
				f := dot(u, w)
				for i := range w {
					w[i] -= f * u[i]
				}
			}
		}
		off = append(off, w)
	}
	for i := range k {
		for j := range i + 1 {
			z.SetSym(i, j, dot(random[i], random[j]))
			pz.SetSym(i, j, dot(off[i], off[j]))
		}
	}
	var es mat.EigenSym
	if !es.Factorize(z, false) {
		return fail("the random columns have no eigenvalues")
	}
	v.Xi = positivePart(es.Values(nil))
	return v, v.eigen(pz)
}

func (v *VarianceComponent) eigen(a *mat.SymDense) error {
	var es mat.EigenSym
	if !es.Factorize(a, false) {
		return fmt.Errorf("lrt: variance component: %w: the design has no eigenvalues", ErrInvalid)
	}
	v.Mu = positivePart(es.Values(nil))
	return v.check()
}

// positivePart drops eigenvalues that are nil within rounding.
func positivePart(x []float64) []float64 {
	big := 0.0
	for _, e := range x {
		big = math.Max(big, math.Abs(e))
	}
	var out []float64
	for _, e := range x {
		if e > 1e-10*big {
			out = append(out, e)
		}
	}
	return out
}

func (v VarianceComponent) check() error {
	rest := v.N - v.P - len(v.Mu)
	if len(v.Mu) == 0 || rest < 1 || v.Draws < 0 {
		return fmt.Errorf("lrt: variance component: %w: %d rows, %d fixed columns and %d random directions leave nothing to estimate the error from", ErrInvalid, v.N, v.P, len(v.Mu))
	}
	for _, set := range [][]float64{v.Mu, v.Xi} {
		for _, e := range set {
			if !(e > 0) || math.IsInf(e, 1) {
				return fmt.Errorf("lrt: variance component: %w: eigenvalue %g", ErrInvalid, e)
			}
		}
	}
	return nil
}

// statistic draws one −2 log λ under the null.
func (v VarianceComponent) statistic(src rand.Source) float64 {
	r := rand.New(src)
	w := make([]float64, len(v.Mu))
	for i := range w {
		x := r.NormFloat64()
		w[i] = x * x
	}
	rest := dist.ChiSquared{K: float64(v.N - v.P - len(v.Mu))}.Rand(src)
	m, minus := float64(v.N), v.Xi
	if v.Residual {
		m, minus = float64(v.N-v.P), v.Mu
	}
	value := func(t float64) float64 { // t = log of the variance ratio
		e := math.Exp(t)
		num, den := 0.0, rest
		for i, mu := range v.Mu {
			num += e * mu / (1 + e*mu) * w[i]
			den += w[i] / (1 + e*mu)
		}
		f := m * math.Log1p(num/den)
		for _, x := range minus {
			f -= math.Log1p(e * x)
		}
		return f
	}
	// The curve may have two tops: a grid over the ratios that matter, then a golden section.
	big, small := v.Mu[0], v.Mu[0]
	for _, e := range v.Mu {
		big, small = math.Max(big, e), math.Min(small, e)
	}
	lo, hi := math.Log(1e-4/big), math.Log(1e4/small)
	const steps = 48
	best, at := 0.0, -1
	h := (hi - lo) / steps
	for i := range steps + 1 {
		if f := value(lo + float64(i)*h); f > best {
			best, at = f, i
		}
	}
	if at < 0 {
		return 0
	}
	a, b := lo+float64(at-1)*h, lo+float64(at+1)*h
	g := (math.Sqrt(5) - 1) / 2
	c, d := b-g*(b-a), a+g*(b-a)
	fc, fd := value(c), value(d)
	for b-a > 1e-6 {
		if fc > fd {
			b, d, fd = d, c, fc
			c = b - g*(b-a)
			fc = value(c)
		} else {
			a, c, fc = c, d, fd
			d = a + g*(b-a)
			fd = value(d)
		}
	}
	return math.Max(best, math.Max(fc, fd))
}

// Refer implements Reference.
func (v VarianceComponent) Refer(ctx context.Context, _ Comparison, p Pair, s *Settings) (Test, error) {
	if err := v.check(); err != nil {
		return Test{}, err
	}
	residual := p.Full.Criterion.Kind == ResidualLikelihood
	if p.Full.N != v.N || residual != v.Residual {
		return Test{}, fmt.Errorf("%w: the law is of %d rows (residual: %v), the fits are of %d (residual: %v)", ErrInvalid, v.N, v.Residual, p.Full.N, residual)
	}
	n := v.Draws
	if n == 0 {
		n = 9999
	}
	var seed uint64
	if s != nil {
		seed = s.Seed
	}
	observed := p.statistic()
	if observed <= 1e-8 {
		observed = 0
	}
	sim := &Simulation{}
	var total float64
	err := drawn(ctx, s, n, func(ctx context.Context, i int) (float64, error) {
		return v.statistic(drawSource(seed, i)), ctx.Err()
	}, func(_ int, x float64) bool {
		sim.Draws++
		total += x
		if x >= observed-1e-7*observed {
			sim.AtLeast++
		}
		return true
	})
	if err != nil {
		return Test{}, err
	}
	sim.Mean = total / float64(n)
	sim.Lower, sim.Upper = clopperPearson(sim.AtLeast, n)
	t := Test{Kind: Simulated, Name: "finite-sample law", Statistic: observed, Simulation: sim,
		P: float64(1+sim.AtLeast) / float64(n+1)}
	t.LogP = math.Log(t.P)
	t.Why = fmt.Sprintf("exact law of a variance component at 0 for this design (Crainiceanu and Ruppert 2004), from %d draws (endless simulation: p within %.3g to %.3g)", n, sim.Lower, sim.Upper)
	return t, nil
}
