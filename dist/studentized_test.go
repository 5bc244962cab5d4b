package dist

import (
	"bufio"
	"encoding/json"
	"math"
	"math/rand/v2"
	"os"
	"sort"
	"strconv"
	"strings"
	"testing"
)

// studentizedRow is a row of testdata/srange.csv or smm.csv. They come from
// integrals at 80 (range) and 150-170 bits (modulus), two step sizes agreeing
// to 1e-15 and 1e-17; the range with K = 2 from Student's t at 240 bits.
type studentizedRow struct {
	k                                     int
	nu, x, lower, upper, logLower, logUpp float64
}

func studentizedRows(t testing.TB, file string) []studentizedRow {
	f, err := os.Open("testdata/" + file)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var rows []studentizedRow
	for sc := bufio.NewScanner(f); sc.Scan(); {
		p := strings.Split(sc.Text(), ",")
		if len(p) < 7 || p[0] == "k" || strings.HasPrefix(p[0], "#") {
			continue
		}
		k, err := strconv.Atoi(p[0])
		if err != nil {
			t.Fatal(err)
		}
		var v [6]float64
		for i := range v {
			if v[i], err = strconv.ParseFloat(p[i+1], 64); err != nil {
				t.Fatal(err)
			}
		}
		rows = append(rows, studentizedRow{k, v[0], v[1], v[2], v[3], v[4], v[5]})
	}
	if len(rows) < 100 {
		t.Fatalf("%s: %d rows", file, len(rows))
	}
	return rows
}

// fullLaw is the method set that both laws share.
type fullLaw interface {
	Law
	LogCDF(x float64) float64
	Prob(x float64) float64
	LogProb(x float64) float64
	Quantile(p float64) float64
	Mean() float64
	Variance() float64
	Rand(src rand.Source) float64
}

func rangeLaw(k int, nu float64) fullLaw   { return StudentizedRange{k, nu} }
func modulusLaw(k int, nu float64) fullLaw { return MaximumModulus{k, nu} }

func relErr(got, want float64) float64 {
	if got == want {
		return 0
	}
	return math.Abs(got-want) / math.Abs(want)
}

var studentizedFamilies = []struct {
	name, file string
	law        func(int, float64) fullLaw
	ks         []int
}{
	{"StudentizedRange", "srange.csv", rangeLaw, []int{2, 3, 4, 5, 8, 20, 100, 1000}},
	{"MaximumModulus", "smm.csv", modulusLaw, []int{1, 2, 3, 5, 20, 300, 10000}},
}

// TestStudentizedTables checks the smaller tail of every row and its
// logarithm, and that the larger is the complement. The bounds are 1e-14 for
// tails above 1e-30 and 1e-12 for all (the conditioning x·density/tail of a
// tail of 1e-300 is up to 1400).
func TestStudentizedTables(t *testing.T) {
	for _, fam := range studentizedFamilies {
		var errs []float64
		everyday, logWorst := 0.0, 0.0
		for _, r := range studentizedRows(t, fam.file) {
			d := fam.law(r.k, r.nu)
			got, want, gotLog, wantLog := d.CDF(r.x), r.lower, d.LogCDF(r.x), r.logLower
			other := d.Survival(r.x)
			otherLog, otherWant := d.LogSurvival(r.x), r.logUpp
			if r.upper < r.lower {
				got, other = other, got
				want = r.upper
				gotLog, wantLog, otherLog, otherWant = otherLog, otherWant, gotLog, wantLog
			}
			e := relErr(gotLog, wantLog)
			if e > 1e-13 {
				t.Errorf("%v: log tail at %v = %v, want %v, error %.2g", d, r.x, gotLog, wantLog, e)
			}
			logWorst = math.Max(logWorst, e)
			if math.Abs(otherWant) > 1e-307 {
				if e := relErr(otherLog, otherWant); e > 1e-12 {
					t.Errorf("%v: log of the larger tail at %v = %v, want %v, error %.2g", d, r.x, otherLog, otherWant, e)
				}
			}
			if want < 2.3e-308 {
				continue
			}
			e = relErr(got, want)
			errs = append(errs, e)
			if want >= 1e-30 {
				everyday = math.Max(everyday, e)
			}
			if e > 1e-12 || want >= 1e-30 && e > 2e-14 {
				t.Errorf("%v: tail at %v = %v, want %v, error %.2g", d, r.x, got, want, e)
			}
			if s := got + other; math.Abs(s-1) > 0x1p-52 {
				t.Errorf("%v: tails at %v add to 1%+g", d, r.x, s-1)
			}
		}
		sort.Float64s(errs)
		n := len(errs)
		t.Logf("%s: %d tails, relative error median %.2g, max %.2g; above 1e-30 max %.2g; logs max %.2g", fam.name, n, errs[n/2], errs[n-1], everyday, logWorst)
	}
}

// TestStudentizedRangeTable holds the percentage points of Harter (Annals of
// Mathematical Statistics 31, 1960) and Pearson and Hartley (Biometrika Tables
// for Statisticians, table 29), typed from memory and confirmed by recomputing.
func TestStudentizedRangeTable(t *testing.T) {
	for name, points := range percentagePoints(t, "table-studentized-range-a.json") {
		alpha, nu := 0.05, 0.0
		if strings.HasPrefix(name, "q_0.01") {
			alpha = 0.01
		}
		nu = dfOf(t, name)
		for i, want := range points.exact {
			d := StudentizedRange{i + 2, nu}
			x := d.UpperQuantile(alpha)
			if math.Abs(x-want) > 1e-9 {
				t.Errorf("%v: upper %v point %v, want %v", d, alpha, x, want)
			}
			if math.Round(x*100)/100 != points.published[i] {
				t.Errorf("%v: upper %v point %v, published %v", d, alpha, x, points.published[i])
			}
		}
	}
}

type points struct{ published, exact []float64 }

func dfOf(t *testing.T, name string) float64 {
	s := name[strings.LastIndex(name, "_")+1:]
	nu, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return nu
}

func percentagePoints(t *testing.T, file string) map[string]points {
	return percentageLists(t, file, 4)
}

func percentageLists(t *testing.T, file string, lists int) map[string]points {
	raw, err := os.ReadFile("testdata/" + file)
	if err != nil {
		t.Fatal(err)
	}
	var doc struct {
		Expected map[string]struct{ Published, Exact []string }
	}
	if err := json.Unmarshal(raw, &doc); err != nil {
		t.Fatal(err)
	}
	out := map[string]points{}
	for name, e := range doc.Expected {
		var p points
		for i := range e.Exact {
			x, err1 := strconv.ParseFloat(e.Exact[i], 64)
			r, err2 := strconv.ParseFloat(e.Published[i], 64)
			if err1 != nil || err2 != nil {
				t.Fatal(err1, err2)
			}
			p.exact, p.published = append(p.exact, x), append(p.published, r)
		}
		out[name] = p
	}
	if len(out) < lists {
		t.Fatalf("%s: %d lists", file, len(out))
	}
	return out
}

// TestStudentizedQuantiles goes from a probability to x and back.
func TestStudentizedQuantiles(t *testing.T) {
	worst := 0.0
	for _, fam := range studentizedFamilies {
		for _, k := range fam.ks {
			for _, nu := range []float64{1e-3, 0.1, 0.5, 1, 2.5, 7, 20, 300, 1e6, 1e12, math.Inf(1)} {
				d := fam.law(k, nu)
				for _, p := range []float64{1e-300, 1e-100, 1e-20, 1e-6, 0.01, 0.3, 0.5, 0.7, 0.95} {
					for side := range 2 {
						x, back := d.Quantile(p), 0.0
						log := d.LogCDF
						if side == 1 {
							x = d.UpperQuantile(p)
							log = d.LogSurvival
						}
						if math.IsInf(x, 1) || x == 0 { // beyond float64
							if far := log(math.MaxFloat64); x > 0 && (far < math.Log(p)) != (side == 0) || x == 0 && log(math.SmallestNonzeroFloat64) < math.Log(p) {
								t.Errorf("%v: quantile of %g (side %d) = %v", d, p, side, x)
							}
							continue
						}
						back = log(x)
						// d log tail / d log x is the conditioning of the way back.
						cond := x * math.Exp(d.LogProb(x)-back)
						e := math.Abs(back-math.Log(p)) / math.Max(1, cond) / math.Max(1, -math.Log(p)/30)
						worst = math.Max(worst, e)
						if !(e < 2e-14) {
							t.Errorf("%v: log tail at the quantile %v of %g (side %d) = %v, off by %.2g of x", d, x, p, side, back, e)
						}
					}
				}
			}
		}
	}
	t.Logf("largest relative error of x: %.2g", worst)
}

// TestStudentizedLimits checks ends, wrong parameters and the limit nu = +Inf.
func TestStudentizedLimits(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, fam := range studentizedFamilies {
		for _, d := range []fullLaw{fam.law(3, 7), fam.law(3, inf), fam.law(3, 1e-3)} {
			if err := d.Validate(); err != nil {
				t.Errorf("%v: %v", d, err)
			}
			for _, c := range []struct {
				name      string
				got, want float64
			}{
				{"CDF(0)", d.CDF(0), 0}, {"CDF(-1)", d.CDF(-1), 0}, {"CDF(-Inf)", d.CDF(-inf), 0}, {"CDF(+Inf)", d.CDF(inf), 1},
				{"Survival(0)", d.Survival(0), 1}, {"Survival(-Inf)", d.Survival(-inf), 1}, {"Survival(+Inf)", d.Survival(inf), 0},
				{"LogCDF(0)", d.LogCDF(0), -inf}, {"LogCDF(+Inf)", d.LogCDF(inf), 0},
				{"LogSurvival(0)", d.LogSurvival(0), 0}, {"LogSurvival(+Inf)", d.LogSurvival(inf), -inf},
				{"Prob(0)", d.Prob(0), 0}, {"Prob(-1)", d.Prob(-1), 0}, {"Prob(+Inf)", d.Prob(inf), 0}, {"LogProb(0)", d.LogProb(0), -inf},
				{"Quantile(0)", d.Quantile(0), 0}, {"Quantile(1)", d.Quantile(1), inf},
				{"UpperQuantile(0)", d.UpperQuantile(0), inf}, {"UpperQuantile(1)", d.UpperQuantile(1), 0},
			} {
				if c.got != c.want {
					t.Errorf("%v.%s = %v, want %v", d, c.name, c.got, c.want)
				}
			}
			for i, v := range []float64{d.CDF(nan), d.Survival(nan), d.LogCDF(nan), d.LogSurvival(nan), d.Prob(nan), d.LogProb(nan),
				d.Quantile(nan), d.Quantile(-0.1), d.UpperQuantile(1.1), d.UpperQuantile(nan)} {
				if !math.IsNaN(v) {
					t.Errorf("%v: case %d is %v, want NaN", d, i, v)
				}
			}
		}
		for _, d := range []fullLaw{fam.law(0, 7), fam.law(10001, 7), fam.law(3, 0), fam.law(3, -1), fam.law(3, nan), fam.law(3, 1e-4), fam.law(3, 1e13), fam.law(3, -inf)} {
			if d.Validate() == nil {
				t.Errorf("%v is valid", d)
			}
			for i, v := range []float64{d.CDF(1), d.Survival(1), d.LogCDF(1), d.LogSurvival(1), d.Prob(1), d.LogProb(1), d.Quantile(0.5),
				d.UpperQuantile(0.5), d.Mean(), d.Variance(), d.Rand(rand.NewPCG(1, 2)), d.Prob(0)} {
				if !math.IsNaN(v) {
					t.Errorf("%v: case %d is %v, want NaN", d, i, v)
				}
			}
		}
	}
}

// TestStudentizedMoments: E of the range of k normals as tabulated for control
// charts (Tippett, Biometrika 17, 1925), exact values for small k, and the
// known factors of s; the variance against the integral of the density.
func TestStudentizedMoments(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		d              Law
		got, want, tol float64
	}{
		{StudentizedRange{2, inf}, StudentizedRange{2, inf}.Mean(), 2 / math.Sqrt(math.Pi), 1e-14},
		{StudentizedRange{3, inf}, StudentizedRange{3, inf}.Mean(), 3 / math.Sqrt(math.Pi), 1e-14},
		{StudentizedRange{5, inf}, StudentizedRange{5, inf}.Mean(), 2.32593, 2e-6},   // Tippett
		{StudentizedRange{10, inf}, StudentizedRange{10, inf}.Mean(), 3.07751, 2e-6}, // Tippett
		{StudentizedRange{100, inf}, StudentizedRange{100, inf}.Mean(), 5.01519, 2e-6},
		{StudentizedRange{1000, inf}, StudentizedRange{1000, inf}.Mean(), 6.48287, 2e-6},
		{StudentizedRange{2, inf}, StudentizedRange{2, inf}.Variance(), 2 - 4/math.Pi, 1e-13},
		{StudentizedRange{2, 5}, StudentizedRange{2, 5}.Mean(), 2 / math.Sqrt(math.Pi) * math.Sqrt(2.5) / math.Gamma(2.5), 1e-14},
		{StudentizedRange{2, 5}, StudentizedRange{2, 5}.Variance(), 2*5.0/3 - math.Pow(2/math.Sqrt(math.Pi)*math.Sqrt(2.5)/math.Gamma(2.5), 2), 1e-13},
		{MaximumModulus{1, 3}, MaximumModulus{1, 3}.Variance(), 3 - 2*3/math.Pi/math.Pi*2, 1e-13},
		{MaximumModulus{1, inf}, MaximumModulus{1, inf}.Mean(), math.Sqrt(2 / math.Pi), 1e-14},
		{StudentizedRange{2, 1}, StudentizedRange{2, 1}.Mean(), inf, 0},
		{StudentizedRange{2, 2}, StudentizedRange{2, 2}.Variance(), inf, 0},
	} {
		if relErr(c.got, c.want) > c.tol {
			t.Errorf("%v: %v, want %v", c.d, c.got, c.want)
		}
	}
	for _, fam := range studentizedFamilies {
		for _, k := range []int{2, 9} {
			for _, nu := range []float64{2.5, 10.1, 1e7, inf} {
				d := fam.law(k, nu)
				var m0, m1, m2 float64
				h := 0.1 / math.Sqrt(float64(k))
				for u := -2 - 35/float64(k-1); u < 70; u += h {
					x := math.Exp(u)
					f := d.Prob(x) * x * h
					m0, m1, m2 = m0+f, m1+f*x, m2+f*x*x
				}
				tol := 1e-12
				if nu < 9 {
					tol = 1e-10
				}
				if math.Abs(m0-1) > 1e-12 || relErr(d.Mean(), m1) > tol || relErr(d.Variance(), m2-m1*m1) > 100*tol {
					t.Errorf("%v: integral %v, mean %v and %v, variance %v and %v", d, m0, d.Mean(), m1, d.Variance(), m2-m1*m1)
				}
			}
		}
	}
}

// TestStudentizedRand compares 1,000 draws with the CDF (Kolmogorov-Smirnov;
// 2.2 is exceeded with probability 1.3e-4 by sqrt(n) D).
func TestStudentizedRand(t *testing.T) {
	for _, d := range []fullLaw{StudentizedRange{2, 3}, StudentizedRange{6, 0.4}, StudentizedRange{20, 50}, StudentizedRange{4, math.Inf(1)},
		MaximumModulus{1, 3}, MaximumModulus{12, 1}, MaximumModulus{5, math.Inf(1)}} {
		src := rand.NewPCG(11, 12)
		const n = 1000
		x := make([]float64, n)
		for i := range x {
			x[i] = d.Rand(src)
		}
		sort.Float64s(x)
		worst := 0.0
		for i, v := range x {
			f := d.CDF(v)
			worst = math.Max(worst, math.Max(f-float64(i)/n, float64(i+1)/n-f))
		}
		if ks := worst * math.Sqrt(n); ks > 2.2 {
			t.Errorf("%v: Kolmogorov-Smirnov %v", d, ks)
		}
	}
}

// TestStudentizedSweep draws parameters over the whole domain and looks for
// NaN, tails outside [0, 1], and decreasing CDFs.
func TestStudentizedSweep(t *testing.T) {
	n := 2000
	if os.Getenv("SUBSUME_LONG") == "1" {
		n = 300000
	}
	rng := rand.New(rand.NewPCG(3, 4))
	for range n {
		checkStudentized(t, rng.IntN(2) == 0, rng.Float64(), rng.Float64(), rng.Float64(), rng.Float64())
	}
}

// checkStudentized turns four numbers of [0, 1] into a law and an x.
func checkStudentized(t *testing.T, modulus bool, a, b, c, e float64) {
	k := int(math.Exp(a*math.Log(1000))) + 1
	nu := math.Exp(math.Log(1e-3) + b*math.Log(1e15)*1.02)
	if nu > 1e12 {
		nu = math.Inf(1)
	}
	var d fullLaw = StudentizedRange{max(min(k, 1000), 2), nu}
	if modulus {
		d = MaximumModulus{min(k*k, 10000), nu}
	}
	// A third each: near the centre, everywhere, through the quantile.
	x := math.Exp(3 * (e - 0.3))
	switch int(c * 3) {
	case 1:
		x = math.Exp(700 * (2*e - 1))
	case 2:
		x = d.UpperQuantile(math.Exp(-100 * e))
	}
	lo, up, llo, lup, f, lf := d.CDF(x), d.Survival(x), d.LogCDF(x), d.LogSurvival(x), d.Prob(x), d.LogProb(x)
	for _, v := range []float64{lo, up, llo, lup, f, lf} {
		if math.IsNaN(v) {
			t.Fatalf("%v at %v: %v %v %v %v %v %v", d, x, lo, up, llo, lup, f, lf)
		}
	}
	if lo < 0 || lo > 1 || up < 0 || up > 1 || math.Abs(lo+up-1) > 0x1p-52 || llo > 0 || lup > 0 || f < 0 {
		t.Fatalf("%v at %v: tails %v and %v, logs %v and %v, density %v", d, x, lo, up, llo, lup, f)
	}
	if y := x * (1 + 1e-9); x > 0 && !math.IsInf(y, 0) {
		// One step to the right: never back by more than the error of 1e-13 of
		// the logarithm or of the tail.
		l2, u2 := d.LogCDF(y), d.LogSurvival(y)
		if l2 < llo-2e-13*math.Max(1, -llo) || u2 > lup+2e-13*math.Max(1, -lup) {
			t.Fatalf("%v from %v to %v: log CDF %v to %v, log survival %v to %v", d, x, y, llo, l2, lup, u2)
		}
	}
}

func FuzzStudentized(f *testing.F) {
	f.Add(false, 0.3, 0.5, 0.1, 0.5)
	f.Add(true, 1.0, 0.0, 0.5, 1.0)
	f.Fuzz(func(t *testing.T, modulus bool, a, b, c, e float64) {
		for _, v := range []float64{a, b, c, e} {
			if !(v >= 0 && v <= 1) {
				return
			}
		}
		checkStudentized(t, modulus, a, b, c, e)
	})
}

func TestStudentizedNoAllocation(t *testing.T) {
	d := StudentizedRange{5, 20}
	m := MaximumModulus{5, 20}
	var s float64
	if n := testing.AllocsPerRun(10, func() {
		s += d.Survival(4) + d.CDF(1) + d.LogCDF(1) + d.LogSurvival(9) + d.Prob(2) + d.LogProb(2) + m.Survival(4) + m.CDF(1) + m.Prob(2)
		s += d.UpperQuantile(0.05)
	}); n != 0 {
		t.Errorf("%v allocations", n)
	}
}

func BenchmarkStudentizedRange(b *testing.B) {
	benchmarkStudentized(b, rangeLaw, []int{2, 3, 5, 10, 50, 200, 1000})
}

func BenchmarkMaximumModulus(b *testing.B) {
	benchmarkStudentized(b, modulusLaw, []int{1, 5, 100, 10000})
}

func benchmarkStudentized(b *testing.B, law func(int, float64) fullLaw, ks []int) {
	var s float64
	for _, k := range ks {
		for _, nu := range []float64{0.5, 20, 1e6} {
			d := law(k, nu)
			for _, c := range []struct {
				name string
				f    func(float64) float64
				x    float64
			}{
				{"upper/5%", d.Survival, d.UpperQuantile(0.05)}, {"upper/centre", d.Survival, d.UpperQuantile(0.49)},
				{"upper/1e-30", d.Survival, d.UpperQuantile(1e-30)}, {"lower/1e-30", d.CDF, d.Quantile(1e-30)}, {"quantile/5%", d.UpperQuantile, 0.05},
			} {
				b.Run("k="+strconv.Itoa(k)+"/nu="+strconv.FormatFloat(nu, 'g', -1, 64)+"/"+c.name, func(b *testing.B) {
					b.ReportAllocs()
					for b.Loop() {
						s += c.f(c.x)
					}
				})
			}
		}
	}
	_ = s
}
