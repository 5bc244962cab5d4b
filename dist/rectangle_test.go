package dist

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func same(n int, v float64) []float64 {
	s := make([]float64, n)
	for i := range s {
		s[i] = v
	}
	return s
}

func equicorrelated(n int, rho float64) *mat.SymDense {
	c := mat.NewSymDense(n, nil)
	for i := range n {
		for j := range i {
			c.SetSym(i, j, rho)
		}
		c.SetSym(i, i, 1)
	}
	return c
}

func mustRectangle(t *testing.T, r Rectangle, s *RectangleSettings) RectangleProbability {
	t.Helper()
	p, err := r.Probability(context.Background(), s)
	if err != nil {
		t.Fatalf("%v: %v", r, err)
	}
	return p
}

// TestRectangleOrthants: the classical orthant probabilities of two and three
// values, which hold for any Nu (Sheppard 1899; David, Biometrika 40, 1953).
func TestRectangleOrthants(t *testing.T) {
	inf := math.Inf(1)
	for _, nu := range []float64{inf, 5} {
		for _, rho := range []float64{-0.99999, -0.7, 0, 0.2, 0.95} {
			p := mustRectangle(t, Rectangle{same(2, 0), same(2, inf), equicorrelated(2, rho), nu}, nil)
			want := 0.25 + math.Asin(rho)/(2*math.Pi)
			if p.Method != RectangleProduct || relErr(p.Inside, want) > 1e-10 || relErr(p.Outside, 1-want) > 1e-12 {
				t.Errorf("rho=%v nu=%v: %+v, want %v", rho, nu, p, want)
			}
		}
		for _, c := range []struct {
			a, b, c float64
			method  RectangleMethod
		}{{0.5, 0.5, 0.5, RectangleProduct}, {0.5, -0.3, 0.2, RectangleThree}, {-0.4, -0.4, -0.1, RectangleThree}, {0.9, 0.1, 0, RectangleThree}, {0, 0.6, 0, RectangleProduct}} {
			m := symmetric([]float64{1, c.a, c.b}, []float64{c.a, 1, c.c}, []float64{c.b, c.c, 1})
			p := mustRectangle(t, Rectangle{same(3, -inf), same(3, 0), m, nu}, nil)
			want := 0.125 + (math.Asin(c.a)+math.Asin(c.b)+math.Asin(c.c))/(4*math.Pi)
			if p.Method != c.method || relErr(p.Inside, want) > 1e-10 {
				t.Errorf("%v nu=%v: %+v, want %v", c, nu, p, want)
			}
		}
	}
}

// TestRectangleProduct compares with Dunnett's law, Student's t, and the sum of
// a partition of the plane.
func TestRectangleProduct(t *testing.T) {
	for _, nu := range []float64{math.Inf(1), 1e6, 20, 1, 0.2} {
		for _, x := range []float64{0.01, 1, 2.5, 6, 30} {
			d := equalDunnett(4, 0.6, nu, true)
			p := mustRectangle(t, Rectangle{same(4, -x), same(4, x), equicorrelated(4, 0.36), nu}, nil)
			if relErr(p.Inside, d.CDF(x)) > 1e-11 || relErr(p.Outside, d.Survival(x)) > 1e-11 {
				t.Errorf("nu=%v x=%v: %+v, want %v and %v", nu, x, p, d.CDF(x), d.Survival(x))
			}
			one := mustRectangle(t, Rectangle{[]float64{x}, []float64{2 * x}, equicorrelated(1, 0), nu}, nil)
			st := StudentT{nu}
			if want := st.Survival(x) - st.Survival(2*x); relErr(one.Inside, want) > 1e-11 {
				t.Errorf("nu=%v (%v, %v]: %+v, want %v", nu, x, 2*x, one, want)
			}
		}
		// Nine rectangles fill the plane.
		cuts := []float64{math.Inf(-1), -0.3, 1.1, math.Inf(1)}
		sum := 0.0
		for i := range 3 {
			for j := range 3 {
				sum += mustRectangle(t, Rectangle{[]float64{cuts[i], cuts[j]}, []float64{cuts[i+1], cuts[j+1]}, equicorrelated(2, -0.8), nu}, nil).Inside
			}
		}
		if math.Abs(sum-1) > 1e-11 {
			t.Errorf("nu=%v: partition sums to %v", nu, sum)
		}
	}
}

// TestRectangleThree: three values with a product form, by the other method.
func TestRectangleThree(t *testing.T) {
	m := symmetric([]float64{1, 0.35, 0.42}, []float64{0.35, 1, 0.3}, []float64{0.42, 0.3, 1}) // λ = 0.7, 0.5, 0.6
	for _, nu := range []float64{math.Inf(1), 7} {
		for _, x := range []float64{0.05, 1.3, 4, 9} {
			r := Rectangle{[]float64{-x, -2 * x, -x}, []float64{x, x, 3 * x}, m, nu}
			want := mustRectangle(t, r, nil)
			u := r.exact()
			if u.three = newThreeValues(r); u.three == nil {
				t.Fatal("no conditional form")
			}
			got := u.probability(nu)
			if want.Method != RectangleProduct || relErr(got.Inside, want.Inside) > 1e-10 || relErr(got.Outside, want.Outside) > 1e-10 {
				t.Errorf("nu=%v x=%v: %+v, product form %+v", nu, x, got, want)
			}
		}
	}
}

// TestRectangleLattice: the lattice against product forms, and against the
// studentized range, whose differences have a singular correlation matrix.
func TestRectangleLattice(t *testing.T) {
	s := &RectangleSettings{Seed: 7, Simulate: true, Target: 2e-5}
	if os.Getenv("SUBSUME_LONG") == "1" {
		s.Target = 1e-6
	}
	for _, nu := range []float64{math.Inf(1), 12, 1} {
		for _, x := range []float64{0.8, 2.5} {
			r := Rectangle{same(6, -x), same(6, x), equicorrelated(6, 0.5), nu}
			got, want := mustRectangle(t, r, s), mustRectangle(t, r, nil)
			if e := math.Abs(got.Inside - want.Inside); e > got.Error || got.Error > s.Target || got.Method != RectangleLattice {
				t.Errorf("nu=%v x=%v: %+v, want %v, off by %v", nu, x, got, want.Inside, e)
			}
			k := 4
			c, n := differencesOfMeans([]float64{1, 1, 1, 1})
			r = Rectangle{same(n, -x), same(n, x), c, nu}
			got = mustRectangle(t, r, s)
			exact := StudentizedRange{k, nu}.CDF(x * math.Sqrt2)
			if e := math.Abs(got.Inside - exact); e > got.Error || got.Error > s.Target {
				t.Errorf("range of %d, nu=%v, x=%v: %+v, want %v, off by %v", k, nu, x, got, exact, e)
			}
		}
	}
	// Bits do not depend on workers; seeds do matter.
	r := Rectangle{same(5, -1), same(5, 2), equicorrelated(5, 0.3), 4}
	a, b := mustRectangle(t, r, &RectangleSettings{Simulate: true, Workers: 1, Target: 1e-5}), mustRectangle(t, r, &RectangleSettings{Simulate: true, Workers: 4, Target: 1e-5})
	if a != b {
		t.Errorf("workers change the result: %+v, %+v", a, b)
	}
	if c := mustRectangle(t, r, &RectangleSettings{Simulate: true, Seed: 5, Target: 1e-5}); c.Inside == a.Inside || math.Abs(c.Inside-a.Inside) > c.Error+a.Error {
		t.Errorf("seeds 0 and 5: %+v, %+v", a, c)
	}
	// A target out of reach is an error with a result.
	p, err := r.Probability(context.Background(), &RectangleSettings{Simulate: true, Target: 1e-14, MaxPoints: 20000})
	if !errors.Is(err, ErrTolerance) || math.Abs(p.Inside-a.Inside) > p.Error+a.Error || p.Error <= 1e-14 {
		t.Errorf("%+v, %v", p, err)
	}
}

// differencesOfMeans is the correlation matrix of all differences of means with the
// given variances.
func differencesOfMeans(v []float64) (*mat.SymDense, int) {
	var rows [][]float64
	for i := range v {
		for j := range i {
			r := make([]float64, len(v))
			s := math.Sqrt(v[i] + v[j])
			r[i], r[j] = math.Sqrt(v[i])/s, -math.Sqrt(v[j])/s
			rows = append(rows, r)
		}
	}
	c := mat.NewSymDense(len(rows), nil)
	for i := range rows {
		for j := range i + 1 {
			c.SetSym(i, j, dot(rows[i], rows[j]))
		}
	}
	return c, len(rows)
}

func TestRectangleErrors(t *testing.T) {
	ctx := context.Background()
	inf := math.Inf(1)
	for _, c := range []struct {
		name string
		r    Rectangle
		want error
	}{
		{"empty", Rectangle{nil, nil, equicorrelated(1, 0), 5}, ErrParam},
		{"lengths", Rectangle{same(2, 0), same(3, 1), equicorrelated(2, 0), 5}, ErrParam},
		{"NaN limit", Rectangle{same(2, math.NaN()), same(2, 1), equicorrelated(2, 0), 5}, ErrParam},
		{"NaN upper", Rectangle{same(2, 0), same(2, math.NaN()), equicorrelated(2, 0), 5}, ErrParam},
		{"crossed", Rectangle{same(2, 1), same(2, 0), equicorrelated(2, 0), 5}, ErrParam},
		{"nu", Rectangle{same(2, 0), same(2, 1), equicorrelated(2, 0), 0}, ErrParam},
		{"order", Rectangle{same(2, 0), same(2, 1), equicorrelated(3, 0), 5}, ErrParam},
		{"no matrix", Rectangle{same(2, 0), same(2, 1), nil, 5}, ErrParam},
		{"diagonal", Rectangle{same(1, 0), same(1, 1), symmetric([]float64{2}), 5}, ErrCovariance},
		{"entry", Rectangle{same(2, 0), same(2, 1), equicorrelated(2, 1.5), 5}, ErrCovariance},
		{"NaN entry", Rectangle{same(2, 0), same(2, 1), equicorrelated(2, math.NaN()), 5}, ErrCovariance},
		{"indefinite", Rectangle{same(4, 0), same(4, 1), equicorrelated(4, -0.9), 5}, ErrCovariance},
		{"indefinite three", Rectangle{same(3, 0), same(3, 1), equicorrelated(3, -0.9), 5}, ErrCovariance},
	} {
		if _, err := c.r.Probability(ctx, nil); !errors.Is(err, c.want) {
			t.Errorf("%s: %v, want %v", c.name, err, c.want)
		}
	}
	gone, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := (Rectangle{same(5, -1), same(5, 1), equicorrelated(5, 0.2), 5}).Probability(gone, nil); !errors.Is(err, context.Canceled) {
		t.Error(err)
	}
	for _, c := range []struct {
		name string
		r    Rectangle
		want float64
	}{
		{"no limits", Rectangle{same(4, -inf), same(4, inf), equicorrelated(4, 0.2), 5}, 1},
		{"no limits, lattice", Rectangle{same(6, -inf), same(6, inf), differencesOnly(4), 5}, 1},
		{"nothing", Rectangle{same(4, 1), same(4, 1), equicorrelated(4, 0.2), 5}, 0},
		{"limits at infinity", Rectangle{[]float64{inf, -1, -2}, []float64{inf, 1, 3}, equicorrelated(3, 0.2), 5}, 0},
		{"limits at infinity, three", Rectangle{[]float64{-1, -inf, -2}, []float64{1, -inf, 3}, symmetric([]float64{1, 0.5, -0.3}, []float64{0.5, 1, 0.2}, []float64{-0.3, 0.2, 1}), 5}, 0},
		{"limits at infinity, lattice", Rectangle{[]float64{-1, -inf, -2, -3, -1, -1}, []float64{1, -inf, 3, 4, 1, 1}, differencesOnly(4), 5}, 0},
		{"limits at infinity, plane", Rectangle{[]float64{-1, -inf, -2}, []float64{1, -inf, 3}, differencesOnly(3), 5}, 0},
		{"equal pair", Rectangle{same(2, -1), same(2, 1), equicorrelated(2, 1), inf}, 0.68268949213708590},
		{"opposite pair", Rectangle{same(2, 0), same(2, 1), equicorrelated(2, -1), inf}, 0},
	} {
		p := mustRectangle(t, c.r, nil)
		if math.Abs(p.Inside-c.want) > 1e-6 || math.Abs(p.Inside+p.Outside-1) > 1e-12 {
			t.Errorf("%s: %+v, want %v", c.name, p, c.want)
		}
	}
}

func differencesOnly(k int) mat.Symmetric {
	c, _ := differencesOfMeans(same(k, 1))
	return c
}

func FuzzRectangle(f *testing.F) {
	f.Add(-1.0, 1.0, -2.0, 0.5, 0.3, 5.0)
	f.Add(0.0, 0.0, 3.0, math.Inf(1), -1.0, 1e-3)
	f.Fuzz(func(t *testing.T, l1, u1, l2, u2, rho, nu float64) {
		r := Rectangle{[]float64{l1, l2}, []float64{u1, u2}, equicorrelated(2, rho), nu}
		p, err := r.Probability(context.Background(), &RectangleSettings{MaxPoints: 20000})
		if err != nil && !errors.Is(err, ErrTolerance) {
			return
		}
		if !(p.Inside >= -1e-12 && p.Inside <= 1+1e-12) || math.Abs(p.Inside+p.Outside-1) > 1e-9 {
			t.Fatalf("%v: %+v", r, p)
		}
	})
}

func BenchmarkRectangle(b *testing.B) {
	inf := math.Inf(1)
	for _, c := range []struct {
		name string
		r    Rectangle
		s    *RectangleSettings
	}{
		{"product/n=2/nu=inf", Rectangle{same(2, -2), same(2, 2), equicorrelated(2, 0.5), inf}, nil},
		{"product/n=2/nu=20", Rectangle{same(2, -2), same(2, 2), equicorrelated(2, 0.5), 20}, nil},
		{"three/nu=inf", Rectangle{same(3, -2), same(3, 2), symmetric([]float64{1, 0.5, -0.3}, []float64{0.5, 1, 0.2}, []float64{-0.3, 0.2, 1}), inf}, nil},
		{"three/nu=20", Rectangle{same(3, -2), same(3, 2), symmetric([]float64{1, 0.5, -0.3}, []float64{0.5, 1, 0.2}, []float64{-0.3, 0.2, 1}), 20}, nil},
		{"lattice/range of 4/nu=20", Rectangle{same(6, -2), same(6, 2), differencesOnly(4), 20}, nil},
		{"lattice/range of 10/nu=20/1e-4", Rectangle{same(45, -2.5), same(45, 2.5), differencesOnly(10), 20}, &RectangleSettings{Target: 1e-4}},
	} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				p, err := c.r.Probability(context.Background(), c.s)
				if err != nil {
					b.Fatal(err)
				}
				b.ReportMetric(float64(p.Points), "points")
			}
		})
	}
}

// TestRectanglePlane: three means of equal variances (studentized range), unequal ones
// against the lattice, perfectly correlated values, and a half plane.
func TestRectanglePlane(t *testing.T) {
	inf := math.Inf(1)
	for _, nu := range []float64{inf, 14, 0.6} {
		for _, x := range []float64{0.02, 1.1, 3, 11} {
			c, n := differencesOfMeans([]float64{2, 2, 2})
			p := mustRectangle(t, Rectangle{same(n, -x), same(n, x), c, nu}, nil)
			d := StudentizedRange{3, nu}
			if e := math.Max(relErr(p.Inside, d.CDF(x*math.Sqrt2)), relErr(p.Outside, d.Survival(x*math.Sqrt2))); p.Method != RectanglePlane || e > 1e-10 {
				t.Errorf("nu=%v x=%v: %+v, want %v and %v, error %.2g", nu, x, p, d.CDF(x*math.Sqrt2), d.Survival(x*math.Sqrt2), e)
			}
		}
		c, n := differencesOfMeans([]float64{1, 4, 25})
		r := Rectangle{same(n, -1.7), []float64{2, inf, 1.9}, c, nu}
		p, q := mustRectangle(t, r, nil), mustRectangle(t, r, &RectangleSettings{Simulate: true, Target: 3e-5})
		if p.Method != RectanglePlane || math.Abs(p.Inside-q.Inside) > q.Error {
			t.Errorf("nu=%v: %+v, lattice %+v", nu, p, q)
		}
		st := StudentT{nu}
		one := mustRectangle(t, Rectangle{[]float64{-1, -2}, []float64{1.5, 1}, equicorrelated(2, 1), nu}, nil)
		if want := st.CDF(1) - st.CDF(-1); relErr(one.Inside, want) > 1e-10 {
			t.Errorf("nu=%v: %+v, want %v", nu, one, want)
		}
		// Equal limits beyond reach leave one value: P(T1 > 2).
		half := mustRectangle(t, Rectangle{[]float64{2, -inf, -inf}, []float64{inf, inf, inf}, c, nu}, nil)
		if want := st.Survival(2); relErr(half.Inside, want) > 1e-10 {
			t.Errorf("nu=%v: %+v, want %v", nu, half, want)
		}
	}
}

// TestRectangleSweep draws correlations of any rank and limits of any kind, and
// compares the exact methods with the lattice.
func TestRectangleSweep(t *testing.T) {
	n := 30
	if os.Getenv("SUBSUME_LONG") == "1" {
		n = 1500
	}
	rng := rand.New(rand.NewPCG(41, 5))
	limit := func() float64 {
		switch rng.IntN(9) {
		case 0:
			return math.Inf(1)
		case 1:
			return math.Inf(-1)
		case 2:
			return 0
		case 3:
			return math.Copysign(math.Exp(1400*(rng.Float64()-0.5)), rng.Float64()-0.5)
		}
		return 3 * rng.NormFloat64()
	}
	far := 0
	for range n {
		k, rank := rng.IntN(5)+1, rng.IntN(5)+1
		a := make([][]float64, k)
		for i := range a {
			a[i] = make([]float64, rank)
			s := 0.0
			for j := range a[i] {
				a[i][j] = rng.NormFloat64()
				s += a[i][j] * a[i][j]
			}
			for j := range a[i] {
				a[i][j] /= math.Sqrt(s)
			}
		}
		c := mat.NewSymDense(k, nil)
		r := Rectangle{make([]float64, k), make([]float64, k), c, math.Exp(math.Log(0.05) + rng.Float64()*30)}
		if rng.IntN(3) == 0 {
			r.Nu = math.Inf(1)
		}
		for i := range k {
			for j := range i {
				c.SetSym(i, j, math.Max(-1, math.Min(1, dot(a[i], a[j]))))
			}
			c.SetSym(i, i, 1)
			x, y := limit(), limit()
			r.Lower[i], r.Upper[i] = math.Min(x, y), math.Max(x, y)
		}
		if r.Nu > 1e12 {
			r.Nu = math.Inf(1)
		}
		p, err := r.Probability(context.Background(), &RectangleSettings{MaxPoints: 11000})
		if err != nil && !errors.Is(err, ErrTolerance) {
			t.Fatalf("%+v, correlations %v: %v", r, mat.Formatted(c), err)
		}
		if !(p.Inside >= 0 && p.Inside <= 1+1e-12 && p.Outside >= -1e-12) || math.Abs(p.Inside+p.Outside-1) > 1e-9 {
			t.Fatalf("%+v, correlations %v: %+v", r, mat.Formatted(c), p)
		}
		q, err := r.Probability(context.Background(), &RectangleSettings{MaxPoints: 60000, Simulate: true, Seed: 3})
		if err != nil && !errors.Is(err, ErrTolerance) {
			t.Fatal(err)
		}
		if e := math.Abs(p.Inside - q.Inside); e > p.Error+q.Error+1e-9 {
			if far++; e > 5*(p.Error+q.Error)+1e-7 {
				t.Errorf("%v limits %v to %v, nu=%v, correlations\n%v: %+v, lattice %+v", k, r.Lower, r.Upper, r.Nu, mat.Formatted(c), p, q)
			}
		}
	}
	if far > n/10 { // the estimate is a 99 % one, over ten shifts that need not be normal
		t.Errorf("%d of %d lattice results are farther off than they say", far, n)
	}
	t.Logf("%d of %d beyond their error estimates", far, n)
}
