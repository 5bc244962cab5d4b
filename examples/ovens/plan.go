package main

import (
	"context"
	"errors"
	"fmt"

	"subsume.example/anova"
)

// plan holds what the design could be expected to find, from figures that were
// there before the response: the difference of interest and the spread of earlier work.
type plan struct {
	difference, sd float64
	alpha, wanted  float64
	a, b           string // the pair of groups that is hardest to tell apart
	power          anova.Power
	row            anova.PlannedRow // of the group, in power
	detectable     float64          // difference found with the wanted power by this design
	size           anova.Size       // equal groups with the wanted power
	each           int              // rows a group then; 0: out of reach
}

// plan works the planning figures, for the least favourable pattern: two
// groups differ by the difference of interest and all others lie halfway.
func (s *study) plan(ctx context.Context) error {
	if s.difference == 0 {
		return nil
	}
	q := &plan{difference: s.difference, sd: s.sd, alpha: 1 - s.level, wanted: s.power}
	a, b := hardestPair(s.counts)
	q.a, q.b = s.groups[a], s.groups[b]
	design := anova.Design{Factors: []string{s.group}, SD: s.sd}
	for i, g := range s.groups {
		c := anova.DesignCell{Levels: []string{g}, Units: s.counts[i]}
		switch i {
		case a:
			c.Mean = s.difference / 2
		case b:
			c.Mean = -s.difference / 2
		}
		design.Cells = append(design.Cells, c)
	}
	var err error
	if q.power, err = design.Power(ctx, q.alpha); err != nil {
		return err
	}
	q.row, _ = q.power.Row(s.group)
	if q.row.Err != nil {
		return s.explain(q.row.Err)
	}
	least, err := design.Detectable(ctx, s.group, q.alpha, q.wanted)
	if err != nil {
		return err
	}
	q.detectable = least.Scale * s.difference
	for i := range design.Cells {
		design.Cells[i].Units = 1
	}
	q.size, err = design.SampleSize(ctx, s.group, q.alpha, q.wanted, nil)
	switch {
	case err == nil:
		q.each = q.size.N[0]
	case !errors.Is(err, anova.ErrUnreachable):
		return err
	}
	s.planned = q
	return nil
}

// hardestPair returns the pair of groups whose difference, all others halfway, has
// the smallest noncentrality: Σ n (μ − μ̄)² for means ½, −½ and 0.
func hardestPair(counts []int) (a, b int) {
	least := -1.0
	n := 0.0
	for _, c := range counts {
		n += float64(c)
	}
	for j := range counts {
		for i := range j {
			ni, nj := float64(counts[i]), float64(counts[j])
			if v := (ni+nj)/4 - (ni-nj)*(ni-nj)/(4*n); least < 0 || v < least {
				least, a, b = v, i, j
			}
		}
	}
	return a, b
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
	p.gap()
	t := p.table("lr")
	t.row("level of the test", percent(q.alpha))
	t.row("noncentrality of that pattern in this design", fig(q.row.Plan.Noncentrality, 4))
	t.row("power of the exact F test in this design", percent(q.row.Power))
	t.row(fmt.Sprintf("difference found with power %s in this design", percent(q.wanted)), fig(q.detectable, 4))
	if q.each > 0 {
		t.row(fmt.Sprintf("rows a group for power %s, equal groups (power %s)", percent(q.wanted), percent(q.size.Power)), fmt.Sprint(q.each))
	}
	t.end()
}
