package dd

import (
	"encoding/csv"
	"math"
	"math/big"
	"os"
	"strconv"
	"testing"
)

// TestElementary compares with values of 50 digits made by mpmath
// (gen/elementary.py).
func TestElementary(t *testing.T) {
	f, err := os.Open("testdata/elementary.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	funcs := map[string]func(DD) DD{"exp": Exp, "expm1": Expm1, "log": Log, "log1p": Log1p, "log1pmx": Log1pmx}
	worst := map[string]float64{}
	for _, row := range rows[1:] {
		hi, _ := strconv.ParseFloat(row[1], 64)
		lo, _ := strconv.ParseFloat(row[2], 64)
		want, _, err := big.ParseFloat(row[3], 10, 400, big.ToNearestEven)
		if err != nil {
			t.Fatal(err)
		}
		got := funcs[row[0]](DD{hi, lo})
		e := relErr(got, want)
		worst[row[0]] = max(worst[row[0]], e)
		if !(e < 0x1p-95) {
			t.Errorf("%s(%v, %v): error 2^%.1f", row[0], hi, lo, math.Log2(e))
		}
	}
	for k, v := range worst {
		t.Logf("%-8s worst error 2^%.1f", k, math.Log2(v))
	}
}

// TestElementarySpecial holds the ends of the domains.
func TestElementarySpecial(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"Exp(800)", Exp(From(800)).Hi, inf},
		{"Exp(-800)", Exp(From(-800)).Hi, 0},
		{"Exp(-Inf)", Exp(From(-inf)).Hi, 0},
		{"Exp(+Inf)", Exp(From(inf)).Hi, inf},
		{"Log(0)", Log(From(0)).Hi, -inf},
		{"Log(Inf)", Log(From(inf)).Hi, inf},
		{"Log1p(-1)", Log1p(From(-1)).Hi, -inf},
		{"Log(1)", Log(From(1)).Hi, 0},
		{"Pow(0,2)", Pow(From(0), From(2)).Hi, 0},
		{"Pow(0,-2)", Pow(From(0), From(-2)).Hi, inf},
		{"Pow(7,0)", Pow(From(7), From(0)).Hi, 1},
		{"Log(5e-324)", Log(From(5e-324)).Hi, -1074 * math.Ln2},
		{"Log(max)", Log(From(math.MaxFloat64)).Hi, math.Log(math.MaxFloat64)},
	} {
		if c.got != c.want {
			t.Errorf("%s = %v, want %v", c.name, c.got, c.want)
		}
	}
	for name, v := range map[string]float64{"Log(-1)": Log(From(-1)).Hi, "Exp(NaN)": Exp(From(math.NaN())).Hi, "Log1p(-2)": Log1p(From(-2)).Hi} {
		if !math.IsNaN(v) {
			t.Errorf("%s = %v, want NaN", name, v)
		}
	}
	if m, k := ExpScaled(From(-1e5)); k != -144270 || math.Abs(math.Log(m.Hi)+float64(k)*math.Ln2+1e5) > 1e-10 {
		t.Errorf("ExpScaled(-1e5) = %v, %d", m, k)
	}
}

var sink DD

func BenchmarkElementary(b *testing.B) {
	x := DD{0.7312, 1e-18}
	for _, c := range []struct {
		name string
		f    func(DD) DD
	}{{"Exp", Exp}, {"Log", Log}, {"Log1p", Log1p}, {"Log1pmx", Log1pmx}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				sink = c.f(x)
			}
		})
	}
}
