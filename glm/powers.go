package glm

import (
	"context"
	"fmt"
	"math"
	"strconv"

	"subsume.example/internal/dd"
)

// Powers is a polynomial in a numeric field: the columns x, x², … x^Degree. The
// powers are formed in double-double from the digits the field holds; inside a
// fit with a constant they are taken of a centred and scaled covariate and the
// coefficients mapped back in double-double, so that high degrees keep
// their digits.
type Powers struct {
	Field  string
	Degree int // 1 to 30
}

// Name returns the field with its largest power, "x^1..x^5".
func (p Powers) Name() string {
	if p.Degree == 1 {
		return p.Field
	}
	return fmt.Sprintf("%s^1..%s^%d", p.Field, p.Field, p.Degree)
}

// Bind returns the powers as columns; the field must be numeric.
func (p Powers) Bind(_ context.Context, src Source) (Columns, error) {
	if p.Degree < 1 || p.Degree > 30 {
		return Columns{}, &TermError{Term: p.Name(), Err: fmt.Errorf("%w: degree %d, want 1 to 30", ErrTerm, p.Degree)}
	}
	f, err := findNumeric(src, p.Field)
	if err != nil {
		return Columns{}, err
	}
	names := make([]string, p.Degree)
	for k := range names {
		names[k] = p.Field
		if k > 0 {
			names[k] += "^" + strconv.Itoa(k+1)
		}
	}
	raw := &powers{field: f, degree: p.Degree}
	return Columns{
		Names: names, Key: fmt.Sprintf("powers %q to %d", p.Field, p.Degree),
		Fill: func(w Window, hi, lo [][]float64) error {
			raw.fill(w, hi, lo)
			return nil
		},
		fields: []string{p.Field}, numeric: []string{p.Field},
		powers: raw,
	}, nil
}

// powers fills u, u², … with u = (x − centre)·2^−exp.
type powers struct {
	field, degree int
	centre        float64
	exp           int
}

func (p *powers) fill(w Window, hi, lo [][]float64) {
	scale := math.Ldexp(1, -p.exp)
	for i := range w.Rows {
		u := numberAt(w, p.field, i).AddF(-p.centre)
		u = dd.DD{Hi: u.Hi * scale, Lo: u.Lo * scale}
		x := u
		hi[0][i], lo[0][i] = x.Hi, x.Lo
		for k := 1; k < p.degree; k++ {
			x = x.Mul(u)
			hi[k][i], lo[k][i] = x.Hi, x.Lo
		}
	}
}
