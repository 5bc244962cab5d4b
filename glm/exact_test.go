package glm_test

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"subsume.example/glm"
)

// residual returns the weighted residual sum of squares of y off the columns, by
// Gram and Schmidt's method, twice, in 400 bits, and the rank.
func residual(cols [][]float64, y, w []float64) (*big.Float, int) {
	num := func(x float64) *big.Float { return new(big.Float).SetPrec(400).SetFloat64(x) }
	op := func(f func(z, a, b *big.Float) *big.Float, a, b *big.Float) *big.Float {
		return f(new(big.Float).SetPrec(400), a, b)
	}
	vector := func(x []float64) []*big.Float {
		v := make([]*big.Float, len(x))
		for i := range v {
			v[i] = op((*big.Float).Mul, num(x[i]), new(big.Float).SetPrec(400).Sqrt(num(w[i])))
		}
		return v
	}
	inner := func(a, b []*big.Float) *big.Float {
		s := num(0)
		for i := range a {
			s = op((*big.Float).Add, s, op((*big.Float).Mul, a[i], b[i]))
		}
		return s
	}
	var basis [][]*big.Float
	reduce := func(v []*big.Float) {
		for range 2 {
			for _, q := range basis {
				a := inner(q, v)
				for i := range v {
					v[i] = op((*big.Float).Sub, v[i], op((*big.Float).Mul, a, q[i]))
				}
			}
		}
	}
	for _, c := range cols {
		v := vector(c)
		norm := inner(v, v)
		reduce(v)
		left := inner(v, v)
		if norm.Sign() == 0 || op((*big.Float).Quo, left, norm).Cmp(num(1e-40)) < 0 {
			continue
		}
		root := new(big.Float).SetPrec(400).Sqrt(left)
		for i := range v {
			v[i] = op((*big.Float).Quo, v[i], root)
		}
		basis = append(basis, v)
	}
	v := vector(y)
	reduce(v)
	return inner(v, v), len(basis)
}

// TestExactArithmetic: F of random comparisons, every kind of term among them, against
// columns written out and sums in 400 bits.
func TestExactArithmetic(t *testing.T) {
	for seed := range uint64(12) {
		p := field(100+seed, 30+int(seed))
		r := rand.New(rand.NewPCG(seed, 8))
		n := len(p.y)
		w := make([]float64, n)
		for i := range w {
			w[i] = 1
		}
		o := &glm.Options{}
		what := "plain"
		switch seed % 4 {
		case 1:
			what, o.Weights = "frequency", glm.Weights{Kind: glm.Frequency, Field: "w"}
			w = p.w
		case 2:
			what, o.Weights = "precision", glm.Weights{Kind: glm.Precision, Field: "w"}
			for i := range p.w {
				p.w[i] = r.Float64()
			}
			w = p.w
		case 3:
			what, o.Offset = "offset", "off"
		}
		if seed%3 == 0 { // far from zero
			for i := range p.y {
				p.y[i] += 1e9
				p.x[i] += 1000
			}
		}
		y := make([]float64, n)
		for i := range y {
			y[i] = p.y[i]
			if o.Offset != "" {
				p.off[i] = math.Round(p.off[i]*1024) / 1024 // so that the difference is exact
				p.y[i] = math.Round(p.y[i]*1024) / 1024
				y[i] = p.y[i] - p.off[i]
			}
		}
		column := func(f func(i int) float64) []float64 {
			c := make([]float64, n)
			for i := range c {
				c[i] = f(i)
			}
			return c
		}
		is := func(b bool) float64 {
			if b {
				return 1
			}
			return 0
		}
		constant := column(func(int) float64 { return 1 })
		small := [][]float64{constant, p.x}
		large := append([][]float64(nil), small...)
		for _, a := range []string{"p", "q", "r"} {
			large = append(large, column(func(i int) float64 { return is(p.a[i] == a) }), column(func(i int) float64 { return is(p.a[i] == a) * p.x[i] }))
			for k := range 4 {
				large = append(large, column(func(i int) float64 { return is(p.a[i] == a && p.b[i] == fmt.Sprintf("block %d", k+1)) }))
			}
		}
		rs, ks := residual(small, y, w)
		rb, kb := residual(large, y, w)
		d := p.data(t)
		s := model(t, d, o, one, cx)
		b := model(t, d, o, one, cx, fa, glm.Cross{fa, cx}, glm.Cross{fa, fb})
		got := compare(t, s, b)
		d1, d2 := got.Pair.Linear.DF()
		obs := 0.0
		for _, v := range w {
			if o.Weights.Kind == glm.Frequency {
				obs += v
			} else {
				obs++
			}
		}
		if d1 != float64(kb-ks) || d2 != obs-float64(kb) {
			t.Errorf("seed %d, %s: degrees of freedom %g and %g, want %d and %g", seed, what, d1, d2, kb-ks, obs-float64(kb))
			continue
		}
		q := new(big.Float).SetPrec(400).Quo(new(big.Float).SetPrec(400).Sub(rs, rb), rb)
		want, _ := q.Float64()
		want *= d2 / d1
		if e := relative(got.Exact.Statistic, want); e > 4e-15 {
			t.Errorf("seed %d, %s: F = %.17g, want %.17g (%.2g off)", seed, what, got.Exact.Statistic, want, e)
		}
		rss, _ := rb.Float64()
		if f := fitted(t, b); relative(f.RSS, rss) > 2e-15 || f.Rank != kb {
			t.Errorf("seed %d, %s: RSS %.17g, want %.17g; rank %d, want %d", seed, what, f.RSS, rss, f.Rank, kb)
		}
	}
}
