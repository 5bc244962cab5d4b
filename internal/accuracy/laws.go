package accuracy

import "subsume.example/dist"

// Tables lists the tables of dist/testdata; each law adds its own.
var Tables = []Table{
	{File: "chi2", Params: 1, New: func(p []float64) Distribution { return dist.ChiSquared{K: p[0]} }, Everyday: everydayDF(1)},
	{File: "f", Params: 2, New: func(p []float64) Distribution { return dist.F{D1: p[0], D2: p[1]} }, Everyday: everydayDF(2)},
	{File: "t", Params: 1, New: func(p []float64) Distribution { return dist.StudentT{Nu: p[0]} }, Everyday: everydayDF(1)},
	{File: "betainc", Params: 2, New: func(p []float64) Distribution { return dist.Beta{A: p[0], B: p[1]} }, Everyday: func(p []float64) bool {
		return min(p[0], p[1]) >= 0.25 && max(p[0], p[1]) <= 5e3
	}},
	{File: "chi2_wide", Params: 1, New: func(p []float64) Distribution { return dist.ChiSquared{K: p[0]} }, Everyday: everydayDF(1)},
	{File: "f_wide", Params: 2, New: func(p []float64) Distribution { return dist.F{D1: p[0], D2: p[1]} }, Everyday: everydayDF(2)},
	{File: "t_wide", Params: 1, New: func(p []float64) Distribution { return dist.StudentT{Nu: p[0]} }, Everyday: everydayDF(1)},
	{File: "srange", Params: 2, NoDensity: true, New: func(p []float64) Distribution { return dist.StudentizedRange{K: int(p[0]), Nu: p[1]} }, Everyday: everydayScale},
	{File: "smm", Params: 2, NoDensity: true, New: func(p []float64) Distribution { return dist.MaximumModulus{K: int(p[0]), Nu: p[1]} }, Everyday: everydayScale},
}

// everydayScale holds for every row with an estimated or known scale.
func everydayScale([]float64) bool { return true }

// everydayDF reports whether the first n parameters lie in 0.5 ... 1e4.
func everydayDF(n int) func(p []float64) bool {
	return func(p []float64) bool {
		for _, v := range p[:n] {
			if v < 0.5 || v > 1e4 {
				return false
			}
		}
		return true
	}
}
