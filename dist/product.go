package dist

import (
	"math"

	"subsume.example/internal/special"
)

// productGroup is count normal values Zᵢ = λ Z₀ + √(1-λ²) Eᵢ with the common Z₀,
// so that two values correlate by the product of their λ, and the limits
// lower*w < Zᵢ <= upper*w at scale w.
type productGroup struct {
	lambda, rest, slope float64 // λ, √(1-λ²), λ/√(1-λ²)
	lower, upper        float64
	count               float64
}

func newProductGroup(lambda, lower, upper, count float64) productGroup {
	rest := math.Sqrt((1 - lambda) * (1 + lambda))
	return productGroup{lambda, rest, lambda / rest, lower, upper, count}
}

// product holds groups and the steps of the inner integral over Z₀.
type product struct {
	groups    []productGroup
	symmetric bool    // lower = -upper everywhere: the integrand is even
	step      float64 // resolves the sharpest transition
	sharp     float64 // resolves the smallest width the inside can have
	apart     float64 // beyond it no two values are outside together
}

func newProduct(groups []productGroup) product {
	p := product{groups: groups, symmetric: true}
	n, slope, info, top := 0.0, 0.0, 1.0, 0.0
	for _, g := range groups {
		n += g.count
		top = math.Max(top, math.Abs(g.lambda))
		slope = math.Max(slope, math.Abs(g.slope))
		info += g.count * g.slope * g.slope
		p.symmetric = p.symmetric && g.lower == -g.upper
	}
	// n transitions in a row have the Gumbel shape of rate b in their own scale.
	b := 1.0
	if n > 1 {
		b = math.Max(1, special.NormalUpperQuantile(1/n)+0.35)
	}
	p.step = 0.43 / math.Sqrt(1+b*b*slope*slope)
	p.sharp = 0.7 / math.Sqrt(info)
	// P(Zᵢ > x, Zⱼ > x)/P(Zᵢ > x) falls like exp(-x²/2 (1-ρ)/(1+ρ)).
	p.apart = math.Sqrt((1 + top*top) / ((1 - top) * (1 + top)) * (90 + 4*math.Log(n)))
	return p
}

// scaled is w times a unit limit, infinite limits staying so.
func scaled(limit, w float64) float64 {
	if math.IsInf(limit, 0) {
		return limit
	}
	return limit * w
}

// node returns, given Z₀ = z, the logs of the probabilities that all values lie
// inside and that some lie outside, each without cancellation, and the
// derivative of the first with respect to w if asked for.
func (p *product) node(w, z float64, derivative bool) (in, out, slope float64) {
	sum, missed := 0.0, 0.0
	deep := math.Inf(-1) // log of the sum of tails, when they underflow
	for i := range p.groups {
		g := &p.groups[i]
		t := g.slope * z
		a, b := scaled(g.upper, w)/g.rest-t, scaled(g.lower, w)/g.rest-t
		q := 0.0
		if !math.IsInf(a, 1) {
			q = special.NormalUpper(a)
		}
		if !math.IsInf(b, -1) {
			q += special.NormalLower(b)
		}
		var l float64
		switch {
		case q < 0.5:
			l = math.Log1p(-q)
		case a-b < 1: // its width from the limits themselves, which may be tiny beside t
			l = special.NormalAround(0.5*(g.upper+g.lower)*w/g.rest-t, 0.5*(g.upper-g.lower)*w/g.rest)
		default:
			l = logInterval(b, a)
		}
		sum += g.count * l
		missed += g.count * q
		if missed < 1e-290 {
			m := math.Log(g.count) + math.Max(special.NormalLogUpper(a), special.NormalLogLower(b))
			if math.IsInf(m, -1) {
				// no limit within reach
			} else if m > deep {
				deep = m + math.Log1p(math.Exp(deep-m))
			} else {
				deep += math.Log1p(math.Exp(m - deep))
			}
		}
		if derivative {
			// φ(limit)/P(inside), from logs since both may underflow.
			d := 0.0
			if !math.IsInf(a, 1) {
				d = g.upper * math.Exp(special.NormalLogDensity(a)-l)
			}
			if !math.IsInf(b, -1) {
				d -= g.lower * math.Exp(special.NormalLogDensity(b)-l)
			}
			slope += g.count * d / g.rest
		}
	}
	switch {
	case missed < 1e-290:
		out = deep
	case sum > -1e-17:
		out = math.Log(missed)
	default:
		out = math.Log(-math.Expm1(sum))
	}
	return sum, out, slope
}

// scaledSum adds exponentials, the even and the odd ones apart, relative to
// the largest so far.
type scaledSum struct {
	ref float64
	acc [2]float64
}

func (s *scaledSum) add(i int, l, factor float64) (relative float64) {
	if l > s.ref {
		c := math.Exp(s.ref - l)
		s.acc[0] *= c
		s.acc[1] *= c
		s.ref = l
	}
	x := math.Exp(l-s.ref) * factor
	s.acc[i&1] += x
	return x
}

func (s *scaledSum) total() float64 { return s.acc[0] + s.acc[1] }

// agree reports whether the two halves differ by what their mean can bear:
// its error is about the square of the difference.
func (s *scaledSum) agree() bool {
	return math.Abs(s.acc[0]-s.acc[1]) <= 1e-6*s.total()
}

// inside returns P(all inside) and, if asked for, its derivative in w. The
// integrand is log-concave (Prékopa 1973): it is summed outwards from its mode, with a
// step from its curvature there.
func (p *product) inside(w float64, derivative bool) (in, slope tail) {
	f := func(z float64) float64 {
		l, _, _ := p.node(w, z, false)
		return l - 0.5*z*z
	}
	mode := 0.0
	top := f(0)
	if !p.symmetric {
		h := 2.0
		for n := 0; n < 300 && h > 0.1 && h < 1e9; n++ {
			switch l, r := f(mode-h), f(mode+h); {
			case l > top && l >= r:
				mode, top = mode-h, l
				h *= 2
			case r > top:
				mode, top = mode+h, r
				h *= 2
			case math.IsInf(top, -1):
				h *= 2
			default:
				h *= 0.5
			}
		}
	}
	if math.IsInf(top, -1) {
		return tail{}, tail{}
	}
	d := p.sharp
	h := p.step
	if c := (2*top - f(mode-d) - f(mode+d)) / (d * d); c > 0 {
		h = math.Min(h, 0.7/math.Sqrt(c))
	}
	for try := 0; ; try++ {
		s := scaledSum{ref: top}
		t := scaledSum{ref: top}
		for dir := 1; dir >= -1; dir -= 2 {
			for i := (1 - dir) / 2 * dir; i < 40000 && i > -40000; i += dir {
				z := mode + h*float64(i)
				l, _, e := p.node(w, z, derivative)
				l -= 0.5 * z * z
				factor := 1.0
				if p.symmetric && i == 0 {
					factor = 0.5
				}
				x := s.add(i, l, factor)
				y := 0.0
				if derivative && e != 0 {
					y = math.Abs(t.add(i, l, e*factor))
				}
				if x < 1e-17*s.total() && y <= 1e-17*math.Abs(t.total()) {
					break
				}
			}
			if p.symmetric {
				break
			}
		}
		even := s
		if p.symmetric { // the half lattice: double the rest, half of node 0 is in
			h2 := 2 * h
			in, slope = tail{s.total() * h2 * 0.3989422804014327, s.ref}, tail{t.total() * h2 * 0.3989422804014327, t.ref}
		} else {
			in, slope = tail{s.total() * h * 0.3989422804014327, s.ref}, tail{t.total() * h * 0.3989422804014327, t.ref}
		}
		if even.agree() || try == 4 {
			return in, slope
		}
		h *= 0.5
	}
}

// reach is how far from its centre a normal integrand is followed.
const reach = 9.3

// outside returns P(some outside) and, if asked for, the derivative of P(all
// inside). Given that Zᵢ is beyond its limit, Z₀ is near λ times that limit: the lattice is
// summed over the union of intervals around those centres. Far out, where no
// two values are outside together, it is the sum of their tails.
func (p *product) outside(w float64, derivative bool) (out, slope tail) {
	if p.nearest(w) > p.apart {
		return p.sumOfTails(w)
	}
	h := p.step
	for try := 0; ; try++ {
		s := scaledSum{ref: math.Inf(-1)}
		t := scaledSum{ref: math.Inf(-1)}
		z := math.Inf(-1)
		if p.symmetric {
			z = 0
		}
		i := 0
		for count := 0; count < 200000; count++ {
			var ok bool
			if z, ok = p.next(w, z); !ok {
				break
			}
			i = int(math.Ceil(z/h - 1e-9))
			z = h * float64(i)
			in, l, e := p.node(w, z, derivative)
			factor := 1.0
			if p.symmetric && i == 0 {
				factor = 0.5
			}
			if l > math.Inf(-1) {
				s.add(i, l-0.5*z*z, factor)
			}
			if e != 0 && in > math.Inf(-1) {
				t.add(i, in-0.5*z*z, e*factor)
			}
			z = h * (float64(i) + 1)
		}
		if p.symmetric {
			s.acc[0], s.acc[1] = 2*s.acc[0], 2*s.acc[1]
			t.acc[0], t.acc[1] = 2*t.acc[0], 2*t.acc[1]
		}
		if s.agree() || try == 4 {
			out, slope = tail{s.total() * h * 0.3989422804014327, s.ref}, tail{t.total() * h * 0.3989422804014327, t.ref}
			if s.total() == 0 {
				out = tail{}
			}
			if t.total() == 0 {
				slope = tail{}
			}
			return out, slope
		}
		h *= 0.5
	}
}

// nearest returns the distance from 0 to the nearest limit, negative when 0 is
// not inside.
func (p *product) nearest(w float64) float64 {
	d := math.Inf(1)
	for i := range p.groups {
		d = math.Min(d, math.Min(scaled(p.groups[i].upper, w), -scaled(p.groups[i].lower, w)))
	}
	return d
}

func (p *product) sumOfTails(w float64) (out, slope tail) {
	s, t := scaledSum{ref: math.Inf(-1)}, scaledSum{ref: math.Inf(-1)}
	for i := range p.groups {
		g := &p.groups[i]
		for _, limit := range [2]float64{g.upper, -g.lower} {
			if x := scaled(limit, w); x < 1e154 {
				s.add(0, special.NormalLogUpper(x), g.count)
				t.add(0, special.NormalLogDensity(x), g.count*limit)
			}
		}
	}
	if s.total() == 0 {
		return tail{}, tail{}
	}
	return tail{s.total(), s.ref}, tail{t.total(), t.ref}
}

// next returns the first point from z on that lies in an interval, ok = false
// beyond the last.
func (p *product) next(w, z float64) (at float64, ok bool) {
	at = math.Inf(1)
	for i := range p.groups {
		g := &p.groups[i]
		for side := range 2 {
			c := 0.0
			if side == 0 {
				if math.IsInf(g.upper, 1) {
					continue
				}
				c = g.lambda * math.Max(0, scaled(g.upper, w))
			} else {
				if math.IsInf(g.lower, -1) {
					continue
				}
				c = g.lambda * math.Min(0, scaled(g.lower, w))
			}
			lo, hi := c-reach, c+reach
			if z <= hi {
				at = math.Min(at, math.Max(z, lo))
			}
		}
	}
	return at, !math.IsInf(at, 1)
}
