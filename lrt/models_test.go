package lrt

import (
	"math"
	"math/rand/v2"
	"testing"
)

// grouped is test data: a value and a group for each row.
type grouped struct {
	y []float64
	g []int
	k int
}

func (d grouped) sums() (n, s, ss []float64) {
	n, s, ss = make([]float64, d.k), make([]float64, d.k), make([]float64, d.k)
	for i, v := range d.y {
		n[d.g[i]]++
		s[d.g[i]] += v
	}
	for i, v := range d.y {
		e := v - s[d.g[i]]/n[d.g[i]]
		ss[d.g[i]] += e * e
	}
	return n, s, ss
}

type parts uint8

const (
	withEach parts = 1 << iota
	withGradient
	withStart
	withClosed
)

// normalModel: own mean and standard deviation in each group.
func normalModel(k int, with parts) Model[grouped] {
	m := Model[grouped]{Name: "normal", Params: append(Block(k, Real("mean")), Block(k, Positive("sd"))...)}
	term := func(y, mu, sd float64) float64 {
		z := (y - mu) / sd
		return -0.5*z*z - math.Log(sd) - 0.5*math.Log(2*math.Pi)
	}
	m.LogLikelihood = func(d grouped, th []float64) float64 {
		s := 0.0
		for i, y := range d.y {
			s += term(y, th[d.g[i]], th[k+d.g[i]])
		}
		return s
	}
	if with&withEach != 0 {
		m.Each = func(d grouped, th, each []float64) {
			for i, y := range d.y {
				each[i] = term(y, th[d.g[i]], th[k+d.g[i]])
			}
		}
	}
	if with&withGradient != 0 {
		m.Gradient = func(d grouped, th, g []float64) {
			clear(g)
			for i, y := range d.y {
				j := d.g[i]
				e, sd := y-th[j], th[k+j]
				g[j] += e / (sd * sd)
				g[k+j] += e*e/(sd*sd*sd) - 1/sd
			}
		}
	}
	closed := func(d grouped) []float64 {
		n, s, ss := d.sums()
		th := make([]float64, 2*k)
		for j := range k {
			th[j], th[k+j] = s[j]/n[j], math.Sqrt(ss[j]/n[j])
		}
		return th
	}
	if with&withStart != 0 {
		m.Start = func(d grouped) []float64 { // rough on purpose: the first value and the range
			th := closed(d)
			lo, hi := d.y[0], d.y[0]
			for _, v := range d.y {
				lo, hi = math.Min(lo, v), math.Max(hi, v)
			}
			for j := range k {
				th[j], th[k+j] = 0.5*(lo+hi), hi-lo
			}
			return th
		}
	}
	if with&withClosed != 0 {
		m.ClosedForm = func(d grouped) ([]float64, error) { return closed(d), nil }
	}
	m.Simulate = func(d grouped, th []float64, src rand.Source) (grouped, error) {
		r := rand.New(src)
		y := make([]float64, len(d.y))
		for i := range y {
			y[i] = th[d.g[i]] + th[k+d.g[i]]*r.NormFloat64()
		}
		return grouped{y, d.g, d.k}, nil
	}
	return m
}

// gammaModel: own shape and rate in each group.
func gammaModel(k int, with parts) Model[grouped] {
	m := Model[grouped]{Name: "gamma", Params: append(Block(k, Positive("shape")), Block(k, Positive("rate"))...)}
	all := func(d grouped, th, each []float64) float64 {
		c := make([]float64, k)
		for j := range k {
			lg, _ := math.Lgamma(th[j])
			c[j] = th[j]*math.Log(th[k+j]) - lg
		}
		s := 0.0
		for i, y := range d.y {
			j := d.g[i]
			v := c[j] + (th[j]-1)*math.Log(y) - th[k+j]*y
			s += v
			if each != nil {
				each[i] = v
			}
		}
		return s
	}
	m.LogLikelihood = func(d grouped, th []float64) float64 { return all(d, th, nil) }
	if with&withEach != 0 {
		m.Each = func(d grouped, th, each []float64) { all(d, th, each) }
	}
	if with&withGradient != 0 {
		m.Gradient = func(d grouped, th, g []float64) {
			clear(g)
			psi := make([]float64, k)
			for j := range k {
				psi[j] = math.Log(th[k+j]) - digammaForTest(th[j])
			}
			for i, y := range d.y {
				j := d.g[i]
				g[j] += psi[j] + math.Log(y)
				g[k+j] += th[j]/th[k+j] - y
			}
		}
	}
	if with&withStart != 0 {
		m.Start = func(d grouped) []float64 {
			n, s, ss := d.sums()
			th := make([]float64, 2*k)
			for j := range k {
				mu, v := s[j]/n[j], ss[j]/n[j]
				th[j], th[k+j] = mu*mu/v, mu/v
			}
			return th
		}
	}
	return m
}

// digammaForTest is ψ(x) by recurrence and the asymptotic series, DLMF 5.11.2.
func digammaForTest(x float64) float64 {
	r := 0.0
	for ; x < 12; x++ {
		r -= 1 / x
	}
	f := 1 / (x * x)
	return r + math.Log(x) - 0.5/x - f*(1./12-f*(1./120-f*(1./252-f*(1./240-f/132))))
}

func draw(seed uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, 20261201)) }

// gammaGroups draws n rows in k groups, sums of three exponentials.
func gammaGroups(n, k int, scale float64, seed uint64) grouped {
	r := draw(seed)
	d := grouped{k: k}
	for i := range n {
		d.g = append(d.g, i%k)
		d.y = append(d.y, scale*(r.ExpFloat64()+r.ExpFloat64()+r.ExpFloat64())*(1+0.05*float64(i%k)))
	}
	return d
}

// normalGroups draws n rows in k groups around centre, all of it times scale.
func normalGroups(n, k int, centre, scale float64, seed uint64) grouped {
	r := draw(seed)
	d := grouped{k: k}
	for i := range n {
		d.g = append(d.g, i%k)
		d.y = append(d.y, scale*(centre+r.NormFloat64()))
	}
	return d
}

func mustBind[D any](t testing.TB, m Model[D], d D, n int) *Declared {
	t.Helper()
	s, err := Bind(m, Observe(d, n))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func mustRestrict(t testing.TB, s Space, rs ...Restriction) *Declared {
	t.Helper()
	r, err := Restrict(s, rs...)
	if err != nil {
		t.Fatal(err)
	}
	return r.(*Declared)
}

// simulateGamma draws by the method of Marsaglia and Tsang (2000).
func simulateGamma(k int) func(grouped, []float64, rand.Source) (grouped, error) {
	return func(d grouped, th []float64, src rand.Source) (grouped, error) {
		r := rand.New(src)
		y := make([]float64, len(d.y))
		for i := range y {
			shape, rate := th[d.g[i]], th[k+d.g[i]]
			boost := 1.0
			if shape < 1 {
				boost = math.Pow(r.Float64(), 1/shape)
				shape++
			}
			a := shape - 1.0/3
			for {
				x := r.NormFloat64()
				v := math.Pow(1+x/math.Sqrt(9*a), 3)
				if v > 0 && math.Log(1-r.Float64()) < 0.5*x*x+a-a*v+a*math.Log(v) {
					y[i] = a * v * boost / rate
					break
				}
			}
		}
		return grouped{y, d.g, d.k}, nil
	}
}
