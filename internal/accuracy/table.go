// Package accuracy measures the laws of package dist against tables of
// high-precision values (dist/testdata, described in its README): the tests of
// dist and the command internal/cmd/accuracy share it.
package accuracy

import (
	"encoding/csv"
	"fmt"
	"math"
	"math/big"
	"os"
	"path/filepath"
	"sort"
	"strconv"
)

// Distribution is the part of a law that a table judges.
type Distribution interface {
	CDF(x float64) float64
	Survival(x float64) float64
	LogCDF(x float64) float64
	LogSurvival(x float64) float64
	Prob(x float64) float64
	LogProb(x float64) float64
}

// Inverter is a Distribution with quantiles.
type Inverter interface {
	Distribution
	Quantile(p float64) float64
	UpperQuantile(q float64) float64
}

// Table names a file of reference rows and makes the law of a row.
type Table struct {
	File   string // without ".csv"
	Params int    // number of parameter columns
	New    func(p []float64) Distribution
	// Everyday reports whether parameters belong to the everyday region; the tail
	// bound of 1e-10 is added by Measure.
	Everyday func(p []float64) bool
	// NoDensity is set when the table has no density columns.
	NoDensity bool
}

// Row is one line of a table.
type Row struct {
	P      []float64
	X      float64
	Values map[string]string // column to its decimal text
	Line   int
}

// Load reads a table from dir.
func Load(dir string, t Table) ([]Row, error) {
	recs, err := read(filepath.Join(dir, t.File+".csv"))
	if err != nil {
		return nil, err
	}
	head := recs[0]
	var rows []Row
	for i, rec := range recs[1:] {
		r := Row{Values: map[string]string{}, Line: i + 1}
		for j := range t.Params {
			v, err := strconv.ParseFloat(rec[j], 64)
			if err != nil {
				return nil, fmt.Errorf("%s row %d: %w", t.File, i+1, err)
			}
			r.P = append(r.P, v)
		}
		if r.X, err = strconv.ParseFloat(rec[t.Params], 64); err != nil {
			return nil, fmt.Errorf("%s row %d: %w", t.File, i+1, err)
		}
		for j, h := range head {
			r.Values[h] = rec[j]
		}
		rows = append(rows, r)
	}
	return rows, nil
}

func read(name string) ([][]string, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	recs, err := r.ReadAll()
	if err == nil && len(recs) < 2 {
		err = fmt.Errorf("%s: no rows", name)
	}
	return recs, err
}

// RelativeError returns |got - want| / |want| with want in decimal; values whose exact
// magnitude is below the normal range are taken as met when got is there too.
func RelativeError(got float64, want string) float64 {
	if math.IsNaN(got) {
		return math.Inf(1)
	}
	w, _, err := big.ParseFloat(want, 10, 200, big.ToNearestEven)
	if err != nil {
		return math.Inf(1)
	}
	approx, _ := w.Float64()
	if math.Abs(approx) < 2.3e-308 {
		if math.Abs(got) < 2.4e-308 {
			return 0
		}
		return math.Inf(1)
	}
	if math.IsInf(got, 0) {
		if math.IsInf(approx, 0) {
			return 0
		}
		return math.Inf(1)
	}
	d := new(big.Float).SetPrec(200).SetFloat64(got)
	d.Sub(d, w)
	d.Quo(d, w)
	e, _ := d.Float64()
	return math.Abs(e)
}

// Result is one judged value.
type Result struct {
	Row      Row
	What     string // "lower", "upper", "log_lower", ...
	Got      float64
	Want     string
	Err      float64
	Everyday bool
	// Conditioning is |x density/tail| of the row's smaller tail.
	Conditioning float64
}

// Measure judges every value of a table. The returned map is by kind: "tail" (the smaller
// tail), "other" (the larger), "log" (both log tails), "density", "logdensity".
func Measure(t Table, rows []Row) map[string][]Result {
	out := map[string][]Result{}
	for _, r := range rows {
		d := t.New(r.P)
		lo, _ := strconv.ParseFloat(r.Values["lower"], 64)
		up, _ := strconv.ParseFloat(r.Values["upper"], 64)
		everyday := min(lo, up) >= 1e-10 && t.Everyday(r.P)
		small, large := "lower", "upper"
		gs, gl := d.CDF, d.Survival
		if up < lo {
			small, large, gs, gl = large, small, gl, gs
		}
		den, _ := strconv.ParseFloat(r.Values["density"], 64)
		cond := math.Abs(r.X) * den / min(lo, up)
		if min(lo, up) == 0 && !t.NoDensity {
			ld, _ := strconv.ParseFloat(r.Values["log_density"], 64)
			lt, _ := strconv.ParseFloat(r.Values["log_"+small], 64)
			cond = math.Exp(ld - lt + math.Log(math.Abs(r.X)))
		}
		add := func(kind, col string, got float64) {
			out[kind] = append(out[kind], Result{r, col, got, r.Values[col], RelativeError(got, r.Values[col]), everyday, cond})
		}
		add("tail", small, gs(r.X))
		add("other", large, gl(r.X))
		add("log", "log_lower", d.LogCDF(r.X))
		add("log", "log_upper", d.LogSurvival(r.X))
		if !t.NoDensity {
			add("density", "density", d.Prob(r.X))
			add("logdensity", "log_density", d.LogProb(r.X))
		}
	}
	return out
}

// Summary holds the figures of one kind.
type Summary struct {
	N                            int
	Median, MaxEveryday, Max     float64
	MedianEveryday               float64
	Everyday, Above12, NotFinite int
	Worst                        Result
}

// Summarize takes medians and maxima.
func Summarize(rs []Result) Summary {
	var s Summary
	var all, day []float64
	for _, r := range rs {
		all = append(all, r.Err)
		if r.Everyday {
			day = append(day, r.Err)
			s.MaxEveryday = max(s.MaxEveryday, r.Err)
		}
		if r.Err > 1e-12 {
			s.Above12++
		}
		if math.IsInf(r.Err, 0) {
			s.NotFinite++
		}
		if r.Err >= s.Max {
			s.Max, s.Worst = r.Err, r
		}
	}
	s.N, s.Everyday = len(all), len(day)
	s.Median, s.MedianEveryday = median(all), median(day)
	return s
}

func median(v []float64) float64 {
	if len(v) == 0 {
		return math.NaN()
	}
	sort.Float64s(v)
	return v[len(v)/2]
}
