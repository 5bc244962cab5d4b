package dist_test

import (
	"math"
	"testing"

	"subsume.example/dist"
	"subsume.example/dist/lawtest"
)

// TestStudentizedLaws runs the generic checks of any law.
func TestStudentizedLaws(t *testing.T) {
	inf := math.Inf(1)
	for _, law := range []lawtest.Law{
		dist.StudentizedRange{K: 2, Nu: 3}, dist.StudentizedRange{K: 5, Nu: 20}, dist.StudentizedRange{K: 40, Nu: inf},
		dist.MaximumModulus{K: 1, Nu: 4}, dist.MaximumModulus{K: 30, Nu: 12},
		dist.DunnettFor(5, []float64{4, 4, 9}, 12, true), dist.DunnettFor(5, []float64{4, 4, 9}, 12, false),
	} {
		lawtest.Check(t, law, &lawtest.Settings{Draws: 2000, Tolerance: 1e-12, Invalid: []lawtest.Law{
			dist.StudentizedRange{K: 1, Nu: 3}, dist.MaximumModulus{K: 0, Nu: 3}, dist.Dunnett{},
		}})
	}
	for _, law := range []lawtest.Law{
		dist.NewChiBarSquared(0.25, 0.5, 0.25), dist.NewChiBarSquared(0.1, 0, 0.9),
	} {
		lawtest.Check(t, law, &lawtest.Settings{Draws: 4000, Atom: true, Tolerance: 1e-12, Invalid: []lawtest.Law{dist.ChiBarSquared{}}})
	}
	lawtest.Check(t, dist.NewChiBarSquared(0, 0.3, 0.7), &lawtest.Settings{Draws: 4000, Tolerance: 1e-12})
}
