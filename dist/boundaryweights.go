package dist

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"sync"

	"gonum.org/v1/gonum/mat"
)

// ErrCovariance is wrapped by every MatrixError.
var ErrCovariance = errors.New("dist: not a positive definite covariance matrix")

// MatrixError says where a matrix cannot be the covariance that a function
// asks for. It unwraps to ErrCovariance.
type MatrixError struct {
	Func     string // the function that was called
	Row, Col int    // the entry at fault, from 0
	Value    float64
	Want     string
}

// Error names the function, the entry, its value and what was wanted.
func (e *MatrixError) Error() string {
	return fmt.Sprintf("dist: %s: entry (%d, %d) = %v: want %s", e.Func, e.Row, e.Col, e.Value, e.Want)
}

// Unwrap returns ErrCovariance.
func (e *MatrixError) Unwrap() error { return ErrCovariance }

// MaxBoundary is the largest number of boundary parameters of BoundaryWeights.
const MaxBoundary = 64

// WeightSettings hold the choices of BoundaryWeights; nil and zero fields mean
// the defaults.
type WeightSettings struct {
	Draws   int    // simulated points for more than three parameters; 0: 200,000
	Seed    uint64 // draw i uses its own source made from (Seed, i)
	Workers int    // 0: one a processor; the result does not depend on it
}

// Weights are the mixing weights of a ChiBarSquared law.
type Weights struct {
	// Value[j] is the weight of χ²_j, j = 0 ... number of parameters.
	Value []float64
	// StdError[j] is the standard error of a simulated weight; nil when exact.
	StdError []float64
	// Draws is the number of simulated points, 0 when exact.
	Draws int
}

// Exact reports whether the weights are in closed form.
func (w Weights) Exact() bool { return w.Draws == 0 }

// Law returns the mixture for testing the origin against the cone.
func (w Weights) Law() ChiBarSquared { return NewChiBarSquared(w.Value...) }

// BoundaryWeights returns the weights of the chi-bar-squared law for testing
// that q parameters are 0 against all of them being at least 0. cov is the
// covariance matrix of their estimates (up to a factor), nuisance parameters
// profiled out: the corresponding block of the inverse information. Weight j is the probability that exactly j
// components of the projection of N(0, cov) on the orthant, in the metric of the
// inverse of cov, are positive.
//
// Up to three parameters the weights are exact (Kudô 1963; Shapiro, Biometrika
// 72, 1985): with ρ the correlations and ρ.k the partial correlations given k,
//
//	q = 1  1/2, 1/2
//	q = 2  w₀ = arccos(ρ)/2π, w₁ = 1/2, w₂ = 1/2 - w₀
//	q = 3  w₃ = (2π - Σ arccos ρᵢⱼ)/4π, w₂ = (3π - Σ arccos ρᵢⱼ.ₖ)/4π,
//	       w₁ = 1/2 - w₃, w₀ = 1/2 - w₂
//
// Beyond three they are simulated: each drawn point is projected by principal pivoting
// (Murty 1974), and the even and the odd weights are scaled to sum to 1/2 each,
// which they do exactly for every cone other than a subspace. The same seed
// gives the same weights whatever the number of workers.
//
// A matrix that is not finite, symmetric or positive definite gives a
// *MatrixError, more than MaxBoundary parameters or none a *ParamError,
// and a cancelled context its own error.
func BoundaryWeights(ctx context.Context, cov mat.Symmetric, s *WeightSettings) (Weights, error) {
	const name = "BoundaryWeights"
	q := cov.SymmetricDim()
	if q < 1 || q > MaxBoundary {
		return Weights{}, &ParamError{name, "the number of parameters", float64(q), fmt.Sprintf("1 to %d", MaxBoundary)}
	}
	r, err := correlationOf(name, cov)
	if err != nil {
		return Weights{}, err
	}
	switch q {
	case 1:
		return Weights{Value: []float64{0.5, 0.5}}, nil
	case 2:
		w := angle(r[0][1]) / (2 * math.Pi)
		return Weights{Value: []float64{w, 0.5, 0.5 - w}}, nil
	case 3:
		w3 := (2*math.Pi - angle(r[0][1]) - angle(r[0][2]) - angle(r[1][2])) / (4 * math.Pi)
		w2 := (3*math.Pi - angle(partial(r[0][1], r[0][2], r[1][2])) - angle(partial(r[0][2], r[0][1], r[1][2])) -
			angle(partial(r[1][2], r[0][1], r[0][2]))) / (4 * math.Pi)
		w3, w2 = math.Max(0, w3), math.Min(0.5, math.Max(0, w2))
		return Weights{Value: []float64{0.5 - w2, 0.5 - w3, w2, w3}}, nil
	}
	return simulateWeights(ctx, r, s)
}

// angle is arccos of a correlation, within its range.
func angle(r float64) float64 { return math.Acos(math.Max(-1, math.Min(1, r))) }

// partial returns the correlation of a and b given c.
func partial(ab, ac, bc float64) float64 {
	return (ab - ac*bc) / math.Sqrt((1-ac*ac)*(1-bc*bc))
}

// correlationOf checks a covariance matrix and scales it to unit diagonal.
func correlationOf(name string, cov mat.Symmetric) ([][]float64, error) {
	n := cov.SymmetricDim()
	r := make([][]float64, n)
	for i := range r {
		r[i] = make([]float64, n)
		if d := cov.At(i, i); !(d > 0 && d <= math.MaxFloat64) {
			return nil, &MatrixError{name, i, i, d, "a finite variance above 0"}
		}
	}
	for i := range r {
		for j := range r {
			v := cov.At(i, j)
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, &MatrixError{name, i, j, v, "a finite number"}
			}
			if i == j {
				r[i][j] = 1
				continue
			}
			if w := cov.At(j, i); w != v {
				return nil, &MatrixError{name, i, j, v, fmt.Sprintf("the value of entry (%d, %d), %v", j, i, w)}
			}
			r[i][j] = v / math.Sqrt(cov.At(i, i)) / math.Sqrt(cov.At(j, j))
		}
	}
	if _, i, d := choleskyOf(r); i >= 0 {
		return nil, &MatrixError{name, i, i, d, "a pivot above 1e-14: the matrix is not positive definite (its row depends on those before)"}
	}
	return r, nil
}

// choleskyOf returns the lower factor of a correlation matrix, or the row and
// value of the first pivot not above 1e-14.
func choleskyOf(r [][]float64) (l [][]float64, bad int, pivot float64) {
	n := len(r)
	l = make([][]float64, n)
	for i := range l {
		l[i] = make([]float64, n)
		for j := 0; j <= i; j++ {
			s := r[i][j]
			for k := range j {
				s -= l[i][k] * l[j][k]
			}
			if i != j {
				l[i][j] = s / l[j][j]
				continue
			}
			if !(s > 1e-14) {
				return nil, i, s
			}
			l[i][i] = math.Sqrt(s)
		}
	}
	return l, -1, 0
}

// simulateWeights counts the positive components of projected normal draws,
// in blocks of draws that any worker may take.
func simulateWeights(ctx context.Context, r [][]float64, s *WeightSettings) (Weights, error) {
	draws, seed, workers := 200000, uint64(0), runtime.GOMAXPROCS(0)
	if s != nil {
		seed = s.Seed
		if s.Draws > 0 {
			draws = s.Draws
		}
		if s.Workers > 0 {
			workers = s.Workers
		}
	}
	const block = 1024
	blocks := (draws + block - 1) / block
	q := len(r)
	l, _, _ := choleskyOf(r)
	counts := make([]int, q+1)
	var mu sync.Mutex
	var wg sync.WaitGroup
	next := 0
	for range min(workers, blocks) {
		wg.Go(func() {
			p := newOrthantProjector(r)
			g, z := make([]float64, q), make([]float64, q)
			local := make([]int, q+1)
			for {
				mu.Lock()
				b := next
				next++
				mu.Unlock()
				if b >= blocks || ctx.Err() != nil {
					break
				}
				for i := b * block; i < min(draws, (b+1)*block); i++ {
					rng := rand.New(rand.NewPCG(seed, uint64(i)))
					for j := range g {
						g[j] = rng.NormFloat64()
					}
					for j := range z {
						z[j] = 0
						for k, v := range l[j][:j+1] {
							z[j] += v * g[k]
						}
					}
					local[p.positive(z)]++
				}
			}
			mu.Lock()
			for j, n := range local {
				counts[j] += n
			}
			mu.Unlock()
		})
	}
	wg.Wait()
	if err := ctx.Err(); err != nil {
		return Weights{}, err
	}
	// Even and odd weights sum to 1/2 each.
	var half [2]int
	for j, n := range counts {
		half[j&1] += n
	}
	w := Weights{Value: make([]float64, q+1), StdError: make([]float64, q+1), Draws: draws}
	for j, n := range counts {
		m := math.Max(1, float64(half[j&1]))
		f := float64(n) / m
		w.Value[j] = 0.5 * f
		w.StdError[j] = 0.5 * math.Sqrt(f*(1-f)/m)
	}
	return w, nil
}

// orthantProjector finds the projection x of z on x >= 0 in the metric of the
// inverse of v: x = z + v λ with x, λ >= 0 and xᵀλ = 0.
type orthantProjector struct {
	v      [][]float64
	active []bool // λ may be positive, x = 0
	index  []int
	l      [][]float64
	lambda []float64
}

func newOrthantProjector(v [][]float64) *orthantProjector {
	q := len(v)
	p := &orthantProjector{v: v, active: make([]bool, q), index: make([]int, 0, q), l: make([][]float64, q), lambda: make([]float64, q)}
	for i := range p.l {
		p.l[i] = make([]float64, q)
	}
	return p
}

// positive returns the number of positive components of the projection.
// Whole sets of wrong signs are exchanged while their number falls (Kostreva
// 1978), else the last one alone, which is finite for a positive definite
// matrix (Murty, Linear Algebra and its Applications 7, 1974).
func (p *orthantProjector) positive(z []float64) int {
	q := len(z)
	for i, v := range z {
		p.active[i] = v < 0
	}
	fewest, patience := q+1, 3
	for range 50 * q {
		p.solve(z)
		wrong, last := 0, -1
		for i := range z {
			if p.wrong(z, i) {
				wrong++
				last = i
			}
		}
		if wrong == 0 {
			break
		}
		switch {
		case wrong < fewest:
			fewest, patience = wrong, 3
		case patience > 0:
			patience--
		}
		if patience > 0 {
			// wrong looks at values fixed by solve, so flags can change at once.
			flips := p.index[:0]
			for i := range z {
				if p.wrong(z, i) {
					flips = append(flips, i)
				}
			}
			for _, i := range flips {
				p.active[i] = !p.active[i]
			}
		} else {
			p.active[last] = !p.active[last]
		}
	}
	n := 0
	for _, a := range p.active {
		if !a {
			n++
		}
	}
	return n
}

// solve sets lambda from v_SS λ_S = -z_S over the active set S.
func (p *orthantProjector) solve(z []float64) {
	s := p.index[:0]
	for i, a := range p.active {
		p.lambda[i] = 0
		if a {
			s = append(s, i)
		}
	}
	for a, i := range s {
		for b, j := range s[:a+1] {
			t := p.v[i][j]
			for k := range b {
				t -= p.l[a][k] * p.l[b][k]
			}
			if a == b {
				p.l[a][a] = math.Sqrt(math.Max(t, 1e-300))
			} else {
				p.l[a][b] = t / p.l[b][b]
			}
		}
		t := -z[i]
		for k := range a {
			t -= p.l[a][k] * p.lambda[s[k]]
		}
		p.lambda[i] = t / p.l[a][a]
	}
	for a := len(s) - 1; a >= 0; a-- {
		t := p.lambda[s[a]]
		for k := a + 1; k < len(s); k++ {
			t -= p.l[k][a] * p.lambda[s[k]]
		}
		p.lambda[s[a]] = t / p.l[a][a]
	}
}

// wrong reports whether component i violates its sign.
func (p *orthantProjector) wrong(z []float64, i int) bool {
	if p.active[i] {
		return p.lambda[i] < 0
	}
	x := z[i]
	for j, a := range p.active {
		if a {
			x += p.v[i][j] * p.lambda[j]
		}
	}
	return x < 0
}
