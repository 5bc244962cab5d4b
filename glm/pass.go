package glm

import (
	"context"
	"fmt"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"subsume.example/internal/linalg"
)

// blocks passes over the rows in blocks of fixed bounds. The visitor owns the
// filler's block until it returns.
func (f *filler) blocks(ctx context.Context, visit func(f *filler) error) error {
	if s, ok := f.j.src.(Sliced); ok {
		for at := 0; at < s.Len(); at += linalg.BlockRows {
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := slice(s, &f.part, at, min(linalg.BlockRows, s.Len()-at)); err != nil {
				return err
			}
			f.block.Rows = 0
			if err := f.add(f.part); err != nil {
				return err
			}
			if err := visit(f); err != nil {
				return err
			}
		}
		return nil
	}
	for w, err := range windows(ctx, f.j.src) {
		if err != nil {
			return err
		}
		for from := 0; from < w.Rows; {
			to := min(w.Rows, from+linalg.BlockRows-f.block.Rows)
			if err := f.add(f.cut(w, from, to)); err != nil {
				return err
			}
			if from = to; f.block.Rows == linalg.BlockRows {
				if err := ctx.Err(); err != nil {
					return err
				}
				if err := visit(f); err != nil {
					return err
				}
				f.block.Rows = 0
			}
		}
	}
	if f.block.Rows == 0 {
		return nil
	}
	return visit(f)
}

// shape returns the groups of the joint's columns, and the dense column of the
// constant, −1.
func (j *joint) shape() (gs []linalg.Group, ones int) {
	if j.ws != nil {
		gs = j.ws.groups[:0]
	}
	ones = -1
	n := 0
	for _, b := range j.cols {
		var g linalg.Group
		if b.Key == "constant" {
			ones = n
		}
		if b.dense() {
			g.Dense = len(b.Names)
			n += len(b.Names)
		} else {
			g.Levels, g.Valued = len(b.Names), b.Value != nil
		}
		gs = append(gs, g)
	}
	if j.ws != nil {
		j.ws.groups = gs
	}
	return gs, ones
}

// chunkRows is the number of rows that a worker takes at a time.
const chunkRows = 32 * linalg.BlockRows

// accumulate makes the pass that fills the Gram.
func (j *joint) accumulate(ctx context.Context) error {
	groups, ones := j.shape()
	if j.ws != nil {
		j.gram = &j.ws.gram
	} else {
		j.gram = new(linalg.Gram)
	}
	j.gram.Init(groups, 1+len(j.offsets), ones, j.opt.Weights.Kind == Precision)
	size := linalg.BlockRows
	sliced, ok := j.src.(Sliced)
	if ok {
		size = min(size, max(sliced.Len(), 1))
		if sliced.Len() > chunkRows && j.gram.Small() && j.workers() > 1 {
			return j.accumulateParallel(ctx, sliced)
		}
	}
	j.gram.Workers = j.workers()
	f := j.newFiller(size)
	if ok && sliced.Len() == size { // one block
		if err := slice(sliced, &f.part, 0, size); err != nil {
			return err
		}
		if err := f.add(f.part); err != nil {
			return err
		}
		if err := f.finish(true); err != nil {
			return err
		}
		j.gram.Add(&f.block)
		j.tally = f.tally
		return j.checkRows()
	}
	total := j.gram
	part := total
	chunk := 0
	if err := f.blocks(ctx, func(f *filler) error {
		// Sums are taken in chunks as the parallel route does, where chunks are cheap.
		if c := f.start / chunkRows; c != chunk && total.Small() {
			if part != total {
				total.Merge(part)
			}
			part, chunk = total.Empty(), c
			part.Workers = j.workers()
		}
		if err := f.finish(f.start == 0); err != nil {
			return err
		}
		part.Add(&f.block)
		return nil
	}); err != nil {
		return err
	}
	if part != total {
		total.Merge(part)
	}
	j.tally = f.tally
	return j.checkRows()
}

func (j *joint) checkRows() error {
	if j.rows > 0 && j.n == 0 {
		return &ColumnError{Column: j.opt.Weights.Field, Row: -1, Err: fmt.Errorf("%w: every weight is 0", ErrEmpty)}
	}
	if j.rows == 0 {
		return &ColumnError{Column: j.response, Row: -1, Err: ErrEmpty}
	}
	return nil
}

func (j *joint) workers() int {
	if j.opt.Workers > 0 {
		return j.opt.Workers
	}
	return runtime.GOMAXPROCS(0)
}

// accumulateParallel shares chunks of rows among workers and merges their sums in order.
func (j *joint) accumulateParallel(ctx context.Context, src Sliced) error {
	f := j.newFiller(linalg.BlockRows)
	// The first block fixes the basis for all.
	var w Window
	if err := slice(src, &w, 0, min(linalg.BlockRows, src.Len())); err != nil {
		return err
	}
	if err := f.add(w); err != nil {
		return err
	}
	if err := f.finish(true); err != nil {
		return err
	}
	type outcome struct {
		gram *linalg.Gram
		tally
		err error
	}
	chunks := (src.Len() + chunkRows - 1) / chunkRows
	workers := min(j.workers(), chunks)
	fillers := make([]*filler, workers)
	for i := range fillers {
		fillers[i] = j.newFiller(linalg.BlockRows)
	}
	round := make([]outcome, 8*workers) // chunks between two merges
	empty := j.gram
	for from := 0; from < chunks; from += len(round) {
		var next atomic.Int64
		var wg sync.WaitGroup
		for _, f := range fillers {
			wg.Go(func() {
				for {
					i := int(next.Add(1)) - 1
					if i >= len(round) || from+i >= chunks {
						return
					}
					f.tally = tally{}
					g := empty.Empty()
					err := f.chunk(ctx, src, from+i, g)
					round[i] = outcome{g, f.tally, err}
				}
			})
		}
		wg.Wait()
		for i := range min(len(round), chunks-from) {
			o := &round[i]
			if o.err != nil {
				return o.err
			}
			if from+i == 0 {
				j.gram = o.gram
			} else {
				j.gram.Merge(o.gram)
			}
			j.tally.merge(o.tally)
		}
	}
	return j.checkRows()
}

// chunk accumulates one chunk of rows.
func (f *filler) chunk(ctx context.Context, src Sliced, c int, g *linalg.Gram) error {
	for at := c * chunkRows; at < min(src.Len(), (c+1)*chunkRows); at += linalg.BlockRows {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := slice(src, &f.part, at, min(linalg.BlockRows, src.Len()-at)); err != nil {
			return err
		}
		f.block.Rows = 0
		if err := f.add(f.part); err != nil {
			return err
		}
		if err := f.finish(false); err != nil {
			return err
		}
		g.Add(&f.block)
	}
	return nil
}

func (t *tally) merge(u tally) {
	t.rows += u.rows
	t.n += u.n
	t.zero += u.zero
	t.logW = t.logW.Add(u.logW)
	t.maxY = math.Max(t.maxY, u.maxY)
	t.sumW += u.sumW
	t.decimal = t.decimal || u.decimal
}
