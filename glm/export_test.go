package glm

import (
	"context"
	"errors"

	"subsume.example/lrt"
)

// CertifyByCoordinates takes the decision of a certificate without its short
// cuts: every identity is computed.
func CertifyByCoordinates(c lrt.Comparison) (*lrt.Certificate, error) {
	cs, err := Join(context.Background(), c)
	if err != nil {
		return nil, err
	}
	c = cs[0]
	j := c.Full.(*Model).joint
	var vs [2]*view
	for i, m := range []lrt.Space{c.Restricted, c.Full} {
		if vs[i], err = j.space(m.(*Model)); err != nil {
			return nil, err
		}
	}
	e0, e1, err := j.errorPair(c, &lrt.Linear{}, vs[0], vs[1])
	if err != nil {
		return nil, err
	}
	k := &certificate{j: j, c: c, s: vs[0], b: vs[1], e0: e0, e1: e1, out: &lrt.Certificate{Exact: true, C: []float64{1}}}
	if err := errors.Join(k.numerator(), k.denominator()); err != nil {
		return nil, err
	}
	known := j.opt.KnownVariance > 0
	if !known {
		k.check("numerator", "Pn Pd = 0", k.qn.Overlap(k.qd))
	}
	if c.Effects == nil {
		return k.out, nil
	}
	overlap := func(s lrt.Space, numerator bool) float64 {
		v, err := j.space(s.(*Model))
		if err != nil {
			panic(err)
		}
		u, err := j.subspace(k.co, v)
		if err != nil {
			panic(err)
		}
		if numerator {
			return k.qn.Overlap(u)
		}
		return k.qd.Overlap(u)
	}
	if s := c.Effects.Fixed; s != nil && !known {
		k.check("error", "Pd M1 = 0", overlap(s, false))
	}
	if s := c.Effects.NullFixed; s != nil {
		k.check("numerator", "Pn M0 = 0", overlap(s, true))
	}
	for _, r := range c.Effects.Random {
		z, err := j.space(r.Space.(*Model))
		if err != nil {
			return nil, err
		}
		if err := k.byCoordinates(r, z, known); err != nil {
			return nil, err
		}
	}
	return k.out, nil
}
