package glm

import (
	"fmt"
	"math"

	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// Workspace compares nested sets of columns for one small problem after another
// without allocating: the per-feature loop of a pipeline. The columns are given as they
// are, the restricted space being the first of them. For anything with factors,
// weights or missing values make models and use lrt.Compare.
//
// A Workspace is not safe for concurrent use; give each goroutine its own.
type Workspace struct {
	n, p  int
	small *linalg.Small
	tol   float64

	// Estimate and SE hold the coefficients of all columns and their standard
	// errors after Compare; 0 and NaN for a column that earlier ones span.
	Estimate, SE []float64
	// Rank is the dimension of the full space, RSS its residual sum of squares.
	Rank int
	RSS  float64
}

// NewWorkspace returns a workspace for n rows and p columns. It refuses, with an
// error wrapping lrt.ErrInvalid, what leaves no degrees of freedom for error.
func NewWorkspace(n, p int) (*Workspace, error) {
	if p < 1 || n <= p {
		return nil, fmt.Errorf("glm: %w: %d rows and %d columns, want 1 column or more and more rows than columns", lrt.ErrInvalid, n, p)
	}
	return &Workspace{n: n, p: p, small: linalg.NewSmall(p), tol: 100 * float64(p) * 0x1p-52,
		Estimate: make([]float64, p), SE: make([]float64, p)}, nil
}

// Compare fits y by the first q columns and by all of them, and returns the
// arithmetic of the F comparison; its method F gives F, p and log p. x holds p
// columns of n values of size 1e-130 to 1e150, or zero; nothing of it is kept. Errors are
// *ColumnError, with the column's number as its name, for what is not finite or out of range, and
// lrt.ErrInvalid for wrong shapes.
func (w *Workspace) Compare(x [][]float64, y []float64, q int) (lrt.Linear, error) {
	if len(x) != w.p || len(y) != w.n || q < 0 || q >= w.p {
		return lrt.Linear{}, fmt.Errorf("glm: %w: %d columns, %d rows, %d restricted; the workspace is for %d columns and %d rows",
			lrt.ErrInvalid, len(x), len(y), q, w.p, w.n)
	}
	for j := range x {
		if len(x[j]) != w.n {
			return lrt.Linear{}, fmt.Errorf("glm: %w: column %d has %d rows, want %d", lrt.ErrInvalid, j, len(x[j]), w.n)
		}
	}
	s := w.small
	s.Factor(x, y, w.tol)
	if sum := s.YY + s.Spread(); math.IsNaN(sum) || math.IsInf(sum, 0) {
		return lrt.Linear{}, w.blame(x, y)
	}
	if err := w.underflow(x, y); err != nil {
		return lrt.Linear{}, err
	}
	tiny := 4 * 0x1p-104 * s.YY
	l := lrt.Linear{RankE1: w.n, Numerator: s.Between(q, w.p), Denominator: s.RSS, M: float64(w.n), Certified: true}
	for j, k := range s.Kept {
		if k && j < q {
			l.RankS++
		}
	}
	l.RankB, l.RankE0 = s.Rank, s.Rank
	l.Nil, l.NilNumerator = l.Denominator <= tiny, l.Numerator <= tiny
	if l.Nil {
		l.Denominator = 0
	}
	w.Rank, w.RSS = s.Rank, l.Denominator
	s.Solve(w.Estimate)
	s.Diagonal(w.SE)
	v := w.RSS / float64(w.n-w.Rank)
	for j := range w.SE {
		w.SE[j] = math.Sqrt(w.SE[j] * v)
	}
	return l, nil
}

// underflow refuses a response or a column whose squares fall below the range: it would
// pass for zero.
func (w *Workspace) underflow(x [][]float64, y []float64) error {
	below := func(name string, c []float64) error {
		for i, v := range c {
			if v != 0 && math.Abs(v) < 1e-130 {
				return &ColumnError{Column: name, Row: i, Text: fmt.Sprint(v), Err: fmt.Errorf("%w: multiply the column by a constant", ErrOverflow)}
			}
		}
		return nil
	}
	if w.small.YY < 1e-260 {
		if err := below("response", y); err != nil {
			return err
		}
	}
	for j, kept := range w.small.Kept {
		if !kept {
			if err := below(fmt.Sprintf("column %d", j), x[j]); err != nil {
				return err
			}
		}
	}
	return nil
}

// blame finds what made the cross-products leave the range.
func (w *Workspace) blame(x [][]float64, y []float64) error {
	name := func(j int) string {
		if j < 0 {
			return "response"
		}
		return fmt.Sprintf("column %d", j)
	}
	for j := -1; j < len(x); j++ {
		c := y
		if j >= 0 {
			c = x[j]
		}
		for i, v := range c {
			switch {
			case math.IsNaN(v) || math.IsInf(v, 0):
				return &ColumnError{Column: name(j), Row: i, Err: ErrNotFinite}
			case math.Abs(v) > 1e150:
				return &ColumnError{Column: name(j), Row: i, Text: fmt.Sprint(v), Err: ErrOverflow}
			}
		}
	}
	return fmt.Errorf("glm: %w", ErrOverflow)
}
