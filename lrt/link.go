package lrt

import "math"

// link carries one coordinate from the whole line, where fits work, to its range.
type link struct {
	kind   linkKind
	lo, hi float64
}

type linkKind uint8

const (
	linkIdentity linkKind = iota
	linkAbove             // lo + exp(u)
	linkBelow             // hi − exp(u)
	linkBetween           // lo + (hi − lo)/(1 + exp(−u))
)

func linkFor(lo, hi float64) link {
	l, h := math.IsInf(lo, -1), math.IsInf(hi, 1)
	switch {
	case l && h:
		return link{linkIdentity, lo, hi}
	case h:
		return link{linkAbove, lo, hi}
	case l:
		return link{linkBelow, lo, hi}
	}
	return link{linkBetween, lo, hi}
}

// to returns z(u) and its first derivative.
func (l link) to(u float64) (z, slope float64) {
	switch l.kind {
	case linkAbove:
		e := math.Exp(u)
		return l.lo + e, e
	case linkBelow:
		e := math.Exp(u)
		return l.hi - e, -e
	case linkBetween:
		w := l.hi - l.lo
		if u < 0 {
			e := math.Exp(u)
			return l.lo + w*(e/(1+e)), w * e / (1 + e) / (1 + e)
		}
		e := math.Exp(-u)
		return l.hi - w*(e/(1+e)), w * e / (1 + e) / (1 + e)
	}
	return u, 1
}

// bend returns the second derivative of z(u).
func (l link) bend(u float64) float64 {
	switch l.kind {
	case linkAbove:
		return math.Exp(u)
	case linkBelow:
		return -math.Exp(u)
	case linkBetween:
		_, s := l.to(u)
		return -s * math.Tanh(u/2)
	}
	return 0
}

// from returns u(z), for z moved inside the range when it lies on its edge or
// outside.
func (l link) from(z float64) float64 {
	switch l.kind {
	case linkAbove:
		return math.Log(inner(z-l.lo, math.Abs(l.lo)))
	case linkBelow:
		return math.Log(inner(l.hi-z, math.Abs(l.hi)))
	case linkBetween:
		t := (z - l.lo) / (l.hi - l.lo)
		t = math.Min(math.Max(t, 1e-3), 1-1e-3)
		if s := (z - l.lo) / (l.hi - l.lo); s > 0 && s < 1 {
			t = s
		}
		return math.Log(t / (1 - t))
	}
	return z
}

func inner(d, size float64) float64 {
	if d > 0 && !math.IsInf(d, 1) {
		return d
	}
	if size > 0 {
		return 0.01 * size
	}
	return 1
}

// inside returns a value well inside the range near z, which is outside it or no number.
func (l link) inside(z float64) float64 {
	if math.IsNaN(z) || math.IsInf(z, 0) {
		z = 0
	}
	v, _ := l.to(l.from(z))
	return v
}
