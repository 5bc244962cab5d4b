package glm

import (
	"math"

	"subsume.example/internal/dd"
)

// chooseBasis sets shift and scale from the first block: a value that occurs where
// all are far from zero, and a power of two where they are far from one.
func (f *filler) chooseBasis() {
	j, n := f.j, f.block.Rows
	j.shift, j.exp = append(j.shift[:0], make([]float64, f.yc+1)...), append(j.exp[:0], make([]int, f.yc+1)...)
	idx := 0
	for g, b := range j.cols {
		switch c := f.first[g]; {
		case !b.dense():
			if v := f.block.VHi[idx]; v != nil {
				f.chooseScale(g, v[:n])
			}
			idx++
		case b.Key == "constant":
		case b.powers != nil:
			f.choosePowers(g)
		default:
			for k := range b.Names {
				j.shift[c+k], j.exp[c+k] = j.centre(f.weighty(f.block.Hi[c+k][:n]))
			}
		}
	}
	j.shift[f.yc], j.exp[f.yc] = j.centre(f.weighty(f.block.Hi[f.yc][:n]))
	for _, offset := range f.block.Hi[f.yc+1:] {
		lower, upper := extremes(f.weighty(offset[:n]))
		if e := reach(lower, upper, 0); e > j.exp[f.yc] && (e >= 64 || j.exp[f.yc] <= -64) {
			j.exp[f.yc] = e
		}
	}
}

// chooseScale sets the scale of the values of an index group.
func (f *filler) chooseScale(g int, x []float64) {
	lower, upper := extremes(f.weighty(x))
	e := reach(lower, upper, 0)
	if e > -64 && e < 64 {
		return
	}
	if f.j.scales == nil {
		f.j.scales = make(map[int]int)
	}
	f.j.scales[g] = e
}

// weighty returns the values in rows of the first block whose weight is not 0; all where none is.
func (f *filler) weighty(x []float64) []float64 {
	if f.block.Weight == nil || f.zero == 0 || f.zero == len(x) {
		return x
	}
	var some []float64
	for i, w := range f.block.Weight[:len(x)] {
		if w != 0 {
			some = append(some, x[i])
		}
	}
	return some
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
	lower, upper := extremes(f.weighty(x))
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
