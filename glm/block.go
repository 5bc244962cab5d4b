package glm

import (
	"fmt"
	"math"

	"subsume.example/internal/dd"
)

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
			return f.notFiniteValue(k, i)
		}
	}
	maxY := f.maxY
	for _, col := range f.block.Hi[f.yc:] { // an offset may be larger than the response
		for _, y := range col[:n] {
			if y = math.Abs(y); y > maxY {
				maxY = y
			}
		}
	}
	f.maxY = maxY
	f.decimal = f.decimal || f.block.Lo[f.yc] != nil
	f.rows += n
	if f.block.Weight == nil {
		f.n += float64(n)
		f.sumW += float64(n)
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
	f.rescaleValues()
	return nil
}

// rescaleValues brings the values of index groups to their scale.
func (f *filler) rescaleValues() {
	if f.j.scales == nil {
		return
	}
	idx := 0
	for g, b := range f.j.cols {
		if b.dense() {
			continue
		}
		if e := f.j.scales[g]; e != 0 {
			rescale(f.block.VHi[idx][:f.block.Rows], e)
			rescale(f.block.VLo[idx][:f.block.Rows], e)
		}
		idx++
	}
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
	rescale(hi, exp)
	if f.block.Lo[c] != nil {
		rescale(f.block.Lo[c][:n], exp)
	}
}

// rescale divides by 2^exp.
func rescale(x []float64, exp int) {
	if scale := math.Ldexp(1, -exp); exp > -1000 && exp < 1000 {
		for i := range x {
			x[i] *= scale
		}
		return
	}
	for i := range x {
		x[i] = math.Ldexp(x[i], -exp)
	}
}

// notFinite says which column of which row holds no number.
func (f *filler) notFinite(c, i int) error {
	e := &ColumnError{Row: f.start + i, Err: ErrNotFinite}
	switch {
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
	if math.IsNaN(f.block.Hi[c][i]) {
		e.Err = errMissingRow
	}
	return e
}

// notFiniteValue says which covariate of a product holds no number.
func (f *filler) notFiniteValue(idx, i int) error {
	e := &ColumnError{Row: f.start + i, Err: ErrNotFinite}
	if math.IsNaN(f.block.VHi[idx][i]) {
		e.Err = errMissingRow
	}
	for _, b := range f.j.cols {
		if b.dense() {
			continue
		}
		if idx == 0 {
			if e.Column = b.name; len(b.numeric) == 1 {
				e.Column = b.numeric[0]
			}
			break
		}
		idx--
	}
	return e
}

func (f *filler) weigh() error {
	for i, w := range f.block.Weight[:f.block.Rows] {
		bad := ""
		switch {
		case math.IsNaN(w):
			return &ColumnError{Column: f.j.opt.Weights.Field, Row: f.start + i, Err: errMissingRow}
		case w < 0:
			bad = "negative"
		case w > 0x1p53 && f.j.opt.Weights.Kind == Frequency:
			bad = "a frequency must be at most 2^53"
		case w > 0x1p400 || w < 0x1p-400 && w > 0:
			bad = "outside 2^-400 to 2^400: multiply all weights by one power of two"
		case f.j.opt.Weights.Kind == Frequency && w != math.Trunc(w):
			bad = "a frequency must be a whole number"
		}
		if bad != "" {
			return &ColumnError{Column: f.j.opt.Weights.Field, Row: f.start + i, Text: fmt.Sprint(w), Err: fmt.Errorf("%w: %s", ErrWeight, bad)}
		}
		f.sumW += w
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
