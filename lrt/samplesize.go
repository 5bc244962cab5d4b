package lrt

import (
	"context"
	"errors"
	"fmt"
	"math"
)

// ErrTooSmall is returned when no design within the limit reaches the power.
var ErrTooSmall = errors.New("no design within the limit reaches the power")

// SizeSearch looks for the cheapest design that reaches a power.
type SizeSearch struct {
	Alpha, Power float64
	// Step is the allocation: the design of m replicates has n[i] = m·Step[i] units
	// in group i. {1, 1, 1} keeps groups equal, {2, 1} has twice as many in the first.
	Step []int
	// Least is the smallest number of units in each group; nil: 1 for each, or
	// what Plan can do with, since a design that Plan refuses with ErrNoErrorDF is
	// taken to have no power.
	Least []int
	// Free lets the groups leave the allocation in the end, one unit at a time,
	// as long as the design becomes cheaper and keeps the power.
	Free bool
	// Cost of a unit in each group; nil: 1.
	Cost []float64
	// Most is the largest total number of units; 0: ten million.
	Most int
	// Plan returns the plan of a design with n[i] units in group i. It must not
	// keep n.
	Plan func(n []int) (Plan, error)
}

// Size is the answer of a SizeSearch.
type Size struct {
	N     []int // units in each group
	Total int
	Cost  float64
	Power float64 // reached, at least what was asked for
	Plan  Plan
	// Cheaper lists the neighbouring designs that cost less, with their powers: all
	// of them are below the power asked for.
	Cheaper []Neighbour
}

// Neighbour is a design next to the answer, and its power.
type Neighbour struct {
	N           []int
	Cost, Power float64
}

type sizer struct {
	SizeSearch
	ctx context.Context
}

func (s *sizer) cost(n []int) float64 {
	var c float64
	for i, v := range n {
		if s.Cost != nil {
			c += s.Cost[i] * float64(v)
		} else {
			c += float64(v)
		}
	}
	return c
}

func (s *sizer) power(n []int) (float64, Plan, error) {
	if err := s.ctx.Err(); err != nil {
		return nan, Plan{}, err
	}
	p, err := s.Plan(append([]int(nil), n...))
	if errors.Is(err, ErrNoErrorDF) || errors.Is(err, ErrNothingTested) {
		return 0, p, nil
	}
	if err != nil {
		return nan, p, err
	}
	v := p.Power(s.Alpha)
	if math.IsNaN(v) {
		return nan, p, fmt.Errorf("%w: the plan of %v units has no power", ErrInvalid, n)
	}
	return v, p, nil
}

// Solve finds the design. Errors wrap ErrInvalid, ErrTooSmall, the error of
// Plan, or that of the context.
func (q SizeSearch) Solve(ctx context.Context) (Size, error) {
	fail := func(err error) (Size, error) { return Size{}, fmt.Errorf("lrt: sample size: %w", err) }
	s := &sizer{q, ctx}
	switch {
	case !(q.Alpha > 0 && q.Alpha < 1) || !(q.Power > q.Alpha && q.Power < 1):
		return fail(fmt.Errorf("%w: alpha %g and power %g, want 0 < alpha < power < 1", ErrInvalid, q.Alpha, q.Power))
	case len(q.Step) == 0 || q.Plan == nil:
		return fail(fmt.Errorf("%w: Step and Plan are needed", ErrInvalid))
	case q.Least != nil && len(q.Least) != len(q.Step), q.Cost != nil && len(q.Cost) != len(q.Step):
		return fail(fmt.Errorf("%w: %d groups, %d Least, %d Cost", ErrInvalid, len(q.Step), len(q.Least), len(q.Cost)))
	case q.Most < 0:
		return fail(fmt.Errorf("%w: Most %d", ErrInvalid, q.Most))
	}
	if s.Most == 0 {
		s.Most = 10_000_000
	}
	unit, first := 0, 1
	for i, v := range q.Step {
		if v < 1 {
			return fail(fmt.Errorf("%w: Step[%d] = %d, want at least 1", ErrInvalid, i, v))
		}
		if q.Cost != nil && !(q.Cost[i] > 0) {
			return fail(fmt.Errorf("%w: Cost[%d] = %g, want a positive number", ErrInvalid, i, q.Cost[i]))
		}
		unit += v
		if q.Least != nil {
			if q.Least[i] < 0 {
				return fail(fmt.Errorf("%w: Least[%d] = %d", ErrInvalid, i, q.Least[i]))
			}
			first = max(first, (q.Least[i]+v-1)/v)
		}
	}
	at := func(m int) []int {
		n := make([]int, len(q.Step))
		for i, v := range q.Step {
			n[i] = m * v
		}
		return n
	}
	// Double until the power is reached, halve the gap, then step down as long
	// as that still reaches it (power may not be monotone in a user's plan).
	lo, hi := first-1, first
	for {
		if hi > s.Most/unit {
			hi = s.Most / unit
		}
		if hi < first || hi <= lo {
			return fail(fmt.Errorf("%w: alpha %g, power %g, at most %d units", ErrTooSmall, q.Alpha, q.Power, s.Most))
		}
		v, _, err := s.power(at(hi))
		if err != nil {
			return fail(err)
		}
		if v >= q.Power {
			break
		}
		lo, hi = hi, 2*hi
	}
	for hi-lo > 1 {
		mid := lo + (hi-lo)/2
		v, _, err := s.power(at(mid))
		if err != nil {
			return fail(err)
		}
		if v >= q.Power {
			hi = mid
		} else {
			lo = mid
		}
	}
	for hi > first {
		v, _, err := s.power(at(hi - 1))
		if err != nil {
			return fail(err)
		}
		if v < q.Power {
			break
		}
		hi--
	}
	n := at(hi)
	for {
		better, cheaper, err := s.around(n, hi > first)
		if err != nil {
			return fail(err)
		}
		if better != nil {
			n = better
			continue
		}
		r := Size{N: n, Cost: s.cost(n), Cheaper: cheaper}
		for _, v := range n {
			r.Total += v
		}
		if r.Power, r.Plan, err = s.power(n); err != nil {
			return fail(err)
		}
		return r, nil
	}
}

// uneven is Σ n²/Step: of two designs of one cost the one nearer to the
// allocation is taken, since nothing else tells them apart where means are equal.
func (s *sizer) uneven(n []int) float64 {
	var u float64
	for i, v := range n {
		u += float64(v) * float64(v) / float64(s.Step[i])
	}
	return u
}

// around looks at every cheaper neighbour of n: one replicate less, or with Free
// up to four units less in a group, some of them replaced by up to twelve in
// another. It returns the cheapest that keeps the power, else all of them.
func (s *sizer) around(n []int, fewer bool) (better []int, cheaper []Neighbour, err error) {
	var try [][]int
	if !s.Free {
		if fewer {
			m := append([]int(nil), n...)
			for i, v := range s.Step {
				m[i] -= v
			}
			try = append(try, m)
		}
	} else {
		least := func(i int) int {
			if s.Least != nil {
				return s.Least[i]
			}
			return 1
		}
		const wide = 4
		for i := range n {
			for d := 1; d <= wide && n[i]-d >= least(i); d++ {
				m := append([]int(nil), n...)
				m[i] -= d
				try = append(try, m)
				for j := range n {
					for e := 1; e <= 3*wide && j != i; e++ {
						k := append([]int(nil), m...)
						k[j] += e
						if s.cost(k) >= s.cost(n) {
							break
						}
						try = append(try, k)
					}
				}
			}
		}
	}
	base, best := s.cost(n), inf
	for _, m := range try {
		c := s.cost(m)
		if !(c < base) {
			continue
		}
		v, _, err := s.power(m)
		if err != nil {
			return nil, nil, err
		}
		if v >= s.Power && (c < best || c == best && s.uneven(m) < s.uneven(better)) {
			better, best = m, c
		}
		cheaper = append(cheaper, Neighbour{m, c, v})
	}
	return better, cheaper, nil
}
