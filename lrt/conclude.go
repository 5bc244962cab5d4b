package lrt

import (
	"context"
	"fmt"
	"math"

	"subsume.example/dist"
)

// Conclude turns a fitted pair into a Result. Every p-value of a comparison in
// this module is made here; tables, chains and batches end here.
func Conclude(ctx context.Context, c Comparison, p Pair, s *Settings) (Result, error) {
	if err := s.validate(); err != nil {
		return Result{}, c.fail("settings", err)
	}
	r := Result{Comparison: c, Pair: p, Level: s.level(), Warnings: p.Warnings}
	var err error
	if p.Linear.M > 0 {
		err = r.concludeLinear()
	} else {
		err = r.concludeLikelihood(ctx, s)
	}
	if err != nil {
		return Result{}, c.fail("", err)
	}
	if s != nil {
		for i, ref := range s.References {
			if ref == nil {
				return Result{}, c.fail(fmt.Sprintf("reference %d", i), fmt.Errorf("%w: nil", ErrInvalid))
			}
			t, err := ref.Refer(ctx, c, p, s)
			if err != nil {
				return Result{}, c.fail(fmt.Sprintf("reference %d", i), err)
			}
			r.Others = append(r.Others, t)
		}
	}
	r.recommend()
	r.distrust()
	return r, nil
}

// distrust warns where χ² is all there is and the sample is small, with the
// one figure an exact law can give: what the nominal level would be worth in
// a normal linear pair of the same dimensions.
func (r *Result) distrust() {
	p := r.Pair
	if p.Linear.M > 0 || r.Recommended != Asymptotic || r.ChiSquared.Kind != Asymptotic {
		return
	}
	alpha, d2 := 1-r.Level, p.Full.N-p.Full.Dim
	if d2 <= 0 {
		return
	}
	size := Linear{RankB: int(p.DF), RankE1: d2, M: float64(p.Full.N), Certified: true}.TrueSize(alpha)
	if size > 1.25*alpha {
		r.Warnings = append(r.Warnings[:len(r.Warnings):len(r.Warnings)], Warning{"small-sample", fmt.Sprintf(
			"χ² is all that %d observations and %d free parameters were referred to; in a normal linear pair of this size the nominal %.3g %% test rejects %.3g %% of true null hypotheses: ask for a Bootstrap or a Bartlett correction",
			p.Full.N, p.Full.Dim, 100*alpha, 100*size)})
	}
}

// concludeLinear refers a mean comparison of linear spaces to F, or to χ²
// when the variance is known.
func (r *Result) concludeLinear() error {
	l := r.Pair.Linear
	d1, d2 := l.DF()
	if d1 <= 0 {
		return fmt.Errorf("%w: both have rank %d", ErrNothingTested, l.RankS)
	}
	if l.Known <= 0 {
		if d2 <= 0 {
			return fmt.Errorf("%w: the error pair has ranks %d and %d; fewer parameters or more observations are needed", ErrNoErrorDF, l.RankE0, l.RankE1)
		}
		if l.Nil && l.NilNumerator {
			return ErrNoVariation
		}
	}
	r.LogLambda = l.LogLambda()
	r.Lambda = math.Exp(r.LogLambda)
	r.Statistic = math.Abs(2 * r.LogLambda) // −2 log λ without a −0
	r.ChiSquared = chiSquared(r.Statistic, d1)

	f, pv, lp := l.F()
	t := Test{Kind: Exact, Name: "F", Statistic: f, P: pv, LogP: lp}
	if l.Known > 0 {
		t.Name, t.Law, t.Why = "χ²", dist.ChiSquared{K: d1}, whyKnown
	} else {
		t.Law, t.Why = dist.F{D1: d1, D2: d2}, whyF
	}
	if !l.Certified {
		t.Kind, t.Why = Approximate, "F is not certified exact for this design"
		if k := r.Pair.Certificate; k != nil && k.Identity != "" {
			t.Why += ": " + k.Term + ", " + k.Identity
		}
	}
	if l.Nil && l.Known <= 0 {
		r.Warnings = append(r.Warnings[:len(r.Warnings):len(r.Warnings)], Warning{"nil-residual",
			"the residual is nil on the scale of the data: F = +Inf and p = 0 say that the fit is perfect, not that p was computed"})
	}
	r.Exact = t
	return nil
}

const (
	whyF     = "F is a monotone function of λ, and its law is exact for normal errors of one variance whatever the sample size"
	whyKnown = "with known variance −2 log λ is exactly χ² for normal errors"
	whyChi   = "−2 log λ tends to χ² as the data grow (Wilks 1938)"
)

func chiSquared(x, df float64) Test {
	if df <= 0 {
		return Test{Name: "χ²", Statistic: x, P: math.NaN(), LogP: math.NaN(),
			Why: "the restriction has no degrees of freedom of its own: χ² does not apply"}
	}
	law := dist.ChiSquared{K: df}
	t := Test{Kind: Asymptotic, Name: "χ²", Statistic: x, Law: law, Why: whyChi}
	if math.IsInf(x, 1) {
		t.LogP = -inf
		return t
	}
	t.P, t.LogP = tails(law.Survival(x), x, law.LogSurvival)
	return t
}

// concludeLikelihood compares two log likelihoods.
func (r *Result) concludeLikelihood(ctx context.Context, s *Settings) error {
	if r.Pair.Full.Criterion.Kind == QuasiLikelihood {
		return fmt.Errorf("%w: a quasi-likelihood has no λ", ErrDifferentCriterion)
	}
	if r.Pair.DF < 0 {
		return fmt.Errorf("%w: %g degrees of freedom", ErrNotNested, r.Pair.DF)
	}
	r.LogLambda = math.Min(r.Pair.Restricted.LogLikelihood-r.Pair.Full.LogLikelihood, 0)
	r.Lambda = math.Exp(r.LogLambda)
	r.Statistic = math.Abs(2 * r.LogLambda)
	p := r.Pair
	switch {
	case p.Irregular != "":
		r.ChiSquared = Test{Name: "χ²", Statistic: r.Statistic, P: nan, LogP: nan, Why: p.Irregular}
	case p.Cone != nil:
		r.ChiSquared = Test{Name: "χ²", Statistic: r.Statistic, P: nan, LogP: nan,
			Why: "inequalities take part: the law is a mixture"}
		t, err := p.Cone.test(ctx, r.Statistic, s)
		if err != nil {
			if ctx.Err() != nil {
				return ctx.Err()
			}
			t = absent("χ̄²", "the weights of the mixture cannot be had: "+err.Error())
			r.ChiSquared.Why = t.Why
		}
		r.Boundary = t
	default:
		r.ChiSquared = chiSquared(r.Statistic, p.DF)
	}
	if e, ok := r.Comparison.Full.(ExactReferrer); ok {
		t, err := e.ReferExact(ctx, r.Comparison, r.Pair)
		if err != nil {
			return err
		}
		r.Exact = t
	}
	return nil
}

// recommend picks the test to read: exact before simulated before approximate
// (a certified law failing, or a corrected χ²) before the mixture at a boundary
// or χ² itself. Score, Wald and signed root are companions, never the test to read.
func (r *Result) recommend() {
	best := r.ChiSquared
	if r.Boundary.Kind != None {
		best = r.Boundary
	}
	for _, k := range []Kind{Approximate, Simulated, Exact} {
		for i := len(r.Others) - 1; i >= 0; i-- {
			if r.Others[i].Kind == k {
				best = r.Others[i]
			}
		}
		if r.Exact.Kind == k {
			best = r.Exact
		}
	}
	r.Recommended, r.Why = best.Kind, best.Why
}
