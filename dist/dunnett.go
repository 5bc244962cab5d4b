package dist

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"subsume.example/internal/special"
)

// Dunnett is the law of the largest of K correlated t statistics, or of their
// largest modulus, that share the estimate of the standard deviation: the law behind
// comparisons of several treatments with one control (Dunnett, JASA 50, 1955).
//
// T = max Zᵢ/s or max |Zᵢ|/s, where Zᵢ are standard normal, Zᵢ and Zⱼ
// correlate by Lambda[i]*Lambda[j], and s is independent with Nu degrees of freedom. For K
// treatments of n₁ ... n_K rows against a control of n₀, Lambda[i] =
// sqrt(nᵢ/(nᵢ+n₀)), 1/√2 for equal numbers; DunnettFor makes it.
//
// Lambda has 1 to 1000 entries between -1 and 1, no closer to ±1 than 1e-6; Nu is a real
// number from 1e-3 to 1e12, or +Inf for a known standard deviation. The law
// never writes to the slice; do not change it while the law is in use.
//
// Each tail is an integral over the common normal inside one over log s, both of
// positive terms by trapezoidal rules that check themselves: relative error
// below 1e-10 on the tail, in practice near 1e-14 (seven rows by two methods at 24 digits, and all
// of random laws by halved steps); the inner integral is that of Dunnett and Sobel (Biometrika
// 42, 1955). A tail takes 0.1 to 1 ms, up to 20 ms for Lambda near ±1.
type Dunnett struct {
	Lambda   []float64
	Nu       float64
	TwoSided bool
}

var _ Law = Dunnett{}

const (
	maxTreatments = 1000
	maxLambda     = 1 - 1e-6
)

// DunnettFor returns the law for treatments of the given numbers of rows against
// a control, with nu degrees of freedom. Numbers that are not positive give a law that
// Validate rejects.
func DunnettFor(control float64, treatments []float64, nu float64, twoSided bool) Dunnett {
	d := Dunnett{make([]float64, len(treatments)), nu, twoSided}
	for i, n := range treatments {
		d.Lambda[i] = math.NaN()
		if n > 0 && control > 0 {
			d.Lambda[i] = math.Sqrt(1 / (1 + control/n))
		}
	}
	return d
}

// Validate returns a *ParamError that names the parameter outside its range,
// nil when none is.
func (d Dunnett) Validate() error {
	if n := len(d.Lambda); n < 1 || n > maxTreatments {
		return &ParamError{"Dunnett", "len(Lambda)", float64(n), "1 to 1000"}
	}
	for i, l := range d.Lambda {
		if !(math.Abs(l) <= maxLambda) {
			return &ParamError{"Dunnett", fmt.Sprintf("Lambda[%d]", i), l, "a number between -1 and 1, at least 1e-6 from both"}
		}
	}
	return studentizedNuError("Dunnett", d.Nu)
}

func (d Dunnett) valid() bool {
	for _, l := range d.Lambda {
		if !(math.Abs(l) <= maxLambda) {
			return false
		}
	}
	n := len(d.Lambda)
	return n >= 1 && n <= maxTreatments && (d.Nu >= minStudentizedNu && d.Nu <= maxStudentizedNu || math.IsInf(d.Nu, 1))
}

// groupBuffer holds the groups of most designs without an allocation.
type groupBuffer [12]productGroup

// law makes the law of T on x > 0, or with below that of -T.
func (d Dunnett) law(below bool, buffer *groupBuffer) studentizedLaw {
	lower, upper := math.Inf(-1), 1.0
	if d.TwoSided {
		lower = -1
	}
	if below {
		upper = -1
	}
	groups := buffer[:0]
	for _, l := range d.Lambda {
		i := slices.IndexFunc(groups, func(g productGroup) bool { return g.lambda == l })
		if i < 0 {
			groups = append(groups, newProductGroup(l, lower, upper, 1))
		} else {
			groups[i].count++
		}
	}
	return newStudentizedLaw(newUnitProduct(groups, len(d.Lambda), below), d.Nu)
}

// newUnitProduct prepares the largest of k correlated normals, or minus it.
func newUnitProduct(groups []productGroup, k int, below bool) unitLaw {
	kf := float64(k)
	u := unitLaw{kind: unitLargest, n: k - 1, quad: 1, base: 1, product: newProduct(groups)}
	two := groups[0].lower == -1
	b := math.Max(1, special.NormalUpperQuantile(math.Min(0.5, 0.5/kf))+0.35)
	u.inf = special.NormalUpperQuantile(0.5e-18 / kf)
	if two {
		u.power = kf
		u.middle = special.NormalUpperQuantile(-0.5 * math.Expm1(-math.Ln2/kf))
		logs := 0.0
		for _, g := range groups {
			logs += g.count * math.Log(g.rest)
		}
		u.one = math.Exp((logs-41.5)/kf) / 0.8
		u.step = math.Min(0.12, 0.39/(b*u.middle))
		return u
	}
	in, slope := u.product.inside(0, true)
	u.slope = math.Abs(slope.value())
	u.base = 1 - in.value()
	u.middle = math.Max(0.5, special.NormalUpperQuantile(-math.Expm1(-math.Ln2/kf)))
	smallest := 1.0
	info, cross := 0.0, 0.0
	for _, g := range groups {
		smallest = math.Min(smallest, g.rest)
		info += g.count / (g.rest * g.rest)
		cross += g.count * g.slope / g.rest
	}
	u.one = 1e-18 * smallest / kf
	u.linear = 1e-8 * smallest / kf
	if below {
		u.kind = unitBelow
		u.base = in.value()
		u.middle = 0.5
		u.inf = special.NormalUpperQuantile(1e-18)
		// 1ᵀR⁻¹1 by Sherman and Morrison; at least the 1 of a single value.
		u.quad = math.Max(1, info-cross*cross/(1+sumSlopes(groups)))
	}
	u.step = math.Min(0.12, 0.39/(b*math.Max(1, u.middle)))
	return u
}

func sumSlopes(groups []productGroup) float64 {
	s := 0.0
	for _, g := range groups {
		s += g.count * g.slope * g.slope
	}
	return s
}

// productTails serves the two product kinds: below the middle the inside is
// summed, above it the outside, and the other where it turns out to be small.
func (u *unitLaw) productTails(w float64, density bool) unitTails {
	p := &u.product
	var in, out, slope tail
	if w < u.linear {
		d := u.slope * w
		return unitTails{lower: tail{1 - u.base + d, 0}, upper: tail{u.base - d, 0}, density: tail{u.slope, 0}}
	}
	if u.kind == unitBelow {
		if w > 1e7 { // the logarithm is all that is left
			return unitTails{lower: tail{1, 0}, upper: tail{1, -0.5 * u.quad * w * w}, density: tail{u.quad * w, -0.5 * u.quad * w * w}}
		}
		in, slope = p.inside(w, density)
		out = tail{1 - in.value(), 0}
		if out.mant < 0.1 {
			out, _ = p.outside(w, false)
		}
		return unitTails{lower: out, upper: in, density: tail{-slope.mant, slope.log}}
	}
	if w < u.middle {
		in, slope = p.inside(w, density)
		if out = (tail{1 - in.value(), 0}); out.mant < 0.1 {
			out, _ = p.outside(w, false)
		}
	} else {
		out, slope = p.outside(w, density)
		if in = (tail{1 - out.value(), 0}); in.mant < 0.1 {
			in, slope = p.inside(w, density)
		}
	}
	return unitTails{lower: in, upper: out, density: slope}
}

// atZero answers for x = 0 and one-sided laws: P(all Zᵢ <= 0).
func (d Dunnett) atZero() (in float64) {
	var buffer groupBuffer
	l := d.law(true, &buffer)
	return l.u.base
}

// side answers the ends and chooses the law: of T for x > 0, of -T below 0.
func (d Dunnett) side(x float64, buffer *groupBuffer, left, zero, right float64) (l studentizedLaw, y float64, below bool, v float64, done bool) {
	switch {
	case !d.valid() || math.IsNaN(x):
		return l, 0, false, math.NaN(), true
	case math.IsInf(x, 1):
		return l, 0, false, right, true
	case math.IsInf(x, -1) || d.TwoSided && x <= 0:
		return l, 0, false, left, true
	case x == 0:
		return l, 0, false, zero, true
	case x < 0:
		return d.law(true, buffer), -x, true, 0, false
	}
	return d.law(false, buffer), x, false, 0, false
}

// CDF returns P(T <= x), directly where it is the smaller tail; 0 for x <= 0
// and a two-sided law.
func (d Dunnett) CDF(x float64) float64 {
	var buffer groupBuffer
	l, y, below, v, done := d.side(x, &buffer, 0, math.NaN(), 1)
	switch {
	case done && math.IsNaN(v) && d.valid() && x == 0:
		return d.atZero()
	case done:
		return v
	case below:
		return l.survival(y)
	}
	return l.cdf(y)
}

// Survival returns P(T > x), directly where it is the smaller tail; 1 for
// x <= 0 and a two-sided law.
func (d Dunnett) Survival(x float64) float64 {
	var buffer groupBuffer
	l, y, below, v, done := d.side(x, &buffer, 1, math.NaN(), 0)
	switch {
	case done && math.IsNaN(v) && d.valid() && x == 0:
		return 1 - d.atZero()
	case done:
		return v
	case below:
		return l.cdf(y)
	}
	return l.survival(y)
}

// LogCDF returns log P(T <= x), finite beyond the underflow of CDF.
func (d Dunnett) LogCDF(x float64) float64 {
	var buffer groupBuffer
	l, y, below, v, done := d.side(x, &buffer, math.Inf(-1), math.NaN(), 0)
	switch {
	case done && math.IsNaN(v) && d.valid() && x == 0:
		return math.Log(d.atZero())
	case done:
		return v
	case below:
		return l.logSurvival(y)
	}
	return l.logCDF(y)
}

// LogSurvival returns log P(T > x), finite beyond the underflow of Survival.
func (d Dunnett) LogSurvival(x float64) float64 {
	var buffer groupBuffer
	l, y, below, v, done := d.side(x, &buffer, 0, math.NaN(), math.Inf(-1))
	switch {
	case done && math.IsNaN(v) && d.valid() && x == 0:
		return math.Log1p(-d.atZero())
	case done:
		return v
	case below:
		return l.logCDF(y)
	}
	return l.logSurvival(y)
}

// Prob returns the density at x.
func (d Dunnett) Prob(x float64) float64 {
	var buffer groupBuffer
	if x == 0 {
		x = 1e-150 // continuous there, of the right
	}
	l, y, _, v, done := d.side(x, &buffer, 0, 0, 0)
	if done {
		return v
	}
	return l.prob(y)
}

// LogProb returns the log of the density.
func (d Dunnett) LogProb(x float64) float64 {
	var buffer groupBuffer
	if x == 0 {
		x = 1e-150
	}
	l, y, _, v, done := d.side(x, &buffer, math.Inf(-1), 0, math.Inf(-1))
	if done {
		return v
	}
	return l.logProb(y)
}

// Quantile returns the x with P(T <= x) = p: the left end of the law at 0,
// +Inf at 1, NaN outside [0, 1].
func (d Dunnett) Quantile(p float64) float64 {
	left := math.Inf(-1)
	if d.TwoSided {
		left = 0
	}
	if v, done := edgeQuantile(d.valid(), p, left, math.Inf(1)); done {
		return v
	}
	var buffer groupBuffer
	if !d.TwoSided {
		if l := d.law(true, &buffer); p < l.u.base {
			return -l.upperQuantile(p)
		}
	}
	l := d.law(false, &buffer)
	return l.quantile(p)
}

// UpperQuantile returns the x with P(T > x) = q, the critical value of size q:
// +Inf at q = 0, the left end of the law at 1, NaN outside [0, 1].
func (d Dunnett) UpperQuantile(q float64) float64 {
	left := math.Inf(-1)
	if d.TwoSided {
		left = 0
	}
	if v, done := edgeQuantile(d.valid(), q, math.Inf(1), left); done {
		return v
	}
	var buffer groupBuffer
	l := d.law(false, &buffer)
	if !d.TwoSided && q > l.u.base {
		l = d.law(true, &buffer)
		return -l.quantile(q)
	}
	return l.upperQuantile(q)
}

// moments returns E W and E W² of the statistic at known scale, from the
// integrals of its tails.
func (d Dunnett) moments() (m1, m2 float64) {
	var buffer groupBuffer
	for side := range 2 {
		if side == 1 && d.TwoSided {
			break
		}
		l := d.law(side == 1, &buffer)
		h := 0.6 * l.u.step
		var a1, a2 float64
		for dir := 1; dir >= -1; dir -= 2 {
			for j := min(dir, 0); j < 10000 && j > -10000; j += dir {
				w := l.u.middle * math.Exp(h*float64(j))
				x := l.u.tails(w, false).upper.value() * w
				a1 += x
				a2 += 2 * x * w
				if x < 1e-17*a1 {
					break
				}
			}
		}
		if side == 1 {
			a1 = -a1
		}
		m1 += a1 * h
		m2 += a2 * h
	}
	return m1, m2
}

// Mean returns the expected value: +Inf for a two-sided law with Nu <= 1, NaN
// for a one-sided one, which has none.
func (d Dunnett) Mean() float64 {
	switch {
	case !d.valid() || d.Nu <= 1 && !d.TwoSided:
		return math.NaN()
	case d.Nu <= 1:
		return math.Inf(1)
	}
	m, _ := d.moments()
	return m * chiMoment(d.Nu, -1)
}

// Variance returns the variance: +Inf for 1 < Nu <= 2, NaN for Nu <= 1.
func (d Dunnett) Variance() float64 {
	switch {
	case !d.valid() || d.Nu <= 1:
		return math.NaN()
	case d.Nu <= 2:
		return math.Inf(1)
	}
	m1, m2 := d.moments()
	return studentizedVariance(m1, m2, d.Nu)
}

// Rand draws a value: the common normal, K others, and s.
func (d Dunnett) Rand(src rand.Source) float64 {
	if !d.valid() {
		return math.NaN()
	}
	rng := rand.New(src)
	z := rng.NormFloat64()
	top := math.Inf(-1)
	for _, l := range d.Lambda {
		x := l*z + math.Sqrt((1-l)*(1+l))*rng.NormFloat64()
		if d.TwoSided {
			x = math.Abs(x)
		}
		top = math.Max(top, x)
	}
	return top * math.Exp(-logChiVariate(src, d.Nu))
}

// String returns the parameters, "Dunnett([0.7 0.7], 20, two-sided)".
func (d Dunnett) String() string {
	side := "one-sided"
	if d.TwoSided {
		side = "two-sided"
	}
	return fmt.Sprintf("Dunnett(%v, %v, %s)", d.Lambda, d.Nu, side)
}
