package special

import (
	"bufio"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"
)

// normalRows reads testdata/normal.csv: x, Q(x), log Q(x), M(x), by mpmath at
// 40 digits (gen/normal.py).
func normalRows(t testing.TB) [][]float64 {
	f, err := os.Open("testdata/normal.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var rows [][]float64
	for sc := bufio.NewScanner(f); sc.Scan(); {
		if strings.HasPrefix(sc.Text(), "#") || strings.HasPrefix(sc.Text(), "x") {
			continue
		}
		var row []float64
		for _, s := range strings.Split(sc.Text(), ",") {
			v, err := strconv.ParseFloat(s, 64)
			if err != nil {
				t.Fatal(err)
			}
			row = append(row, v)
		}
		rows = append(rows, row)
	}
	return rows
}

func normalRelErr(got, want float64) float64 {
	if got == want {
		return 0
	}
	return math.Abs(got-want) / math.Abs(want)
}

func TestNormalTails(t *testing.T) {
	const ulp = 0x1p-52
	worst := [4]float64{}
	for _, r := range normalRows(t) {
		x := r[0]
		for i, c := range []struct {
			name      string
			got, want float64
			tol       float64
		}{
			{"NormalUpper", NormalUpper(x), r[1], 3 * ulp},
			{"NormalLogUpper", NormalLogUpper(x), r[2], 2 * ulp},
			{"Mills", Mills(x), r[3], 1.5 * ulp},
			{"NormalLogLower", NormalLogLower(x), math.Log1p(-r[1]), 3 * ulp},
		} {
			e := normalRelErr(c.got, c.want)
			worst[i] = math.Max(worst[i], e)
			if e > c.tol {
				t.Errorf("%s(%v) = %v, want %v, relative error %.2g", c.name, x, c.got, c.want, e)
			}
		}
		if NormalLower(-x) != NormalUpper(x) || NormalUpper(-x) != 1-NormalUpper(x) {
			t.Errorf("tails at %v do not mirror", x)
		}
		// The way back: the error of q times q/(x φ(x)), at most a few ulp.
		if x > 1e-5 {
			cond := r[3]/x + 2
			if back := NormalUpperQuantile(r[1]); normalRelErr(back, x) > 2*ulp*cond {
				t.Errorf("NormalUpperQuantile(%v) = %v, want %v", r[1], back, x)
			}
			if back := NormalLogUpperQuantile(r[2]); normalRelErr(back, x) > 2*ulp*cond*math.Max(1, -r[2]) {
				t.Errorf("NormalLogUpperQuantile(%v) = %v, want %v", r[2], back, x)
			}
		}
	}
	t.Logf("largest relative errors: upper %.2g, log upper %.2g, Mills %.2g, log lower %.2g", worst[0], worst[1], worst[2], worst[3])
}

func TestNormalLimits(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"Upper(+Inf)", NormalUpper(inf), 0},
		{"Upper(-Inf)", NormalUpper(-inf), 1},
		{"Upper(40)", NormalUpper(40), 0},
		{"LogUpper(+Inf)", NormalLogUpper(inf), -inf},
		{"LogUpper(-Inf)", NormalLogUpper(-inf), 0},
		{"LogUpper(1e5)", NormalLogUpper(1e5), -5e9 - logSqrt2Pi - math.Log(1e5)},
		{"Mills(+Inf)", Mills(inf), 0},
		{"Mills(1e200)", Mills(1e200), 1e-200},
		{"Quantile(0)", NormalUpperQuantile(0), inf},
		{"Quantile(1)", NormalUpperQuantile(1), -inf},
		{"Quantile(1/2)", NormalUpperQuantile(0.5), 0},
		{"LogQuantile(-Inf)", NormalLogUpperQuantile(-inf), inf},
		{"LogQuantile(0)", NormalLogUpperQuantile(0), -inf},
		{"Density(+Inf)", NormalDensity(inf), 0},
		{"Between(-Inf, +Inf)", NormalBetween(-inf, inf), 1},
		{"Between(0, +Inf)", NormalBetween(0, inf), 0.5},
		{"Between(3, 3)", NormalBetween(3, 3), 0},
		// Abramowitz and Stegun, table 26.1 and 26.5: Q(x) = 0.025 at 1.95996 39845.
		{"Quantile(0.025)", math.Round(NormalUpperQuantile(0.025)*1e10) / 1e10, 1.9599639845},
		// mpmath, 40 digits.
		{"Between(1, 1+2^-30)", NormalBetween(1, 1+0x1p-30), 2.2535279803580321e-10},
		{"Between(20, 20.01)", NormalBetween(20, 20.01), 5.0038115018691585e-90},
	} {
		if normalRelErr(c.got, c.want) > 1e-15 {
			t.Errorf("%s = %.17g, want %.17g", c.name, c.got, c.want)
		}
	}
	nan := math.NaN()
	for i, v := range []float64{NormalUpper(nan), NormalLogUpper(nan), Mills(nan), NormalUpperQuantile(nan), NormalUpperQuantile(1.1),
		NormalLogUpperQuantile(0.1), NormalLogUpperQuantile(nan), NormalBetween(1, 0), NormalBetween(nan, 1), NormalDensity(nan)} {
		if !math.IsNaN(v) {
			t.Errorf("case %d is %v, want NaN", i, v)
		}
	}
}

// TestNormalQuantileRoundTrip goes from the log tail to x and back, through
// all branches and their seams.
func TestNormalQuantileRoundTrip(t *testing.T) {
	for l := -1e-12; l > -1e12; l *= 1.07 {
		x := NormalLogUpperQuantile(l)
		if got := NormalLogUpper(x); normalRelErr(got, l) > 1e-14 {
			t.Errorf("log Q(%v) = %v, want %v", x, got, l)
		}
	}
	for q := 1e-300; q < 1; q *= 1.13 {
		x := NormalUpperQuantile(q)
		if got := NormalUpper(x); normalRelErr(got, q) > 4e-16*math.Max(1, x*x) {
			t.Errorf("Q(%v) = %v, want %v", x, got, q)
		}
	}
}

func BenchmarkNormal(b *testing.B) {
	var s float64
	for _, c := range []struct {
		name string
		f    func(float64) float64
		x    float64
	}{
		{"upper/x=1.6", NormalUpper, 1.6}, {"upper/x=20", NormalUpper, 20}, {"mills", Mills, 1.6},
		{"quantile/q=0.05", NormalUpperQuantile, 0.05}, {"quantile/q=0.4", NormalUpperQuantile, 0.4}, {"quantile/q=1e-200", NormalUpperQuantile, 1e-200},
		{"reference/erfc", math.Erfc, 0.1}, {"reference/exp", math.Exp, -3.3},
	} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				s += c.f(c.x)
			}
		})
	}
	_ = s
}
