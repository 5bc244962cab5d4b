package lrt

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"
	"subsume.example/dist"
)

// Covariances are spaces of covariance matrices of multivariate normal rows
// in k groups, by the residual likelihood (own mean vector in each group, ν = n − k):
//
//	Free        a matrix for each group
//	Common      one matrix for all groups
//	Blocks      one matrix, zero between blocks of responses
//	Spherical   one variance, no covariance
//
// each inside the one before it. Common against Free is the test of Box (1949),
// Blocks against Common that of Wilks (1935), Spherical against Common that of Mauchly
// (1940). λ is pivotal in each; the reference Bartlett uses the published
// multipliers. Exact laws: two blocks of which one has at most two responses,
// and sphericity of two responses.
type Covariances struct {
	sample  Sample[vectors]
	within  ID
	n, k, p int
	nu      []float64
	logDet  []float64     // log |E_g| of each group, NaN where it is singular
	total   *mat.SymDense // E = Σ E_g, scaled
	scale   []float64
	failure error
}

// NewCovariances takes n rows of p responses, as NewMeanVectors does.
func NewCovariances(rows [][]float64, group []int) (*Covariances, error) {
	m, err := NewMeanVectors(rows, group)
	if err != nil {
		return nil, err
	}
	c := &Covariances{sample: m.sample, within: NewID(nil), n: m.n, k: m.k, p: m.p, failure: m.unusable}
	if c.failure == nil {
		c.factor(m)
	}
	return c, nil
}

func (c *Covariances) factor(m *MeanVectors) {
	d := c.sample.Value
	c.scale = m.scale
	c.nu, c.logDet = make([]float64, c.k), make([]float64, c.k)
	units := 0.0
	for _, s := range c.scale {
		units += 2 * math.Log(s)
	}
	c.total = mat.NewSymDense(c.p, nil)
	for g := range c.k {
		var x []float64
		n := 0
		for i, r := range d.rows {
			if d.group[i] == g {
				n++
				for j, v := range r {
					x = append(x, (v-m.means[g][j])/c.scale[j])
				}
			}
		}
		c.nu[g], c.logDet[g] = float64(n-1), nan
		e := mat.NewDense(n, c.p, x)
		var s mat.SymDense
		s.SymOuterK(1, e.T())
		c.total.AddSym(c.total, &s)
		if n-1 < c.p {
			continue
		}
		var qr mat.QR // the factor, not the product: its determinant keeps the digits
		qr.Factorize(e)
		var r mat.Dense
		qr.RTo(&r)
		l := units
		for j := range c.p {
			v := math.Abs(r.At(j, j))
			if norm := mat.Norm(r.ColView(j), 2); v <= 100*float64(c.p)*epsilon*norm {
				l = nan
			}
			l += 2 * math.Log(v)
		}
		c.logDet[g] = l
	}
}

type covarianceSpace struct {
	c      *Covariances
	kind   uint8 // 0 free, 1 common, 2 blocks, 3 spherical
	blocks []int // block of each response
	sizes  []int
}

var (
	_ Nester            = (*covarianceSpace)(nil)
	_ ExactReferrer     = (*covarianceSpace)(nil)
	_ Simulator         = (*covarianceSpace)(nil)
	_ Pivot             = (*covarianceSpace)(nil)
	_ BartlettCorrector = (*covarianceSpace)(nil)
)

// Free returns the space with a covariance matrix for each group, each of more than p rows.
func (c *Covariances) Free() Space {
	if c.k == 1 {
		return c.Common()
	}
	return &covarianceSpace{c: c}
}

// Common returns the space with one covariance matrix.
func (c *Covariances) Common() Space { return &covarianceSpace{c: c, kind: 1} }

// Blocks returns the space with one covariance matrix that is zero between
// responses of different blocks; block[j] numbers the block of response j from 0.
func (c *Covariances) Blocks(block []int) (Space, error) {
	if len(block) != c.p {
		return nil, fmt.Errorf("lrt: covariances: %w: %d block numbers for %d responses", ErrInvalid, len(block), c.p)
	}
	s := &covarianceSpace{c: c, kind: 2, blocks: append([]int(nil), block...)}
	for j, b := range block {
		if b < 0 || b >= c.p {
			return nil, fmt.Errorf("lrt: covariances: %w: response %d is in block %d", ErrInvalid, j+1, b)
		}
		for len(s.sizes) <= b {
			s.sizes = append(s.sizes, 0)
		}
		s.sizes[b]++
	}
	for b, n := range s.sizes {
		if n == 0 {
			return nil, fmt.Errorf("lrt: covariances: %w: block %d is empty", ErrInvalid, b)
		}
	}
	if len(s.sizes) < 2 {
		return c.Common(), nil
	}
	return s, nil
}

// Spherical returns the space with one variance for all responses and no covariance.
func (c *Covariances) Spherical() Space { return &covarianceSpace{c: c, kind: 3} }

// Observations returns the identity of the data.
func (s *covarianceSpace) Observations() Observations { return s.c.sample.obs }

// String names the space.
func (s *covarianceSpace) String() string {
	return []string{"own covariance matrices", "one covariance matrix", "independent blocks", "sphericity"}[s.kind]
}

func (s *covarianceSpace) freeParameters() int {
	p := s.c.p
	switch s.kind {
	case 0:
		return s.c.k * p * (p + 1) / 2
	case 1:
		return p * (p + 1) / 2
	case 2:
		d := 0
		for _, b := range s.sizes {
			d += b * (b + 1) / 2
		}
		return d
	}
	return 1
}

// logDetOf is log |E| over the chosen responses, from a Cholesky factor of the
// scaled matrix.
func (c *Covariances) logDetOf(keep func(j int) bool) (float64, error) {
	var ix []int
	l := 0.0
	for j := range c.p {
		if keep(j) {
			ix = append(ix, j)
			l += 2 * math.Log(c.scale[j])
		}
	}
	m := mat.NewSymDense(len(ix), nil)
	for a, i := range ix {
		for b, j := range ix {
			m.SetSym(a, b, c.total.At(i, j))
		}
	}
	var ch mat.Cholesky
	if !ch.Factorize(m) {
		return 0, fmt.Errorf("%w: responses depend linearly on each other within groups", ErrNoErrorDF)
	}
	return l + ch.LogDet(), nil
}

// Maximize fits the space.
func (s *covarianceSpace) Maximize(ctx context.Context) (Fit, error) {
	if err := ctx.Err(); err != nil {
		return Fit{}, err
	}
	c := s.c
	if c.failure != nil {
		return Fit{}, c.failure
	}
	p, nu := float64(c.p), sum(c.nu)
	l := -0.5 * nu * p * math.Log(2*math.Pi)
	switch s.kind {
	case 0:
		for g, v := range c.nu {
			if math.IsNaN(c.logDet[g]) {
				return Fit{}, fmt.Errorf("%w: group %d has %g residual degrees of freedom for %d responses, or dependent ones", ErrNoErrorDF, g, v, c.p)
			}
			l -= 0.5 * v * (c.logDet[g] - p*math.Log(v) + p)
		}
	case 1, 2:
		d := 0.0
		for b := range max(1, len(s.sizes)) {
			v, err := c.logDetOf(func(j int) bool { return s.kind == 1 || s.blocks[j] == b })
			if err != nil {
				return Fit{}, err
			}
			d += v
		}
		l -= 0.5 * nu * (d - p*math.Log(nu) + p)
	case 3:
		t := 0.0
		for j := range c.p {
			t += c.total.At(j, j) * c.scale[j] * c.scale[j]
		}
		l -= 0.5 * nu * p * (math.Log(t/p/nu) + 1)
	}
	return Fit{N: c.n, Dim: s.freeParameters(), Deviance: nan, LogLikelihood: l,
		Criterion: Criterion{Kind: ResidualLikelihood, Within: c.within}}, nil
}

// NestedIn: spherical in blocks in common in free; blocks in coarser blocks.
func (s *covarianceSpace) NestedIn(larger Space) error {
	l, ok := larger.(*covarianceSpace)
	if !ok {
		return fmt.Errorf("%w: %T holds no covariance matrices", ErrNestingUnknown, larger)
	}
	in := l.kind < s.kind || l.kind == s.kind && l.kind != 2
	if l.kind == 2 && s.kind == 2 { // responses together in s must be together in l
		in = true
		for i := range s.blocks {
			for j := range i {
				in = in && (s.blocks[i] != s.blocks[j] || l.blocks[i] == l.blocks[j])
			}
		}
	}
	if in {
		return nil
	}
	return fmt.Errorf("%w: %v is not inside %v", ErrNotNested, s, l)
}

// ReferExact knows the cases of one beta variable.
func (s *covarianceSpace) ReferExact(_ context.Context, c Comparison, p Pair) (Test, error) {
	none := Test{Why: "exact laws are known for two blocks, one of at most two responses, and for sphericity of two responses"}
	r, ok := c.Restricted.(*covarianceSpace)
	if !ok || s.kind != 1 {
		return none, nil
	}
	nu := sum(s.c.nu)
	logW := -p.statistic() / nu
	switch {
	case r.kind == 3 && s.c.p == 2 && nu > 1:
		// W^((ν−1)/2) is uniform.
		lp := 0.5 * (nu - 1) * logW
		return Test{Kind: Exact, Name: "W of Mauchly", Statistic: math.Exp(logW), P: math.Exp(lp), LogP: lp,
			Why: "for two responses W^((ν−1)/2) is uniform under sphericity"}, nil
	case r.kind == 2 && len(r.sizes) == 2:
		t, ok := raoF(logW, float64(r.sizes[0]), float64(r.sizes[1]), nu-float64(r.sizes[1]))
		if !ok {
			return none, nil
		}
		return t, nil
	}
	return none, nil
}

// BartlettFactor returns ν over the published multiplier of −log W.
func (s *covarianceSpace) BartlettFactor(c Comparison, _ Pair) (float64, error) {
	r, ok := c.Restricted.(*covarianceSpace)
	if !ok {
		return 0, ErrNoFactor
	}
	p, nu := float64(s.c.p), sum(s.c.nu)
	factor := 0.0
	switch {
	case s.kind == 0 && r.kind == 1: // Box (1949)
		d := -1 / nu
		for _, v := range s.c.nu {
			d += 1 / v
		}
		factor = 1 / (1 - d*(2*p*p+3*p-1)/(6*(p+1)*float64(s.c.k-1)))
	case s.kind == 1 && r.kind == 2: // Box (1949), Anderson (2003) 9.5
		a, b := p*p*p, p*p
		for _, q := range r.sizes {
			v := float64(q)
			a, b = a-v*v*v, b-v*v
		}
		factor = nu / (nu - 0.5 - a/(3*b))
	case s.kind == 1 && r.kind == 3: // Anderson (2003) 10.7
		factor = nu / (nu - (2*p*p+p+2)/(6*p))
	}
	if !(factor > 0) || math.IsInf(factor, 1) {
		return 0, ErrNoFactor
	}
	return factor, nil
}

// PivotalAgainst: λ does not change under the transformations that each space allows.
func (s *covarianceSpace) PivotalAgainst(r Space) bool {
	q, ok := r.(*covarianceSpace)
	return ok && (s.kind == 0 && q.kind != 0 || s.kind == 1 && q.kind > 1 || s.kind == 2 && q.kind == 3)
}

// Redraw draws standard normal rows of the same groups.
func (s *covarianceSpace) Redraw(_ context.Context, _ Fit, src rand.Source, c Comparison) (Comparison, error) {
	r := rand.New(src)
	d := s.c.sample.Value
	rows := make([][]float64, len(d.rows))
	for i := range rows {
		rows[i] = make([]float64, s.c.p)
		for j := range rows[i] {
			rows[i][j] = r.NormFloat64()
		}
	}
	fresh, err := NewCovariances(rows, d.group)
	if err != nil {
		return c, err
	}
	return c.Each(func(x Space) (Space, error) {
		q, ok := x.(*covarianceSpace)
		if !ok {
			return nil, fmt.Errorf("%w: %T is not a space of covariance matrices", ErrInvalid, x)
		}
		v := *q
		v.c = fresh
		return &v, nil
	})
}

// raoF refers Wilks' Λ of p responses, q hypothesis and e error degrees of
// freedom to F (Rao 1951).
func raoF(logL, p, q, e float64) (Test, bool) {
	root := 1.0
	if d := p*p + q*q - 5; d > 0 && p*q > 2 {
		root = math.Sqrt((p*p*q*q - 4) / d)
	}
	d1 := p * q
	d2 := (e-(p-q+1)/2)*root - (p*q-2)/2
	if !(d2 > 0) {
		return Test{}, false
	}
	x := math.Expm1(-logL/root) * d2 / d1
	t := Test{Kind: Exact, Name: "F of Wilks' Λ", Statistic: x, Law: dist.F{D1: d1, D2: d2},
		Why: "Rao's F of Wilks' Λ is exact where one of its two dimensions is at most two"}
	if math.Min(p, q) > 2 {
		t.Kind, t.Why = Approximate, fmt.Sprintf("Rao's F (1951) is approximate for dimensions %g and %g; λ is pivotal, so a Bootstrap calibrates it exactly", p, q)
	}
	t.P, t.LogP = tails(t.Law.Survival(x), x, t.Law.LogSurvival)
	return t, true
}
