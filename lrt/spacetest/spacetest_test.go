package spacetest

import (
	"context"
	"fmt"
	"math"
	"strings"
	"testing"

	"subsume.example/lrt"
)

// record collects what Check says.
type record struct{ errs, logs []string }

func (r *record) Helper()                   {}
func (r *record) Errorf(f string, a ...any) { r.errs = append(r.errs, fmt.Sprintf(f, a...)) }
func (r *record) Logf(f string, a ...any)   { r.logs = append(r.logs, fmt.Sprintf(f, a...)) }

func declared(t *testing.T) (small, large lrt.Space) {
	t.Helper()
	sample := lrt.Observe([]float64{1.2, 0.4, 2.2, 0.9, 1.7, 3.1}, 6)
	m, err := lrt.Bind(lrt.Model[[]float64]{
		Name:   "normal",
		Params: []lrt.Param{lrt.Real("mean"), lrt.Positive("sd")},
		LogLikelihood: func(y, th []float64) float64 {
			s := 0.0
			for _, v := range y {
				z := (v - th[0]) / th[1]
				s -= 0.5*z*z + math.Log(th[1]) + 0.5*math.Log(2*math.Pi)
			}
			return s
		},
	}, sample)
	if err != nil {
		t.Fatal(err)
	}
	r, err := lrt.Restrict(m, lrt.Fix("mean", 1))
	if err != nil {
		t.Fatal(err)
	}
	return r, m
}

func TestCheckDeclared(t *testing.T) {
	small, large := declared(t)
	Check(t, small, large)
	var r record
	Check(&r, large, small) // swapped
	if len(r.errs) == 0 || !strings.Contains(strings.Join(r.errs, "\n"), "NestedIn") {
		t.Errorf("swapped spaces pass: %q", r.errs)
	}
	if !strings.Contains(strings.Join(r.logs, "\n"), "PairFitter, Restrictable, Nester, Improver, ExactReferrer, Simulator, Companion, Pivot, BartlettCorrector") {
		t.Errorf("interfaces not listed: %q", r.logs)
	}
}

// wrapped embeds a Space, so that it lends its two methods and no more.
type wrapped struct{ lrt.Space }

// moody gives another answer each time.
type moody struct {
	lrt.Space
	calls *int
}

func (m moody) Maximize(ctx context.Context) (lrt.Fit, error) {
	f, err := m.Space.Maximize(ctx)
	*m.calls++
	f.LogLikelihood += float64(*m.calls)
	return f, err
}

func TestCheckFindsFaults(t *testing.T) {
	small, large := declared(t)
	other, _ := declared(t)
	for _, c := range []struct {
		name         string
		small, large lrt.Space
		want         string
	}{
		{"nil", nil, large, "nil"},
		{"other data", other, large, "observations"},
		{"lost interfaces", wrapped{small}, large, "does not meet"},
	} {
		t.Run(c.name, func(t *testing.T) {
			var r record
			Check(&r, c.small, c.large)
			if !strings.Contains(strings.Join(r.errs, "\n"), c.want) {
				t.Errorf("errors %q, want one with %q", r.errs, c.want)
			}
		})
	}
	t.Run("not repeatable", func(t *testing.T) {
		if raceEnabled {
			t.Skip("the faulty space races by design")
		}
		var r record
		Check(&r, small, moody{large, new(int)})
		if !strings.Contains(strings.Join(r.errs, "\n"), "a second fit differs") {
			t.Errorf("errors %q", r.errs)
		}
	})
}
