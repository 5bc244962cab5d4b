package anova

import (
	"context"
	"fmt"

	"subsume.example/glm"
	"subsume.example/lrt"
)

// Options of a layout. nil and every zero field mean the default.
type Options struct {
	// Decomposition is the question asked of each term; the zero value: Sequential.
	Decomposition Decomposition
	// Order is the highest order of interaction of Crossed: 1 for main effects
	// only, 2 for pairs as well; 0: as many as there are factors.
	Order int
	// Covariates are numeric fields that come before the factors of OneWay and
	// Crossed, each with one slope for all cells.
	Covariates []string
	// NoConstant leaves out the common mean of Terms.
	NoConstant bool
	// Model holds weights, offset, known variance and tolerance of the models.
	Model *glm.Options
}

func (o *Options) filled() Options {
	if o == nil {
		return Options{}
	}
	return *o
}

// Terms returns a comparison for each term of a normal linear model with a
// constant: of the model's terms before it (Sequential) or of all that do not contain it
// (Hierarchical), against the same with the term. Each is judged against the error of the
// model of all terms. A Cross contains its parts and the crosses of some of
// them, Powers contain lower powers, and a Factor contains the Covariate of the
// same field, which makes Terms(Covariate x, Factor x) the check of a straight
// line against free means. Where two terms would have one name the later one is renamed.
//
// Errors are those of glm.Normal, and a *LayoutError wrapping ErrLayout for no
// terms and for Partial, which needs the cells of Crossed.
func Terms(ctx context.Context, src glm.Source, response string, terms []glm.Term, o *Options) ([]lrt.Comparison, error) {
	opt := o.filled()
	switch {
	case len(terms) == 0:
		return nil, &LayoutError{Err: fmt.Errorf("%w: no terms", ErrLayout)}
	case opt.Decomposition == Partial:
		return nil, &LayoutError{Err: fmt.Errorf("%w: partial hypotheses are about cells; use Crossed", ErrLayout)}
	case opt.Decomposition > Partial:
		return nil, &LayoutError{Err: fmt.Errorf("%w: %v", ErrLayout, opt.Decomposition)}
	}
	l := &list{}
	if !opt.NoConstant {
		l.add(glm.Constant{})
	}
	for _, t := range terms {
		if t == nil {
			return nil, &LayoutError{Err: fmt.Errorf("%w: nil term", ErrLayout)}
		}
		if _, ok := t.(glm.Constant); ok && !opt.NoConstant {
			continue
		}
		l.add(t)
	}
	largest, err := l.model(ctx, src, response, opt.Model)
	if err != nil {
		return nil, err
	}
	return l.comparisons(largest, opt.Decomposition)
}

// list is a list of terms with names of their own.
type list struct {
	terms []glm.Term
	names []string
}

func (l *list) add(t glm.Term) {
	name := t.Name()
	if l.has(name) {
		if _, ok := t.(glm.Factor); ok && !l.has(name+" as levels") {
			name += " as levels"
		} else {
			for i := 2; l.has(name); i++ {
				name = fmt.Sprintf("%s (%d)", t.Name(), i)
			}
		}
	}
	l.terms, l.names = append(l.terms, t), append(l.names, name)
}

func (l *list) has(name string) bool {
	for _, n := range l.names {
		if n == name {
			return true
		}
	}
	return false
}

// model binds the terms, each once.
func (l *list) model(ctx context.Context, src glm.Source, response string, o *glm.Options) (*glm.Model, error) {
	named := make([]glm.Term, len(l.terms))
	for i, t := range l.terms {
		named[i] = renamed{t, l.names[i]}
	}
	return glm.Normal(ctx, src, response, named, o)
}

// renamed is a term under another name.
type renamed struct {
	glm.Term
	name string
}

func (r renamed) Name() string { return r.name }

// comparisons asks each term but the constant.
func (l *list) comparisons(largest *glm.Model, d Decomposition) ([]lrt.Comparison, error) {
	atoms := make([]map[string]int, len(l.terms))
	for i, t := range l.terms {
		atoms[i] = atomsOf(t, i)
	}
	var cs []lrt.Comparison
	for i, t := range l.terms {
		if _, ok := t.(glm.Constant); ok {
			continue
		}
		var out []string
		for k := range l.terms {
			if d == Sequential && k > i || d == Hierarchical && k != i && contains(atoms[k], atoms[i]) {
				out = append(out, l.names[k])
			}
		}
		full, err := without(largest, out...)
		if err != nil {
			return nil, err
		}
		restricted, err := full.Without(l.names[i])
		if err != nil {
			return nil, err
		}
		c := lrt.Comparison{Name: l.names[i], Restricted: restricted, Full: full}
		if full != largest {
			c.Error = &lrt.ErrorPair{Smaller: largest}
		}
		cs = append(cs, c)
	}
	if len(cs) == 0 {
		return nil, &LayoutError{Err: fmt.Errorf("%w: no terms beside the constant", ErrLayout)}
	}
	return cs, nil
}

func without(m *glm.Model, names ...string) (*glm.Model, error) {
	if len(names) == 0 {
		return m, nil
	}
	return m.Without(names...)
}

// atomsOf returns what a term is made of: fields as levels, fields as numbers
// with their power, or the term itself where it is of another kind.
func atomsOf(t glm.Term, at int) map[string]int {
	switch t := t.(type) {
	case glm.Constant:
		return map[string]int{}
	case glm.Factor:
		return map[string]int{"levels " + t.Field: 1}
	case glm.Covariate:
		return map[string]int{"number " + t.Field: 1}
	case glm.Powers:
		return map[string]int{"number " + t.Field: t.Degree}
	case glm.Cross:
		m := map[string]int{}
		for _, part := range t {
			for a, n := range atomsOf(part, at) {
				m[a] += n
			}
		}
		return m
	}
	return map[string]int{fmt.Sprintf("term %d", at): 1}
}

// contains reports whether a term of atoms big contains one of atoms small.
func contains(big, small map[string]int) bool {
	const number, levels = "number ", "levels "
	for a, n := range small {
		if big[a] >= n {
			continue
		}
		if len(a) > len(number) && a[:len(number)] == number && big[levels+a[len(number):]] > 0 {
			continue // any function of a field is one of its levels
		}
		return false
	}
	return true
}
