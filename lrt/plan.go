package lrt

import (
	"context"
	"fmt"
	"math"

	"subsume.example/dist"
)

// Plan says how the statistic of a comparison is distributed under the
// restricted space and under the effect that was planned for. The power of the
// test of size alpha is Truth.Survival(Null.UpperQuantile(alpha)).
type Plan struct {
	Null, Truth dist.Law
	// Noncentrality is ‖(P_B − P_S)(μ − origin)‖²/σ² for linear spaces, σ² being the
	// expected mean square of the error pair; elsewhere −2 log λ on the expected
	// data of the alternative (O'Brien 1986).
	Noncentrality float64
	// Exact says that both laws hold for these sizes, not only as data grow.
	Exact bool
	Why   string
}

// PlanF returns the plan of an F test with d1 and d2 degrees of freedom; d2 may
// be +Inf. It returns ErrNothingTested for d1 <= 0, ErrNoErrorDF for d2 <= 0.
func PlanF(d1, d2, noncentrality float64) (Plan, error) {
	switch {
	case d1 <= 0:
		return Plan{}, fmt.Errorf("lrt: plan: %w: %g numerator degrees of freedom", ErrNothingTested, d1)
	case d2 <= 0:
		return Plan{}, fmt.Errorf("lrt: plan: %w: %g", ErrNoErrorDF, d2)
	}
	p := Plan{Null: dist.F{D1: d1, D2: d2}, Truth: dist.NoncentralF{D1: d1, D2: d2, Lambda: noncentrality},
		Noncentrality: noncentrality, Exact: true, Why: "under the effect F is noncentral F for normal errors of one variance; the noncentrality is the squared length of the effect over the error variance"}
	return p, p.Validate()
}

// PlanChiSquared returns the plan of a likelihood ratio test with df degrees of freedom.
func PlanChiSquared(df, noncentrality float64) (Plan, error) {
	p := Plan{Null: dist.ChiSquared{K: df}, Truth: dist.NoncentralChiSquared{K: df, Lambda: noncentrality},
		Noncentrality: noncentrality, Why: "−2 log λ tends to noncentral χ² for effects of the size of the standard error (Wald 1943); the noncentrality is −2 log λ on the expected data (O'Brien 1986)"}
	return p, p.Validate()
}

// Validate reports laws that are missing or out of range.
func (p Plan) Validate() error {
	if p.Null == nil || p.Truth == nil {
		return fmt.Errorf("lrt: plan: %w: a law is missing", ErrInvalid)
	}
	for _, l := range []dist.Law{p.Null, p.Truth} {
		if err := l.Validate(); err != nil {
			return fmt.Errorf("lrt: plan: %w: %w", ErrInvalid, err)
		}
	}
	return nil
}

// Critical returns the value that the statistic of a test of size alpha must
// exceed, NaN unless 0 < alpha < 1.
func (p Plan) Critical(alpha float64) float64 {
	if !(alpha > 0 && alpha < 1) || p.Null == nil {
		return nan
	}
	return p.Null.UpperQuantile(alpha)
}

// Power returns the probability that the test of size alpha rejects when the
// effect is as planned, NaN unless 0 < alpha < 1.
func (p Plan) Power(alpha float64) float64 {
	c := p.Critical(alpha)
	if math.IsNaN(c) || p.Truth == nil {
		return nan
	}
	return p.Truth.Survival(c)
}

// Detectable returns the noncentrality at which the test of size alpha, with
// the null law of this plan, has the given power. An effect grows with the
// square root of it. The power must be above alpha and below 1.
func (p Plan) Detectable(alpha, power float64) (float64, error) {
	c := p.Critical(alpha)
	if math.IsNaN(c) || !(power > alpha && power < 1) {
		return nan, fmt.Errorf("lrt: plan: %w: alpha %g and power %g, want 0 < alpha < power < 1", ErrInvalid, alpha, power)
	}
	switch l := p.Null.(type) {
	case dist.F:
		return dist.NoncentralityF(l.D1, l.D2, c, power)
	case dist.ChiSquared:
		return dist.NoncentralityChiSquared(l.K, c, power)
	}
	return nan, fmt.Errorf("lrt: plan: %w: no noncentral law goes with %v", ErrInvalid, p.Null)
}

// String says what the plan assumes.
func (p Plan) String() string {
	kind := "asymptotic"
	if p.Exact {
		kind = "exact"
	}
	return fmt.Sprintf("%s: null %v, truth %v; noncentrality %.6g; %s", kind, p.Null, p.Truth, p.Noncentrality, p.Why)
}

// Plan plans a comparison whose spaces are bound to *expected* responses in
// place of data: the same fits give the noncentrality. variance is the expected
// mean square of the error pair for linear spaces; it is not looked at for
// others, whose likelihood knows its own dispersion. Bind the spaces to the
// means that the effect worth finding would give. Power at an effect estimated
// from the same data says nothing that its p-value does not; do not plan so.
func (c Comparison) Plan(ctx context.Context, variance float64, s *Settings) (Plan, error) {
	p, err := c.Fit(ctx, s)
	if err != nil {
		return Plan{}, err
	}
	return PlanPair(c, p, variance)
}

// PlanPair is Comparison.Plan for a pair that is already fitted to expected
// responses.
func PlanPair(c Comparison, p Pair, variance float64) (Plan, error) {
	l := p.Linear
	if l.M == 0 {
		if p.DF <= 0 {
			return Plan{}, c.fail("plan", fmt.Errorf("%w: the restriction has no degrees of freedom of its own", ErrNothingTested))
		}
		if p.Irregular != "" {
			return Plan{}, c.fail("plan", fmt.Errorf("%w: %s", ErrInvalid, p.Irregular))
		}
		plan, err := PlanChiSquared(p.DF, math.Max(0, 2*(p.Full.LogLikelihood-p.Restricted.LogLikelihood)))
		if err != nil {
			return Plan{}, c.fail("plan", err)
		}
		return plan, nil
	}
	if l.Known > 0 {
		variance = l.Known
	}
	if !(variance > 0) || math.IsInf(variance, 1) {
		return Plan{}, c.fail("plan", fmt.Errorf("%w: variance %g, want a positive number", ErrInvalid, variance))
	}
	d1, d2 := l.DF()
	switch {
	case d1 <= 0:
		return Plan{}, c.fail("plan", fmt.Errorf("%w: both have rank %d", ErrNothingTested, l.RankS))
	case d2 <= 0 && l.Known <= 0:
		return Plan{}, c.fail("plan", fmt.Errorf("%w: the error pair has ranks %d and %d", ErrNoErrorDF, l.RankE0, l.RankE1))
	}
	lambda := math.Ldexp(l.Numerator/variance, 2*l.Scale)
	if l.NilNumerator {
		lambda = 0
	}
	var plan Plan
	var err error
	if l.Known > 0 {
		plan, err = PlanChiSquared(d1, lambda)
		plan.Exact, plan.Why = true, "with known variance −2 log λ is exactly noncentral χ² for normal errors"
	} else {
		plan, err = PlanF(d1, d2, lambda)
	}
	if err != nil {
		return Plan{}, c.fail("plan", err)
	}
	if !l.Certified {
		plan.Exact = false
		plan.Why = "F is not certified exact for this design, nor is its power"
		if k := p.Certificate; k != nil && k.Identity != "" {
			plan.Why += ": " + k.Term + ", " + k.Identity
		}
	}
	return plan, nil
}
