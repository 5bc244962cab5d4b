package dist

import (
	"math"
	"testing"
)

func TestSurvivals(t *testing.T) {
	worst := 0.0
	for _, fam := range studentizedFamilies {
		for _, k := range fam.ks {
			for _, nu := range []float64{1e-3, 0.5, 3, 20, 1000, 1e12, math.Inf(1)} {
				d := fam.law(k, nu)
				var x []float64
				for p := 1e-200; p < 1; p *= 1e21 {
					x = append(x, d.UpperQuantile(p), d.Quantile(p))
				}
				x = append(x, 0, math.NaN(), math.Inf(1), -1)
				got := d.(interface {
					Survivals(dst, x []float64) []float64
				}).Survivals(nil, x)
				for i, v := range x {
					want := d.Survival(v)
					if math.IsNaN(v) != math.IsNaN(got[i]) {
						t.Fatalf("%v: Survivals at %v = %v", d, v, got[i])
					}
					if math.IsNaN(v) || want < 2.3e-308 {
						continue
					}
					e := relErr(got[i], want)
					worst = math.Max(worst, e)
					if e > 1e-12 {
						t.Errorf("%v: Survivals at %v = %v, Survival = %v, error %.2g", d, v, got[i], want, e)
					}
				}
			}
		}
	}
	t.Logf("largest difference %.2g", worst)
	for _, v := range (StudentizedRange{1, 5}).Survivals(nil, []float64{1, 2, 3, 4, 5}) {
		if !math.IsNaN(v) {
			t.Errorf("Survivals of a wrong law: %v", v)
		}
	}
	dst := make([]float64, 9)
	if got := (StudentizedRange{3, 5}).Survivals(dst, []float64{1, 2, 3, 4, 5}); len(got) != 5 || &got[0] != &dst[0] {
		t.Error("dst was not used")
	}
}

// BenchmarkSurvivals is all pairs of 50 means, 1,225 tails.
func BenchmarkSurvivals(b *testing.B) {
	for _, c := range []struct {
		name string
		d    StudentizedRange
	}{{"k=5/nu=20", StudentizedRange{5, 20}}, {"k=50/nu=100", StudentizedRange{50, 100}}, {"k=50/nu=0.5", StudentizedRange{50, 0.5}}, {"k=50/nu=1e9", StudentizedRange{50, 1e9}}} {
		b.Run(c.name, func(b *testing.B) {
			x := make([]float64, 1225)
			for i := range x {
				x[i] = 0.01 + 12*float64(i)/float64(len(x))
			}
			dst := make([]float64, len(x))
			b.ReportAllocs()
			for b.Loop() {
				c.d.Survivals(dst, x)
			}
		})
	}
}
