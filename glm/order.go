package glm

import (
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/linalg"
)

// termOrder brings the coefficients of a fit whose largest factor was eliminated
// first to the rule of every fit: among columns that span each other the last in
// the order of the terms is the one with coefficient zero.
type termOrder struct {
	null []linalg.Vec // one for each column set aside: 1 there, 0 at the others set aside
	last []int        // that column
}

// maxNull bounds the size of a null space that is formed.
const maxNull = 1 << 23

// orderTerms finds the columns to set aside and moves beta, on asked columns, accordingly.
// It reports false where the null space is too large to form.
func (j *joint) orderTerms(m *Model, f *linalg.Factor, beta linalg.Vec) (*termOrder, bool) {
	if n := len(f.Aside); n == 0 || n*beta.Len() > maxNull {
		return nil, n == 0
	}
	null := f.Null()
	for i := range null {
		null[i] = j.forward(m, null[i])
	}
	o := &termOrder{}
	used := make([]bool, len(null))
	for t := len(m.cols) - 1; t >= 0 && len(o.last) < len(null); t-- {
		g := j.group(m.cols[t])
		at := j.gram.Offset(g)
		for c := len(m.cols[t].Names) - 1; c >= 0; c-- {
			best, size := -1, 1e-9
			for i, v := range null {
				if a := math.Abs(v.At(at + c).Hi); !used[i] && a > size {
					best, size = i, a
				}
			}
			if best < 0 {
				continue
			}
			used[best] = true
			scale(null[best], dd.From(1).Div(null[best].At(at+c)))
			for i := range null {
				if i != best {
					sub(null[i], null[best], null[i].At(at+c))
				}
			}
			o.last = append(o.last, at+c)
			o.null = append(o.null, null[best])
		}
	}
	for i, v := range o.null {
		sub(beta, v, beta.At(o.last[i]))
	}
	return o, true
}

func scale(v linalg.Vec, a dd.DD) {
	for i := range v.Len() {
		if x := v.At(i); x.Hi != 0 {
			v.Set(i, x.Mul(a))
		}
	}
}

func sub(v, w linalg.Vec, a dd.DD) {
	if a.Hi == 0 {
		return
	}
	for i := range v.Len() {
		if x := w.At(i); x.Hi != 0 {
			v.Set(i, v.At(i).Sub(x.Mul(a)))
		}
	}
}

// forward returns Vγ, the asked coefficients of a vector on the basis, without
// scale and origin of the response.
func (j *joint) forward(m *Model, gamma linalg.Vec) linalg.Vec {
	out := j.gram.NewVec()
	var carried dd.DD
	for _, b := range m.cols {
		g := j.group(b)
		at := j.gram.Offset(g)
		p := j.basis.powers[g]
		switch {
		case p != nil:
			v := p.inverse()
			for k := range p.degree {
				var x dd.DD
				for i := range p.degree {
					x = x.Add(v[k+1][i+1].Mul(gamma.At(at + i)))
				}
				out.Set(at+k, x.Scale(-(k+1)*p.exp))
				carried = carried.Add(v[0][k+1].Mul(gamma.At(at + k)))
			}
		case b.dense():
			for k := range b.Names {
				d := j.denseColumn(g) + k
				x := gamma.At(at + k).Scale(-j.exp[d])
				out.Set(at+k, x)
				carried = carried.Sub(x.MulF(j.shift[d]))
			}
		default:
			for k := range b.Names {
				out.Set(at+k, gamma.At(at+k).Scale(-j.scales[g]))
			}
		}
	}
	if c := m.carrier(); c >= 0 && j.shifted && carried.Hi != 0 {
		at := j.gram.Offset(j.group(m.cols[c]))
		for k := range m.cols[c].Names {
			out.Set(at+k, out.At(at+k).Add(carried))
		}
	}
	return out
}
