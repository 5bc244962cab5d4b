package dist

import (
	"context"
	"errors"
	"math"
	"testing"
)

func TestLargest(t *testing.T) {
	ctx := context.Background()
	// Product correlations: Dunnett's law.
	d := equalDunnett(5, 0.6, 11, true)
	got, err := Largest{equicorrelated(5, 0.36), 11, true}.UpperQuantile(ctx, 0.05, nil)
	if want := d.UpperQuantile(0.05); err != nil || relErr(got.X, want) > 1e-10 {
		t.Errorf("%+v, %v, want %v", got, err, want)
	}
	// Equal variances: the studentized range.
	c, _ := differencesOfMeans([]float64{1, 1, 1, 1})
	l := Largest{c, 16, true}
	q, err := l.UpperQuantile(ctx, 0.05, &RectangleSettings{Seed: 3, Target: 2e-4})
	want := StudentizedRange{4, 16}.UpperQuantile(0.05) / math.Sqrt2
	if err != nil || math.Abs(q.X-want) > q.Error || q.Error > 5e-3 || q.Method != RectangleLattice {
		t.Errorf("%+v, %v, want %v", q, err, want)
	}
	// Unequal variances: Tukey and Kramer's critical value is conservative (Hayter
	// 1984), the exact one is smaller.
	c, _ = differencesOfMeans([]float64{1, 1, 1, 30})
	u, err := Largest{c, 16, true}.UpperQuantile(ctx, 0.05, &RectangleSettings{Seed: 3, Target: 2e-4})
	if err != nil || !(u.X+u.Error < want) || u.X < want-0.3 {
		t.Errorf("unequal variances: %+v, %v, equal ones %v", u, err, want)
	}
	p, err := l.Survival(ctx, want, &RectangleSettings{Target: 2e-4})
	if err != nil || math.Abs(p.Outside-0.05) > p.Error {
		t.Errorf("%+v, %v", p, err)
	}
	if p, err := l.Survival(ctx, -1, nil); err != nil || p.Outside != 1 {
		t.Errorf("%+v, %v", p, err)
	}
	// Three values, exactly; one-sided.
	m := symmetric([]float64{1, 0.5, -0.3}, []float64{0.5, 1, 0.2}, []float64{-0.3, 0.2, 1})
	x, err := Largest{m, math.Inf(1), false}.UpperQuantile(ctx, 0.01, nil)
	back := mustRectangle(t, Largest{m, math.Inf(1), false}.Rectangle(x.X), nil)
	if err != nil || x.Method != RectangleThree || relErr(back.Outside, 0.01) > 1e-10 {
		t.Errorf("%+v, %v, P = %v", x, err, back.Outside)
	}
}

func TestLargestErrors(t *testing.T) {
	ctx := context.Background()
	good := equicorrelated(3, 0.2)
	for _, c := range []struct {
		name string
		l    Largest
		q    float64
		want error
	}{
		{"no matrix", Largest{nil, 5, true}, 0.05, ErrParam},
		{"nu", Largest{good, -1, true}, 0.05, ErrParam},
		{"q", Largest{good, 5, true}, 0, ErrParam},
		{"q NaN", Largest{good, 5, true}, math.NaN(), ErrParam},
		{"diagonal", Largest{symmetric([]float64{2}), 5, true}, 0.1, ErrCovariance},
	} {
		if _, err := c.l.UpperQuantile(ctx, c.q, nil); !errors.Is(err, c.want) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	gone, cancel := context.WithCancel(ctx)
	cancel()
	c, _ := differencesOfMeans([]float64{1, 2, 3, 4})
	if _, err := (Largest{c, 5, true}).UpperQuantile(gone, 0.05, nil); !errors.Is(err, context.Canceled) {
		t.Error(err)
	}
	_, err := Largest{c, 5, true}.UpperQuantile(ctx, 0.05, &RectangleSettings{Target: 1e-9, MaxPoints: 20000})
	if !errors.Is(err, ErrTolerance) {
		t.Error(err)
	}
}
