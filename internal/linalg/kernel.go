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

// lanes are four compensated sums; element i of a dot product goes to sum i mod 4,
// whichever kernel adds it, so that all kernels give the same bits.
type lanes struct{ s, c [4]float64 }

// sum adds the four up.
func (l *lanes) sum() dd.DD {
	s, e := dd.TwoSum(l.s[0], l.s[1])
	t, f := dd.TwoSum(l.s[2], l.s[3])
	u, g := dd.TwoSum(s, t)
	return dd.Sum(u, ((l.c[0]+l.c[1])+(l.c[2]+l.c[3]))+((e+f)+g))
}

// addFrom adds elements from..n−1 one by one.
func (l *lanes) addFrom(a, b []float64, from int) {
	for i := from; i < len(a); i++ {
		k := i & 3
		t := acc{l.s[k], l.c[k]}
		t.add(a[i], b[i])
		l.s[k], l.c[k] = t.s, t.c
	}
}

// dot returns Σ a·b of n elements in twice the working precision (Ogita, Rump and
// Oishi 2005, algorithm 5.3), low parts included.
func dot(a, b vec, n int) dd.DD {
	var l lanes
	ah, bh := a.hi[:n], b.hi[:n]
	l.addFrom(ah, bh, lanesOf(ah, bh, &l))
	if a.lo != nil || b.lo != nil {
		l.c[0] += crossLow(a, b, n)
	}
	return l.sum()
}

// dot4 returns the dot products of a with four vectors; the bits are those of dot.
func dot4(a, b0, b1, b2, b3 vec, n int) (r [4]dd.DD) {
	var l [4]lanes
	ah, h0, h1, h2, h3 := a.hi[:n], b0.hi[:n], b1.hi[:n], b2.hi[:n], b3.hi[:n]
	from := lanesOf4(ah, h0, h1, h2, h3, &l)
	if from < n {
		l[0].addFrom(ah, h0, from)
		l[1].addFrom(ah, h1, from)
		l[2].addFrom(ah, h2, from)
		l[3].addFrom(ah, h3, from)
	}
	if a.lo != nil || b0.lo != nil || b1.lo != nil || b2.lo != nil || b3.lo != nil {
		l[0].c[0] += crossLow(a, b0, n)
		l[1].c[0] += crossLow(a, b1, n)
		l[2].c[0] += crossLow(a, b2, n)
		l[3].c[0] += crossLow(a, b3, n)
	}
	for k := range r {
		r[k] = l[k].sum()
	}
	return r
}

// crossLow returns Σ a.hi·b.lo + a.lo·b.hi, plain: it is of the order of the
// roundoff of the leading sum, and its own roundoff of the order of that squared.
func crossLow(a, b vec, n int) float64 {
	var l [4]float64
	if b.lo != nil {
		sumOf(a.hi[:n], b.lo[:n], &l)
	}
	if a.lo != nil {
		sumOf(a.lo[:n], b.hi[:n], &l)
	}
	return (l[0] + l[1]) + (l[2] + l[3])
}

// sumOf adds the products to four plain sums, element i to sum i mod 4.
func sumOf(a, b []float64, l *[4]float64) {
	for i := sumsOf(a, b, l); i < len(a); i++ {
		l[i&3] = math.FMA(a[i], b[i], l[i&3])
	}
}
