package dist

import (
	"bufio"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"
)

// TestStudentizedFarRows holds rows by mpmath at 24 digits, each by two methods
// that agree to 1e-17 (testdata/gen/studentized.py), where the larger tables have none: up to
// 1000 groups and 10000 values, degrees of freedom from 1e-3 to 1e12, and Dunnett's law. A row
// read backwards is a reference for the quantile: x at the probability p.
func TestStudentizedFarRows(t *testing.T) {
	f, err := os.Open("testdata/studentized.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	n, worst, worstX := 0, 0.0, 0.0
	for sc := bufio.NewScanner(f); sc.Scan(); {
		p := strings.Split(sc.Text(), ",")
		if len(p) != 7 || p[0] == "law" || strings.HasPrefix(p[0], "#") {
			continue
		}
		var v [3]float64 // df, x, probability
		for i, s := range []string{p[2], p[3], p[5]} {
			if v[i], err = strconv.ParseFloat(s, 64); err != nil {
				t.Fatal(err)
			}
		}
		var d fullLaw
		switch p[0] {
		case "dunnett":
			law := Dunnett{nil, v[0], true}
			for _, s := range strings.Fields(p[1]) {
				l, err := strconv.ParseFloat(s, 64)
				if err != nil {
					t.Fatal(err)
				}
				law.Lambda = append(law.Lambda, l)
			}
			d = law
		default:
			k, err := strconv.Atoi(p[1])
			if err != nil {
				t.Fatal(err)
			}
			d = StudentizedRange{k, v[0]}
			if p[0] == "smm" {
				d = MaximumModulus{k, v[0]}
			}
		}
		tail, inverse := d.CDF, d.Quantile
		if p[4] == "upper" {
			tail, inverse = d.Survival, d.UpperQuantile
		}
		n++
		e := relErr(tail(v[1]), v[2])
		worst = math.Max(worst, e)
		if e > 1e-13 {
			t.Errorf("%v: %s tail at %v = %v, want %v, error %.2g", d, p[4], v[1], tail(v[1]), v[2], e)
		}
		// p is rounded to float64: x moves by tail/(x density) ulp.
		cond := math.Max(1, v[2]/(v[1]*d.Prob(v[1])))
		e = relErr(inverse(v[2]), v[1])
		worstX = math.Max(worstX, e/cond)
		if e > 2e-14*cond {
			t.Errorf("%v: quantile of the %s tail %v = %v, want %v, error %.2g", d, p[4], v[2], inverse(v[2]), v[1], e)
		}
	}
	if n < 25 {
		t.Errorf("%d rows", n)
	}
	t.Logf("%d rows: tails within %.2g, quantiles within %.2g of x or of their conditioning", n, worst, worstX)
}
