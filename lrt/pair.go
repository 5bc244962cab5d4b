package lrt

import (
	"math"

	"subsume.example/dist"
)

// Pair is all that a reference law sees of a comparison: both fits, the degrees
// of freedom between them, and for linear spaces the arithmetic of the F test.
type Pair struct {
	Restricted, Full Fit

	// DF is the difference of ranks for linear spaces, the rank of the
	// restriction's Jacobian for declared models, 0 for a cone.
	DF float64

	// Nesting says how the nesting was shown; "" when it was not, which comes
	// with a warning.
	Nesting string

	// Irregular says why −2 log λ has no χ² law here; "" when nothing speaks
	// against one.
	Irregular string

	// Cone is set where inequalities take part, so that the law of −2 log λ is a
	// mixture.
	Cone *Cone

	Linear      Linear
	Certificate *Certificate
	Warnings    []Warning
}

// Linear is the arithmetic of one F comparison. It is flat, so that a batch
// fills it without allocating. The zero value (M = 0) means that the pair is not
// a mean comparison of linear spaces.
type Linear struct {
	RankS, RankB, RankE0, RankE1 int

	// Numerator and Denominator are the squared norms of the response projected
	// on B off S, and on E1 off E0, in units of 2^(2·Scale).
	Numerator, Denominator float64
	// Scale is the power of two by which the response was divided, so that
	// data near 1e300 or 1e-300 keep their digits.
	Scale int

	// Known is the known error variance in the units of the response; 0: estimated.
	Known float64
	// M is the m of λ = (1 + F d1/d2)^(−m/2): the number of observations for the
	// default error pair ("rows"), d1 + d2 for any other ("stratum").
	M float64
	// Stratum tells the two apart.
	Stratum bool
	// Certified says that F has exactly the F law under the null.
	Certified bool
	// Nil and NilNumerator say that the denominator, the numerator, is nil on
	// the scale of the data.
	Nil, NilNumerator bool
}

// DF returns the numerator and denominator degrees of freedom, differences of ranks.
func (l Linear) DF() (d1, d2 float64) {
	return float64(l.RankB - l.RankS), float64(l.RankE1 - l.RankE0)
}

// F returns the statistic F = (Numerator/d1)/(Denominator/d2) with its upper
// tail probability and the logarithm of that, without allocating. With a nil
// denominator F is +Inf and p is 0; with both nil all three are NaN. With
// known variance it returns the χ² statistic Numerator/Known and its tail.
func (l Linear) F() (f, p, logP float64) {
	d1, d2 := l.DF()
	if l.Known > 0 {
		x := l.standardized()
		c := dist.ChiSquared{K: d1}
		p, logP = tails(c.Survival(x), x, c.LogSurvival)
		return x, p, logP
	}
	switch {
	case d1 <= 0 || d2 <= 0 || l.Nil && l.NilNumerator:
		return math.NaN(), math.NaN(), math.NaN()
	case l.Nil:
		return inf, 0, -inf
	}
	f = l.Numerator / l.Denominator * (d2 / d1)
	law := dist.F{D1: d1, D2: d2}
	p, logP = tails(law.Survival(f), f, law.LogSurvival)
	return f, p, logP
}

// standardized returns Numerator/Known in the units of the response.
func (l Linear) standardized() float64 { return math.Ldexp(l.Numerator/l.Known, 2*l.Scale) }

// tails completes p with its logarithm, taking the law's own logarithm where p
// has lost digits: towards underflow, and near 1.
func tails(p, x float64, logSurvival func(float64) float64) (float64, float64) {
	if p > 1e-290 && p < 0.5 {
		return p, math.Log(p)
	}
	return p, logSurvival(x)
}

// LogLambda returns log λ: −(M/2)·log1p(Numerator/Denominator), or with known
// variance −Numerator/(2·Known).
func (l Linear) LogLambda() float64 {
	switch {
	case l.Known > 0:
		return -0.5 * l.standardized()
	case l.Nil && l.NilNumerator:
		return math.NaN()
	case l.Nil:
		return -inf
	}
	return -0.5 * l.M * math.Log1p(l.Numerator/l.Denominator)
}

// TrueSize returns the probability under the null, with normal errors, that
// the χ² test of nominal level alpha rejects: from the exact law of F. It is
// alpha itself with known variance, and NaN where F is not certified.
func (l Linear) TrueSize(alpha float64) float64 {
	d1, d2 := l.DF()
	if !(alpha > 0 && alpha < 1) || l.M == 0 || !l.Certified || d1 <= 0 || d2 <= 0 {
		return math.NaN()
	}
	if l.Known > 0 {
		return alpha
	}
	c := dist.ChiSquared{K: d1}.UpperQuantile(alpha)
	return dist.F{D1: d1, D2: d2}.Survival(math.Expm1(c/l.M) * (d2 / d1))
}

// Certificate says whether the F of a comparison has exactly the F law, and if
// not which term breaks which identity. It follows from the design alone.
type Certificate struct {
	Exact bool
	// Term and Identity name what failed: "numerator", "error" or a random term.
	Term, Identity string
	// Residual is the largest violation seen, Tol what is allowed.
	Residual, Tol float64
	// C are the constants c_j: of the independent errors (1) first, then of the
	// random terms in their order; nil without random terms.
	C []float64
}
