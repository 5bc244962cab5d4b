package dist_test

import (
	"encoding/json"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"testing"

	"subsume.example/dist"
	"subsume.example/dist/lawtest"
)

var inf = math.Inf(1)

// centralLaws spans the domain.
var centralLaws = []lawtest.Law{
	dist.ChiSquared{K: 0.05}, dist.ChiSquared{K: 0.5}, dist.ChiSquared{K: 1}, dist.ChiSquared{K: 2}, dist.ChiSquared{K: 4.7},
	dist.ChiSquared{K: 5}, dist.ChiSquared{K: 33}, dist.ChiSquared{K: 1e3}, dist.ChiSquared{K: 1e6}, dist.ChiSquared{K: 1e12},
	dist.F{D1: 0.3, D2: 0.7}, dist.F{D1: 1, D2: 1}, dist.F{D1: 3, D2: 20}, dist.F{D1: 3.3, D2: 17.6}, dist.F{D1: 2, D2: 9},
	dist.F{D1: 40, D2: 200}, dist.F{D1: 1e4, D2: 3}, dist.F{D1: 5, D2: 1e9}, dist.F{D1: 7, D2: inf}, dist.F{D1: 1e11, D2: 1e12},
	dist.Beta{A: 0.3, B: 0.2}, dist.Beta{A: 1, B: 1}, dist.Beta{A: 8.5, B: 2}, dist.Beta{A: 3, B: 700.5}, dist.Beta{A: 1e7, B: 4e6},
	dist.Gamma{Shape: 0.4, Scale: 3}, dist.Gamma{Shape: 1, Scale: 1e-200}, dist.Gamma{Shape: 12.3, Scale: 0.7}, dist.Gamma{Shape: 1e9, Scale: 1e5},
	dist.StudentT{Nu: 0.5}, dist.StudentT{Nu: 1}, dist.StudentT{Nu: 3.7}, dist.StudentT{Nu: 12}, dist.StudentT{Nu: 1e6}, dist.StudentT{Nu: inf},
}

// TestCentralLaws runs the generic checks.
func TestCentralLaws(t *testing.T) {
	for _, law := range centralLaws {
		var bad []lawtest.Law
		for _, v := range []float64{0, -1, math.NaN(), math.Inf(-1)} {
			switch law.(type) {
			case dist.ChiSquared:
				bad = append(bad, dist.ChiSquared{K: v}, dist.ChiSquared{K: inf})
			case dist.F:
				bad = append(bad, dist.F{D1: v, D2: 3}, dist.F{D1: 3, D2: v}, dist.F{D1: inf, D2: 3})
			case dist.StudentT:
				bad = append(bad, dist.StudentT{Nu: v})
			case dist.Beta:
				bad = append(bad, dist.Beta{A: v, B: 3}, dist.Beta{A: 3, B: v}, dist.Beta{A: inf, B: 1})
			case dist.Gamma:
				bad = append(bad, dist.Gamma{Shape: v, Scale: 3}, dist.Gamma{Shape: 3, Scale: v})
			}
		}
		t.Run(law.String(), func(t *testing.T) {
			lawtest.Check(t, law, &lawtest.Settings{Tolerance: 2e-15, Invalid: bad, Draws: 5000})
		})
	}
}

// TestParamError names law, parameter and value.
func TestParamError(t *testing.T) {
	for _, c := range []struct {
		law   dist.Law
		want  dist.ParamError
		valid bool
	}{
		{dist.F{D1: -1, D2: 3}, dist.ParamError{Law: "F", Param: "D1", Value: -1}, false},
		{dist.F{D1: 1, D2: 0}, dist.ParamError{Law: "F", Param: "D2", Value: 0}, false},
		{dist.ChiSquared{K: inf}, dist.ParamError{Law: "ChiSquared", Param: "K", Value: inf}, false},
		{dist.StudentT{}, dist.ParamError{Law: "StudentT", Param: "Nu", Value: 0}, false},
		{dist.StudentT{Nu: inf}, dist.ParamError{}, true},
		{dist.F{D1: 1e-3, D2: inf}, dist.ParamError{}, true},
	} {
		err := c.law.Validate()
		if c.valid {
			if err != nil {
				t.Errorf("%v: %v", c.law, err)
			}
			continue
		}
		var p *dist.ParamError
		if !errors.Is(err, dist.ErrParam) || !errors.As(err, &p) || p.Law != c.want.Law || p.Param != c.want.Param || p.Value != c.want.Value {
			t.Errorf("%v: %v, want %+v", c.law, err, c.want)
		}
	}
}

// TestPublishedF: upper percentage points of Merrington and Thompson (1943), Biometrika 33, 73-88, and
// the values recomputed to 17 digits beside them (testdata/table-f-a.json).
func TestPublishedF(t *testing.T) {
	raw, err := os.ReadFile("testdata/table-f-a.json")
	if err != nil {
		t.Fatal(err)
	}
	var table struct {
		Columns struct {
			DF1   []float64 `json:"df1"`
			DF2   []float64 `json:"df2"`
			Alpha []string  `json:"alpha"`
		} `json:"columns"`
		Expected struct {
			F struct{ Published, Exact []string }
		} `json:"expected"`
	}
	if err := json.Unmarshal(raw, &table); err != nil {
		t.Fatal(err)
	}
	if len(table.Columns.DF1) != 12 {
		t.Fatalf("%d rows, want 12", len(table.Columns.DF1))
	}
	for i, d1 := range table.Columns.DF1 {
		law := dist.F{D1: d1, D2: table.Columns.DF2[i]}
		alpha, _ := strconv.ParseFloat(table.Columns.Alpha[i], 64)
		exact, _ := strconv.ParseFloat(table.Expected.F.Exact[i], 64)
		x := law.UpperQuantile(alpha)
		if math.Abs(x/exact-1) > 4e-16 {
			t.Errorf("%v.UpperQuantile(%v) = %v, want %v", law, alpha, x, exact)
		}
		text := table.Expected.F.Published[i]
		digits := 0
		for j := range text {
			if text[j] == '.' {
				digits = len(text) - j - 1
			}
		}
		if s := strconv.FormatFloat(x, 'f', digits, 64); s != text {
			t.Errorf("%v.UpperQuantile(%v) prints as %s, the table has %s", law, alpha, s, text)
		}
		if p := law.Survival(exact); math.Abs(p/alpha-1) > 1e-14 {
			t.Errorf("%v.Survival(%v) = %v, want %v", law, exact, p, alpha)
		}
	}
}

// TestPublishedChiSquared and t: Pearson and Hartley (1966), Biometrika Tables for Statisticians I, tables
// 8 and 12; the values are typed from memory.
func TestPublishedPercentagePoints(t *testing.T) {
	for _, c := range []struct {
		law    dist.Law
		q      float64
		digits int
		want   string
	}{
		{dist.ChiSquared{K: 1}, 0.05, 5, "3.84146"},
		{dist.ChiSquared{K: 2}, 0.05, 5, "5.99146"},
		{dist.ChiSquared{K: 3}, 0.05, 5, "7.81473"},
		{dist.ChiSquared{K: 5}, 0.05, 4, "11.0705"},
		{dist.ChiSquared{K: 10}, 0.05, 4, "18.3070"},
		{dist.ChiSquared{K: 10}, 0.01, 4, "23.2093"},
		{dist.ChiSquared{K: 30}, 0.05, 4, "43.7730"},
		{dist.ChiSquared{K: 100}, 0.05, 3, "124.342"},
		{dist.ChiSquared{K: 1}, 0.95, 8, "0.00393214"},
		{dist.ChiSquared{K: 10}, 0.95, 5, "3.94030"},
		{dist.StudentT{Nu: 1}, 0.025, 3, "12.706"},
		{dist.StudentT{Nu: 4}, 0.025, 3, "2.776"},
		{dist.StudentT{Nu: 10}, 0.025, 3, "2.228"},
		{dist.StudentT{Nu: 30}, 0.025, 3, "2.042"},
		{dist.StudentT{Nu: 20}, 0.005, 3, "2.845"},
		{dist.StudentT{Nu: inf}, 0.025, 6, "1.959964"},
	} {
		if s := strconv.FormatFloat(c.law.UpperQuantile(c.q), 'f', c.digits, 64); s != c.want {
			t.Errorf("%v.UpperQuantile(%v) = %s, the table has %s", c.law, c.q, s, c.want)
		}
	}
}

// TestKnownTrouble holds the traps that other implementations fell into; the values are mpmath's
// with 40 digits.
func TestKnownTrouble(t *testing.T) {
	for _, c := range []struct {
		call      string
		got, want float64
	}{
		{"F(3,20).Survival(100)", dist.F{D1: 3, D2: 20}.Survival(100), 3.2682418072616422e-12},
		{"F(3,20).Survival(1e4)", dist.F{D1: 3, D2: 20}.Survival(1e4), 6.3720540858416611e-32},
		{"F(3,20).Survival(1e8)", dist.F{D1: 3, D2: 20}.Survival(1e8), 6.4166010694061963e-72},
		{"F(2,1e8).Survival(3)", dist.F{D1: 2, D2: 1e8}.Survival(3), math.Exp(-5e7 * math.Log1p(6e-8))},
		{"F(3,+Inf).Survival(2)", dist.F{D1: 3, D2: inf}.Survival(2), 0.11161022509471256},
		{"F(3,1e300).Survival(2)", dist.F{D1: 3, D2: 1e300}.Survival(2), 0.11161022509471256},
		{"F(1e300,4).CDF(2)", dist.F{D1: 1e300, D2: 4}.CDF(2), 2 / math.E},
		{"F(2,2).Survival(1)", dist.F{D1: 2, D2: 2}.Survival(1), 0.5},
		{"F(2e8,2e8).CDF(1)", dist.F{D1: 2e8, D2: 2e8}.CDF(1), 0.5},
		{"F(1e12,1e12).CDF(1)", dist.F{D1: 1e12, D2: 1e12}.CDF(1), 0.5},
		{"ChiSquared(2).LogSurvival(2e5)", dist.ChiSquared{K: 2}.LogSurvival(2e5), -1e5},
		{"ChiSquared(2).LogCDF(2e-300)", dist.ChiSquared{K: 2}.LogCDF(2e-300), -690.7755278982137},
		{"StudentT(1).Survival(1)", dist.StudentT{Nu: 1}.Survival(1), 0.25},
		{"StudentT(2).CDF(0)", dist.StudentT{Nu: 2}.CDF(0), 0.5},
		{"StudentT(+Inf).Survival(20)", dist.StudentT{Nu: inf}.Survival(20), 2.7536241186062337e-89},
	} {
		if !(math.Abs(c.got/c.want-1) <= 2e-15) {
			t.Errorf("%s = %v, want %v", c.call, c.got, c.want)
		}
	}
}

// TestNoAllocation: neither tails nor densities allocate.
func TestNoAllocation(t *testing.T) {
	f, c, s := dist.F{D1: 3.3, D2: 17.6}, dist.ChiSquared{K: 1e7}, dist.StudentT{Nu: 2.2}
	n := testing.AllocsPerRun(100, func() {
		sink = f.CDF(1.1) + f.Survival(3) + f.LogCDF(0.2) + f.LogSurvival(30) + f.Prob(1) + f.LogProb(1) + f.Quantile(0.2)
		sink += c.CDF(1e7) + c.Survival(1e7) + c.LogCDF(1e7) + c.LogSurvival(1e7) + c.Prob(1e7) + c.UpperQuantile(0.01)
		sink += s.CDF(1.1) + s.Survival(3) + s.LogCDF(0.2) + s.LogSurvival(30) + s.Prob(1) + s.Quantile(0.2)
	})
	if n != 0 {
		t.Errorf("%v allocations", n)
	}
}

// TestNeighbours walks along neighbouring floats around every switch of method: tails must not move
// against x by more than the stated error bound.
func TestNeighbours(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 5))
	for range 3000 {
		law, x := sweepPoint(r)
		if !(math.Abs(x) < 1e300) {
			continue
		}
		lo, up := law.CDF(x), law.Survival(x)
		y := x
		for range 4 {
			y = math.Nextafter(y, inf)
			l, u := law.CDF(y), law.Survival(y)
			if l < lo*(1-3e-15) || u > up*(1+3e-15) {
				t.Fatalf("%v: CDF %v at %v, %v at %v; Survival %v, %v", law, lo, x, l, y, up, u)
			}
			lo, up = l, u
		}
	}
}

// FuzzCentral asks the same of whatever the fuzzer finds.
func FuzzCentral(f *testing.F) {
	f.Add(3.0, 20.0, 1.0)
	f.Add(1e-3, 1e12, 5e-324)
	f.Add(1e12, 1e-3, math.MaxFloat64)
	f.Add(0.5, inf, 30.0)
	f.Fuzz(func(t *testing.T, a, b, x float64) {
		in := func(v float64) bool { return v >= 1e-3 && v <= 1e12 }
		laws := []fullLaw{dist.StudentT{Nu: b}, dist.F{D1: a, D2: b}, dist.ChiSquared{K: a}}
		for _, law := range laws {
			if law.Validate() != nil {
				if v := law.CDF(x); !math.IsNaN(v) {
					t.Errorf("%v: CDF(%v) = %v, want NaN", law, x, v)
				}
				continue
			}
			// Outside the stated domain there must only be no panic and no hang.
			law.Quantile(0.3)
			law.UpperQuantile(1e-30)
			law.LogSurvival(x)
			if in(a) && (in(b) || math.IsInf(b, 1)) && !math.IsNaN(x) && !(x < 0 && law != laws[0]) && !math.IsInf(x, 0) && x != 0 {
				if msg := checkPoint(law, x, true); msg != "" {
					t.Errorf("%v at %v: %s", law, x, msg)
				}
			}
		}
	})
}
