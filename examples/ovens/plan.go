package main

import (
	"context"
	"fmt"
	"math"

	"subsume.example/dist"
)

// plan holds what the design could be expected to find, from figures that were
// there before the response: the difference of interest and the spread of earlier work.
type plan struct {
	difference, sd   float64
	a, b             string // the pair of groups that is hardest to tell apart
	noncentrality    float64
	power            float64
	each             int     // rows a group, equal groups, for the wanted power
	powerEach        float64 // reached with them
	detectable       float64 // difference found with the wanted power by this design
	alpha, d1, d2    float64
	critical, wanted float64
}

// plan works the planning figures, for the least favourable pattern: two
// groups differ by the difference of interest and all others lie halfway.
func (s *study) plan(context.Context) error {
	if s.difference == 0 {
		return nil
	}
	k := float64(len(s.groups))
	q := &plan{difference: s.difference, sd: s.sd, alpha: 1 - s.level, wanted: s.power, noncentrality: math.Inf(1)}
	q.d1, q.d2 = k-1, float64(s.data.Len())-k-float64(len(s.covariates))
	if q.d2 < 1 {
		return fmt.Errorf("%s: %s in %d groups leave no degrees of freedom for error", s.name(), rows(s.data.Len()), len(s.groups))
	}
	for a := range s.groups {
		for b := range a {
			if l := spreadOf(s.counts, a, b); l < q.noncentrality {
				q.noncentrality, q.a, q.b = l, s.groups[b], s.groups[a]
			}
		}
	}
	ratio := q.difference / q.sd
	unit := q.noncentrality
	q.noncentrality *= ratio * ratio
	q.critical = dist.F{D1: q.d1, D2: q.d2}.UpperQuantile(q.alpha)
	q.power = dist.NoncentralF{D1: q.d1, D2: q.d2, Lambda: q.noncentrality}.Survival(q.critical)
	lambda, err := dist.NoncentralityF(q.d1, q.d2, q.critical, q.wanted)
	if err != nil {
		return err
	}
	q.detectable = q.sd * math.Sqrt(lambda/unit)
	q.each, q.powerEach = smallestGroups(k, float64(len(s.covariates)), ratio, q.alpha, q.wanted)
	s.planned = q
	return nil
}

// spreadOf returns Σ n (μ − μ̄)² for means ½ in group a, −½ in group b and 0 elsewhere.
func spreadOf(counts []int, a, b int) float64 {
	n := 0
	for _, c := range counts {
		n += c
	}
	na, nb := float64(counts[a]), float64(counts[b])
	mean := (na - nb) / 2 / float64(n)
	return (na+nb)/4 - float64(n)*mean*mean
}

// smallestGroups returns the fewest rows a group, equal groups, with which the
// exact F test finds two groups ratio standard deviations apart with the wanted
// power, and the power then; 0 when no size up to a million does.
func smallestGroups(k, covariates, ratio, alpha, wanted float64) (int, float64) {
	power := func(n int) float64 {
		d1, d2 := k-1, k*float64(n)-k-covariates
		if d2 < 1 {
			return 0
		}
		c := dist.F{D1: d1, D2: d2}.UpperQuantile(alpha)
		return dist.NoncentralF{D1: d1, D2: d2, Lambda: float64(n) * ratio * ratio / 2}.Survival(c)
	}
	low, high := 1, 2 // power(low) < wanted <= power(high); power grows with n
	for power(high) < wanted {
		if low, high = high, 2*high; high > 1<<20 {
			return 0, math.NaN()
		}
	}
	for high-low > 1 {
		if m := (low + high) / 2; power(m) < wanted {
			low = m
		} else {
			high = m
		}
	}
	return high, power(high)
}

// writePlan says what could be expected before the response was looked at.
func (s *study) writePlan(p *page) {
	q := s.planned
	if q == nil {
		return
	}
	p.title("Plan")
	p.text("Stated before the response is looked at: a difference of %s in %s between two groups matters, and %s is the expected standard deviation within groups%s. The pattern hardest to see is two groups that far apart with the others halfway; of these groups, %s and %s.",
		fig(q.difference, 3), s.response, fig(q.sd, 3), s.atEqual(), q.a, q.b)
	p.line("")
	t := p.table("lr")
	t.row("level of the test", percent(q.alpha))
	t.row("noncentrality λ of that pattern in this design", fig(q.noncentrality, 4))
	t.row("power of the exact F test in this design", percent(q.power))
	t.row(fmt.Sprintf("difference found with power %s in this design", percent(q.wanted)), fig(q.detectable, 4))
	if q.each > 0 {
		t.row(fmt.Sprintf("rows a group for power %s, equal groups (power %s)", percent(q.wanted), percent(q.powerEach)), fmt.Sprint(q.each))
	}
	t.end()
}
