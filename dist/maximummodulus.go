package dist

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// MaximumModulus is the law of max |Zᵢ|/s, the largest modulus of K
// independent normal values of mean 0 and one variance, over an independent
// estimate s of their standard deviation with Nu degrees of freedom. It gives
// simultaneous intervals for K orthogonal contrasts, and conservative ones for
// correlated contrasts (Šidák 1967).
//
// K is an integer from 1 to 10000 (K = 1 is the modulus of Student's t); Nu a
// real number from 1e-3 to 1e12, or +Inf for a known standard deviation.
// Outside of that Validate reports an error and every method returns NaN.
//
// Each tail is an integral of positive terms over log s by the trapezoidal
// rule. Measured against integrals at 170 bits, tails down to 1e-304: relative
// error of 6e-16 in the median and 1e-13 at most, the same up to 10000 values and for
// Nu from 1e-3 to 1e12; 5 to 50 µs a tail, with no allocation.
type MaximumModulus struct {
	K  int
	Nu float64
}

var _ Law = MaximumModulus{}

const maxModulusGroups = 10000

// Validate returns a *ParamError that names the parameter outside its range, nil
// when none is.
func (d MaximumModulus) Validate() error {
	if d.K < 1 || d.K > maxModulusGroups {
		return &ParamError{"MaximumModulus", "K", float64(d.K), "an integer from 1 to 10000"}
	}
	return studentizedNuError("MaximumModulus", d.Nu)
}

func (d MaximumModulus) valid() bool {
	return d.K >= 1 && d.K <= maxModulusGroups &&
		(d.Nu >= minStudentizedNu && d.Nu <= maxStudentizedNu || math.IsInf(d.Nu, 1))
}

func (d MaximumModulus) law() studentizedLaw {
	return newStudentizedLaw(newUnitModulus(d.K), d.Nu)
}

// CDF returns P(M <= x), computed directly where it is the smaller tail: 0 for
// x <= 0, 1 at +Inf, NaN for NaN.
func (d MaximumModulus) CDF(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), 0, 1); done {
		return v
	}
	l := d.law()
	return l.cdf(x)
}

// Survival returns P(M > x), computed directly where it is the smaller tail:
// 1 for x <= 0, 0 at +Inf, NaN for NaN.
func (d MaximumModulus) Survival(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), 1, 0); done {
		return v
	}
	l := d.law()
	return l.survival(x)
}

// LogCDF returns log P(M <= x), finite beyond the underflow of CDF.
func (d MaximumModulus) LogCDF(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), math.Inf(-1), 0); done {
		return v
	}
	l := d.law()
	return l.logCDF(x)
}

// LogSurvival returns log P(M > x), finite beyond the underflow of Survival.
func (d MaximumModulus) LogSurvival(x float64) float64 {
	if v, done := positiveEnds(x, d.valid(), 0, math.Inf(-1)); done {
		return v
	}
	l := d.law()
	return l.logSurvival(x)
}

// Prob returns the density at x: 0 for x < 0; at 0 it is positive for K = 1 only.
func (d MaximumModulus) Prob(x float64) float64 {
	if d.valid() && x == 0 && d.K == 1 {
		return chiMoment(d.Nu, 1) * math.Sqrt(2/math.Pi)
	}
	if v, done := positiveEnds(x, d.valid(), 0, 0); done {
		return v
	}
	l := d.law()
	return l.prob(x)
}

// LogProb returns the log of the density, finite beyond the underflow of Prob.
func (d MaximumModulus) LogProb(x float64) float64 {
	if d.valid() && x == 0 && d.K == 1 {
		return math.Log(d.Prob(0))
	}
	if v, done := positiveEnds(x, d.valid(), math.Inf(-1), math.Inf(-1)); done {
		return v
	}
	l := d.law()
	return l.logProb(x)
}

// Quantile returns the x with P(M <= x) = p: 0 at p = 0, +Inf at p = 1, NaN
// outside [0, 1], +Inf where the answer exceeds the largest float64.
func (d MaximumModulus) Quantile(p float64) float64 {
	if v, done := edgeQuantile(d.valid(), p, 0, math.Inf(1)); done {
		return v
	}
	l := d.law()
	return l.quantile(p)
}

// UpperQuantile returns the x with P(M > x) = q, the critical value of size
// q: +Inf at q = 0, 0 at q = 1, NaN outside [0, 1].
func (d MaximumModulus) UpperQuantile(q float64) float64 {
	if v, done := edgeQuantile(d.valid(), q, math.Inf(1), 0); done {
		return v
	}
	l := d.law()
	return l.upperQuantile(q)
}

// Mean returns the expected value, +Inf for Nu <= 1.
func (d MaximumModulus) Mean() float64 {
	if !d.valid() {
		return math.NaN()
	}
	l := d.law()
	return l.mean()
}

// Variance returns the variance: +Inf for 1 < Nu <= 2, NaN where the mean is
// infinite.
func (d MaximumModulus) Variance() float64 {
	if !d.valid() {
		return math.NaN()
	}
	l := d.law()
	return l.variance()
}

// Rand draws a value: K normals and a chi variate from src.
func (d MaximumModulus) Rand(src rand.Source) float64 {
	if !d.valid() {
		return math.NaN()
	}
	rng := rand.New(src)
	top := 0.0
	for range d.K {
		top = math.Max(top, math.Abs(rng.NormFloat64()))
	}
	return top * math.Exp(-logChiVariate(src, d.Nu))
}

// String returns the law with its parameters, "MaximumModulus(5, 20)".
func (d MaximumModulus) String() string {
	return fmt.Sprintf("MaximumModulus(%d, %v)", d.K, d.Nu)
}
