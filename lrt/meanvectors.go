package lrt

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"
)

// MeanVectors are rows of p responses in k groups: multivariate normal with one
// unknown covariance matrix. Its spaces are Free (a mean vector for each
// group), Equal (one for all) and At (one given). Comparing Equal or At with
// Free gives the test of Hotelling (1931) for one and two groups and of Wilks
// (1932) for more: λ = Λ^(n/2), referred to F by the formula of Rao (1951), which
// is exact when the responses or the degrees of freedom between groups are at
// most two.
//
// Repeated measures on one group are compared by taking differences or
// contrasts of the rows first and testing At zero.
type MeanVectors struct {
	sample Sample[vectors]
	// residual is the triangular factor of the rows about their group means, in
	// units of scale.
	residual *mat.Dense
	scale    []float64
	means    [][]float64
	grand    []float64
	logDet   float64 // log |E|
	n, k, p  int
	unusable error
}

type vectors struct {
	rows  [][]float64
	group []int
	k     int
}

// NewMeanVectors takes n rows of p responses; group[i] in 0 … k − 1 is the group
// of row i, group nil means one group. The rows are copied. Rows that are not
// finite or not of one length are refused; with n − k < p, or responses that
// depend linearly on each other within groups, fits return ErrNoErrorDF.
func NewMeanVectors(rows [][]float64, group []int) (*MeanVectors, error) {
	fail := func(format string, args ...any) (*MeanVectors, error) {
		return nil, fmt.Errorf("lrt: mean vectors: %w: "+format, append([]any{ErrInvalid}, args...)...)
	}
	if len(rows) == 0 || len(rows[0]) == 0 {
		return fail("no rows")
	}
	if group != nil && len(group) != len(rows) {
		return fail("%d rows and %d groups", len(rows), len(group))
	}
	m := &MeanVectors{n: len(rows), p: len(rows[0]), k: 1}
	d := vectors{}
	for i, r := range rows {
		if len(r) != m.p {
			return fail("row %d has %d responses, row 1 has %d", i+1, len(r), m.p)
		}
		if !finite(r) {
			return fail("row %d is not finite", i+1)
		}
		g := 0
		if group != nil {
			g = group[i]
		}
		if g < 0 || g >= len(rows) {
			return fail("row %d is in group %d, want 0 to k−1", i+1, g)
		}
		m.k = max(m.k, g+1)
		d.rows, d.group = append(d.rows, append([]float64(nil), r...)), append(d.group, g)
	}
	d.k = m.k
	size := make([]int, m.k)
	for _, g := range d.group {
		size[g]++
	}
	for g, c := range size {
		if c == 0 {
			return fail("group %d is empty", g)
		}
	}
	m.sample = Observe(d, m.n)
	m.factor()
	return m, nil
}

// factor centres, scales and factors the rows.
func (m *MeanVectors) factor() {
	d := m.sample.Value
	m.scale, m.grand = make([]float64, m.p), make([]float64, m.p)
	size := make([]float64, m.k)
	for _, g := range d.group {
		size[g]++
	}
	m.means = make([][]float64, m.k)
	for g := range m.means {
		m.means[g] = make([]float64, m.p)
	}
	col := make([]float64, m.n)
	for j := range m.p {
		// A provisional mean first, so that a large constant costs no digits.
		for i, r := range d.rows {
			col[i] = r[j] - d.rows[0][j]
		}
		for g := range m.k {
			var part []float64
			for i, v := range col {
				if d.group[i] == g {
					part = append(part, v)
				}
			}
			m.means[g][j] = d.rows[0][j] + sum(part)/size[g]
		}
		m.grand[j] = d.rows[0][j] + sum(col)/float64(m.n)
		for i, r := range d.rows {
			m.scale[j] = math.Max(m.scale[j], math.Abs(r[j]-m.means[d.group[i]][j]))
		}
		if m.scale[j] <= 8*epsilon*math.Abs(m.grand[j]) {
			m.unusable = fmt.Errorf("%w: response %d does not vary within groups", ErrNoErrorDF, j+1)
			return
		}
	}
	if m.n-m.k < m.p {
		m.unusable = fmt.Errorf("%w: %d rows in %d groups leave %d for %d responses", ErrNoErrorDF, m.n, m.k, m.n-m.k, m.p)
		return
	}
	x := mat.NewDense(m.n, m.p, nil)
	for i, r := range d.rows {
		for j, v := range r {
			x.Set(i, j, (v-m.means[d.group[i]][j])/m.scale[j])
		}
	}
	var qr mat.QR
	qr.Factorize(x)
	var r mat.Dense
	qr.RTo(&r)
	m.residual = mat.NewDense(m.p, m.p, nil)
	m.residual.Copy(r.Slice(0, m.p, 0, m.p))
	for j := range m.p {
		v := math.Abs(m.residual.At(j, j))
		if norm := mat.Norm(r.ColView(j), 2); v <= 100*float64(m.p)*epsilon*norm {
			m.unusable = fmt.Errorf("%w: response %d depends linearly on those before it within groups", ErrNoErrorDF, j+1)
			return
		}
		m.logDet += 2 * (math.Log(v) + math.Log(m.scale[j]))
	}
}

// roots returns the eigenvalues of E⁻¹H for mean vectors shifted by the rows of
// shift with the given weights: squared singular values of R⁻ᵀ times them.
func (m *MeanVectors) roots(shift [][]float64, weight []float64) []float64 {
	z := mat.NewDense(m.p, len(shift), nil)
	for g, v := range shift {
		for j, e := range v {
			z.Set(j, g, math.Sqrt(weight[g])*e/m.scale[j])
		}
	}
	// Rᵀ w = z by forward substitution.
	for c := range len(shift) {
		for j := range m.p {
			s := z.At(j, c)
			for i := range j {
				s -= m.residual.At(i, j) * z.At(i, c)
			}
			z.Set(j, c, s/m.residual.At(j, j))
		}
	}
	var svd mat.SVD
	if !svd.Factorize(z, mat.SVDNone) {
		return nil
	}
	v := svd.Values(nil)
	for i := range v {
		v[i] *= v[i]
	}
	return v
}

// Observations returns the identity of the data.
func (m *MeanVectors) Observations() Observations { return m.sample.obs }

// meanSpace is one of the spaces.
type meanSpace struct {
	m    *MeanVectors
	kind uint8 // 0 free, 1 equal, 2 given
	at   []float64
}

// Free returns the space with a mean vector for each group.
func (m *MeanVectors) Free() Space { return &meanSpace{m: m} }

// Equal returns the space with one mean vector. With one group it is Free.
func (m *MeanVectors) Equal() Space {
	if m.k == 1 {
		return m.Free()
	}
	return &meanSpace{m: m, kind: 1}
}

// At returns the space in which every group has the given mean vector.
func (m *MeanVectors) At(mean []float64) (Space, error) {
	if len(mean) != m.p || !finite(mean) {
		return nil, fmt.Errorf("lrt: mean vectors: %w: a mean of %d finite values is needed, got %v", ErrInvalid, m.p, mean)
	}
	return &meanSpace{m: m, kind: 2, at: append([]float64(nil), mean...)}, nil
}

var (
	_ Nester            = (*meanSpace)(nil)
	_ ExactReferrer     = (*meanSpace)(nil)
	_ Simulator         = (*meanSpace)(nil)
	_ Pivot             = (*meanSpace)(nil)
	_ BartlettCorrector = (*meanSpace)(nil)
)

// Observations returns the identity of the data.
func (s *meanSpace) Observations() Observations { return s.m.sample.obs }

// String names the space.
func (s *meanSpace) String() string {
	switch s.kind {
	case 0:
		return "mean vector of each group"
	case 1:
		return "one mean vector"
	}
	return fmt.Sprintf("mean vector %v", s.at)
}

// logWilks returns log Λ against Free, −Σ log(1 + root): log λ over n/2.
func (s *meanSpace) logWilks() float64 {
	if s.kind == 0 {
		return 0
	}
	m := s.m
	size := make([]float64, m.k)
	for _, g := range m.sample.Value.group {
		size[g]++
	}
	var shift [][]float64
	for g := range m.k {
		v := make([]float64, m.p)
		for j := range v {
			if s.kind == 1 {
				v[j] = m.means[g][j] - m.grand[j]
			} else {
				v[j] = m.means[g][j] - s.at[j]
			}
		}
		shift = append(shift, v)
	}
	l := 0.0
	for _, r := range m.roots(shift, size) {
		l -= math.Log1p(r)
	}
	return l
}

// Maximize fits the space.
func (s *meanSpace) Maximize(ctx context.Context) (Fit, error) {
	if err := ctx.Err(); err != nil {
		return Fit{}, err
	}
	m := s.m
	if m.unusable != nil {
		return Fit{}, m.unusable
	}
	n, p := float64(m.n), float64(m.p)
	logDet := m.logDet - s.logWilks()
	groups := m.k
	switch s.kind {
	case 1:
		groups = 1
	case 2:
		groups = 0
	}
	return Fit{N: m.n, Dim: groups*m.p + m.p*(m.p+1)/2, Deviance: nan,
		LogLikelihood: -0.5 * n * (p*math.Log(2*math.Pi/n) + p + logDet)}, nil
}

// NestedIn: given in equal in free.
func (s *meanSpace) NestedIn(larger Space) error {
	l, ok := larger.(*meanSpace)
	if !ok {
		return fmt.Errorf("%w: %T holds no mean vectors", ErrNestingUnknown, larger)
	}
	if l.kind <= s.kind && (l.kind != 2 || sameFloats(l.at, s.at)) {
		return nil
	}
	return fmt.Errorf("%w: %v is not inside %v", ErrNotNested, s, l)
}

func sameFloats(a, b []float64) bool {
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return len(a) == len(b)
}

// wilks returns Λ's logarithm and its parameters: responses, hypothesis and
// error degrees of freedom.
func (s *meanSpace) wilks(restricted Space) (logL, p, q, e float64, ok bool) {
	r, is := restricted.(*meanSpace)
	if !is || s.kind != 0 || r.kind == 0 {
		return 0, 0, 0, 0, false
	}
	q = float64(s.m.k - 1)
	if r.kind == 2 {
		q = float64(s.m.k)
	}
	return r.logWilks(), float64(s.m.p), q, float64(s.m.n - s.m.k), true
}

// ReferExact refers Λ to F by Rao's formula.
func (s *meanSpace) ReferExact(_ context.Context, c Comparison, _ Pair) (Test, error) {
	logL, p, q, e, ok := s.wilks(c.Restricted)
	if !ok {
		return Test{Why: "an exact law is known against the free mean vectors"}, nil
	}
	t, ok := raoF(logL, p, q, e)
	if !ok {
		return Test{Why: "too few degrees of freedom for Rao's F"}, nil
	}
	if q == 1 {
		t.Name, t.Why = "F of Hotelling's T²", "T² is (n − k) times a monotone function of λ, and its multiple has an F law for normal rows"
	}
	return t, nil
}

// BartlettFactor is n over Bartlett's (1938) multiplier of −log Λ.
func (s *meanSpace) BartlettFactor(c Comparison, _ Pair) (float64, error) {
	_, p, q, e, ok := s.wilks(c.Restricted)
	if !ok || !(e-(p-q+1)/2 > 0) {
		return 0, ErrNoFactor
	}
	return float64(s.m.n) / (e - (p-q+1)/2), nil
}

// PivotalAgainst: Λ does not depend on the covariance or the common mean.
func (s *meanSpace) PivotalAgainst(r Space) bool {
	_, _, _, _, ok := s.wilks(r)
	return ok
}

// Redraw draws standard normal rows about the mean of the restricted space, or
// about 0: Λ depends on neither covariance nor common mean.
func (s *meanSpace) Redraw(_ context.Context, _ Fit, src rand.Source, c Comparison) (Comparison, error) {
	r := rand.New(src)
	d := s.m.sample.Value
	given := make([]float64, s.m.p)
	if q, ok := c.Restricted.(*meanSpace); ok && q.kind == 2 {
		given = q.at
	}
	rows := make([][]float64, len(d.rows))
	flat := make([]float64, len(d.rows)*s.m.p)
	for i := range rows {
		rows[i] = flat[i*s.m.p : (i+1)*s.m.p]
		for j := range rows[i] {
			rows[i][j] = given[j] + r.NormFloat64()*math.Max(1, math.Abs(given[j])*1e-3)
		}
	}
	fresh := &MeanVectors{sample: Observe(vectors{rows, d.group, d.k}, s.m.n), n: s.m.n, k: s.m.k, p: s.m.p}
	fresh.factor()
	return c.Each(func(x Space) (Space, error) {
		q, ok := x.(*meanSpace)
		if !ok {
			return nil, fmt.Errorf("%w: %T is not a space of mean vectors", ErrInvalid, x)
		}
		v := *q
		v.m = fresh
		return &v, nil
	})
}
