package glm

import (
	"context"
	"fmt"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
)

// filler turns windows of a source into blocks of columns on the basis of a joint.
type filler struct {
	j     *joint
	first []int // first dense column of each group
	yc    int   // column of the response; the offsets follow

	block linalg.Block
	low   [][]float64    // storage of low parts; block.Lo shows those that are not zero
	part  Window         // scratch
	mem   []float64      // behind the columns
	heads [][]float64    // behind the lists of columns
	start int            // row number of the block's first row
	watch func(w Window) // called with every window added; may be nil
	tally
}

// newFiller prepares the buffers for blocks of up to rows rows.
func (j *joint) newFiller(rows int) *filler {
	var f *filler
	if j.ws != nil {
		f = &j.ws.filler
	} else {
		f = new(filler)
	}
	*f = filler{j: j, first: f.first[:0], part: f.part, mem: f.mem, heads: f.heads}
	n, idx, val := 0, 0, 0
	for _, b := range j.cols {
		f.first = append(f.first, n)
		if b.dense() {
			n += len(b.Names)
		} else if idx++; b.Value != nil {
			val++
		}
	}
	f.yc = n
	n += 1 + len(j.offsets)
	if need := (2*n + 2*val + 1) * rows; cap(f.mem) < need {
		f.mem = make([]float64, need)
	}
	floats := f.mem[:cap(f.mem)]
	take := func() []float64 {
		s := floats[:rows:rows]
		floats = floats[rows:]
		return s
	}
	if cap(f.heads) < 3*n+2*idx {
		f.heads = make([][]float64, 3*n+2*idx)
	}
	heads := f.heads[:3*n+2*idx]
	clear(heads)
	f.block.Hi, f.block.Lo, f.low = heads[:n:n], heads[n:2*n:2*n], heads[2*n:3*n:3*n]
	for i := range n {
		f.block.Hi[i], f.low[i] = take(), take()
	}
	if j.at.weights >= 0 {
		f.block.Weight = take()
	}
	if idx > 0 {
		f.block.VHi, f.block.VLo = heads[3*n:3*n+idx], heads[3*n+idx:]
		f.block.Index = make([][]int32, idx)
		ints := make([]int32, idx*rows)
		k := 0
		for _, b := range j.cols {
			if b.dense() {
				continue
			}
			f.block.Index[k] = ints[k*rows : (k+1)*rows : (k+1)*rows]
			if b.Value != nil {
				f.block.VHi[k], f.block.VLo[k] = take(), take()
			}
			k++
		}
	}
	return f
}

// add appends rows of a window to the block, which must have room.
func (f *filler) add(w Window) error {
	j, at := f.j, f.block.Rows
	if f.watch != nil {
		f.watch(w)
	}
	if at == 0 {
		f.start = w.First
		for c := range f.block.Lo {
			f.block.Lo[c] = nil
		}
	}
	end := at + w.Rows
	idx := 0
	for g, b := range j.cols {
		c := f.first[g]
		switch {
		case b.field > 0:
			f.copy(w, b.field-1, c, at, end)
		case b.Key == "constant":
			one := f.block.Hi[c][at:end]
			for i := range one {
				one[i] = 1
			}
		case b.powers != nil && j.basis.powers[g] == nil: // the first block: chooseBasis forms the powers
			for k := range b.Names {
				f.copy(w, b.powers.field, c+k, at, end)
			}
		case b.dense():
			if err := f.fill(w, g, at, end); err != nil {
				return err
			}
		default:
			if err := f.index(w, b, idx, at, end); err != nil {
				return err
			}
			idx++
		}
	}
	f.copy(w, j.at.response, f.yc, at, end)
	for k, o := range j.offsetAt {
		f.copy(w, o, f.yc+1+k, at, end)
	}
	if j.at.weights >= 0 {
		copy(f.block.Weight[at:end], w.Hi[j.at.weights])
	}
	f.block.Rows = end
	return nil
}

// copy takes a numeric field of the window as column c.
func (f *filler) copy(w Window, field, c, at, end int) {
	copy(f.block.Hi[c][at:end], w.Hi[field])
	switch {
	case w.Lo != nil && w.Lo[field] != nil:
		f.lower(c, at)
		copy(f.block.Lo[c][at:end], w.Lo[field])
	case f.block.Lo[c] != nil:
		clear(f.block.Lo[c][at:end])
	}
}

// lower makes the low part of column c stand, zero in the rows before at.
func (f *filler) lower(c, at int) {
	if f.block.Lo[c] == nil {
		f.block.Lo[c] = f.low[c]
		clear(f.low[c][:at])
	}
}

// fill asks a term for its dense columns.
func (f *filler) fill(w Window, g, at, end int) error {
	b, c := f.j.cols[g], f.first[g]
	n := len(b.Names)
	heads := make([][]float64, 2*n)
	hi, lo := heads[:n], heads[n:]
	for k := range n {
		f.lower(c+k, at)
		hi[k], lo[k] = f.block.Hi[c+k][at:end], f.block.Lo[c+k][at:end]
	}
	if p := f.j.basis.powers[g]; p != nil {
		p.fill(w, hi, lo)
		return nil
	}
	if err := b.Fill(w, hi, lo); err != nil {
		return f.blame(b, err)
	}
	return nil
}

// index asks a term for its non-zero column in each row.
func (f *filler) index(w Window, b *bound, idx, at, end int) error {
	to := f.block.Index[idx][at:end]
	if err := b.Index(w, to); err != nil {
		return f.blame(b, err)
	}
	for i, l := range to {
		if int(l) >= len(b.Names) || l < -1 {
			return &TermError{Term: b.name, Err: fmt.Errorf("%w: index %d in row %d, the term has %d columns", ErrTerm, l, w.First+i, len(b.Names))}
		}
	}
	if b.Value == nil {
		return nil
	}
	if err := b.Value(w, f.block.VHi[idx][at:end], f.block.VLo[idx][at:end]); err != nil {
		return f.blame(b, err)
	}
	return nil
}

func (f *filler) blame(b *bound, err error) error {
	switch err.(type) {
	case *ColumnError, *TermError:
		return err
	}
	return &TermError{Term: b.name, Err: err}
}

// finish checks the block, counts its rows and brings its columns to the basis.
// With choose set it first chooses the basis from this block.
func (f *filler) finish(choose bool) error {
	j, n := f.j, f.block.Rows
	for c := range f.block.Hi {
		if i := badValue(f.block.Hi[c][:n]); i >= 0 {
			return f.notFinite(c, i)
		}
	}
	for k := range f.block.VHi {
		if f.block.VHi[k] == nil {
			continue
		}
		if i := badValue(f.block.VHi[k][:n]); i >= 0 {
			return f.notFinite(-1, i)
		}
	}
	maxY := f.maxY
	for _, y := range f.block.Hi[f.yc][:n] {
		if y = math.Abs(y); y > maxY {
			maxY = y
		}
	}
	f.maxY = maxY
	f.decimal = f.decimal || f.block.Lo[f.yc] != nil
	f.rows += n
	if f.block.Weight == nil {
		f.n += float64(n)
	} else if err := f.weigh(); err != nil {
		return err
	}
	if choose {
		f.chooseBasis()
	}
	for c := range f.block.Hi {
		k := min(c, f.yc) // offsets share the scale of the response
		if j.shift[k] == 0 && j.exp[k] == 0 {
			continue
		}
		shift := j.shift[k]
		if c > f.yc {
			shift = 0
		}
		f.toBasis(c, shift, j.exp[k])
	}
	return nil
}

// badValue returns the place of a value that is no number, −1 for none.
func badValue(x []float64) int {
	var s, t, u, v float64
	i := 0
	for ; i+3 < len(x); i += 4 {
		s += x[i] * 0
		t += x[i+1] * 0
		u += x[i+2] * 0
		v += x[i+3] * 0
	}
	for ; i < len(x); i++ {
		s += x[i] * 0
	}
	if s+t+u+v == 0 {
		return -1
	}
	for i, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return i
		}
	}
	return -1
}

// toBasis brings a column to its shift and scale, exactly where the digits allow.
func (f *filler) toBasis(c int, shift float64, exp int) {
	n := f.block.Rows
	hi := f.block.Hi[c][:n]
	if shift != 0 {
		lost := false
		low := f.low[c][:n]
		if f.block.Lo[c] == nil {
			for i, h := range hi {
				hi[i], low[i] = dd.TwoSum(h, -shift)
				lost = lost || low[i] != 0
			}
		} else {
			lost = true
			for i, h := range hi {
				s, e := dd.TwoSum(h, -shift)
				hi[i], low[i] = dd.QuickTwoSum(s, e+low[i])
			}
		}
		if lost {
			f.block.Lo[c] = f.low[c]
		}
	}
	if exp == 0 {
		return
	}
	for _, x := range [][]float64{hi, f.block.Lo[c]} {
		if x == nil {
			continue
		}
		x = x[:n]
		if scale := math.Ldexp(1, -exp); exp > -1000 && exp < 1000 {
			for i := range x {
				x[i] *= scale
			}
			continue
		}
		for i := range x {
			x[i] = math.Ldexp(x[i], -exp)
		}
	}
}

// notFinite says which column of which row holds no number.
func (f *filler) notFinite(c, i int) error {
	e := &ColumnError{Row: f.start + i, Err: ErrNotFinite}
	switch {
	case c < 0:
		e.Column = "covariate of a product"
	case c == f.yc:
		e.Column = f.j.response
	case c > f.yc:
		e.Column = f.j.offsets[c-f.yc-1]
	default:
		for g, b := range f.j.cols {
			if k := c - f.first[g]; b.dense() && k >= 0 && k < len(b.Names) {
				e.Column = b.Names[k]
			}
		}
	}
	if c >= 0 && math.IsNaN(f.block.Hi[c][i]) {
		e.Err = errMissingRow
	}
	return e
}

func (f *filler) weigh() error {
	for i, w := range f.block.Weight[:f.block.Rows] {
		bad := ""
		switch {
		case math.IsNaN(w) || math.IsInf(w, 0):
			return &ColumnError{Column: f.j.opt.Weights.Field, Row: f.start + i, Err: errMissingRow}
		case w < 0:
			bad = "negative"
		case f.j.opt.Weights.Kind == Frequency && w != math.Trunc(w):
			bad = "a frequency must be a whole number"
		}
		if bad != "" {
			return &ColumnError{Column: f.j.opt.Weights.Field, Row: f.start + i, Text: fmt.Sprint(w), Err: fmt.Errorf("%w: %s", ErrWeight, bad)}
		}
		switch {
		case w == 0:
			f.zero++
		case f.j.opt.Weights.Kind == Frequency:
			f.n += w
		default:
			f.n++
			f.logW = f.logW.AddF(math.Log(w))
		}
	}
	return nil
}

// chooseBasis sets shift and scale from the first block: a value that occurs where
// all are far from zero, and a power of two where they are far from one.
func (f *filler) chooseBasis() {
	j, n := f.j, f.block.Rows
	j.shift, j.exp = append(j.shift[:0], make([]float64, f.yc+1)...), append(j.exp[:0], make([]int, f.yc+1)...)
	for g, b := range j.cols {
		switch c := f.first[g]; {
		case !b.dense() || b.Key == "constant":
		case b.powers != nil:
			f.choosePowers(g)
		default:
			for k := range b.Names {
				j.shift[c+k], j.exp[c+k] = j.centre(f.block.Hi[c+k][:n])
			}
		}
	}
	j.shift[f.yc], j.exp[f.yc] = j.centre(f.block.Hi[f.yc][:n])
}

// centre returns a shift and a scale for a column of plain values.
func (j *joint) centre(x []float64) (shift float64, exp int) {
	lower, upper := extremes(x)
	if j.shifted && math.Abs(x[0]) > 32*(upper/2-lower/2) {
		// Far from zero x − shift is exact (Sterbenz 1974) and saves digits. Near
		// zero there are none to save, and x itself has no low part.
		shift = x[0]
	}
	if exp = reach(lower, upper, shift); exp > -64 && exp < 64 {
		exp = 0
	}
	return shift, exp
}

// extremes returns the smallest and the largest value.
func extremes(x []float64) (lower, upper float64) {
	lower, upper = x[0], x[0]
	for _, v := range x {
		if v < lower {
			lower = v
		} else if v > upper {
			upper = v
		}
	}
	return lower, upper
}

// reach returns the exponent of the largest distance from the centre.
func reach(lower, upper, centre float64) int {
	d := math.Max(math.Abs(lower/2-centre/2), math.Abs(upper/2-centre/2))
	if d == 0 {
		return 0
	}
	return math.Ilogb(d) + 2
}

// choosePowers centres a polynomial and forms its powers in the first block.
func (f *filler) choosePowers(g int) {
	j, n, c := f.j, f.block.Rows, f.first[g]
	q := &powers{field: j.cols[g].powers.field, degree: j.cols[g].powers.degree}
	x := f.block.Hi[c][:n]
	lower, upper := extremes(x)
	if j.shifted {
		q.centre = lower/2 + upper/2
	}
	q.exp = reach(lower, upper, q.centre) - 1
	if j.basis.powers == nil {
		j.basis.powers = make(map[int]*powers)
	}
	j.basis.powers[g] = q
	scale := math.Ldexp(1, -q.exp)
	if f.block.Lo[c] == nil {
		clear(f.low[c][:n])
	}
	for k := range q.degree {
		f.lower(c+k, 0)
	}
	for i := range n {
		u := dd.DD{Hi: x[i], Lo: f.block.Lo[c][i]}.AddF(-q.centre)
		u = dd.DD{Hi: u.Hi * scale, Lo: u.Lo * scale}
		x := u
		for k := range q.degree {
			if k > 0 {
				x = x.Mul(u)
			}
			f.block.Hi[c+k][i], f.block.Lo[c+k][i] = x.Hi, x.Lo
		}
	}
}

// blocks passes over the rows in blocks of fixed bounds. The visitor owns the
// filler's block until it returns.
func (f *filler) blocks(ctx context.Context, visit func(f *filler) error) error {
	if s, ok := f.j.src.(Sliced); ok {
		for at := 0; at < s.Len(); at += linalg.BlockRows {
			if err := ctx.Err(); err != nil {
				return err
			}
			s.Slice(&f.part, at, min(linalg.BlockRows, s.Len()-at))
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
	for w, err := range f.j.src.Windows(ctx) {
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

// cut returns rows from to to of a window.
func (f *filler) cut(w Window, from, to int) Window {
	if from == 0 && to == w.Rows {
		return w
	}
	p := &f.part
	k := len(w.Hi)
	if len(p.Hi) != k {
		p.Hi, p.Lo, p.Index = make([][]float64, k), make([][]float64, k), make([][]int32, k)
	}
	p.First, p.Rows = w.First+from, to-from
	for i := range k {
		p.Hi[i], p.Lo[i], p.Index[i] = nil, nil, nil
		if w.Hi[i] != nil {
			p.Hi[i] = w.Hi[i][from:to]
		}
		if w.Lo != nil && w.Lo[i] != nil {
			p.Lo[i] = w.Lo[i][from:to]
		}
		if w.Index != nil && w.Index[i] != nil {
			p.Index[i] = w.Index[i][from:to]
		}
	}
	return *p
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
		sliced.Slice(&f.part, 0, size)
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
	if j.rows == 0 || j.n == 0 {
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
	src.Slice(&w, 0, min(linalg.BlockRows, src.Len()))
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
		src.Slice(&f.part, at, min(linalg.BlockRows, src.Len()-at))
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
	t.decimal = t.decimal || u.decimal
}
