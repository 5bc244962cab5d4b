package anova_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/internal/published"
	"subsume.example/lrt"
)

// TestPublishedSizes: Cohen (1992), Table 2; Bratcher, Moran and Zimmer (1970).
func TestPublishedSizes(t *testing.T) {
	ctx := context.Background()
	for _, id := range []string{"samplesize-cohen-a", "samplesize-range-a", "samplesize-range-b"} {
		s, err := published.Load(id)
		if err != nil {
			t.Fatal(err)
		}
		number := func(raw []byte) float64 {
			x, err := strconv.ParseFloat(strings.Trim(string(raw), `"`), 64)
			if err != nil {
				t.Fatal(err)
			}
			return x
		}
		alpha, power := number(s.Alpha), number(s.TargetPower)
		for i, k := range s.Numbers("groups") {
			effect := s.Numbers("effect")[i]
			means := make([]float64, int(k))
			half := effect / 2 // two extreme groups, the rest in the middle
			if id == "samplesize-cohen-a" {
				half = effect * math.Sqrt(k/2) // so that the SD of the means is effect
			}
			means[0], means[len(means)-1] = -half, half
			d := anova.OneWayDesign(means, 1, 1)
			size, err := d.SampleSize(ctx, "group", alpha, power, nil)
			if err != nil {
				t.Fatal(err)
			}
			against(t, s, "n_per_group", i, float64(size.N[0]), 0)
			against(t, s, "power_at_n", i, size.Power, 1e-9)
			for j := range d.Cells {
				d.Cells[j].Units = size.N[0]
			}
			p, err := d.Power(ctx, alpha)
			if err != nil {
				t.Fatal(err)
			}
			r, _ := p.Row("group")
			against(t, s, "power_at_n", i, r.Power, 1e-9)
			// The effect that is found with just that power is the planned one.
			x, err := d.Detectable(ctx, "group", alpha, r.Power)
			if err != nil {
				t.Fatal(err)
			}
			if math.Abs(x.Scale-1) > 1e-9 || math.Abs(x.Difference-2*half) > 1e-9*half {
				t.Errorf("%s %d: detectable %+v, planned range %g", id, i, x, 2*half)
			}
		}
	}
}

func crossedDesign(t *testing.T, units int) anova.Design {
	t.Helper()
	d, err := anova.CrossedDesign([]string{"press", "resin"}, [][]string{{"north", "south"}, {"amber", "birch", "cedar"}},
		[]float64{10, 11, 12, 11, 12.5, 13}, units, 1.5)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// TestBalancedNoncentrality: with n units in each cell the noncentralities are the textbook
// sums n·b·Σα²/σ² and so on (common practice, no source).
func TestBalancedNoncentrality(t *testing.T) {
	ctx := context.Background()
	const n = 4.0
	mu := [2][3]float64{{10, 11, 12}, {11, 12.5, 13}}
	grand := 0.0
	var row [2]float64
	var col [3]float64
	for i := range 2 {
		for j := range 3 {
			grand += mu[i][j] / 6
			row[i] += mu[i][j] / 3
			col[j] += mu[i][j] / 2
		}
	}
	var a, b, ab float64
	for i := range 2 {
		a += 3 * n * (row[i] - grand) * (row[i] - grand)
	}
	for j := range 3 {
		b += 2 * n * (col[j] - grand) * (col[j] - grand)
	}
	for i := range 2 {
		for j := range 3 {
			x := mu[i][j] - row[i] - col[j] + grand
			ab += n * x * x
		}
	}
	for _, dec := range []anova.Decomposition{anova.Sequential, anova.Hierarchical, anova.Partial} {
		d := crossedDesign(t, n)
		d.Options = &anova.Options{Decomposition: dec}
		p, err := d.Power(ctx, 0.05)
		if err != nil {
			t.Fatal(err)
		}
		for i, want := range []float64{a, b, ab} {
			r := p.Rows()[i]
			want /= 1.5 * 1.5
			if math.Abs(r.Plan.Noncentrality-want) > 1e-12*want || !r.Plan.Exact || r.D2 != 18 {
				t.Errorf("%v, %s: λ = %.15g, want %.15g; error df %g", dec, r.Name, r.Plan.Noncentrality, want, r.D2)
			}
		}
		x, err := d.Detectable(ctx, "press", 0.05, 0.8)
		if err != nil {
			t.Fatal(err)
		}
		if want := x.Scale * math.Abs(row[1]-row[0]); dec != anova.Partial && math.Abs(x.Difference-want) > 1e-12*want {
			t.Errorf("%v: detectable difference %g, want %g", dec, x.Difference, want)
		}
	}
}

// TestPlanAgainstData: simulated data of the planned design reject at the planned rate.
func TestPlanAgainstData(t *testing.T) {
	if os.Getenv("SUBSUME_LONG") == "" {
		t.Skip("SUBSUME_LONG=1 runs it")
	}
	ctx := context.Background()
	d := crossedDesign(t, 3)
	d.Cells[0].Units, d.Cells[4].Units = 5, 2
	p, err := d.Power(ctx, 0.05)
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(4, 4))
	hits := make([]float64, 3)
	const draws = 3000
	for range draws {
		var a, b []string
		var y []float64
		for _, c := range d.Cells {
			for range c.Units {
				a, b, y = append(a, c.Levels[0]), append(b, c.Levels[1]), append(y, c.Mean+1.5*r.NormFloat64())
			}
		}
		data, err := glm.NewData(glm.Labels("press", a), glm.Labels("resin", b), glm.Numbers("y", y))
		if err != nil {
			t.Fatal(err)
		}
		cs, err := anova.Crossed(ctx, data, "y", []string{"press", "resin"}, nil)
		for i, row := range tabulate(t, cs, err).Rows() {
			if row.Test().P <= 0.05 {
				hits[i]++
			}
		}
	}
	for i, row := range p.Rows() {
		// A sequential row above an interaction sees other effects only through its
		// own projection, so that its law is noncentral F here too.
		if rate := hits[i] / draws; math.Abs(rate-row.Power) > 0.03 {
			t.Errorf("%s: %.3f rejected, planned %.3f", row.Name, rate, row.Power)
		}
	}
}

func TestUnequalAllocation(t *testing.T) {
	ctx := context.Background()
	d := anova.OneWayDesign([]float64{0, 1, 1}, 1, 1)
	d.Cells[0].Units = 2
	d.Cells[0].Cost, d.Cells[1].Cost, d.Cells[2].Cost = 1, 5, 5
	tied, err := d.SampleSize(ctx, "group", 0.05, 0.9, nil)
	if err != nil {
		t.Fatal(err)
	}
	if tied.N[0] != 2*tied.N[1] || tied.N[1] != tied.N[2] {
		t.Errorf("allocation 2:1:1 gave %v", tied.N)
	}
	free, err := d.SampleSize(ctx, "group", 0.05, 0.9, &anova.SizeOptions{Free: true, Loss: 0.1})
	if err != nil {
		t.Fatal(err)
	}
	if free.Cost > tied.Cost || free.Power < 0.9 {
		t.Errorf("free allocation costs %g (power %g), tied %g", free.Cost, free.Power, tied.Cost)
	}
	// Groups 2 and 3 have one mean and one cost: nothing tells them apart.
	if d := free.N[1] - free.N[2]; d < -1 || d > 1 {
		t.Errorf("free allocation %v", free.N)
	}
	if s, err := d.SampleSize(ctx, "group", 0.05, 0.9, &anova.SizeOptions{Free: true, Least: 11}); err != nil || slices.Min(s.N) < 11 {
		t.Errorf("at least 11 in each: %v, %v", s.N, err)
	}
	for i, n := range free.N {
		if s := free.Start[i]; float64(s)*0.9 < float64(n)-1e-6 || float64(s-1)*0.9 >= float64(n) {
			t.Errorf("cell %d: start with %d to keep %d after a loss of 10 %%", i, s, n)
		}
	}
	for _, s := range []anova.Size{tied, free} {
		for _, c := range s.Cheaper {
			if c.Power >= 0.9 || c.Cost >= s.Cost {
				t.Errorf("neighbour %+v of %v", c, s.N)
			}
		}
		if len(s.Cheaper) == 0 {
			t.Error("no cheaper neighbour was tried")
		}
	}
	if s := free.String(); !strings.Contains(s, "to start with") || !strings.Contains(s, "cost") {
		t.Errorf("report:\n%s", s)
	}
}

func TestPlanErrors(t *testing.T) {
	ctx := context.Background()
	good := anova.OneWayDesign([]float64{0, 1}, 3, 1)
	change := func(f func(d *anova.Design)) anova.Design {
		d := good
		d.Cells = slices.Clone(good.Cells)
		f(&d)
		return d
	}
	power := func(d anova.Design, alpha float64) error { _, err := d.Power(ctx, alpha); return err }
	size := func(d anova.Design, row string, a, p float64, o *anova.SizeOptions) error {
		_, err := d.SampleSize(ctx, row, a, p, o)
		return err
	}
	detect := func(d anova.Design, row string) error { _, err := d.Detectable(ctx, row, 0.05, 0.8); return err }
	none := anova.OneWayDesign([]float64{3, 3, 3}, 3, 1)
	_, crossed := anova.CrossedDesign([]string{"a"}, [][]string{{"x", "y"}}, []float64{1}, 2, 1)
	for _, c := range []struct {
		name string
		err  error
		want error
	}{
		{"no cells", power(anova.Design{Factors: []string{"a"}, SD: 1}, 0.05), anova.ErrDesign},
		{"SD 0", power(change(func(d *anova.Design) { d.SD = 0 }), 0.05), anova.ErrDesign},
		{"SD NaN", power(change(func(d *anova.Design) { d.SD = math.NaN() }), 0.05), anova.ErrDesign},
		{"alpha", power(good, 1), anova.ErrDesign},
		{"mean", power(change(func(d *anova.Design) { d.Cells[0].Mean = math.Inf(1) }), 0.05), anova.ErrDesign},
		{"units", power(change(func(d *anova.Design) { d.Cells[0].Units = -1 }), 0.05), anova.ErrDesign},
		{"cost", power(change(func(d *anova.Design) { d.Cells[0].Cost = -1 }), 0.05), anova.ErrDesign},
		{"twice", power(change(func(d *anova.Design) { d.Cells[0].Levels = d.Cells[1].Levels }), 0.05), anova.ErrDesign},
		{"levels", power(change(func(d *anova.Design) { d.Cells[0].Levels = nil }), 0.05), anova.ErrDesign},
		{"covariates", power(change(func(d *anova.Design) { d.Options = &anova.Options{Covariates: []string{"x"}} }), 0.05), anova.ErrDesign},
		{"no such row", size(good, "nosuch", 0.05, 0.8, nil), anova.ErrDesign},
		{"power below alpha", size(good, "group", 0.05, 0.01, nil), anova.ErrDesign},
		{"least", size(good, "group", 0.05, 0.8, &anova.SizeOptions{Least: -1}), anova.ErrDesign},
		{"loss", size(good, "group", 0.05, 0.8, &anova.SizeOptions{Loss: 1}), anova.ErrDesign},
		{"empty cell", size(change(func(d *anova.Design) { d.Cells[0].Units = 0 }), "group", 0.05, 0.8, nil), anova.ErrDesign},
		{"no effect", size(none, "group", 0.05, 0.8, nil), anova.ErrUnreachable},
		{"limit", size(good, "group", 0.05, 0.8, &anova.SizeOptions{Most: 12}), anova.ErrUnreachable},
		{"no effect to scale", detect(none, "group"), anova.ErrDesign},
		{"no such row to scale", detect(good, "nosuch"), anova.ErrDesign},
		{"means", crossed, anova.ErrDesign},
	} {
		if !errors.Is(c.err, c.want) {
			t.Errorf("%s: %v, want %v", c.name, c.err, c.want)
		}
	}
	// One unit in each cell leaves nothing for error: a row with the reason.
	p, err := change(func(d *anova.Design) { d.Cells[0].Units, d.Cells[1].Units = 1, 1 }).Power(ctx, 0.05)
	if err != nil || !errors.Is(p.Rows()[0].Err, lrt.ErrNoErrorDF) {
		t.Errorf("no error df: %v, %v", err, p.Rows())
	}
	if s := p.String(); strings.Contains(s, "NaN") {
		t.Errorf("report:\n%s", s)
	}
	// No effect: the power is alpha.
	q, err := none.Power(ctx, 0.05)
	if err != nil || math.Abs(q.Rows()[0].Power-0.05) > 1e-12 {
		t.Errorf("no effect: %v, %+v", err, q.Rows())
	}
	gone, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := good.SampleSize(gone, "group", 0.05, 0.8, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}
