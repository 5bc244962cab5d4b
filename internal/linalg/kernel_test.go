package linalg

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// TestKernelsAgree: vector kernels and the element by element route give the same bits.
func TestKernelsAgree(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for n := range 70 {
		var v [5]vec
		for k := range v {
			v[k] = newVec(n)
			for i := range n {
				v[k].hi[i] = math.Ldexp(r.NormFloat64(), r.IntN(60)-30)
				v[k].lo[i] = v[k].hi[i] * (r.Float64() - 0.5) * 0x1p-53
			}
		}
		var want lanes
		want.addFrom(v[0].hi, v[1].hi, 0)
		var got lanes
		got.addFrom(v[0].hi, v[1].hi, lanesOf(v[0].hi, v[1].hi, &got))
		if got != want {
			t.Fatalf("n = %d: lanes %v, one by one %v", n, got, want)
		}
		four := dot4(v[0], v[1], v[2], v[3], v[4], n)
		for k := range four {
			if one := dot(v[0], v[k+1], n); one != four[k] {
				t.Fatalf("n = %d, vector %d: %v in four, %v alone", n, k, four[k], one)
			}
		}
		// Against 600-bit arithmetic: error of order n·2^-104 of Σ|a·b|.
		exact, size := new(big.Float).SetPrec(600), 0.0
		for i := range n {
			a := new(big.Float).SetPrec(600).SetFloat64(v[0].hi[i])
			a.Add(a, big.NewFloat(v[0].lo[i]))
			b := new(big.Float).SetPrec(600).SetFloat64(v[1].hi[i])
			b.Add(b, big.NewFloat(v[1].lo[i]))
			exact.Add(exact, a.Mul(a, b))
			size += math.Abs(v[0].hi[i] * v[1].hi[i])
		}
		d := new(big.Float).SetPrec(600).SetFloat64(four[0].Hi)
		d.Add(d, big.NewFloat(four[0].Lo))
		e, _ := d.Sub(d, exact).Float64()
		if math.Abs(e) > float64(n+4)*0x1p-104*size {
			t.Errorf("n = %d: error %g of Σ|a·b| = %g", n, e, size)
		}
	}
}

func BenchmarkDot(b *testing.B) {
	const n = BlockRows
	v := newVec(n)
	for i := range n {
		v.hi[i] = float64(i)
	}
	v.lo = nil
	for b.Loop() {
		dot4(v, v, v, v, v, n)
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/(4*n), "ns/product")
}
