package dist

import (
	"context"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// Largest is the law of the largest of t statistics with any correlations, or
// of their largest modulus: the exact reference for several contrasts of an
// unbalanced layout at once, all pairs of means among them (their correlation
// matrix is singular, which is allowed). It is not a Law, because its tail may
// be simulated: the methods take a context and say how sure they are. When the
// correlations are products the answers are those of Dunnett.
type Largest struct {
	Correlation mat.Symmetric
	Nu          float64 // as in Rectangle
	TwoSided    bool
}

// Rectangle returns the event that no statistic (or modulus) exceeds x.
func (l Largest) Rectangle(x float64) Rectangle {
	n := 0
	if l.Correlation != nil {
		n = l.Correlation.SymmetricDim()
	}
	low := math.Inf(-1)
	if l.TwoSided {
		low = -x
	}
	return Rectangle{slices.Repeat([]float64{low}, n), slices.Repeat([]float64{x}, n), l.Correlation, l.Nu}
}

// Validate returns a *ParamError or *MatrixError as Rectangle does.
func (l Largest) Validate() error { return l.Rectangle(1).Validate() }

// Survival returns P(largest > x) as the Outside of a rectangle, with its
// error; see Rectangle.Probability for settings and errors. x must not be NaN, and
// a two-sided law exceeds every negative x.
func (l Largest) Survival(ctx context.Context, x float64, s *RectangleSettings) (RectangleProbability, error) {
	if l.TwoSided && x < 0 {
		return RectangleProbability{Outside: 1}, l.Validate()
	}
	return l.Rectangle(x).Probability(ctx, s)
}

// LargestQuantile is a critical value with its error.
type LargestQuantile struct {
	X      float64
	Error  float64 // of X, from the error of the probability and the slope there
	Method RectangleMethod
	Points int // evaluations of the lattice in all
}

// UpperQuantile returns the x with P(largest > x) = q for 0 < q < 1, by the
// regula falsi in the Illinois form on log P between the quantiles of one statistic at q
// and at q/n (Bonferroni), which enclose it. All evaluations share
// the random shifts of the lattice, so that the simulated probability is a
// smooth function of x; a loose search comes first, one or two evaluations at the
// target correct it. Errors are those of Rectangle.Probability; with
// ErrTolerance the value is valid and Error says how far.
func (l Largest) UpperQuantile(ctx context.Context, q float64, s *RectangleSettings) (LargestQuantile, error) {
	if err := l.Validate(); err != nil {
		return LargestQuantile{}, err
	}
	if !(q > 0 && q < 1) {
		return LargestQuantile{}, &ParamError{"Largest", "q", q, "a probability between 0 and 1"}
	}
	if s == nil {
		s = &RectangleSettings{}
	}
	n := l.Correlation.SymmetricDim()
	if !s.Simulate {
		if lambda := productForm(l.Correlation); lambda != nil && n <= maxTreatments {
			x := Dunnett{lambda, l.Nu, l.TwoSided}.UpperQuantile(q)
			return LargestQuantile{X: x, Error: 1e-11 * math.Abs(x)}, nil
		}
	}
	t := StudentT{l.Nu}
	one := q
	if l.TwoSided {
		one = q / 2
	}
	a, b := t.UpperQuantile(one), t.UpperQuantile(one/float64(n))
	var r LargestQuantile
	var doubt error
	perr := 0.0
	// Search with a loose target, where a target matters, then correct.
	target := s.Target
	if !(target > 0) {
		target = 1e-6
	}
	loose := *s
	loose.Target = math.Max(target, 0.01*q)
	f := func(x float64, s *RectangleSettings) (float64, error) {
		p, err := l.Rectangle(x).Probability(ctx, s)
		if err != nil && p.Points == 0 {
			return 0, err
		}
		doubt = err
		r.Method, perr = p.Method, p.Error
		r.Points += p.Points
		return math.Log(math.Max(p.Outside, 1e-300) / q), nil
	}
	fa, err := f(a, &loose)
	if err != nil {
		return r, err
	}
	fb, err := f(b, &loose)
	if err != nil {
		return r, err
	}
	slope := (fb - fa) / (b - a)
	last, flast := b, fb
	if fa <= 0 {
		r.X = a // equal within the error already
	} else if fb >= 0 {
		r.X = b
	} else {
		for range 60 {
			x := a - fa*(b-a)/(fb-fa)
			if !(x > a && x < b) {
				x = 0.5 * (a + b)
			}
			fx, err := f(x, &loose)
			if err != nil {
				return r, err
			}
			if d := x - last; math.Abs(d) > 1e-9*math.Abs(x) && math.Abs(fx-flast) > 10*perr/q {
				slope = (fx - flast) / d
			}
			r.X, last, flast = x, x, fx
			if math.Abs(fx) <= math.Max(1e-13, perr/q) || b-a <= 1e-14*math.Abs(x) {
				break
			}
			if fx > 0 {
				a, fa = x, fx
				fb *= 0.5
			} else {
				b, fb = x, fx
				fa *= 0.5
			}
		}
	}
	for n := 0; n < 3 && r.Method == RectangleLattice && loose.Target > target && slope < 0; n++ {
		fx, err := f(r.X, s)
		if err != nil {
			return r, err
		}
		r.X -= fx / slope
		if math.Abs(fx) < 10*perr/q { // the slope is good to a tenth
			break
		}
	}
	if slope < 0 {
		r.Error = 1.5 * perr / q / -slope
	}
	if doubt != nil {
		return r, fmt.Errorf("dist: Largest: critical value %v ± %.2g: %w", r.X, r.Error, doubt)
	}
	return r, nil
}
