package dd

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestQuick compares the quick functions with the full ones.
func TestQuick(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 5))
	worstExp, worstLog, worstNear := 0.0, 0.0, 0.0
	for range 200000 {
		h := (r.Float64() - 0.5) * 1370
		a := DD{h, h * (r.Float64() - 0.5) * 0x1p-53}
		w := Exp(a)
		worstExp = max(worstExp, math.Abs(ExpQuick(a).Sub(w).Hi/w.Hi))

		h = math.Exp((r.Float64() - 0.5) * 1400)
		a = DD{h, h * (r.Float64() - 0.5) * 0x1p-53}
		w = Log(a)
		worstLog = max(worstLog, math.Abs(LogQuick(a).Sub(w).Hi/max(1, math.Abs(w.Hi))))

		h = 1 + math.Exp(-30*r.Float64())*(r.Float64()-0.5)
		a = DD{h, h * (r.Float64() - 0.5) * 0x1p-53}
		if w = Log(a); w.Hi != 0 {
			worstNear = max(worstNear, math.Abs(LogQuick(a).Sub(w).Hi/w.Hi))
		}
	}
	t.Logf("exp 2^%.1f, log 2^%.1f, log near 1 2^%.1f", math.Log2(worstExp), math.Log2(worstLog), math.Log2(worstNear))
	if !(worstExp < 0x1p-63 && worstLog < 0x1p-64 && worstNear < 0x1p-63) {
		t.Errorf("worst errors: exp 2^%.1f, log 2^%.1f, log near 1 2^%.1f", math.Log2(worstExp), math.Log2(worstLog), math.Log2(worstNear))
	}
}

// TestQuotients compares the quick quotients with the full one.
func TestQuotients(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 5))
	for range 100000 {
		a := DD{r.Float64() + 0.1, (r.Float64() - 0.5) * 0x1p-54}
		h := r.Float64() * 10
		b := DD{h, h * (r.Float64() - 0.5) * 0x1p-53}
		w := b.Div(a)
		for name, v := range map[string]DD{"DivQuick": b.DivQuick(a), "Quotient": a.Quotient(b, 1/a.Hi)} {
			if e := math.Abs(v.Sub(w).Hi); e > 0x1p-99*w.Hi {
				t.Fatalf("%s(%v, %v): error 2^%.1f", name, b, a, math.Log2(e/w.Hi))
			}
		}
	}
}

func BenchmarkQuick(b *testing.B) {
	x := DD{0.7312, 1e-18}
	b.Run("Exp", func(b *testing.B) {
		for b.Loop() {
			sink = ExpQuick(x)
		}
	})
	b.Run("Log", func(b *testing.B) {
		for b.Loop() {
			sink = LogQuick(x)
		}
	})
}
