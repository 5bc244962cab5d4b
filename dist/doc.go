// Package dist holds the probability laws that comparisons of nested models
// are referred to: F, chi-squared and t, central and noncentral, the laws of the
// largest of several differences, and mixtures for parameters on a boundary.
//
//	null := dist.F{D1: 3, D2: 20}
//	p := null.Survival(4.94)                // 0.00999: P(F > 4.94)
//	l := null.LogSurvival(1e6)              // -117.9: finite where p underflows or is of no use
//	c := null.UpperQuantile(0.05)           // 3.0984: the critical value
//	alt := dist.NoncentralF{D1: 3, D2: 20, Lambda: 12}
//	power := alt.Survival(c)
//
// Laws are small values with the textbook's letters as fields; they are safe for
// concurrent use, need no constructor, and allocate nothing in a tail or a density.
//
// # Methods of every law
//
//	Validate() error                               which parameter is out of range
//	CDF(x), Survival(x)                            P(X <= x) and P(X > x), each computed directly
//	LogCDF(x), LogSurvival(x)                      their logarithms, far beyond underflow
//	Prob(x), LogProb(x)                            density and its logarithm
//	Quantile(p), UpperQuantile(q)                  inverse of CDF and of Survival
//	Mean(), Variance()
//	Rand(src rand.Source) float64                  a variate; src is math/rand/v2's
//	String()
//
// Law is the part of it that a test needs, and package lawtest checks a law of one's own.
//
// # Conventions
//
// Degrees of freedom are real numbers from 1e-3 to 1e12; values outside work but carry
// no promise. D2 = +Inf and Nu = +Inf are the limits with a known variance. The
// noncentrality Lambda is the sum of squared standardized means, so that the noncentral
// chi-squared mean is K + Lambda.
//
// Functions from float64 to float64 return NaN for NaN, for a probability outside [0, 1], and
// for a law whose Validate fails; they never panic. Validate and the finders return a
// *ParamError, for which errors.Is(err, ErrParam) holds.
//
// Use Survival and UpperQuantile for p-values and critical values, never 1 - CDF(x) or
// Quantile(1-q): below 1e-16 these have nothing left. Below 1e-308 use the logarithms.
//
// # How the central laws are computed
//
// With a = K/2, x the half of the statistic (chi-squared), or a = D1/2, b = D2/2,
// X = D1 x/(D1 x + D2) and Y = 1 - X (F; Student's t is F with D1 = 1), formed in
// double-double. A law has one tail that is computed, on the side away from the mode of
// log x or logit X, where it cannot be near 1; the other is its complement.
//
// The prefactor x^a e^-x/Γ(a) or X^a Y^b/B(a, b) is the exponential of a double-double:
// for parameters from 16 up by Stirling's error and the deviance u - log(1+u) (Loader, "Fast and
// accurate computation of binomial probabilities", 2000), below by logarithms and a table of log Γ
// or, in full double-double, a shifted Stirling series (DLMF 5.11.1). Times it stands:
//
//	gamma law                            factor of the prefactor                          why
//	2a whole <= 28, x > 0.6a             finite sum, erfc by Mills' ratio (DLMF 8.4.10)   one exponential
//	a <= 1000, x <= (a+1)/4              positive series (DLMF 8.7.1)                     ratio below 1/4
//	a <= 1000, x <= a                    even continued fraction of γ (DLMF 8.9.1)        under 40 levels
//	a <= 1000, a < x < 2.5               complement of the series in double-double        fraction is slow
//	a <= 1000, x > a                     even continued fraction of Γ (DLMF 8.9.2)        under 100 levels
//	a >= 60, |η| <= 0.5, or
//	a >= 1000, |η| <= 1.16               uniform expansion (Temme 1979; DLMF 8.12.7)      same cost for every a
//
//	beta law, X <= a/(a+b) by exchange
//	b whole <= 16, 2a whole              finite sum (complement of DLMF 8.17.24)                        no logarithm
//	a whole <= 16, 2b whole              its complement in double-double, above 1e-10
//	term ratio below 1/2                 positive series (DLMF 8.17.8)
//	X > 0.9, Y (a+b) < 3                 complement of the series in Y, double-double     fraction is slow
//	min(a, b) <= 1000                    continued fraction of Didonato and Morris        under 60 levels
//	                                     (ACM TOMS 18, 1992, eq. 9)
//	both > 1000                          Mills' ratio in the logit, 32 points             same cost for every a, b
//
// Only the outer level of a fraction and the leading terms of a series need the low part of the
// double-double; the rounding errors of the rest are damped below a tenth of an ulp. Where the quick
// forms do not reach (parameters outside 1e-3 to 1e13, prefactors below e^-660), the same is done in
// full double-double, by series up to 16 and by Mills' ratio (32-point Gauss-Legendre) beyond. Statistics so small or large
// that X or Y leaves the floats are taken by their logarithm. All loops are
// bounded: 128 levels, 800 terms, 32 nodes, 130 steps of a quantile.
//
// Mills' ratio here is ∫ exp(-φ(t)) dt over t >= 0 with φ convex: the density of log x (or logit X) on the
// way outwards, relative to its value at x. By convexity the part beyond φ = 44 is below
// 1e-19, and a Gauss-Legendre rule of 32 points leaves less than 1e-17.
//
// Quantiles invert the smaller tail: Newton's iteration for its logarithm over log x, inside a bracket
// over the ordered floats that is halved when Newton fails to.
//
// # How the noncentral laws are computed
//
// A noncentral tail is an integral of the moment generating function over a closed path in the
// complex plane through the saddle point: a prefactor, its exponent in double-double, times a
// trapezoidal sum of about 13 to 90 nodes that converges geometrically (Rice 1968 and 1973; Helstrom
// 1978; Trefethen and Weideman 2014) and needs the same work for every parameter. Where the integrand does not fall
// within one turn, the Poisson mixture has few terms and is summed in double-double, all terms positive
// (Benton and Krishnamoorthy 2003). With A the index of the mixture's largest term, B = x/(2U) and
// ρ = y/(U-y), U the saddle point in 1/(1-2s):
//
//	NoncentralChiSquared   A + B >= 22, B - A = K/2             circle through the saddle point
//	                       else                                 mixture, A < 11
//	NoncentralF            A + (D2/2) log(1+ρ) >= 42, D2 >= 50  circle
//	                       the same, D2 < 50                    path bent to the left around y
//	                       else                                 mixture, A < 42
//	NoncentralT, t > 0     upper tail, Delta < 2                normal tails over the law of log s, trapezoidal
//	                       lower tail; upper, Delta >= 2        NoncentralF{1, Nu, Delta²} and P(T < -t)
//
// The derivative in the noncentrality comes from the same nodes, so that the finders take Newton
// steps. Formulas and bounds stand in internal/noncentral; its tests compare two paths, and path and mixture,
// over the whole domain: the largest difference seen at 10⁶ points is 3e-15.
//
// # How the laws of the largest are computed
//
// StudentizedRange, MaximumModulus and Dunnett are laws of W/s. With v = log s, P(W/s > q) is
// the integral of the density of v times P(W > q e^v): a positive, log-concave integrand on a lattice in
// v, walked outwards from its mode. The trapezoidal rule converges exponentially there; the sums over even
// and odd nodes show its error, and a step that is too long is halved. Small Nu adds its slow end as a geometric series.
// Both tails and the density have their own sums; the larger tail is the complement.
//
//	law at known scale         rule                                                              why
//	range, k w² < 1e-7         √k (w/√(2π))^(k-1) [1 - w² (k-1)(k+2)/(24 k)]                     two terms are exact
//	range, w < 0.7             trapezoidal, step 0.7/√k, Φ differences by Gauss-Legendre, cosh   no cancellation
//	range, w < median          trapezoidal, lower tail over (2Φ(w/2)-1)^(k-1)                    no underflow
//	range, w > median          trapezoidal, upper tail over exp(-w²/4), Mills' ratios, x^n - y^n as a positive sum
//	modulus                    (2Φ(w)-1)^k by log1p and expm1                                    closed form
//	Dunnett, inside            trapezoidal over the common normal from the mode                  log-concave
//	Dunnett, outside           trapezoidal around λ times each limit                             where Z₀ is when Zᵢ is out
//	Dunnett, far               sum of the tails                                                  no two values are out
//
// (Pearson and Hartley, Biometrika 32, 1942, for the range; Dunnett and Sobel, Biometrika 42, 1955;
// Goodwin, Proc. Camb. Phil. Soc. 45, 1949, for the rule; Prékopa 1973 for the concavity.) A Rectangle
// of the multivariate t is integrated in the same way where its correlations are products, by one more integral for any three values,
// and by a randomized lattice rule beyond (Genz 1992; Genz and Bretz 2009).
//
// # Accuracy
//
// Relative errors against tables of high precision, printed by
//
//	go run ./internal/cmd/accuracy
//
// with gonum's errors on the same rows, and times. "tail" is the smaller tail of a row; everyday rows
// have degrees of freedom in 0.5 to 1e4, noncentrality up to 1e4 and a smaller tail of at least 1e-10. The tables reach
// tails of 1e-300, logarithms of -1e5 and degrees of freedom of 1e10 (the tables named wide: 1e-3 to
// 0.1 and 1e10 to 1e12, noncentrality to 1e8).
//
//	table       value        rows   median  everyday max      max
//	chi2        tail          900  5.1e-17  3.5e-16       7.3e-16
//	chi2        log          1800  4.4e-17  3.2e-16       7.3e-16
//	chi2        density       900  3.4e-17  1.0e-16       1.1e-16
//	chi2        logdensity    900  3.6e-17  9.5e-17       1.1e-16
//	chi2        quantile       54  5.4e-17  3.3e-16       4.0e-16
//	f           tail          900  3.9e-17  3.1e-16       4.6e-16
//	f           log          1800  3.9e-17  5.1e-16       5.6e-16
//	f           density       900  3.7e-17  1.0e-16       1.0e-16
//	f           logdensity    900  3.8e-17  1.1e-16       1.1e-16
//	f           quantile       41  4.8e-17  2.8e-16       2.8e-16
//	t           tail          239  3.1e-17  9.3e-17       1.1e-16
//	t           log           478  3.3e-17  1.0e-16       1.1e-16
//	t           density       239  3.8e-17  9.5e-17       9.5e-17
//	t           logdensity    239  3.5e-17  8.7e-17       9.5e-17
//	t           quantile       17  5.2e-17  1.4e-16       1.4e-16
//	betainc     tail          480  4.3e-17  5.6e-16       5.6e-16
//	betainc     log           960  4.2e-17  8.3e-16       8.3e-16
//	betainc     density       480  3.7e-17  9.5e-17       9.9e-17
//	betainc     logdensity    480  3.7e-17  1.1e-16       1.1e-16
//	betainc     quantile       21  2.6e-17  4.6e-17       5.6e-17
//	chi2_wide   tail           60  4.8e-17  -             1.6e-16
//	chi2_wide   log           120  4.6e-17  -             2.0e-16
//	chi2_wide   density        60  4.4e-17  -             9.5e-17
//	chi2_wide   logdensity     60  3.5e-17  -             1.0e-16
//	f_wide      tail          130  3.9e-17  -             5.4e-16
//	f_wide      log           260  5.0e-17  -             5.5e-16
//	f_wide      density       130  3.7e-17  -             1.1e-16
//	f_wide      logdensity    130  4.6e-17  -             9.7e-17
//	t_wide      tail           60  3.5e-17  -             3.6e-16
//	t_wide      log           120  4.2e-17  -             3.6e-16
//	t_wide      density        60  3.6e-17  -             9.6e-17
//	t_wide      logdensity     60  3.8e-17  -             9.8e-17
//	srange      tail          177  6.1e-16  3.6e-15       1.9e-13
//	srange      log           354  1.9e-16  3.6e-15       1.9e-13
//	smm         tail          176  5.1e-16  2.6e-15       7.7e-14
//	smm         log           352  1.7e-16  2.6e-15       7.7e-14
//	ncx2        tail         1620  7.5e-17  6.6e-16       6.6e-16
//	ncx2        log          3240  4.9e-17  5.9e-16       6.4e-16
//	ncx2        density      1620  7.0e-17  5.7e-16       6.6e-16
//	ncx2        logdensity   1620  3.9e-17  1.9e-16       1.9e-16
//	ncx2        quantile       53  3.9e-17  1.2e-16       2.0e-15
//	ncf         tail         1620  5.7e-17  8.6e-16       8.6e-16
//	ncf         log          3240  4.8e-17  7.4e-16       7.4e-16
//	ncf         density      1620  5.7e-17  8.0e-16       8.0e-16
//	ncf         logdensity   1620  3.9e-17  5.0e-15       5.0e-15
//	ncf         quantile       54  4.7e-17  3.9e-16       2.4e-15
//	nct         tail          360  1.3e-16  7.9e-16       7.9e-16
//	nct         log           720  7.6e-17  1.0e-15       1.0e-15
//	nct         density       360  1.7e-16  1.5e-15       1.5e-15
//	nct         logdensity    360  5.6e-17  8.0e-16       8.0e-16
//	ncfpower    tail          300  5.2e-17  6.3e-16       6.3e-16
//	ncfpower    log           600  4.5e-17  8.3e-16       8.3e-16
//	ncfpower    density       300  4.1e-17  6.5e-16       6.5e-16
//	ncfpower    logdensity    300  3.7e-17  1.2e-15       1.2e-15
//	ncx2_wide   tail           60  1.4e-16  -             5.3e-16
//	ncx2_wide   log           120  6.5e-17  -             5.3e-16
//	ncx2_wide   density        60  9.9e-17  -             3.7e-16
//	ncx2_wide   logdensity     60  3.7e-17  -             1.0e-16
//	ncf_wide    tail           60  6.3e-17  -             5.0e-16
//	ncf_wide    log           120  5.9e-17  -             5.7e-16
//	ncf_wide    density        60  1.0e-16  -             7.6e-16
//	ncf_wide    logdensity     60  4.7e-17  -             6.1e-16
//	nct_wide    tail           40  1.7e-16  -             8.9e-16
//	nct_wide    log            80  9.2e-17  -             1.2e-15
//	nct_wide    density        40  1.4e-16  -             6.9e-16
//	nct_wide    logdensity     40  3.4e-17  -             2.0e-16
//	ncinv       lambda        130  4.9e-17  7.4e-16       7.4e-16
//
// What is not promised: the far ends of quantiles are as sharp as the tail allows, which is
// poor where the tail hardly depends on x (an error of 1e-16 in p moves a chi-squared quantile with
// K = 0.001 by 2e-13 of itself).
package dist
