package accuracy

import (
	"fmt"
	"math"
	"path/filepath"
	"strconv"
)

// InverseRow is one line of inverse.csv.
type InverseRow struct {
	Dist  string
	P     []float64
	Upper bool
	Tail  float64
	Want  string
	Line  int
}

// LoadInverse reads inverse.csv from dir.
func LoadInverse(dir string) ([]InverseRow, error) {
	recs, err := read(filepath.Join(dir, "inverse.csv"))
	if err != nil {
		return nil, err
	}
	var rows []InverseRow
	for i, rec := range recs[1:] {
		r := InverseRow{Dist: rec[0], Upper: rec[4] == "upper", Want: rec[6], Line: i + 1}
		for _, s := range rec[1:4] {
			if s == "" {
				continue
			}
			v, err := strconv.ParseFloat(s, 64)
			if err != nil {
				return nil, fmt.Errorf("inverse row %d: %w", i+1, err)
			}
			r.P = append(r.P, v)
		}
		if r.Tail, err = strconv.ParseFloat(rec[5], 64); err != nil {
			return nil, fmt.Errorf("inverse row %d: %w", i+1, err)
		}
		rows = append(rows, r)
	}
	return rows, nil
}

// MeasureInverse judges the quantiles of one table's law; the conditioning of a result is
// |tail / (x density)| at the quantile.
func MeasureInverse(t Table, rows []InverseRow) []Result {
	var out []Result
	for _, r := range rows {
		if r.Dist != t.File {
			continue
		}
		d, ok := t.New(r.P).(Inverter)
		if !ok {
			continue
		}
		what, got := "Quantile", 0.0
		if r.Upper {
			what, got = "UpperQuantile", d.UpperQuantile(r.Tail)
		} else {
			got = d.Quantile(r.Tail)
		}
		x, _ := strconv.ParseFloat(r.Want, 64)
		out = append(out, Result{
			Row: Row{P: r.P, X: r.Tail, Line: r.Line}, What: what, Got: got, Want: r.Want, Err: RelativeError(got, r.Want),
			Everyday: r.Tail >= 1e-10 && t.Everyday(r.P), Conditioning: math.Abs(r.Tail / (x * d.Prob(x))),
		})
	}
	return out
}
