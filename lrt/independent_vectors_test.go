package lrt

import (
	"math"
	"testing"
)

// contrasts are the n − 1 orthonormal contrasts of Helmert (1876): what is left
// of a sample without its mean.
func contrasts(rows [][]float64) [][]float64 {
	var out [][]float64
	p := len(rows[0])
	head := make([]float64, p) // of differences from the first row: no digits lost to the mean
	for i := 1; i < len(rows); i++ {
		z := make([]float64, p)
		for j := range z {
			v := rows[i][j] - rows[0][j]
			z[j] = (v*float64(i) - head[j]) / math.Sqrt(float64(i)*float64(i+1))
			head[j] += v
		}
		out = append(out, z)
	}
	return out
}

// split puts the rows of each group together.
func split(rows [][]float64, group []int, k int) [][][]float64 {
	out := make([][][]float64, k)
	for i, r := range rows {
		out[group[i]] = append(out[group[i]], r)
	}
	return out
}

func TestIndependentResidualVariances(t *testing.T) {
	independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
		n, k := 24, 2+int(seed%3)
		if three {
			n = 3 * k
		}
		d := normalGroups(n, k, 2, scale, seed)
		s, err := ResidualVariances(d.samples(false))
		full := mustSpace(t, s, err)
		var data [][]float64
		for _, x := range d.samples(false) {
			rows := make([][]float64, len(x))
			for i, v := range x {
				rows[i] = []float64{v}
			}
			var z []float64
			for _, v := range contrasts(rows) {
				z = append(z, v[0])
			}
			data = append(data, z)
		}
		own := mustBind(t, Model[[][]float64]{
			Name: "contrasts", Params: Block(k, Positive("sd")),
			LogLikelihood: func(z [][]float64, th []float64) float64 {
				l := 0.0
				for g, x := range z {
					for _, v := range x {
						v /= th[g]
						l -= 0.5*v*v + math.Log(th[g]) + 0.5*math.Log(2*math.Pi)
					}
					l -= 0.5 * math.Log(float64(len(x)+1)) // the mean, integrated out
				}
				return l
			},
			Start: func([][]float64) []float64 {
				th := make([]float64, k)
				for i := range th {
					th[i] = 3 * scale
				}
				return th
			},
		}, data, n)
		eq := Equate(Names("sd", k)...)
		return []route{closedBoth(t, "free", full, own), closedBoth(t, "equal", mustRestrict(t, full, eq), mustRestrict(t, own, eq))}
	})
}

// plainVectors is the multivariate normal in means and triangular factors of the
// covariance matrices: means of k groups (none: 0), factors of m.
type plainVectors struct {
	rows    [][]float64
	group   []int
	p, k, m int
	scale   float64
}

func (d plainVectors) bind(t *testing.T) *Declared {
	p, off := d.p, d.p*(d.p-1)/2
	var params []Param
	if d.k > 0 {
		params = append(params, Block(d.k*p, Real("mean"))...)
	}
	params = append(params, Block(d.m*p, Positive("diagonal"))...)
	if off > 0 {
		params = append(params, Block(d.m*off, Real("below"))...)
	}
	return mustBind(t, Model[plainVectors]{
		Name: "vectors", Params: params,
		LogLikelihood: func(d plainVectors, th []float64) float64 {
			mean, diag, below := th[:d.k*p], th[d.k*p:d.k*p+d.m*p], th[d.k*p+d.m*p:]
			l := 0.0
			z := make([]float64, p)
			for i, r := range d.rows {
				g, f := d.group[i], 0
				if d.m > 1 {
					f = g
				}
				at := f * off
				for j := range p {
					v := r[j]
					if d.k > 0 {
						v -= mean[g*p+j]
					}
					for q := range j {
						v -= below[at+q] * z[q]
					}
					at += j
					z[j] = v / diag[f*p+j]
					l -= 0.5*z[j]*z[j] + math.Log(diag[f*p+j]) + 0.5*math.Log(2*math.Pi)
				}
			}
			return l
		},
		Start: func(d plainVectors) []float64 {
			th := make([]float64, len(params))
			for i := range d.k * p {
				th[i] = d.rows[0][i%p]
			}
			for i := range d.m * p {
				th[d.k*p+i] = 3 * d.scale
			}
			return th
		},
	}, d, len(d.rows))
}

func TestIndependentMeanVectors(t *testing.T) {
	independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
		n, p, k := 18, 2, 2+int(seed%2)
		if three { // n − k ≥ p
			n, k = 3, 1+int(seed%2)
			p = 3 - k
		}
		rows, group := vectorsOf(n, p, k, scale, seed)
		m, err := NewMeanVectors(rows, group)
		if err != nil {
			t.Fatal(err)
		}
		own := plainVectors{rows, group, p, k, 1, scale}.bind(t)
		out := []route{both(t, "free", m.Free(), own)}
		given := make([]float64, p)
		var equal, fixed []Restriction
		for j := range p {
			given[j] = scale * (float64(j) + 0.5)
			var same []string
			for g := range k {
				name := Names("mean", k*p)[g*p+j]
				same = append(same, name)
				fixed = append(fixed, Fix(name, given[j]))
			}
			equal = append(equal, Equate(same...))
		}
		if k > 1 {
			out = append(out, both(t, "equal", m.Equal(), mustRestrict(t, own, equal...)))
		}
		at, err := m.At(given)
		if err != nil {
			t.Fatal(err)
		}
		return append(out, both(t, "given", at, mustRestrict(t, own, fixed...)))
	})
}

func TestIndependentCovariances(t *testing.T) {
	independently(t, func(t *testing.T, seed uint64, scale float64, three bool) []route {
		n, p, k := 24, 2+int(seed%2), 2
		if three { // in each group: as few as two responses allow
			n, p = 6, 2
		}
		rows, group := vectorsOf(n, p, k, scale, seed)
		c, err := NewCovariances(rows, group)
		if err != nil {
			t.Fatal(err)
		}
		// The residual likelihood is that of the contrasts, the constant of the means left out.
		d := plainVectors{p: p, m: k, scale: scale}
		for g, x := range split(rows, group, k) {
			for _, z := range contrasts(x) {
				d.rows, d.group = append(d.rows, z), append(d.group, g)
			}
		}
		one := d
		one.m = 1
		free, common := d.bind(t), one.bind(t)
		block := make([]int, p)
		block[p-1] = 1
		blocks, err := c.Blocks(block)
		if err != nil {
			t.Fatal(err)
		}
		off := p * (p - 1) / 2
		var apart, round []Restriction
		for i, name := range Names("below", off) {
			if i >= off-(p-1) { // the last row of the factor
				apart = append(apart, Fix(name, 0))
			}
			round = append(round, Fix(name, 0))
		}
		round = append(round, Equate(Names("diagonal", p)...))
		return []route{
			both(t, "free", c.Free(), free), both(t, "common", c.Common(), common),
			both(t, "blocks", blocks, mustRestrict(t, common, apart...)), both(t, "spherical", c.Spherical(), mustRestrict(t, common, round...)),
		}
	})
}
