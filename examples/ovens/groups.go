package main

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"subsume.example/anova"
)

// ways says how the groups compare: each mean, and each pair.
type ways struct {
	groupMeans *anova.Groups
	family     *anova.Family // nil: too many pairs
	at         []float64     // where the covariates are held: their means over the rows used
	means      []anova.Group
	pairs      []pairing
}

// pairing is the difference of two groups, turned so that it is not negative.
type pairing struct {
	over, under string
	anova.ContrastResult
}

// mostGroups is the largest number of groups whose pairs are compared, and mostPairs
// that of the pairs shown.
const (
	mostGroups = 40
	mostPairs  = 45
)

// follow estimates the mean of every group where the covariates are equal, and
// tests every difference of two groups.
func (s *study) follow(ctx context.Context) error {
	groups, err := anova.Means(ctx, s.full, []string{s.group}, nil, s.settings())
	if err != nil {
		return err
	}
	s.groupMeans, s.means = groups, groups.List()
	for _, c := range s.covariates {
		for _, h := range groups.At() {
			if h.Field == c {
				s.at = append(s.at, h.Value)
			}
		}
	}
	if len(s.groups) > mostGroups {
		return nil
	}
	family, err := groups.Test(ctx, groups.Pairs(), anova.Bonferroni, s.settings())
	if err != nil {
		return err
	}
	s.family = &family
	for _, l := range family.Lines() {
		s.pairs = append(s.pairs, s.turned(l))
	}
	slices.SortStableFunc(s.pairs, func(a, b pairing) int { return cmp.Compare(a.LogP, b.LogP) })
	return nil
}

// turned names the groups of a pair and turns the difference so that it is not negative.
func (s *study) turned(l anova.ContrastResult) pairing {
	q := pairing{ContrastResult: l}
	for i, w := range l.Weights {
		switch {
		case w > 0:
			q.over = s.means[i].Name
		case w < 0:
			q.under = s.means[i].Name
		}
	}
	if l.Estimate.Value < 0 {
		q.over, q.under = q.under, q.over
		q.Estimate.Value, q.Estimate.T = -l.Estimate.Value, -l.Estimate.T
		q.Estimate.Lower, q.Estimate.Upper = -l.Estimate.Upper, -l.Estimate.Lower
		q.Lower, q.Upper = -l.Upper, -l.Lower
	}
	return q
}

// writeGroups writes means and differences.
func (s *study) writeGroups(p *page) {
	p.title("Which groups differ, and by how much")
	where := ""
	for i, c := range s.covariates {
		if i > 0 {
			where += ", "
		} else {
			where = " at "
		}
		where += fmt.Sprintf("%s %s", c, fig(s.at[i], 4))
	}
	p.line("Mean %s%s, with %s intervals:", s.response, where, percent(s.level))
	p.line("")
	t := p.table("lrrrrrrr")
	t.row(s.group, "rows", "as measured", "SD", "mean", "standard error", "from", "to")
	places := placesFor(s.fullFit.SD)
	for _, m := range s.means {
		a := m.Adjusted
		t.row(m.Name, fmt.Sprint(m.N), dec(m.Raw.Mean, places), dec(m.Raw.SD, places), dec(a.Value, places), dec(a.SE, places+1), dec(a.Lower, places), dec(a.Upper, places))
	}
	t.end()
	s.writePairs(p, places)
}

// writePairs writes the differences, the clearest first.
func (s *study) writePairs(p *page, places int) {
	if len(s.pairs) == 0 {
		p.text("Differences of pairs: not made for more than %d groups.", mostGroups)
		return
	}
	if len(s.pairs) > 1 {
		p.text("Differences, the clearest first. Intervals and the last p hold for all %d pairs together (level %s, by Bonferroni's inequality):", len(s.pairs), percent(s.level))
	} else {
		p.text("The difference, with its %s interval:", percent(s.level))
	}
	p.line("")
	t := p.table("lrrrrr")
	head := []string{"pair", "difference", "from", "to", "p alone", "p jointly"}
	if len(s.pairs) == 1 {
		head = head[:5]
	}
	t.row(head...)
	for i, q := range s.pairs {
		if i == mostPairs {
			break
		}
		cells := []string{q.over + " over " + q.under, dec(q.Estimate.Value, places), dec(q.Lower, places), dec(q.Upper, places),
			prob(q.P, q.LogP), prob(q.AdjustedP, q.AdjustedLogP)}
		t.row(cells[:len(head)]...)
	}
	t.end()
	if n := len(s.pairs) - mostPairs; n > 0 {
		p.line("%d more are in the record (-record).", n)
	}
}

// placesFor returns how many decimals show about three digits of x.
func placesFor(x float64) int {
	if !(x > 0) || math.IsInf(x, 0) {
		return 3
	}
	return min(max(2-int(math.Floor(math.Log10(x))), 0), 8)
}
