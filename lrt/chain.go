package lrt

import (
	"context"
	"fmt"
)

// Chain compares each space with the next, from the smallest to the largest.
// With largest set every comparison of linear spaces is made against the error
// of the last space; otherwise each pair has its own. A chain needs at
// least two spaces; the error of a step names it.
func Chain(ctx context.Context, spaces []Space, largest bool, s *Settings) ([]Result, error) {
	if len(spaces) < 2 {
		return nil, &ComparisonError{Place: "chain", Err: fmt.Errorf("%w: %d spaces, want at least 2", ErrInvalid, len(spaces))}
	}
	rs := make([]Result, 0, len(spaces)-1)
	for _, c := range Steps(spaces, largest) {
		r, err := c.Run(ctx, s)
		if err != nil {
			return rs, err
		}
		rs = append(rs, r)
	}
	return rs, nil
}

// Steps returns the comparisons of a chain without running them.
func Steps(spaces []Space, largest bool) []Comparison {
	var cs []Comparison
	for i := 1; i < len(spaces); i++ {
		c := Comparison{Name: fmt.Sprintf("step %d", i), Restricted: spaces[i-1], Full: spaces[i]}
		if largest && i < len(spaces)-1 {
			c.Error = &ErrorPair{Smaller: spaces[len(spaces)-1]}
		}
		cs = append(cs, c)
	}
	return cs
}
