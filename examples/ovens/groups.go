package main

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"subsume.example/dist"
	"subsume.example/glm"
)

// ways says how the groups compare: each mean, and each pair.
type ways struct {
	at    []float64 // where the covariates are held: their means over the rows used
	means []glm.Prediction
	pairs []pairing
}

// mostGroups is the largest number of groups whose pairs are compared, and mostPairs
// that of the pairs shown.
const (
	mostGroups = 100
	mostPairs  = 45
)

// pairing is the difference between two groups.
type pairing struct {
	over, under  string // the estimate of over − under is not negative
	difference   glm.Estimate
	joint        float64 // p, and interval, that hold for all pairs together, by Bonferroni's inequality
	lower, upper float64
}

// follow estimates the mean of every group where the covariates are equal, and
// every difference of two groups.
func (s *study) follow(ctx context.Context) error {
	columns := []glm.Column{glm.Labels(s.group, s.groups)}
	for _, c := range s.covariates {
		v, err := s.data.Values(c)
		if err != nil {
			return err
		}
		m := mean(v)
		s.at = append(s.at, m)
		columns = append(columns, glm.Numbers(c, slices.Repeat([]float64{m}, len(s.groups))))
	}
	rows, err := glm.NewData(columns...)
	if err != nil {
		return err
	}
	if s.means, _, err = s.fullFit.Predict(ctx, rows); err != nil {
		return err
	}
	if len(s.groups) > mostGroups {
		return nil
	}
	name := map[string]string{}
	for _, c := range s.fullFit.Coefficients {
		for _, g := range s.groups {
			if c.Name == s.group+"="+g {
				name[g] = c.Name
			}
		}
	}
	for b, under := range s.groups {
		for _, over := range s.groups[:b] {
			e, err := s.fullFit.Combination(glm.Weight{Name: name[over], Coef: 1}, glm.Weight{Name: name[under], Coef: -1})
			if err != nil {
				return err
			}
			q := pairing{over: over, under: under, difference: e}
			if e.Value < 0 {
				q.over, q.under = under, over
				q.difference.Value, q.difference.T = -e.Value, -e.T
				q.difference.Lower, q.difference.Upper = -e.Upper, -e.Lower
			}
			s.pairs = append(s.pairs, q)
		}
	}
	s.adjust()
	return nil
}

// adjust takes into account that there are many pairs.
func (s *study) adjust() {
	slices.SortStableFunc(s.pairs, func(a, b pairing) int { return cmp.Compare(a.difference.P, b.difference.P) })
	m := float64(len(s.pairs))
	t := dist.StudentT{Nu: float64(s.fullFit.DFError)}.UpperQuantile((1 - s.level) / (2 * m))
	for i := range s.pairs {
		q := &s.pairs[i]
		q.joint = min(1, m*q.difference.P)
		q.lower, q.upper = q.difference.Value-t*q.difference.SE, q.difference.Value+t*q.difference.SE
	}
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
	t := p.table("lrrrrr")
	t.row(s.group, "rows", "mean", "standard error", "from", "to")
	places := placesFor(s.fullFit.SD)
	for i, g := range s.groups {
		m := s.means[i]
		t.row(g, fmt.Sprint(s.counts[i]), dec(m.Value, places), dec(m.SE, places+1), dec(m.Lower, places), dec(m.Upper, places))
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
		cells := []string{q.over + " over " + q.under, dec(q.difference.Value, places), dec(q.lower, places), dec(q.upper, places),
			prob(q.difference.P, math.Log(q.difference.P)), prob(q.joint, math.Log(q.joint))}
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

func mean(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += x
	}
	return sum / float64(len(v))
}
