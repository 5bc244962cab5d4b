package lrt

import (
	"errors"
	"math"
	"testing"
)

// One response: equality of covariance matrices is Bartlett's test of variances.
func TestCovariancesOfOneResponseAreVariances(t *testing.T) {
	g := normalGroups(17, 3, 2, 5, 4)
	var rows [][]float64
	for _, v := range g.y {
		rows = append(rows, []float64{v})
	}
	c, err := NewCovariances(rows, g.g)
	if err != nil {
		t.Fatal(err)
	}
	s := &Settings{References: []Reference{Bartlett{}}}
	r, err := Compare(bg, c.Common(), c.Free(), s)
	if err != nil {
		t.Fatal(err)
	}
	d, err := ResidualVariances(g.samples(false))
	full := mustSpace(t, d, err)
	want, err := Compare(bg, mustRestrict(t, full, Equate(Names("sd", 3)...)), full, s)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "−2 log λ", r.Statistic, want.Statistic, 1e-11)
	// Box multiplies by 1 − d where Bartlett divides by 1 + d.
	near(t, "corrected", r.Others[0].Statistic, r.Statistic*(2-want.Statistic/want.Others[0].Statistic), 1e-11)
	near(t, "df", r.Pair.DF, want.Pair.DF, 0)
}

// Two blocks are Wilks' test of one block's regression on the other: one
// response against one is the correlation coefficient's t test.
func TestBlocksAreCorrelation(t *testing.T) {
	rows, _ := vectorsOf(14, 2, 1, 1, 8)
	c, err := NewCovariances(rows, nil)
	if err != nil {
		t.Fatal(err)
	}
	b, err := c.Blocks([]int{0, 1})
	if err != nil {
		t.Fatal(err)
	}
	r, err := Compare(bg, b, c.Common(), nil)
	if err != nil {
		t.Fatal(err)
	}
	var mx, my, sxx, sxy, syy float64
	for _, v := range rows {
		mx, my = mx+v[0]/14, my+v[1]/14
	}
	for _, v := range rows {
		sxx, sxy, syy = sxx+(v[0]-mx)*(v[0]-mx), sxy+(v[0]-mx)*(v[1]-my), syy+(v[1]-my)*(v[1]-my)
	}
	rho2 := sxy * sxy / sxx / syy
	near(t, "F = t²", r.Exact.Statistic, 12*rho2/(1-rho2), 1e-10)
	near(t, "−2 log λ", r.Statistic, -13*math.Log1p(-rho2), 1e-11)
	if r.Exact.Kind != Exact || r.Pair.DF != 1 {
		t.Errorf("%+v, df %g", r.Exact, r.Pair.DF)
	}
}

// Exact laws and published multipliers against simulation of the pivotal λ.
func TestCovarianceReferences(t *testing.T) {
	rows, group := vectorsOf(24, 3, 2, 1, 5)
	c, err := NewCovariances(rows, group)
	if err != nil {
		t.Fatal(err)
	}
	two, err := c.Blocks([]int{0, 0, 1})
	if err != nil {
		t.Fatal(err)
	}
	three, err := c.Blocks([]int{0, 1, 2})
	if err != nil {
		t.Fatal(err)
	}
	pair2, _ := vectorsOf(9, 2, 1, 1, 15)
	for i := range pair2 { // no common part: the null is true, so that p is not tiny
		pair2[i][1] -= 0.9 * pair2[i][0]
	}
	c2, err := NewCovariances(pair2, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, x := range []struct {
		name         string
		small, large Space
		df           float64
	}{
		{"Box", c.Common(), c.Free(), 6},
		{"two blocks", two, c.Common(), 2},
		{"three blocks", three, c.Common(), 3},
		{"finer blocks", three, two, 1},
		{"Mauchly", c.Spherical(), c.Common(), 5},
		{"Mauchly of two", c2.Spherical(), c2.Common(), 2},
	} {
		t.Run(x.name, func(t *testing.T) {
			r, err := Compare(bg, x.small, x.large, &Settings{Seed: 3, References: []Reference{Bootstrap{Draws: 999}, Bartlett{Draws: 300}}})
			if err != nil {
				t.Fatal(err)
			}
			near(t, "df", r.Pair.DF, x.df, 0)
			sim := r.Others[0].Simulation
			for _, q := range []Test{r.Exact, r.Others[1]} {
				if q.Kind != None && (q.P < sim.Lower-0.02 || q.P > sim.Upper+0.02) {
					t.Errorf("%s: p = %g, simulated %g to %g", q.Name, q.P, sim.Lower, sim.Upper)
				}
			}
			if r.HasWarning("nesting-not-checked") {
				t.Errorf("%v", r.Warnings)
			}
			if _, err := Compare(bg, x.large, x.small, nil); !errors.Is(err, ErrNotNested) {
				t.Errorf("swapped: %v", err)
			}
		})
	}
}

func TestCovariancesBadData(t *testing.T) {
	rows, group := vectorsOf(8, 3, 2, 1, 5)
	group[0] = 1 // group 0 keeps three rows
	c, err := NewCovariances(rows, group)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Compare(bg, c.Common(), c.Free(), nil); !errors.Is(err, ErrNoErrorDF) {
		t.Errorf("%v", err)
	}
	for _, b := range [][]int{{0}, {0, 1, -1}, {0, 2, 2}, {0, 1, 7}} {
		if _, err := c.Blocks(b); !errors.Is(err, ErrInvalid) {
			t.Errorf("%v: %v", b, err)
		}
	}
	if s, err := c.Blocks([]int{0, 0, 0}); err != nil || s.(*covarianceSpace).kind != 1 {
		t.Errorf("one block: %v, %v", s, err)
	}
}
