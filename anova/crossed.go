package anova

import (
	"context"
	"fmt"
	"slices"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// OneWay returns the comparison of one common mean with a mean for each level of
// the factor, after a comparison for each of Options.Covariates. It is Crossed
// with one factor.
func OneWay(ctx context.Context, src glm.Source, response, factor string, o *Options) ([]lrt.Comparison, error) {
	return Crossed(ctx, src, response, []string{factor}, o)
}

// Crossed returns a comparison for each covariate, each factor, and each
// interaction of factors up to Options.Order, lower orders first. A numeric
// field serves as a factor too, its distinct values being the levels. Unbalanced
// data are the normal case, cells may be empty, and degrees of freedom come from ranks.
//
// With Partial the comparison of a factor or interaction restricts the model of
// all terms by the equations of its hypothesis on the equally weighted cells;
// where no row has one of the cells, the comparison fails when it is run, with an
// *EmptyCellsError, and the others stand.
//
// Errors are those of glm.Normal, and a *LayoutError wrapping ErrLayout for no
// factors, a factor named twice, and an order that is out of range.
func Crossed(ctx context.Context, src glm.Source, response string, factors []string, o *Options) ([]lrt.Comparison, error) {
	opt := o.filled()
	if err := checkFactors(factors, &opt); err != nil {
		return nil, err
	}
	l := &list{}
	if opt.Decomposition == Partial && opt.Order == len(factors) {
		return saturated(ctx, src, response, factors, &opt)
	}
	l.add(glm.Constant{})
	for _, c := range opt.Covariates {
		l.add(glm.Covariate{Field: c})
	}
	sets := subsets(len(factors), opt.Order)
	for _, s := range sets {
		l.add(cross(factors, s))
	}
	largest, err := l.model(ctx, src, response, opt.Model)
	if err != nil {
		return nil, err
	}
	if opt.Decomposition != Partial {
		return l.comparisons(largest, opt.Decomposition)
	}
	return partial(ctx, largest, factors, sets, &opt)
}

func checkFactors(factors []string, opt *Options) error {
	switch {
	case len(factors) == 0:
		return &LayoutError{Err: fmt.Errorf("%w: no factors", ErrLayout)}
	case len(factors) > 20:
		return &LayoutError{Err: fmt.Errorf("%w: %d factors, want at most 20", ErrLayout, len(factors))}
	case opt.Order < 0 || opt.Order > len(factors):
		return &LayoutError{Err: fmt.Errorf("%w: order %d of interaction with %d factors", ErrLayout, opt.Order, len(factors))}
	case opt.Decomposition > Partial:
		return &LayoutError{Err: fmt.Errorf("%w: %v", ErrLayout, opt.Decomposition)}
	case opt.NoConstant:
		return &LayoutError{Err: fmt.Errorf("%w: crossed factors hold the constant; NoConstant is for Terms", ErrLayout)}
	}
	if opt.Order == 0 {
		opt.Order = len(factors)
	}
	all := slices.Concat(opt.Covariates, factors)
	for i, f := range all {
		if slices.Contains(all[:i], f) {
			return &LayoutError{Place: f, Err: fmt.Errorf("%w: named twice", ErrLayout)}
		}
	}
	return nil
}

// subsets lists the sets of k things with 1 to order members, small sets first,
// each in the order of the things.
func subsets(k, order int) [][]int {
	var sets [][]int
	var grow func(s []int, from, size int)
	grow = func(s []int, from, size int) {
		if len(s) == size {
			sets = append(sets, slices.Clone(s))
			return
		}
		for i := from; i < k; i++ {
			grow(append(s, i), i+1, size)
		}
	}
	for size := 1; size <= order; size++ {
		grow(nil, 0, size)
	}
	return sets
}

// cross is the term of a set of factors.
func cross(factors []string, set []int) glm.Term {
	if len(set) == 1 {
		return glm.Factor{Field: factors[set[0]]}
	}
	c := make(glm.Cross, len(set))
	for i, f := range set {
		c[i] = glm.Factor{Field: factors[f]}
	}
	return c
}

// saturated is the partial layout of all interactions: its largest model has a
// mean for each cell.
func saturated(ctx context.Context, src glm.Source, response string, factors []string, opt *Options) ([]lrt.Comparison, error) {
	l := &list{}
	sets := subsets(len(factors), len(factors))
	l.add(cross(factors, sets[len(sets)-1]))
	for _, c := range opt.Covariates {
		l.add(glm.Covariate{Field: c})
	}
	largest, err := l.model(ctx, src, response, opt.Model)
	if err != nil {
		return nil, err
	}
	return partial(ctx, largest, factors, sets, opt)
}
