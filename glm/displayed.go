package glm

import "subsume.example/internal/dd"

// asDisplayed reads weights of coefficients as people read them off a fit. Beside a
// constant that comes before it, a factor's reference level has coefficient 0 and the
// others are differences from it, so that with β the coefficients of all columns
//
//	Σ w β' = w₀ β₀ + Σ over factors of (Σ w_l β_l + (w₀ − Σ w_l) β_reference).
//
// That is a function of the fitted values whichever column is set aside; differences
// of levels and means of rows are left as they are. Models with products of factors are
// read by their columns alone.
func (m *Model) asDisplayed(ws []weight) []weight {
	constant := -1
	for t, b := range m.cols {
		switch {
		case b.Key == "constant" && constant < 0:
			constant = t
		case len(b.factors) > 1 || len(b.factors) == 1 && !b.partition:
			return ws
		case b.partition && constant < 0:
			return ws
		}
	}
	if constant < 0 {
		return ws
	}
	sums := make([]dd.DD, len(m.cols))
	for _, w := range ws {
		sums[w.term] = sums[w.term].Add(w.coef)
	}
	out := ws[:len(ws):len(ws)]
	for t, b := range m.cols {
		if !b.partition {
			continue
		}
		if rest := sums[constant].Sub(sums[t]); rest.Hi != 0 {
			out = append(out, weight{t, len(b.Names) - 1, rest})
		}
	}
	return out
}

// nothing reports whether the weights cancel: a function that is 0 by the choice of
// the reference levels.
func nothing(ws []weight) bool {
	type place struct{ term, column int }
	sum := make(map[place]dd.DD)
	for _, w := range ws {
		p := place{w.term, w.column}
		sum[p] = sum[p].Add(w.coef)
	}
	for _, x := range sum {
		if x.Hi != 0 {
			return false
		}
	}
	return len(ws) > 0
}
