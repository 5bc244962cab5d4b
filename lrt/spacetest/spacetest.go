// Package spacetest checks that a type keeps the contract of lrt.Space. A test
// of the type calls Check with a restricted and a full space over the same data:
//
//	func TestRates(t *testing.T) {
//		small, large := build()
//		spacetest.Check(t, small, large)
//	}
package spacetest

import (
	"context"
	"errors"
	"math"
	"strings"
	"sync"

	"subsume.example/lrt"
)

// T is what Check needs of a *testing.T.
type T interface {
	Helper()
	Errorf(format string, args ...any)
	Logf(format string, args ...any)
}

// Check reports through t what restricted and full do against the contract:
// observations that differ, fits that are not finite, not repeatable bit for
// bit, not the same from several goroutines, or deaf to a cancelled context,
// dimensions and log likelihoods in the wrong order, nesting that is denied or
// claimed both ways, improvement that makes a fit worse. It logs the
// optional interfaces that each type meets, and those it seems to have meant
// to meet but does not.
func Check(t T, restricted, full lrt.Space) {
	t.Helper()
	if restricted == nil || full == nil {
		t.Errorf("a space is nil")
		return
	}
	ctx := context.Background()
	if err := restricted.Observations().Check(full.Observations()); err != nil {
		t.Errorf("observations: %v", err)
	}
	small, okS := one(ctx, t, "restricted", restricted)
	large, okL := one(ctx, t, "full", full)
	if !okS || !okL {
		return
	}
	if small.N != large.N {
		t.Errorf("fits have %d and %d observations", small.N, large.N)
	}
	if !small.Criterion.Same(large.Criterion) {
		t.Errorf("fits maximise different criteria: %v and %v", small.Criterion.Kind, large.Criterion.Kind)
	}
	if small.Dim > large.Dim {
		t.Errorf("the restricted space has %d free parameters, the full one %d", small.Dim, large.Dim)
	}
	slack := 1e-9 + 1e-11*math.Abs(large.LogLikelihood)
	if _, improves := full.(lrt.Improver); !improves && small.LogLikelihood > large.LogLikelihood+slack {
		t.Errorf("log likelihood %.12g (full) below %.12g (restricted)", large.LogLikelihood, small.LogLikelihood)
	}
	nesting(t, restricted, full)
	improvement(ctx, t, full, small, large)
	if _, err := lrt.Compare(ctx, restricted, full, nil); err != nil && !errors.Is(err, lrt.ErrNothingTested) {
		t.Errorf("Compare: %v", err)
	}
}

func one(ctx context.Context, t T, place string, s lrt.Space) (lrt.Fit, bool) {
	t.Helper()
	t.Logf("%s space %T meets: %s", place, s, list(lrt.Meets(s)))
	if lost := lrt.Lost(s); len(lost) > 0 {
		t.Errorf("%s space %T does not meet %s although its pointer or an embedded space does", place, s, list(lost))
	}
	if s.Observations() == (lrt.Observations{}) {
		t.Errorf("%s: Observations is the zero value, which equals every other zero value: use the Observations of a Sample", place)
	}
	first, err := s.Maximize(ctx)
	if err != nil {
		t.Errorf("%s: Maximize: %v", place, err)
		return first, false
	}
	if first.N < 1 {
		t.Errorf("%s: a fit of %d observations", place, first.N)
	}
	if first.Dim < 0 {
		t.Errorf("%s: %d free parameters", place, first.Dim)
	}
	if math.IsNaN(first.LogLikelihood) || math.IsInf(first.LogLikelihood, 0) {
		t.Errorf("%s: log likelihood %g", place, first.LogLikelihood)
		return first, false
	}
	const workers = 4
	var wg sync.WaitGroup
	fits, errs := make([]lrt.Fit, workers), make([]error, workers)
	for i := range workers {
		wg.Go(func() { fits[i], errs[i] = s.Maximize(ctx) })
	}
	wg.Wait()
	for i, f := range fits {
		if errs[i] != nil {
			t.Errorf("%s: concurrent Maximize: %v", place, errs[i])
			return first, false
		}
		if math.Float64bits(f.LogLikelihood) != math.Float64bits(first.LogLikelihood) || f.Dim != first.Dim {
			t.Errorf("%s: a second fit differs: log likelihood %.17g, then %.17g", place, first.LogLikelihood, f.LogLikelihood)
			return first, false
		}
	}
	gone, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := s.Maximize(gone); err == nil {
		t.Logf("%s: Maximize does not look at a cancelled context (fine for a closed form)", place)
	} else if !errors.Is(err, context.Canceled) {
		t.Errorf("%s: under a cancelled context Maximize returns %q, which does not wrap context.Canceled", place, err)
	}
	return first, true
}

func nesting(t T, restricted, full lrt.Space) {
	t.Helper()
	n, ok := restricted.(lrt.Nester)
	if !ok {
		t.Logf("nesting is vouched for by the caller: %T has no NestedIn", restricted)
		return
	}
	switch err := n.NestedIn(full); {
	case err == nil, errors.Is(err, lrt.ErrNestingUnknown):
	case errors.Is(err, lrt.ErrNotNested):
		t.Errorf("restricted.NestedIn(full): %v", err)
	default:
		t.Errorf("restricted.NestedIn(full) returns %q, which wraps neither ErrNotNested nor ErrNestingUnknown", err)
	}
	if err := n.NestedIn(restricted); err != nil && !errors.Is(err, lrt.ErrNestingUnknown) {
		t.Errorf("a space must be nested in itself: %v", err)
	}
}

func improvement(ctx context.Context, t T, full lrt.Space, small, large lrt.Fit) {
	t.Helper()
	im, ok := full.(lrt.Improver)
	if !ok {
		return
	}
	better, err := im.MaximizeFrom(ctx, small)
	if err != nil {
		t.Errorf("full: MaximizeFrom(restricted fit): %v", err)
		return
	}
	best := math.Max(better.LogLikelihood, large.LogLikelihood)
	if small.LogLikelihood > best+1e-9+1e-11*math.Abs(best) {
		t.Errorf("log likelihood %.12g at best (full) below %.12g (restricted)", best, small.LogLikelihood)
	}
}

func list(names []string) string {
	if len(names) == 0 {
		return "no optional interface"
	}
	return strings.Join(names, ", ")
}
