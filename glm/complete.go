package glm

import (
	"context"
	"fmt"
	"slices"
)

// Fielder is implemented by a term that can say which fields it reads, as all
// terms of this package do.
type Fielder interface {
	Term
	Fields() []string
}

var (
	_ Fielder = Constant{}
	_ Fielder = Covariate{}
	_ Fielder = Factor{}
	_ Fielder = Powers{}
	_ Fielder = Cross{}
)

// Fields returns none.
func (Constant) Fields() []string { return nil }

// Fields returns the field.
func (c Covariate) Fields() []string { return []string{c.Field} }

// Fields returns the field.
func (f Factor) Fields() []string { return []string{f.Field} }

// Fields returns the field.
func (p Powers) Fields() []string { return []string{p.Field} }

// Fields returns the fields of the parts.
func (c Cross) Fields() []string {
	var fs []string
	for _, t := range c {
		if f, ok := t.(Fielder); ok {
			fs = append(fs, f.Fields()...)
		}
	}
	return fs
}

// CompleteFor returns the rows that are complete in the response, the weights and
// offset of o, and every field that any of the models reads: the same rows for all of
// them, so that they can be compared. Its Account says what was left out and why,
// and every result counts it. A term that is no Fielder is refused with a
// *TermError; other errors are those of Complete.
func (d *Data) CompleteFor(ctx context.Context, response string, o *Options, models ...[]Term) (*Data, error) {
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	fields := []string{response}
	add := func(names ...string) {
		for _, n := range names {
			if n != "" && !slices.Contains(fields, n) {
				fields = append(fields, n)
			}
		}
	}
	if o != nil {
		add(o.Weights.Field, o.Offset)
	}
	for _, m := range models {
		for i, t := range m {
			f, ok := t.(Fielder)
			switch {
			case t == nil:
				return nil, &TermError{Term: fmt.Sprintf("number %d", i+1), Err: fmt.Errorf("%w: nil", ErrTerm)}
			case !ok:
				return nil, &TermError{Term: t.Name(), Err: fmt.Errorf("%w: it does not say which fields it reads (method Fields): name them to Complete", ErrTerm)}
			}
			add(f.Fields()...)
		}
	}
	return d.Complete(fields...)
}
