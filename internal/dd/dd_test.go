package dd

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

func toBig(a DD) *big.Float {
	x := new(big.Float).SetPrec(400).SetFloat64(a.Hi)
	return x.Add(x, new(big.Float).SetPrec(400).SetFloat64(a.Lo))
}

func relErr(got DD, want *big.Float) float64 {
	d := new(big.Float).SetPrec(400).Sub(toBig(got), want)
	if d.Sign() == 0 {
		return 0
	}
	r, _ := d.Quo(d, want).Float64()
	return math.Abs(r)
}

// TestOperations compares every operation with 400-bit arithmetic; the bounds
// are those of Joldes, Muller and Popescu (2017).
func TestOperations(t *testing.T) {
	src := rand.New(rand.NewPCG(1, 2))
	draw := func() DD {
		h := math.Ldexp(src.Float64()+0.5, src.IntN(80)-40)
		if src.IntN(2) == 0 {
			h = -h
		}
		s, e := QuickTwoSum(h, h*(src.Float64()-0.5)*0x1p-53)
		return DD{s, e}
	}
	const u2 = 0x1p-106
	for range 20000 {
		a, b := draw(), draw()
		ba, bb := toBig(a), toBig(b)
		n := func() *big.Float { return new(big.Float).SetPrec(400) }
		if w := n().Add(ba, bb); w.Sign() != 0 {
			if e := relErr(a.Add(b), w); e > 3.1*u2 {
				t.Fatalf("%v.Add(%v): error %g u²", a, b, e/u2)
			}
		}
		for _, c := range []struct {
			name  string
			got   DD
			want  *big.Float
			bound float64
		}{
			{"AddF", a.AddF(b.Hi), n().Add(ba, n().SetFloat64(b.Hi)), 2},
			{"Mul", a.Mul(b), n().Mul(ba, bb), 5},
			{"MulF", a.MulF(b.Hi), n().Mul(ba, n().SetFloat64(b.Hi)), 2},
			{"Sqr", a.Sqr(), n().Mul(ba, ba), 5},
			{"Div", a.Div(b), n().Quo(ba, bb), 10},
			{"Inv", b.Inv(), n().Quo(n().SetInt64(1), bb), 4},
			{"DivF", a.DivF(b.Hi), n().Quo(ba, n().SetFloat64(b.Hi)), 4},
			{"Sqrt", a.Abs().Sqrt(), n().Sqrt(n().Abs(ba)), 4},
		} {
			if c.want.Sign() == 0 {
				continue
			}
			if e := relErr(c.got, c.want); e > c.bound*u2 {
				t.Fatalf("%s(%v, %v): error %g u², bound %g", c.name, a, b, e/u2, c.bound)
			}
		}
	}
}
