package lrt

import (
	"strings"
	"testing"
)

// 12 observations, 4 parameters, 2 restrictions: F with 2 and 8 degrees of
// freedom gives the true size of the χ² test in a normal linear pair.
func TestSmallSampleWarning(t *testing.T) {
	d := normalGroups(12, 2, 0, 1, 3)
	full := mustBind(t, normalModel(2, withClosed), d, 12)
	small := mustRestrict(t, full, Equate("mean[1]", "mean[2]"), Equate("sd[1]", "sd[2]"))
	r, err := Compare(bg, small, full, nil)
	if err != nil {
		t.Fatal(err)
	}
	if text := warningText(r.Warnings, "small-sample"); !strings.Contains(text, "12 observations and 4 free") {
		t.Errorf("warnings %v", r.Warnings)
	}
	if !strings.Contains(r.String(), "warning small-sample") {
		t.Errorf("%s", r)
	}
	r, err = Compare(bg, small, full, &Settings{References: []Reference{Bootstrap{Draws: 39}}})
	if err != nil {
		t.Fatal(err)
	}
	if r.HasWarning("small-sample") || r.Recommended != Simulated {
		t.Errorf("recommended %v, warnings %v", r.Recommended, r.Warnings)
	}
	big := normalGroups(2000, 2, 0, 1, 3)
	full = mustBind(t, normalModel(2, withClosed), big, 2000)
	r, err = Compare(bg, mustRestrict(t, full, Equate("mean[1]", "mean[2]")), full, nil)
	if err != nil || r.HasWarning("small-sample") {
		t.Errorf("%v, %v", r.Warnings, err)
	}
}

// True sizes of the nominal 5 % χ² test for three groups of three and for 20
// rows with 10 parameters, all restricted to one: RSS_B/RSS_S is a beta variable
// (regularized incomplete beta function by mpmath, 15 digits).
func TestTrueSizeFigures(t *testing.T) {
	for _, c := range []struct {
		n, rank int
		want    float64
	}{{9, 3, 0.135720880829745}, {20, 10, 0.27513042651996}} {
		l := Linear{RankS: 1, RankB: c.rank, RankE0: c.rank, RankE1: c.n, M: float64(c.n), Certified: true}
		near(t, "size", l.TrueSize(0.05), c.want, 1e-12)
	}
}
