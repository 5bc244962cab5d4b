package accuracy

import (
	"fmt"
	"path/filepath"
	"strconv"

	"subsume.example/dist"
)

func init() {
	everyday := func(df int) func([]float64) bool {
		d := everydayDF(df)
		return func(p []float64) bool { return d(p) && p[df] >= -1e4 && p[df] <= 1e4 }
	}
	ncx2 := func(p []float64) Distribution { return dist.NoncentralChiSquared{K: p[0], Lambda: p[1]} }
	nct := func(p []float64) Distribution { return dist.NoncentralT{Nu: p[0], Delta: p[1]} }
	ncf := func(p []float64) Distribution { return dist.NoncentralF{D1: p[0], D2: p[1], Lambda: p[2]} }
	Tables = append(Tables,
		Table{File: "ncx2", Params: 2, New: ncx2, Everyday: everyday(1)},
		Table{File: "ncf", Params: 3, New: ncf, Everyday: everyday(2)},
		Table{File: "nct", Params: 2, New: nct, Everyday: everyday(1)},
		Table{File: "ncfpower", Params: 3, New: ncf, Everyday: everyday(2)},
		Table{File: "ncx2_wide", Params: 2, New: ncx2, Everyday: everyday(1)},
		Table{File: "ncf_wide", Params: 3, New: ncf, Everyday: everyday(2)},
		Table{File: "nct_wide", Params: 2, New: nct, Everyday: everyday(1)},
	)
}

// MeasureFinders judges the noncentrality finders on ncinv.csv in dir.
func MeasureFinders(dir string) ([]Result, error) {
	recs, err := read(filepath.Join(dir, "ncinv.csv"))
	if err != nil {
		return nil, err
	}
	var out []Result
	for i, rec := range recs[1:] {
		var v [4]float64 // d1, d2, crit, power
		for j := range v {
			if rec[j+1] == "" {
				continue
			}
			if v[j], err = strconv.ParseFloat(rec[j+1], 64); err != nil {
				return nil, fmt.Errorf("ncinv row %d: %w", i+1, err)
			}
		}
		r := Result{Row: Row{P: v[:], Line: i + 1}, What: rec[0], Want: rec[5], Everyday: true}
		if rec[0] == "ncf" {
			r.Got, err = dist.NoncentralityF(v[0], v[1], v[2], v[3])
		} else {
			r.Got, err = dist.NoncentralityChiSquared(v[0], v[2], v[3])
		}
		if err != nil {
			return nil, fmt.Errorf("ncinv row %d: %w", i+1, err)
		}
		r.Err = RelativeError(r.Got, r.Want)
		out = append(out, r)
	}
	return out, nil
}
