package dist_test

import (
	"encoding/json"
	"math"
	"os"
	"strconv"
	"testing"

	"subsume.example/dist"
)

// published is a table of values printed in the literature, typed from memory, with the
// values recomputed to 17 digits beside them; the files name paper and authors.
type published struct {
	Columns  map[string]json.RawMessage `json:"columns"`
	Expected map[string]struct {
		Published []*string `json:"published"`
		Exact     []string  `json:"exact"`
	} `json:"expected"`
	Source string `json:"source"`
}

func loadPublished(t *testing.T, file string) published {
	t.Helper()
	raw, err := os.ReadFile("testdata/" + file)
	if err != nil {
		t.Fatal(err)
	}
	var p published
	if err := json.Unmarshal(raw, &p); err != nil {
		t.Fatal(err)
	}
	return p
}

// column returns numbers, given as numbers or as text.
func (p published) column(t *testing.T, name string) []float64 {
	t.Helper()
	var nums []float64
	if json.Unmarshal(p.Columns[name], &nums) == nil {
		return nums
	}
	nums = nil
	var texts []string
	if err := json.Unmarshal(p.Columns[name], &texts); err != nil {
		t.Fatal(err)
	}
	for _, s := range texts {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		nums = append(nums, v)
	}
	return nums
}

// check compares with the exact value to tol and, where the table prints one, with the
// printed value to the unit of its last digit.
func (p published) check(t *testing.T, name string, i int, got, tol float64) {
	t.Helper()
	e := p.Expected[name]
	want, err := strconv.ParseFloat(e.Exact[i], 64)
	if err != nil {
		t.Fatal(err)
	}
	if !(math.Abs(got/want-1) <= tol) {
		t.Errorf("%s, line %d: %s = %v, want %v", p.Source, i+1, name, got, want)
	}
	if i < len(e.Published) && e.Published[i] != nil {
		s := *e.Published[i]
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		digits := 0
		for j := range s {
			if s[j] == '.' {
				digits = len(s) - j - 1
			}
		}
		if !(math.Abs(got-v) <= math.Pow(10, -float64(digits))) {
			t.Errorf("%s, line %d: %s = %v, printed %s", p.Source, i+1, name, got, s)
		}
	}
}

// Patnaik (1949), Biometrika 36, and Fix (1949): noncentral chi-squared.
func TestNoncentralChiSquaredPatnaik(t *testing.T) {
	p := loadPublished(t, "ncx2-patnaik-a.json")
	k, l, x := p.column(t, "df"), p.column(t, "lambda"), p.column(t, "x")
	for i := range k {
		p.check(t, "lower", i, dist.NoncentralChiSquared{K: k[i], Lambda: l[i]}.CDF(x[i]), 5e-16)
	}
}

// Patnaik (1949), Biometrika 36: noncentral F, and the power of the 5 % test.
func TestNoncentralFPatnaik(t *testing.T) {
	p := loadPublished(t, "ncf-patnaik-a.json")
	d1, d2, l, x := p.column(t, "df1"), p.column(t, "df2"), p.column(t, "lambda"), p.column(t, "x")
	for i := range d1 {
		f := dist.NoncentralF{D1: d1[i], D2: d2[i], Lambda: l[i]}
		p.check(t, "lower", i, f.CDF(x[i]), 5e-16)
		crit := dist.F{D1: d1[i], D2: d2[i]}.UpperQuantile(0.05)
		p.check(t, "power_exact_5pct_test", i, f.Survival(crit), 2e-15)
	}
}

// Haynam, Govindarajulu and Leone (1970): noncentrality for given power at level 0.05.
func TestNoncentralityHaynam(t *testing.T) {
	p := loadPublished(t, "power-lambda-a.json")
	k, power := p.column(t, "df"), p.column(t, "power")
	for i := range k {
		crit := dist.ChiSquared{K: k[i]}.UpperQuantile(0.05)
		l, err := dist.NoncentralityChiSquared(k[i], crit, power[i])
		if err != nil {
			t.Fatal(err)
		}
		p.check(t, "lambda", i, l, 2e-15)
	}
}
