package dist_test

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"subsume.example/dist"
)

// noncentralPoint draws a noncentral law of the whole domain and a point: half of them
// near the bulk, the rest anywhere from denormals to the largest float64.
func noncentralPoint(r *rand.Rand) (fullLaw, float64) {
	df := func() float64 {
		if r.IntN(8) == 0 {
			return float64(1 + r.IntN(40))
		}
		return logUniform(r, 1e-3, 1e12)
	}
	d1, d2, lambda := df(), df(), logUniform(r, 1e-8, 1e8)
	switch r.IntN(8) {
	case 0:
		lambda = logUniform(r, 1e-300, 1)
	case 1:
		d1, d2, lambda = logUniform(r, 0.5, 1e4), logUniform(r, 0.5, 1e4), logUniform(r, 0.01, 1e4)
	}
	return noncentralAt(r, d1, d2, lambda)
}

func noncentralAt(r *rand.Rand, d1, d2, lambda float64) (fullLaw, float64) {
	m := d1 + lambda
	x := m
	switch r.IntN(4) {
	case 0:
		x = math.Float64frombits(r.Uint64N(0x7ff0000000000001))
	case 1:
		x = m * math.Exp(r.NormFloat64()*5)
	default:
		x = m * math.Exp(r.NormFloat64()*3*math.Sqrt(2*d1+4*lambda)/m)
	}
	switch r.IntN(3) {
	case 0:
		return dist.NoncentralChiSquared{K: d1, Lambda: lambda}, x
	case 1:
		if r.IntN(10) == 0 {
			d2 = math.Inf(1)
		}
		x /= d1
		if r.IntN(3) == 0 {
			x *= math.Exp(min(600, r.ExpFloat64()/d2))
		}
		return dist.NoncentralF{D1: d1, D2: d2, Lambda: lambda}, x
	}
	delta := math.Sqrt(lambda)
	switch r.IntN(3) {
	case 0:
		x = delta + r.NormFloat64()*3*math.Sqrt(1+lambda/2/d2)
	case 1:
		x = math.Exp(r.NormFloat64() * 10)
	default:
		x = math.Float64frombits(r.Uint64N(0x7ff0000000000001))
	}
	if r.IntN(2) == 0 {
		x = -x
	}
	if r.IntN(2) == 0 {
		delta = -delta
	}
	return dist.NoncentralT{Nu: d2, Delta: delta}, x
}

// TestNoncentralSweep asks for finite, ordered and complementary answers at random points
// of the whole domain: 12 000 by default, 10^6 with SUBSUME_LONG=1.
func TestNoncentralSweep(t *testing.T) {
	n := 12000
	if os.Getenv("SUBSUME_LONG") == "1" {
		n = 1000000
	}
	r := rand.New(rand.NewPCG(8, 11))
	bad := 0
	for i := range n {
		law, x := noncentralPoint(r)
		msg := checkNoncentral(law, x)
		if msg == "" && i%20 == 0 {
			msg = checkNoncentralInverse(law, x)
		}
		if msg != "" {
			t.Errorf("%#v at x = %v: %s", law, x, msg)
			if bad++; bad > 20 {
				t.Fatal("too many failures")
			}
		}
	}
}

// lawBound is the stated error of the laws' tails.
const lawBound = 4e-15

func checkNoncentral(law fullLaw, x float64) string {
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
	for _, p := range []struct{ v, l float64 }{{lo, llo}, {up, lup}, {d, ld}} {
		if p.v > 1e-300 && p.v < 1e300 && !(math.Abs(math.Log(p.v)-p.l) <= 2e-15*(1+math.Abs(p.l))) {
			return "logarithm and value disagree"
		}
	}
	const bound = lawBound
	y := math.Nextafter(x, math.Inf(1))
	if law.CDF(y) < lo*(1-bound) || law.Survival(y) > up*(1+bound) {
		return "not monotone to the next float"
	}
	// A larger noncentrality moves the law up.
	var higher fullLaw
	switch l := law.(type) {
	case dist.NoncentralChiSquared:
		l.Lambda *= 1 + 1e-12
		higher = l
	case dist.NoncentralF:
		l.Lambda *= 1 + 1e-12
		higher = l
	case dist.NoncentralT:
		l.Delta += 1e-12 * math.Abs(l.Delta)
		higher = l
	}
	if higher.CDF(x) > lo*(1+bound) || higher.Survival(x) < up*(1-bound) {
		return "not monotone in the noncentrality"
	}
	return ""
}

func checkNoncentralInverse(law fullLaw, x float64) string {
	lo, up, d := law.CDF(x), law.Survival(x), law.Prob(x)
	if !(d > 1e-290) || math.IsInf(d, 1) || math.Abs(x) < 1e-290 || math.IsInf(x, 0) {
		return ""
	}
	const bound = lawBound
	if lo > 1e-285 && lo <= 0.5 {
		if back := law.Quantile(lo); !(math.Abs(back-x) <= bound*lo/d+1e-15*math.Abs(x)) {
			return "Quantile(CDF(x)) is not x"
		}
	}
	if up > 1e-285 && up <= 0.5 {
		if back := law.UpperQuantile(up); !(math.Abs(back-x) <= bound*up/d+1e-15*math.Abs(x)) {
			return "UpperQuantile(Survival(x)) is not x"
		}
	}
	return ""
}

// FuzzNoncentral wants no panic, hang or NaN from any parameters and any point.
func FuzzNoncentral(f *testing.F) {
	f.Add(3.0, 20.0, 5.0, 2.5, 0.3)
	f.Add(1e-3, 1e12, 1e8, 1e-300, 1e-300)
	f.Add(1e12, 1e-3, 1e-8, 1e300, 0.999)
	f.Add(math.Inf(1), math.NaN(), -1.0, math.Inf(-1), 2.0)
	f.Fuzz(func(t *testing.T, d1, d2, lambda, x, p float64) {
		for _, law := range []fullLaw{
			dist.NoncentralChiSquared{K: d1, Lambda: lambda},
			dist.NoncentralF{D1: d1, D2: d2, Lambda: lambda},
			dist.NoncentralT{Nu: d2, Delta: lambda},
		} {
			in := law.Validate() == nil && inDomain(d1) && inDomain(d2) && math.Abs(lambda) <= 1e8
			if _, ok := law.(dist.NoncentralT); ok {
				in = law.Validate() == nil && inDomain(d2) && math.Abs(lambda) <= 1e4
			}
			if in && !math.IsNaN(x) {
				if msg := checkNoncentral(law, x); msg != "" && !math.IsInf(x, 0) {
					t.Errorf("%#v at x = %v: %s", law, x, msg)
				}
			} else {
				_, _, _, _ = law.CDF(x), law.Survival(x), law.Prob(x), law.LogProb(x)
			}
			q := law.Quantile(p)
			if in && p >= 0 && p <= 1 && math.IsNaN(q) {
				t.Errorf("%#v: Quantile(%v) is NaN", law, p)
			}
			_, _, _, _ = law.UpperQuantile(p), law.Mean(), law.Variance(), law.String()
		}
		_, _ = dist.NoncentralityChiSquared(d1, x, p)
		_, _ = dist.NoncentralityF(d1, d2, x, p)
		_, _ = dist.NoncentralityT(d2, x, p)
	})
}

func inDomain(df float64) bool { return df >= 1e-3 && df <= 1e12 || math.IsInf(df, 1) }

// TestNoncentralDensity compares the density with differences of the smaller tail at random points
// of the whole domain, where the step can be both small for the law and large for the floats.
func TestNoncentralDensity(t *testing.T) {
	n := 6000
	if os.Getenv("SUBSUME_LONG") == "1" {
		n = 300000
	}
	r := rand.New(rand.NewPCG(8, 12))
	for range n {
		law, x := noncentralPoint(r)
		lo, up, d := law.CDF(x), law.Survival(x), law.Prob(x)
		m := min(lo, up)
		if !(m > 1e-290 && d > 1e-290 && d < 1e290) || math.Abs(x) < 1e-280 || math.Abs(x) > 1e280 {
			continue
		}
		k := math.Abs(x) * d / m
		h := 1e-5 / max(k, 1)
		if h < 1e-10 {
			continue
		}
		tail := law.CDF
		if up < lo {
			tail = law.Survival
		}
		got := math.Abs(tail(x*(1+h))-tail(x*(1-h))) / m / (2 * h)
		if !(math.Abs(got-k) <= 1e-5*k+3e-15/h) {
			t.Errorf("%#v at x = %v: x density/tail is %v, by differences %v", law, x, k, got)
		}
	}
}
