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
	j       *joint
	y       int   // field of the response
	w       int   // field of the weights, −1
	offsets []int // fields of the offsets
	first   []int // first dense column of each group

	block linalg.Block
	part  Window // scratch
	start int    // row number of the block's first row
	spare [][]float64
	watch func(w Window) // called with every window added; may be nil
	tally
}

// newFiller prepares the buffers for blocks of up to rows rows.
func (j *joint) newFiller(rows int) (*filler, error) {
	f := &filler{j: j, w: -1}
	var err error
	if f.y, err = findNumeric(j.src, j.response); err != nil {
		return nil, err
	}
	if j.opt.Weights.Field != "" {
		if f.w, err = findNumeric(j.src, j.opt.Weights.Field); err != nil {
			return nil, err
		}
	}
	for _, o := range j.offsets {
		at, err := findNumeric(j.src, o)
		if err != nil {
			return nil, err
		}
		f.offsets = append(f.offsets, at)
	}
	n, idx, val := 1+len(f.offsets), 0, 0
	for _, b := range j.cols {
		f.first = append(f.first, n-1-len(f.offsets))
		if b.dense() {
			n += len(b.Names)
		} else if idx++; b.Value != nil {
			val++
		}
	}
	floats := make([]float64, (2*n+2*val+1)*rows)
	take := func() []float64 {
		s := floats[:rows:rows]
		floats = floats[rows:]
		return s
	}
	heads := make([][]float64, 2*n)
	f.block.Hi, f.block.Lo = heads[:n], heads[n:]
	for i := range n {
		f.block.Hi[i], f.block.Lo[i] = take(), take()
	}
	if f.w >= 0 {
		f.block.Weight = take()
	}
	if idx > 0 {
		f.block.VHi, f.block.VLo = make([][]float64, 0, idx), make([][]float64, 0, idx)
		for _, b := range j.cols {
			if b.dense() {
				continue
			}
			f.block.Index = append(f.block.Index, make([]int32, rows))
			if b.Value != nil {
				f.block.VHi, f.block.VLo = append(f.block.VHi, take()), append(f.block.VLo, take())
			} else {
				f.block.VHi, f.block.VLo = append(f.block.VHi, nil), append(f.block.VLo, nil)
			}
		}
	}
	return f, nil
}

// add appends rows of a window to the block, which must have room.
func (f *filler) add(w Window) error {
	j, at := f.j, f.block.Rows
	if f.watch != nil {
		f.watch(w)
	}
	if at == 0 {
		f.start = w.First
	}
	end := at + w.Rows
	var hi, lo [8][]float64
	idx := 0
	for g, b := range j.cols {
		if b.dense() {
			n := len(b.Names)
			h, l := hi[:0], lo[:0]
			for c := range n {
				h = append(h, f.block.Hi[f.first[g]+c][at:end])
				l = append(l, f.block.Lo[f.first[g]+c][at:end])
			}
			if p := j.basis.powers[g]; p != nil {
				p.fill(w, h, l)
			} else if b.powers != nil { // the first block: chooseBasis forms the powers
				copyField(w, b.powers.field, h[0], l[0])
			} else if err := b.Fill(w, h, l); err != nil {
				return f.blame(b, err)
			}
			continue
		}
		if err := b.Index(w, f.block.Index[idx][at:end]); err != nil {
			return f.blame(b, err)
		}
		for i, l := range f.block.Index[idx][at:end] {
			if int(l) >= len(b.Names) || l < -1 {
				return &TermError{Term: b.name, Err: fmt.Errorf("%w: index %d in row %d, the term has %d columns", ErrTerm, l, w.First+i, len(b.Names))}
			}
		}
		if b.Value != nil {
			if err := b.Value(w, f.block.VHi[idx][at:end], f.block.VLo[idx][at:end]); err != nil {
				return f.blame(b, err)
			}
		}
		idx++
	}
	n := len(f.block.Hi) - 1 - len(f.offsets)
	copyField(w, f.y, f.block.Hi[n][at:], f.block.Lo[n][at:])
	for k, o := range f.offsets {
		copyField(w, o, f.block.Hi[n+1+k][at:], f.block.Lo[n+1+k][at:])
	}
	if f.w >= 0 {
		copy(f.block.Weight[at:end], w.Hi[f.w])
	}
	f.block.Rows = end
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
	yc := len(f.block.Hi) - 1 - len(f.offsets)
	for c := range f.block.Hi {
		if i := badValue(f.block.Hi[c][:n]); i >= 0 {
			return f.notFinite(c, yc, i)
		}
	}
	for k := range f.block.VHi {
		if f.block.VHi[k] == nil {
			continue
		}
		if i := badValue(f.block.VHi[k][:n]); i >= 0 {
			return f.notFinite(-1, yc, i)
		}
	}
	for i := range n {
		if a := math.Abs(f.block.Hi[yc][i]); a > f.maxY {
			f.maxY = a
		}
		if f.block.Lo[yc][i] != 0 {
			f.decimal = true
		}
	}
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
		k := min(c, yc) // offsets share the scale of the response
		shift := j.shift[k]
		if c > yc {
			shift = 0
		}
		toBasis(f.block.Hi[c][:n], f.block.Lo[c][:n], shift, j.exp[k])
	}
	return nil
}

func badValue(x []float64) int {
	var s float64
	for _, v := range x {
		s += v * 0
	}
	if s == 0 {
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
func toBasis(hi, lo []float64, shift float64, exp int) {
	if shift != 0 {
		for i, h := range hi {
			s, e := dd.TwoSum(h, -shift)
			hi[i], lo[i] = dd.QuickTwoSum(s, e+lo[i])
		}
	}
	if exp == 0 {
		return
	}
	if scale := math.Ldexp(1, -exp); exp > -1000 && exp < 1000 {
		for i := range hi {
			hi[i] *= scale
			lo[i] *= scale
		}
		return
	}
	for i := range hi {
		hi[i], lo[i] = math.Ldexp(hi[i], -exp), math.Ldexp(lo[i], -exp)
	}
}

// notFinite says which column of which row holds no number.
func (f *filler) notFinite(c, yc, i int) error {
	e := &ColumnError{Row: f.start + i, Err: ErrNotFinite}
	switch {
	case c < 0:
		e.Column = "covariate of a product"
	case c == yc:
		e.Column = f.j.response
	case c > yc:
		e.Column = f.j.offsets[c-yc-1]
	default:
		g := 0
		for g+1 < len(f.first) && f.first[g+1] <= c {
			g++
		}
		for !f.j.cols[g].dense() {
			g--
		}
		e.Column = f.j.cols[g].Names[c-f.first[g]]
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

// chooseBasis sets shift and scale from the first block: a provisional mean, and
// the power of two next to the largest distance from it.
func (f *filler) chooseBasis() {
	j, n := f.j, f.block.Rows
	yc := len(f.block.Hi) - 1 - len(f.offsets)
	j.shift, j.exp = make([]float64, yc+1), make([]int, yc+1)
	fixed := make([]bool, yc+1)
	for g, b := range j.cols {
		if !b.dense() {
			continue
		}
		c := f.first[g]
		if b.Key == "constant" {
			fixed[c] = true
		}
		if p := b.powers; p != nil {
			q := &powers{field: p.field, degree: p.degree}
			if j.shifted {
				q.centre = provisional(f.block.Hi[c][:n])
			}
			q.exp = spread(f.block.Hi[c][:n], q.centre)
			j.basis.powers[g] = q
			for k := range p.degree {
				fixed[c+k] = true
			}
			scale := math.Ldexp(1, -q.exp)
			for i := range n {
				u := dd.DD{Hi: f.block.Hi[c][i], Lo: f.block.Lo[c][i]}.AddF(-q.centre)
				u = dd.DD{Hi: u.Hi * scale, Lo: u.Lo * scale}
				x := u
				for k := range p.degree {
					if k > 0 {
						x = x.Mul(u)
					}
					f.block.Hi[c+k][i], f.block.Lo[c+k][i] = x.Hi, x.Lo
				}
			}
		}
	}
	for c := range yc + 1 {
		if fixed[c] {
			continue
		}
		x := f.block.Hi[c][:n]
		if j.shifted {
			// Far from zero x − shift is exact (Sterbenz 1974) and saves digits. Near
			// zero there are none to save, and x itself has no low part.
			if m := provisional(x); math.Abs(m) > 16*math.Ldexp(1, spread(x, m)) {
				j.shift[c] = m
			}
		}
		j.exp[c] = spread(x, j.shift[c])
	}
}

// provisional returns a value near the middle of x: any will do, a mean serves.
func provisional(x []float64) float64 {
	n := float64(len(x))
	var s float64
	for _, v := range x {
		s += v / n
	}
	// The nearest value that occurs is subtracted exactly from its like.
	best := x[0]
	for _, v := range x {
		if math.Abs(v-s) < math.Abs(best-s) {
			best = v
		}
	}
	return best
}

// spread returns the exponent of the largest distance from the centre.
func spread(x []float64, centre float64) int {
	m := 0.0
	for _, v := range x {
		if d := math.Abs(v/2 - centre/2); d > m {
			m = d
		}
	}
	if m == 0 {
		return 0
	}
	return math.Ilogb(m) + 1
}

// blocks passes over the rows in blocks of fixed bounds. The visitor owns the
// filler's block until it returns.
func (f *filler) blocks(ctx context.Context, visit func(f *filler) error) error {
	flush := func() error {
		if f.block.Rows == 0 {
			return nil
		}
		err := visit(f)
		f.block.Rows = 0
		return err
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
			from = to
			if f.block.Rows == linalg.BlockRows {
				if err := ctx.Err(); err != nil {
					return err
				}
				if err := flush(); err != nil {
					return err
				}
			}
		}
	}
	return flush()
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

// shape returns the groups of the joint's columns.
func (j *joint) shape() []linalg.Group {
	gs := make([]linalg.Group, len(j.cols))
	for i, b := range j.cols {
		if b.dense() {
			gs[i].Dense = len(b.Names)
		} else {
			gs[i].Levels, gs[i].Valued = len(b.Names), b.Value != nil
		}
	}
	return gs
}

// chunkRows is the number of rows that a worker takes at a time.
const chunkRows = 32 * linalg.BlockRows

// accumulate makes the pass that fills the Gram.
func (j *joint) accumulate(ctx context.Context) error {
	j.basis.powers = make([]*powers, len(j.cols))
	j.gram = linalg.NewGram(j.shape(), 1+len(j.offsets), j.opt.Weights.Kind == Precision)
	size := linalg.BlockRows
	sliced, ok := j.src.(Sliced)
	if ok {
		size = min(size, max(sliced.Len(), 1))
		if sliced.Len() > chunkRows && j.gram.Small() && j.workers() > 1 {
			return j.accumulateParallel(ctx, sliced)
		}
	}
	f, err := j.newFiller(size)
	if err != nil {
		return err
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
		}
		if err := f.finish(f.start == 0); err != nil {
			return err
		}
		trim(&f.block)
		part.Add(&f.block)
		restore(&f.block, f)
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

// trim hides low parts that are zero throughout the block, which saves half the work.
func trim(b *linalg.Block) {
	for c, lo := range b.Lo {
		zero := true
		for _, x := range lo[:b.Rows] {
			if x != 0 {
				zero = false
				break
			}
		}
		if zero {
			b.Lo[c] = nil
		}
	}
}

// restore gives hidden low parts back their (zero) storage.
func restore(b *linalg.Block, f *filler) {
	for c := range b.Lo {
		if b.Lo[c] == nil {
			if f.spare == nil {
				f.spare = make([][]float64, len(b.Lo))
			}
			if f.spare[c] == nil {
				f.spare[c] = make([]float64, len(b.Hi[c]))
			}
			b.Lo[c] = f.spare[c]
		}
	}
}

// accumulateParallel shares chunks of rows among workers and merges their sums in order.
func (j *joint) accumulateParallel(ctx context.Context, src Sliced) error {
	f, err := j.newFiller(linalg.BlockRows)
	if err != nil {
		return err
	}
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
		if fillers[i], err = j.newFiller(linalg.BlockRows); err != nil {
			return err
		}
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
	var w Window
	for at := c * chunkRows; at < min(src.Len(), (c+1)*chunkRows); at += linalg.BlockRows {
		if err := ctx.Err(); err != nil {
			return err
		}
		src.Slice(&w, at, min(linalg.BlockRows, src.Len()-at))
		f.block.Rows = 0
		if err := f.add(w); err != nil {
			return err
		}
		if err := f.finish(false); err != nil {
			return err
		}
		trim(&f.block)
		g.Add(&f.block)
		restore(&f.block, f)
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
