package dist

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// StudentizedRange is the law of (max - min)/s, the range of K independent
// normal values of one variance, over an independent estimate s of their
// standard deviation with Nu degrees of freedom. It is the law behind
// simultaneous comparisons of all pairs of K equally replicated means.
//
// K is an integer from 2 to 1000; Nu a real number from 1e-3 to 1e12, or +Inf
// for a known standard deviation. Outside of that Validate reports an error and
// every method returns NaN.
//
// Both tails are computed directly, as a double integral of positive terms by
// trapezoidal rules that converge exponentially (regions and sources in the package documentation).
// Measured against 80-bit double integrals, tails down to 1e-300: relative error of 7e-16 in the
// median and 2e-13 at most, 1.2e-14 for tails above 1e-30; against rows at 24 digits with up to 1000
// groups and Nu from 1e-3 to 1e12, 1e-13. A tail takes 15 to 120 µs by K where math.Exp takes 5 ns,
// with no allocation; Survivals shares that work between many x.
type StudentizedRange struct {
	K  int
	Nu float64
}

var _ Law = StudentizedRange{}

const (
	maxRangeGroups   = 1000
	minStudentizedNu = 1e-3
	maxStudentizedNu = 1e12
)

// Validate returns a *ParamError that names the parameter outside its range, nil
// when none is.
func (d StudentizedRange) Validate() error {
	if d.K < 2 || d.K > maxRangeGroups {
		return &ParamError{"StudentizedRange", "K", float64(d.K), "an integer from 2 to 1000"}
	}
	return studentizedNuError("StudentizedRange", d.Nu)
}

func studentizedNuError(law string, nu float64) error {
	if nu >= minStudentizedNu && nu <= maxStudentizedNu || math.IsInf(nu, 1) {
		return nil
	}
	return &ParamError{law, "Nu", nu, "degrees of freedom from 1e-3 to 1e12, or +Inf"}
}

func (d StudentizedRange) valid() bool {
	return d.K >= 2 && d.K <= maxRangeGroups &&
		(d.Nu >= minStudentizedNu && d.Nu <= maxStudentizedNu || math.IsInf(d.Nu, 1))
}

func (d StudentizedRange) law() studentizedLaw {
	return newStudentizedLaw(newUnitRange(d.K), d.Nu)
}

// CDF returns P(Q <= x), computed directly where it is the smaller tail: 0 for
// x <= 0, 1 at +Inf, NaN for NaN.
func (d StudentizedRange) CDF(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), 0, 1); done {
		return v
	}
	l := d.law()
	return l.cdf(x)
}

// Survival returns P(Q > x), computed directly where it is the smaller tail:
// 1 for x <= 0, 0 at +Inf, NaN for NaN.
func (d StudentizedRange) Survival(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), 1, 0); done {
		return v
	}
	l := d.law()
	return l.survival(x)
}

// LogCDF returns log P(Q <= x), finite beyond the underflow of CDF.
func (d StudentizedRange) LogCDF(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), math.Inf(-1), 0); done {
		return v
	}
	l := d.law()
	return l.logCDF(x)
}

// LogSurvival returns log P(Q > x), finite beyond the underflow of Survival.
func (d StudentizedRange) LogSurvival(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), 0, math.Inf(-1)); done {
		return v
	}
	l := d.law()
	return l.logSurvival(x)
}

// Prob returns the density at x: 0 for x < 0; at 0 it is positive for K = 2 only.
func (d StudentizedRange) Prob(x float64) float64 {
	if d.valid() && x == 0 && d.K == 2 {
		return chiMoment(d.Nu, 1) / math.Sqrt(math.Pi)
	}
	if v, done := positiveEnds(x, d.valid(), 0, 0); done {
		return v
	}
	l := d.law()
	return l.prob(x)
}

// LogProb returns the log of the density, finite beyond the underflow of Prob.
func (d StudentizedRange) LogProb(x float64) float64 {
	if d.valid() && x == 0 && d.K == 2 {
		return math.Log(d.Prob(0))
	}
	if v, done := positiveEnds(x, d.valid(), math.Inf(-1), math.Inf(-1)); done {
		return v
	}
	l := d.law()
	return l.logProb(x)
}

// Quantile returns the x with P(Q <= x) = p: 0 at p = 0, +Inf at p = 1, NaN
// outside [0, 1], +Inf where the answer exceeds the largest float64.
func (d StudentizedRange) Quantile(p float64) float64 {
	if v, done := edgeQuantile(d.valid(), p, 0, math.Inf(1)); done {
		return v
	}
	l := d.law()
	return l.quantile(p)
}

// UpperQuantile returns the x with P(Q > x) = q, the critical value of size
// q: +Inf at q = 0, 0 at q = 1, NaN outside [0, 1].
func (d StudentizedRange) UpperQuantile(q float64) float64 {
	if v, done := edgeQuantile(d.valid(), q, math.Inf(1), 0); done {
		return v
	}
	l := d.law()
	return l.upperQuantile(q)
}

// Mean returns the expected value, +Inf for Nu <= 1.
func (d StudentizedRange) Mean() float64 {
	if !d.valid() {
		return math.NaN()
	}
	l := d.law()
	return l.mean()
}

// Variance returns the variance: +Inf for 1 < Nu <= 2, NaN where the mean is
// infinite.
func (d StudentizedRange) Variance() float64 {
	if !d.valid() {
		return math.NaN()
	}
	l := d.law()
	return l.variance()
}

// Rand draws a value: K normals and a chi variate from src.
func (d StudentizedRange) Rand(src rand.Source) float64 {
	if !d.valid() {
		return math.NaN()
	}
	rng := rand.New(src)
	lo := rng.NormFloat64()
	hi := lo
	for range d.K - 1 {
		z := rng.NormFloat64()
		lo, hi = math.Min(lo, z), math.Max(hi, z)
	}
	return (hi - lo) * math.Exp(-logChiVariate(src, d.Nu))
}

// String returns the law with its parameters, "StudentizedRange(5, 20)".
func (d StudentizedRange) String() string {
	return fmt.Sprintf("StudentizedRange(%d, %v)", d.K, d.Nu)
}

// edgeQuantile answers NaN outside [0, 1] and the two ends.
func edgeQuantile(valid bool, p, low, high float64) (v float64, done bool) {
	switch {
	case !valid || !(p >= 0 && p <= 1):
		return math.NaN(), true
	case p == 0:
		return low, true
	case p == 1:
		return high, true
	}
	return 0, false
}
