package glm

import (
	"fmt"

	"subsume.example/internal/linalg"
	"subsume.example/lrt"
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
		clear(lo[k]) // a term may have nothing to say below hi
	}
	if p := f.j.basis.powers[g]; p != nil {
		p.fill(w, hi, lo)
		return nil
	}
	if err := b.guarded(func() error { return b.Fill(w, hi, lo) }); err != nil {
		return b.blame(err)
	}
	for k := range n {
		if len(hi[k]) != end-at || len(lo[k]) != end-at || end > at && (&hi[k][0] != &f.block.Hi[c+k][at] || &lo[k][0] != &f.block.Lo[c+k][at]) {
			return &TermError{Term: b.name, Err: fmt.Errorf("%w: Fill must write into the slices it is given, not replace them", ErrTerm)}
		}
	}
	return nil
}

// guarded calls a function of a term; a panic becomes an error, for a pass may be
// made by goroutines that the caller cannot recover.
func (b *bound) guarded(call func() error) (err error) {
	defer func() {
		if r := recover(); r != nil {
			err = &TermError{Term: b.name, Err: fmt.Errorf("%w: %v", lrt.ErrPanic, r)}
		}
	}()
	return call()
}

// index asks a term for its non-zero column in each row.
func (f *filler) index(w Window, b *bound, idx, at, end int) error {
	to := f.block.Index[idx][at:end]
	if err := b.guarded(func() error { return b.Index(w, to) }); err != nil {
		return b.blame(err)
	}
	for i, l := range to {
		if int(l) >= len(b.Names) || l < -1 {
			return &TermError{Term: b.name, Err: fmt.Errorf("%w: index %d in row %d, the term has %d columns", ErrTerm, l, w.First+i, len(b.Names))}
		}
	}
	if b.Value == nil {
		return nil
	}
	hi, lo := f.block.VHi[idx][at:end], f.block.VLo[idx][at:end]
	clear(lo)
	if err := b.guarded(func() error { return b.Value(w, hi, lo) }); err != nil {
		return b.blame(err)
	}
	return nil
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
