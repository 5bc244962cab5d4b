// Package lrt compares nested parameter spaces by their likelihoods.
//
// A question about data is a pair of spaces over the same observations, a
// restricted one Θ₀ inside a full one Θ₁: equal means inside separate means, a
// constant failure rate inside one per batch, slope 0.5 inside any slope. A
// Comparison states the question; Run fits both spaces and answers with
//
//	λ = max over Θ₀ of the likelihood / max over Θ₁,   0 ≤ λ ≤ 1
//
// and with the reference laws that tell what λ is worth: −2 log λ against χ²,
// which holds as the data grow (Wilks 1938), and the exact law where one is
// known. The Result says which of them to read, and why.
//
// # A model of your own
//
// A likelihood that nobody has packaged is declared by its parameters and a
// function, bound to a sample, and restricted:
//
//	model := lrt.Model[[]float64]{
//		Name:   "waiting times",
//		Params: []lrt.Param{lrt.Positive("shape"), lrt.Positive("scale")},
//		LogLikelihood: func(x, th []float64) float64 { … },
//	}
//	full, err := lrt.Bind(model, lrt.Observe(x, len(x)))
//	small, err := full.Restrict(lrt.Fix("shape", 1))
//	result, err := lrt.Compare(ctx, small, full, nil)
//	interval, err := lrt.Profile(ctx, full, "shape", 0.95, nil)
//
// Fix, Equate, Equations, AtLeast, AtMost and Via are restrictions; they are
// values, compose in any order, and are kept as equations, so that nesting is
// proved and contradictions are found before anything is fitted. Both spaces of
// a comparison must come from one Bind. What more a model can say about itself
// (terms by observation, a gradient, a closed form, a simulator) makes fits
// faster or answers more; see Model.
//
// Ready-made spaces: NormalSamples, LognormalSamples, GammaSamples,
// WeibullSamples, ExponentialMeans, PoissonRates, Multinomial, CrossTable,
// MeanVectors.
//
// # Which law
//
//	situation                                    reference                          where
//	linear spaces, normal errors                 F, exact when certified            Result.Exact
//	known variance                               χ², exact                          Result.Exact
//	the full space knows one                     its own                            Result.Exact
//	regular, interior                            χ² with the rank of the            Result.ChiSquared
//	                                             restriction
//	a parameter tested at the end of its range,  mixture of χ² laws                 Result.Boundary
//	or a cone as the null
//	a nuisance parameter at its end, or one      none: Pair.Irregular says why      Bootstrap on request
//	that the restriction leaves undetermined
//	on request in Settings.References            Bootstrap, Bartlett, ScoreTest,    Result.Others
//	                                             WaldTest, SignedRoot
//
// The recommended test is the exact one, else the simulated, else an
// approximate or corrected one, else the mixture or χ² itself, with the warning
// "small-sample" where the sample is too small to trust it.
//
// # Planning and follow-up
//
// Comparison.Plan gives the power of a comparison from expected responses,
// SizeSearch the cheapest design that reaches a power, Comparison.SimulatePower
// the power where no law is known. Profile, ProfileOf, ProfileCurve and
// ProfileRegion invert comparisons into intervals and regions. Adjust accounts
// for several tests at once. ByInformation compares spaces that are not nested.
//
// # Errors
//
// Errors wrap one sentinel for each condition (ErrNotNested,
// ErrDifferentObservations, ErrNotConverged, ErrUnbounded, …) inside a typed
// error that names the place: *ComparisonError, *ModelError with the parameter
// values, *RestrictionError. A function of a model that panics becomes an error
// wrapping ErrPanic. What is usable but doubtful is a Warning with a stable code.
//
// The codes of this package:
//
//	boundary                 a maximum has a parameter at the end of its range or at a bound
//	not-identifiable         the data do not determine some parameters, named
//	irregular                −2 log λ has no known law here; Pair.Irregular says why
//	maximum-at-infinity      the supremum is approached only as a parameter runs away
//	several-maxima           starts led to different maxima; the largest is kept
//	loose-maximum            the maximum is less certain than usual, by the figure given
//	flat-top                 the curvature at the estimate is not that of a maximum
//	gradient-disagrees       Gradient, Hessian or Each contradict the log likelihood
//	hessian-disagrees        and are not used
//	each-disagrees
//	closed-form-not-maximum  a small step from the closed form gains: fitted numerically
//	start-outside-range      Start was moved inside
//	redundant-restriction    a restriction says nothing that others do not
//	nesting-not-checked      nobody can prove that one space is inside the other
//	optional-interface-lost  a type seems to have methods by intent that it does not have
//	small-sample             χ² is all there is, and the sample is small
//	nil-residual             a perfect fit: p = 0 is no computed probability
//
// # Implementing a Space
//
// A Space needs two methods, Observations and Maximize; by the optional
// interfaces (Nester, Improver, ExactReferrer, Simulator, Pivot,
// BartlettCorrector, Companion, PairFitter, Restrictable, Degrees) it says what more it
// can do. Let the package spacetest check it. Never compare spaces by ==: a
// comparable dynamic type is not promised.
//
// # What it does not do
//
// It does not choose a model, nor decide what a difference is worth. Where a
// decision can hurt someone (medicine, safety, construction), the answer is one
// input to the judgement of qualified people under the rules of their field.
package lrt
