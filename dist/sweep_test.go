package dist_test

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"subsume.example/dist"
)

// fullLaw is the whole method set.
type fullLaw interface {
	dist.Law
	LogCDF(x float64) float64
	Prob(x float64) float64
	LogProb(x float64) float64
	Quantile(p float64) float64
	Mean() float64
	Variance() float64
	Rand(src rand.Source) float64
}

func logUniform(r *rand.Rand, lo, hi float64) float64 {
	return math.Exp(math.Log(lo) + r.Float64()*(math.Log(hi)-math.Log(lo)))
}

// sweepPoint draws a law and a point: half of the points lie near the bulk, the rest anywhere
// from denormals to the largest float64.
func sweepPoint(r *rand.Rand) (fullLaw, float64) {
	df := func() float64 {
		switch r.IntN(12) {
		case 0:
			return float64(1 + r.IntN(40))
		case 1:
			return float64(1+r.IntN(80)) / 2
		}
		return logUniform(r, 1e-3, 1e12)
	}
	var law fullLaw
	switch r.IntN(6) {
	case 4:
		law = dist.Beta{A: df() / 2, B: df() / 2}
	case 5:
		law = dist.Gamma{Shape: df() / 2, Scale: logUniform(r, 1e-100, 1e100)}
	case 0:
		law = dist.ChiSquared{K: df()}
	case 1:
		law = dist.StudentT{Nu: df()}
	case 2:
		law = dist.F{D1: df(), D2: df()}
	default:
		law = dist.F{D1: df(), D2: math.Inf(1)}
	}
	x := 1.0
	switch r.IntN(4) {
	case 0:
		x = math.Float64frombits(r.Uint64N(0x7ff0000000000001))
	case 1:
		x = logUniform(r, 1e-10, 1e10)
	default:
		x = 1 + r.NormFloat64()*math.Exp(-12*r.Float64())
		if c, ok := law.(dist.ChiSquared); ok {
			x = c.K + r.NormFloat64()*math.Sqrt(2*c.K)*3
		}
	}
	switch law := law.(type) {
	case dist.Beta:
		m, s := law.Mean(), math.Sqrt(law.Variance())
		if x = m + 3*s*r.NormFloat64(); !(x > 0 && x < 1) || r.IntN(3) == 0 {
			x = math.Exp(-math.Abs(r.NormFloat64()) * 200 * r.Float64())
		}
		if r.IntN(8) == 0 {
			x = 1 - x
		}
	case dist.Gamma:
		if x = law.Mean() * (1 + 3*r.NormFloat64()/math.Sqrt(law.Shape)); !(x > 0) {
			x = law.Scale * math.Exp(r.NormFloat64()*100)
		}
	}
	if _, ok := law.(dist.StudentT); ok && r.IntN(2) == 0 {
		x = -x
	}
	return law, x
}

// TestSweep asks for finite, ordered and complementary answers at random points of the whole
// domain: 20 000 by default, 10^6 with SUBSUME_LONG=1.
func TestSweep(t *testing.T) {
	n := 20000
	if os.Getenv("SUBSUME_LONG") == "1" {
		n = 1000000
	}
	r := rand.New(rand.NewPCG(7, 11))
	bad := 0
	for i := range n {
		law, x := sweepPoint(r)
		if msg := checkPoint(law, x, i%10 == 0); msg != "" {
			t.Errorf("%v at x = %v (%x): %s", law, x, x, msg)
			if bad++; bad > 20 {
				t.Fatal("too many failures")
			}
		}
	}
}

// checkPoint returns what is wrong with a law at a point.
func checkPoint(law fullLaw, x float64, quantiles bool) string {
	lo, up := law.CDF(x), law.Survival(x)
	llo, lup := law.LogCDF(x), law.LogSurvival(x)
	d, ld := law.Prob(x), law.LogProb(x)
	for name, v := range map[string]float64{"CDF": lo, "Survival": up, "LogCDF": llo, "LogSurvival": lup, "Prob": d, "LogProb": ld} {
		if math.IsNaN(v) {
			return name + " is NaN"
		}
	}
	if math.Abs(lo+up-1) > 4.5e-16 || lo < 0 || up < 0 || lo > 1 || up > 1 {
		return "CDF + Survival is not 1"
	}
	if llo > 0 || lup > 0 || d < 0 {
		return "a logarithm above 0 or a density below"
	}
	for _, p := range []struct{ v, l float64 }{{lo, llo}, {up, lup}} {
		if p.v > 1e-300 && !(math.Abs(math.Log(p.v)-p.l) <= 4e-16*(1+math.Abs(p.l))) {
			return "logarithm and tail disagree"
		}
	}
	// Neighbours: never decreasing by more than the error bound 4e-15.
	y := math.Nextafter(x, math.Inf(1))
	if law.CDF(y) < lo*(1-4e-15) || law.Survival(y) > up*(1+4e-15) {
		return "not monotone to the next float"
	}
	if !quantiles || !(d > 0) || math.IsInf(x, 0) || math.IsInf(d, 1) {
		return ""
	}
	if lo > 1e-300 && lo <= 0.5 {
		back := law.Quantile(lo)
		if !(math.Abs(back-x) <= 4e-15*lo/d+1e-15*math.Abs(x)+1e-323) {
			return "Quantile(CDF(x)) is not x"
		}
	}
	if up > 1e-300 && up <= 0.5 {
		back := law.UpperQuantile(up)
		if !(math.Abs(back-x) <= 4e-15*up/d+1e-15*math.Abs(x)+1e-323) {
			return "UpperQuantile(Survival(x)) is not x"
		}
	}
	return ""
}
