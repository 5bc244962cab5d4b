package lrt

import (
	"fmt"
	"math"
)

// coordinates parametrise the free directions of a frame by m unconstrained
// numbers u: x = origin + basis·z, z_j = link_j(u_j), where z are the columns
// that lead no equation. A parameter that depends on one z alone passes its
// range to the link of that z; the range of a parameter that depends on
// several is a wall, beyond which the log likelihood counts as −∞.
type coordinates struct {
	f      *frame
	m      int
	free   []int       // parameter behind each z
	origin []float64   // p
	basis  [][]float64 // p rows of m
	single []int       // the only z that a parameter depends on, −1: none or several
	links  []link
	walls  []int
	lo, hi []float64 // the ranges in force, by parameter
	z, dz  []float64 // scratch
}

// coordOptions say what is held beyond the frame's equations.
type coordOptions struct {
	eq        *echelon // instead of the frame's own: some bounds made equations
	useBounds bool     // imposed bounds count as ranges
}

func newCoordinates(f *frame, opt *coordOptions) (*coordinates, error) {
	eq := f.eq
	if opt != nil && opt.eq != nil {
		eq = *opt.eq
	}
	p := len(f.params)
	c := &coordinates{f: f, origin: make([]float64, p), single: make([]int, p), lo: make([]float64, p), hi: make([]float64, p)}
	leads := make([]int, p)
	for j := range leads {
		leads[j] = -1
	}
	for i, l := range eq.lead {
		leads[l] = i
	}
	column := make([]int, p)
	for j := range column {
		column[j] = -1
		if leads[j] < 0 {
			column[j] = len(c.free)
			c.free = append(c.free, j)
		}
	}
	c.m = len(c.free)
	zlo, zhi := make([]float64, c.m), make([]float64, c.m)
	for j := range zlo {
		zlo[j], zhi[j] = -inf, inf
	}
	for k := range p {
		b := make([]float64, c.m)
		if i := leads[k]; i >= 0 {
			c.origin[k] = eq.rhs[i]
			for j, v := range eq.rows[i] {
				if j != k && v != 0 {
					b[column[j]] = -v
				}
			}
		} else {
			b[column[k]] = 1
		}
		c.basis = append(c.basis, b)
		lo, hi := f.params[k].Lower, f.params[k].Upper
		if f.lower != nil && opt != nil && opt.useBounds {
			lo, hi = math.Max(lo, f.lower[k]), math.Min(hi, f.upper[k])
		}
		c.lo[k], c.hi[k] = lo, hi
		n, only := 0, -1
		for j, v := range b {
			if v != 0 {
				n++
				only = j
			}
		}
		c.single[k] = -1
		switch {
		case n == 0:
			elo, ehi := lo, hi
			if f.lower != nil {
				elo, ehi = math.Max(lo, f.lower[k]), math.Min(hi, f.upper[k])
			}
			slack := 1e-12 * math.Abs(c.origin[k])
			if c.origin[k] < elo-slack || c.origin[k] > ehi+slack {
				return nil, &RestrictionError{f.said(), fmt.Errorf("%w: it makes %s = %g, outside [%g, %g]", ErrContradiction, f.params[k].Name, c.origin[k], elo, ehi)}
			}
			c.origin[k] = math.Min(math.Max(c.origin[k], elo), ehi)
		case n == 1:
			c.single[k] = only
			l, h := (lo-c.origin[k])/b[only], (hi-c.origin[k])/b[only]
			if l > h {
				l, h = h, l
			}
			zlo[only], zhi[only] = math.Max(zlo[only], l), math.Min(zhi[only], h)
		case !math.IsInf(lo, -1) || !math.IsInf(hi, 1):
			c.walls = append(c.walls, k)
		}
		if rl, rh := f.reach(k); n > 0 && rl > rh+1e-12*math.Abs(rh) {
			return nil, &RestrictionError{f.said(), fmt.Errorf("%w: nothing is left of the range of %s", ErrContradiction, f.params[k].Name)}
		}
	}
	for j := range zlo {
		if zlo[j] < zhi[j] {
			c.links = append(c.links, linkFor(zlo[j], zhi[j]))
			continue
		}
		if zlo[j]-zhi[j] > 1e-12*math.Abs(zhi[j]) {
			return nil, &RestrictionError{f.said(), fmt.Errorf("%w: nothing is left of the range of %s", ErrContradiction, f.params[c.free[j]].Name)}
		}
		one := make([]float64, p) // one point is left: an equation
		one[c.free[j]] = 1
		pinned, st := eq.add(one, zlo[j])
		if st != independent {
			return nil, &RestrictionError{f.said(), ErrContradiction}
		}
		o := coordOptions{eq: &pinned}
		if opt != nil {
			o.useBounds = opt.useBounds
		}
		return newCoordinates(f, &o)
	}
	c.z, c.dz = make([]float64, c.m), make([]float64, c.m)
	return c, nil
}

// point fills the parameters x at u and reports whether they are finite and
// inside their ranges. It leaves z and its slopes in c.
func (c *coordinates) point(u, x []float64) bool {
	for j, l := range c.links {
		c.z[j], c.dz[j] = l.to(u[j])
	}
	for k, b := range c.basis {
		v := c.origin[k]
		if j := c.single[k]; j >= 0 {
			v += b[j] * c.z[j]
			if v < c.lo[k] || v > c.hi[k] {
				if c.links[j].kind == linkIdentity {
					return false
				}
				v = math.Min(math.Max(v, c.lo[k]), c.hi[k]) // rounding
			}
		} else {
			for j, w := range b {
				if w != 0 {
					v += w * c.z[j]
				}
			}
		}
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
		x[k] = v
	}
	for _, k := range c.walls {
		if x[k] < c.lo[k] || x[k] > c.hi[k] {
			return false
		}
	}
	return true
}

// nearest returns the u whose parameters are closest to x in least squares,
// moved inside the ranges.
func (c *coordinates) nearest(x []float64) []float64 {
	u := make([]float64, c.m)
	if c.m == 0 {
		return u
	}
	g := make([]float64, c.m*c.m)
	r := make([]float64, c.m)
	for k, b := range c.basis {
		d := x[k] - c.origin[k]
		for i, v := range b {
			if v == 0 {
				continue
			}
			r[i] += v * d
			for j, w := range b {
				g[i*c.m+j] += v * w
			}
		}
	}
	if cholesky(g, c.m) {
		choleskySolve(g, c.m, r)
	}
	for j := range u {
		u[j] = c.links[j].from(r[j])
	}
	return u
}

// names lists the parameters that move with coordinate j.
func (c *coordinates) names(j int) []string {
	var names []string
	for k, b := range c.basis {
		if b[j] != 0 {
			names = append(names, c.f.params[k].Name)
		}
	}
	return names
}
