package dist

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"sync"

	"subsume.example/internal/special"
)

// The lattice rule integrates the rectangle after Genz's transformation to the
// unit cube (Journal of Computational and Graphical Statistics 1, 1992): the
// correlation matrix is factored into a lower echelon form, value by value the
// normal coordinates are drawn inside the limits that are left, and the product
// of the conditional probabilities is averaged. Values are ordered by the
// smallest conditional probability first (Gibson, Glasbey and Elston 1994);
// those that depend on the coordinates drawn so far only narrow the interval of the last of
// them, so singular matrices need no case of their own (Genz and Kwong, Journal of
// Statistical Computation and Simulation 68, 2000). For finite Nu the scale s is the first
// coordinate (Genz and Bretz, same journal 63, 1999, and Computation of Multivariate Normal and t
// Probabilities, 2009, section 4.2). Points are rank-1 lattices with vectors found component by component,
// ten random shifts each, folded by the baker's transformation (Hickernell 2002).

const latticeShifts = 10

// latticeRow is one value: Σ coef[j] y[j] + pivot y[column] lies in (lower, upper].
type latticeRow struct {
	coef         []float64
	pivot        float64
	lower, upper float64
}

// latticeForm holds the rows by the last coordinate they involve.
type latticeForm struct {
	columns [][]latticeRow
	scale   *scaleTable // nil for known scale
}

// latticeForm factors the correlations; *MatrixError when they are not
// positive semidefinite.
func (r Rectangle) latticeForm() (*latticeForm, error) {
	const dependent = 1e-10 // residual variance
	n := len(r.Lower)
	rows := make([][]float64, n) // factor, one more column a step
	left := make([]float64, n)   // residual variances
	free := make([]int, 0, n)
	for i := range n {
		left[i] = 1
		if !(math.IsInf(r.Lower[i], -1) && math.IsInf(r.Upper[i], 1)) {
			free = append(free, i)
		}
	}
	var f latticeForm
	var y []float64 // expected coordinates
	for len(free) > 0 {
		k := len(f.columns)
		if k == maxFactors {
			return nil, &ParamError{"Rectangle", "the rank of Correlation", float64(k + 1), fmt.Sprintf("at most %d", maxFactors)}
		}
		pick, smallest := -1, math.Inf(1)
		var pa, pb float64
		for at, i := range free {
			d := math.Sqrt(left[i])
			m := dot(rows[i], y)
			a, b := (r.Lower[i]-m)/d, (r.Upper[i]-m)/d
			if p := special.NormalBetween(a, b); p < smallest {
				pick, smallest, pa, pb = at, p, a, b
			}
		}
		if pick < 0 {
			pick = 0
		}
		i := free[pick]
		free = append(free[:pick], free[pick+1:]...)
		d := math.Sqrt(left[i])
		column := []latticeRow{{rows[i], d, r.Lower[i], r.Upper[i]}}
		keep := free[:0]
		for _, j := range free {
			c := (r.Correlation.At(i, j) - dot(rows[i], rows[j])) / d
			res := left[j] - c*c
			switch {
			case res < -1e-7:
				return nil, &MatrixError{"Rectangle", j, i, r.Correlation.At(j, i), "correlations of a positive semidefinite matrix (row and column contradict those before)"}
			case res > dependent:
				rows[j] = append(rows[j], c)
				left[j] = res
				keep = append(keep, j)
			default:
				column = append(column, latticeRow{rows[j], c, r.Lower[j], r.Upper[j]})
			}
		}
		free = keep
		rows[i] = append(rows[i][:k:k], d)
		f.columns = append(f.columns, column)
		e := 0.0
		if smallest > 1e-10 {
			e = (special.NormalDensity(pa) - special.NormalDensity(pb)) / smallest
		} else {
			e = math.Max(-30, math.Min(30, nearestTo0(pa, pb)))
		}
		y = append(y, e)
	}
	return &f, nil
}

func nearestTo0(a, b float64) float64 { return math.Max(a, math.Min(b, 0)) }

func dot(a, b []float64) float64 {
	s := 0.0
	for i, v := range a {
		s += v * b[i]
	}
	return s
}

// lattice runs rules of growing size until the error estimate meets the target.
func (r Rectangle) lattice(ctx context.Context, f *latticeForm, s *RectangleSettings) (RectangleProbability, error) {
	if !math.IsInf(r.Nu, 1) {
		f.scale = newScaleTable(r.Nu)
	}
	target, most := s.Target, s.MaxPoints
	if !(target > 0) {
		target = 1e-6
	}
	if most <= 0 {
		most = 16000000
	}
	p := RectangleProbability{Method: RectangleLattice}
	done := 0
	for i := range latticeRules {
		rule := &latticeRules[i]
		if i > 0 && done+latticeShifts*rule.points > most {
			break
		}
		means, err := f.shifted(ctx, rule, s, uint64(i))
		if err != nil {
			return RectangleProbability{}, err
		}
		done += latticeShifts * rule.points
		mean, v := 0.0, 0.0
		for _, m := range means {
			mean += m / latticeShifts
		}
		for _, m := range means {
			v += (m - mean) * (m - mean) / (latticeShifts - 1)
		}
		// Each rule stands for itself: the next is far better than this one.
		p.Inside, p.Outside, p.Points = mean, 1-mean, done
		p.Error = 3.25*math.Sqrt(v/latticeShifts) + 1e-15
		if p.Error <= target {
			return p, nil
		}
	}
	return p, fmt.Errorf("dist: Rectangle: error estimate %.2g after %d points, target %.2g: %w", p.Error, p.Points, target, ErrTolerance)
}

// shifted returns the means over the shifts of one rule.
func (f *latticeForm) shifted(ctx context.Context, rule *latticeRule, s *RectangleSettings, stage uint64) ([latticeShifts]float64, error) {
	var means [latticeShifts]float64
	workers := s.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	var wg sync.WaitGroup
	jobs := make(chan int, latticeShifts)
	for i := range latticeShifts {
		jobs <- i
	}
	close(jobs)
	for range min(workers, latticeShifts) {
		wg.Go(func() {
			for i := range jobs {
				means[i] = f.mean(ctx, rule, rand.New(rand.NewPCG(s.Seed, stage*latticeShifts+uint64(i))))
			}
		})
	}
	wg.Wait()
	return means, ctx.Err()
}

// mean averages the transformed integrand over one shifted lattice.
func (f *latticeForm) mean(ctx context.Context, rule *latticeRule, rng *rand.Rand) float64 {
	dims := len(f.columns) - 1
	if f.scale != nil {
		dims++
	}
	shift := make([]float64, dims)
	for i := range shift {
		shift[i] = rng.Float64()
	}
	at := make([]int, dims)
	u := make([]float64, dims)
	y := make([]float64, len(f.columns))
	sum, rest := 0.0, 0.0
	for n := range rule.points {
		if n&4095 == 0 && ctx.Err() != nil {
			return 0
		}
		for d := range u {
			x := float64(at[d])/float64(rule.points) + shift[d]
			x -= math.Floor(x)
			u[d] = 1 - math.Abs(2*x-1)
			if at[d] += rule.vector[d]; at[d] >= rule.points {
				at[d] -= rule.points
			}
		}
		// Compensated, so that a million points lose nothing.
		v := f.value(u, y) - rest
		t := sum + v
		rest = (t - sum) - v
		sum = t
	}
	return sum / float64(rule.points)
}

// value is the product of conditional probabilities at a point of the cube.
func (f *latticeForm) value(u, y []float64) float64 {
	s := 1.0
	if f.scale != nil {
		s = f.scale.at(u[0])
		u = u[1:]
	}
	p := 1.0
	for k, rows := range f.columns {
		a, b := math.Inf(-1), math.Inf(1)
		for i := range rows {
			r := &rows[i]
			m := dot(r.coef, y)
			lo, hi := (scaled(r.lower, s)-m)/r.pivot, (scaled(r.upper, s)-m)/r.pivot
			if r.pivot < 0 {
				lo, hi = hi, lo
			}
			a, b = math.Max(a, lo), math.Min(b, hi)
		}
		if !(a < b) {
			return 0
		}
		// Tails on the side where they are small.
		flip := a > 0
		if flip {
			a, b = -b, -a
		}
		pa, pb := special.NormalLower(a), special.NormalLower(b)
		d := pb - pa
		p *= d
		if p == 0 || k == len(f.columns)-1 {
			return p
		}
		z := -special.NormalUpperQuantile(pa + u[k]*d)
		z = math.Max(a, math.Min(b, z))
		z = math.Max(-40, math.Min(40, z))
		if flip {
			z = -z
		}
		y[k] = z
	}
	return p
}

// scaleTable is log s as a function of the normal score of its distribution
// function, by cubic Hermite interpolation.
type scaleTable struct{ value, slope [scaleNodes + 1]float64 }

const (
	scaleNodes = 680
	scaleEnd   = 8.5
	scaleStep  = 2 * scaleEnd / scaleNodes
)

func newScaleTable(nu float64) *scaleTable {
	t := new(scaleTable)
	c := logChiPeak(nu)
	law := ChiSquared{nu}
	for i := range t.value {
		z := -scaleEnd + scaleStep*float64(i)
		x := 0.0
		if z < 0 {
			x = law.Quantile(special.NormalLower(z))
		} else {
			x = law.UpperQuantile(special.NormalUpper(z))
		}
		v := 0.5 * logRatio(x, nu)
		if x < 1e-300 { // leading power of the lower tail
			g, _ := math.Lgamma(1 + nu/2)
			v = (special.NormalLogLower(z)+g)/nu - 0.5*math.Log(nu/2)
		}
		t.value[i] = v
		t.slope[i] = math.Exp(special.NormalLogDensity(z) - c + nu*chiCurve(v))
	}
	return t
}

// at returns s at the quantile u of its law.
func (t *scaleTable) at(u float64) float64 {
	z := -special.NormalUpperQuantile(u)
	x := (math.Max(-scaleEnd, math.Min(scaleEnd, z)) + scaleEnd) / scaleStep
	i := min(int(x), scaleNodes-1)
	d := x - float64(i)
	e := 1 - d
	v := e*e*((1+2*d)*t.value[i]+d*scaleStep*t.slope[i]) + d*d*((1+2*e)*t.value[i+1]-e*scaleStep*t.slope[i+1])
	return math.Exp(v)
}
