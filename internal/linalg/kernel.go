package linalg

import (
	"math"

	"subsume.example/internal/dd"
)

// vec is a vector of double-doubles, parts apart. lo may be nil for zeros.
type vec struct{ hi, lo []float64 }

func newVec(n int) vec {
	b := make([]float64, 2*n)
	return vec{b[:n:n], b[n:]}
}

func (v vec) at(i int) dd.DD {
	if v.lo == nil {
		return dd.DD{Hi: v.hi[i]}
	}
	return dd.DD{Hi: v.hi[i], Lo: v.lo[i]}
}

func (v vec) set(i int, x dd.DD) { v.hi[i], v.lo[i] = x.Hi, x.Lo }

// acc is a compensated sum: s carries the rounded sum and c what it lost.
type acc struct{ s, c float64 }

// add adds the product a·b of plain numbers.
func (t *acc) add(a, b float64) {
	p := float64(a * b)
	e := math.FMA(a, b, -p)
	s := t.s + p
	z := s - t.s
	t.c += (t.s - (s - z)) + (p - z) + e
	t.s = s
}

func (t acc) sum() dd.DD {
	s, e := dd.QuickTwoSum(t.s, t.c)
	return dd.DD{Hi: s, Lo: e}
}

// dot returns Σ a·b in twice the working precision (Ogita, Rump and Oishi 2005,
// algorithm 5.3), low parts included.
func dot(a, b vec, n int) dd.DD {
	var t, u acc
	ah, bh := a.hi[:n], b.hi[:n]
	i := 0
	for ; i+1 < n; i += 2 {
		t.add(ah[i], bh[i])
		u.add(ah[i+1], bh[i+1])
	}
	if i < n {
		t.add(ah[i], bh[i])
	}
	t.c += crossLow(a, b, n)
	return t.sum().Add(u.sum())
}

// crossLow returns Σ a.hi·b.lo + a.lo·b.hi, plain: it is of the order of the
// roundoff of the leading sum, and its own roundoff of the order of that squared.
func crossLow(a, b vec, n int) float64 {
	var x, y float64
	if b.lo != nil {
		bl, ah := b.lo[:n], a.hi[:n]
		for i, v := range bl {
			x = math.FMA(ah[i], v, x)
		}
	}
	if a.lo != nil {
		al, bh := a.lo[:n], b.hi[:n]
		for i, v := range al {
			y = math.FMA(v, bh[i], y)
		}
	}
	return x + y
}

// dot4 returns the dot products of a with four vectors at once: the loads of
// a are shared and the four chains overlap. Bits are those of dot1 on each.
func dot4(a, b0, b1, b2, b3 vec, n int) (r [4]dd.DD) {
	var t0, t1, t2, t3 acc
	ah, h0, h1, h2, h3 := a.hi[:n], b0.hi[:n], b1.hi[:n], b2.hi[:n], b3.hi[:n]
	for i, x := range ah {
		t0.add(x, h0[i])
		t1.add(x, h1[i])
		t2.add(x, h2[i])
		t3.add(x, h3[i])
	}
	if a.lo != nil || b0.lo != nil || b1.lo != nil || b2.lo != nil || b3.lo != nil {
		t0.c += crossLow(a, b0, n)
		t1.c += crossLow(a, b1, n)
		t2.c += crossLow(a, b2, n)
		t3.c += crossLow(a, b3, n)
	}
	return [4]dd.DD{t0.sum(), t1.sum(), t2.sum(), t3.sum()}
}

// dot1 is dot with one chain, the sums of dot4.
func dot1(a, b vec, n int) dd.DD {
	var t acc
	ah, bh := a.hi[:n], b.hi[:n]
	for i, x := range ah {
		t.add(x, bh[i])
	}
	t.c += crossLow(a, b, n)
	return t.sum()
}
