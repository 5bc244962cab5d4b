package lrt

import "math"

// weibullShape returns the shape of largest likelihood that the groups share, each
// with its own scale, and the scales: the root of
//
//	Σ_g (n/c + Σ log x − n Σ x^c log x / Σ x^c),
//
// which falls with c, by Newton's method within a bracket. The logarithms are taken
// about the largest of each group, so that no power overflows whatever the
// scales. It reports false where all values of each group are equal.
func weibullShape(s Samples) (shape float64, scales []float64, ok bool) {
	all, spread := 0.0, false
	logs, top := make([][]float64, len(s)), make([]float64, len(s))
	for g, x := range s {
		big := x[0]
		for _, v := range x {
			big = math.Max(big, v)
		}
		top[g] = big
		for _, v := range x {
			// near the top by log1p: nearly equal values have a large shape
			z := math.Log(v / big)
			if v > 0.5*big {
				z = math.Log1p((v - big) / big)
			}
			logs[g] = append(logs[g], z)
			all += z
			spread = spread || v != big
		}
	}
	if !spread || math.IsInf(all, 0) {
		return 0, nil, false
	}
	score := func(c float64) (f, slope float64) {
		f = all
		for _, z := range logs {
			n := float64(len(z))
			var w0, w1, w2 float64
			for _, v := range z {
				w := math.Exp(c * v)
				w0, w1, w2 = w0+w, w1+w*v, w2+w*v*v
			}
			mean := w1 / w0
			f += n * (1/c - mean)
			slope -= n * (1/(c*c) + math.Max(0, w2/w0-mean*mean))
		}
		return f, slope
	}
	n := 0.0
	for _, z := range logs {
		n += float64(len(z))
	}
	// At c = −N/Σz the sum is not below zero, for no mean is above it.
	lo, hi := -n/all, inf
	c := lo
	for range 200 {
		f, slope := score(c)
		if f >= 0 {
			lo = c
		} else {
			hi = c
		}
		next := c - f/slope
		if math.IsInf(hi, 1) {
			next = math.Min(next, 8*c)
		}
		if !(next > lo && next < hi) {
			next = 0.5 * (lo + math.Min(hi, 4*lo))
		}
		if math.Abs(next-c) <= 4*epsilon*c {
			c = next
			break
		}
		c = next
	}
	for g, z := range logs {
		w := 0.0
		for _, v := range z {
			w += math.Exp(c * v)
		}
		scales = append(scales, top[g]*math.Pow(w/float64(len(z)), 1/c))
	}
	return c, scales, true
}

// weibullSolved solves the spaces in which each group has its own law, all share
// the shape, or all share shape and scale.
func weibullSolved(s Samples, r *Declared) ([]float64, bool) {
	k := len(s)
	if r.frame.layer != nil || r.frame.lower != nil || len(r.frame.params) != 2*k {
		return nil, false
	}
	th := make([]float64, 2*k)
	fill := func(g int, c, b float64) { th[g], th[k+g] = c, b }
	switch shapes := equalBlock(r, "shape", k); {
	case r.Free() == 2*k:
		for g, x := range s {
			c, b, ok := weibullShape(Samples{x})
			if !ok {
				return nil, false // the fit says what is unbounded
			}
			fill(g, c, b[0])
		}
		return th, true
	case shapes && r.Free() == k+1 && !(k == 1):
		c, b, ok := weibullShape(s)
		for g := range b {
			fill(g, c, b[g])
		}
		return th, ok
	case shapes && r.Free() == 2 && equalBlock(r, "scale", k):
		var pooled []float64
		for _, x := range s {
			pooled = append(pooled, x...)
		}
		c, b, ok := weibullShape(Samples{pooled})
		for g := range k {
			if ok {
				fill(g, c, b[0])
			}
		}
		return th, ok
	}
	return nil, false
}
