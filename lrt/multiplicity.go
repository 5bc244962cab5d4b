package lrt

import (
	"fmt"
	"math"
	"sort"
)

// Adjustment is a way to account for several tests at once.
type Adjustment uint8

// The adjustments. The first four hold the probability of any false rejection,
// the last two the expected share of false ones among the rejections.
const (
	Bonferroni         Adjustment = iota // m·p, any dependence
	Holm                                 // step-down Bonferroni (Holm 1979), any dependence
	Hochberg                             // step-up (Hochberg 1988), independent or positively dependent tests
	Sidak                                // 1 − (1 − p)^m (Šidák 1967), independent or positively dependent tests
	BenjaminiHochberg                    // false discovery rate (Benjamini, Hochberg 1995), the same
	BenjaminiYekutieli                   // false discovery rate, any dependence (Benjamini, Yekutieli 2001)
)

// String names the adjustment.
func (a Adjustment) String() string {
	names := []string{"Bonferroni", "Holm", "Hochberg", "Šidák", "Benjamini-Hochberg", "Benjamini-Yekutieli"}
	if int(a) < len(names) {
		return names[a]
	}
	return fmt.Sprintf("adjustment %d", uint8(a))
}

// Adjust returns the adjusted p-values in the order of p, which it leaves as it
// is. NaN stands for a test that could not be made: it stays NaN in its place
// and does not count. A value outside [0, 1] is an error that names its index.
func Adjust(a Adjustment, p []float64) ([]float64, error) {
	logP := make([]float64, len(p))
	for i, v := range p {
		if v < 0 || v > 1 {
			return nil, fmt.Errorf("lrt: adjust: %w: p-value %d is %g", ErrInvalid, i, v)
		}
		logP[i] = math.Log(v)
	}
	out, _, err := adjust(a, p, logP)
	return out, err
}

// AdjustLog is Adjust for logarithms of p-values, which may lie far below the
// smallest float64.
func AdjustLog(a Adjustment, logP []float64) ([]float64, error) {
	p := make([]float64, len(logP))
	for i, v := range logP {
		if v > 0 {
			return nil, fmt.Errorf("lrt: adjust: %w: log p-value %d is %g", ErrInvalid, i, v)
		}
		p[i] = math.Exp(v)
	}
	_, out, err := adjust(a, p, logP)
	return out, err
}

// AdjustResults adjusts the recommended p-values of results: p and log p by result.
func AdjustResults(a Adjustment, rs []Result) (p, logP []float64, err error) {
	p, logP = make([]float64, len(rs)), make([]float64, len(rs))
	for i, r := range rs {
		p[i], logP[i] = r.P(), r.LogP()
	}
	return adjust(a, p, logP)
}

func adjust(a Adjustment, p, logP []float64) (adjP, adjLog []float64, err error) {
	if a > BenjaminiYekutieli {
		return nil, nil, fmt.Errorf("lrt: adjust: %w: %v", ErrInvalid, a)
	}
	adjP, adjLog = make([]float64, len(p)), make([]float64, len(p))
	var order []int
	for i, v := range logP {
		adjP[i], adjLog[i] = nan, nan
		if !math.IsNaN(v) && !math.IsNaN(p[i]) {
			order = append(order, i)
		}
	}
	sort.SliceStable(order, func(i, j int) bool { return logP[order[i]] < logP[order[j]] })
	m := len(order)
	harmonic := 0.0
	for i := m; i >= 1; i-- {
		harmonic += 1 / float64(i)
	}
	for rank, i := range order { // rank 0 is the smallest
		c := float64(m)
		switch a {
		case Holm, Hochberg:
			c = float64(m - rank)
		case BenjaminiHochberg:
			c = float64(m) / float64(rank+1)
		case BenjaminiYekutieli:
			c = float64(m) / float64(rank+1) * harmonic
		case Sidak:
			adjP[i], adjLog[i] = sidak(p[i], logP[i], float64(m))
			continue
		}
		adjP[i] = math.Min(1, c*p[i])
		adjLog[i] = math.Min(0, math.Log(c)+logP[i])
	}
	carry := func(from, to int, worse bool) {
		if worse == (adjLog[from] > adjLog[to]) && adjLog[from] != adjLog[to] {
			adjP[to], adjLog[to] = adjP[from], adjLog[from]
		}
	}
	switch a {
	case Holm: // never below a smaller p's
		for k := 1; k < m; k++ {
			carry(order[k-1], order[k], true)
		}
	case Hochberg, BenjaminiHochberg, BenjaminiYekutieli: // never above a larger p's
		for k := m - 2; k >= 0; k-- {
			carry(order[k+1], order[k], false)
		}
	}
	return adjP, adjLog, nil
}

func sidak(p, logP, m float64) (float64, float64) {
	if logP < -30 { // 1 − (1 − p)^m = m p to the last digit, unless m is huge
		if l := math.Log(m) + logP; l < -20 {
			return m * p, l
		}
	}
	v := -math.Expm1(m * math.Log1p(-p))
	return v, math.Log(v)
}
