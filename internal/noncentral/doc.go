// Package noncentral computes tails and densities of the noncentral chi-squared,
// F and t laws with bounded work over the whole range of their parameters.
//
// # Method
//
// A tail is the integral of the moment generating function over a path in the complex
// plane, P(W > 0) = (1/2πi) ∫ E e^{sW} ds/s with W = U - x for χ² and W = U - cV for F. In
// u = 1/(1-2s) the path becomes a closed one around the singularities at 0 and y, led
// through the saddle point on the positive axis, where the integrand is largest
// and its phase stationary. There
//
//   - the exponent at the saddle point is evaluated in double-double and carried as a
//     special.Scaled, so that tails of 1e-300 and beyond have the relative accuracy
//     of the centre, and their logarithms too;
//   - on the path, modulus and phase relative to the saddle point have closed forms
//     without cancellation, so that plain arithmetic serves for the sum;
//   - the trapezoidal rule converges geometrically (Rice 1973, BSTJ 52; Trefethen and
//     Weideman 2014, SIAM Review 56), with about 13 nodes beside the axis on a circle, whatever the
//     parameters; the pole of 1/s at u = 1 costs nothing, as its part of the
//     rule's error is known (see poleTerm).
//
// The noncentral F density and the derivative of the tail in λ come from the same nodes. Rice
// (1968, BSTJ 47) and Helstrom (1978, IEEE Trans. AES-14) used such integrals for the
// noncentral χ² of signal detection; Temme (1993, Computers Math. Applic. 25) reviews the
// expansions that this replaces. Where the integrand does not fall within one
// turn the law's Poisson mixture has few terms and is summed, all terms positive.
//
// # Regions
//
//	law          region                                 formula                                    file
//	χ²(k, λ)     A+B >= 22                              contour: circle                            chi2contour.go
//	             else                                   mixture, A < 11 terms before the largest   poisson.go, quick.go
//	             x < 1e-250; x > 1e40 max(1, k, λ)      first term; exponent alone                 chi2.go
//	F(2a, 2b, λ) A + b log(1+ρ) >= 42, b >= 25          contour: circle                            fcontour.go
//	             A + b log(1+ρ) >= 42, b < 25           contour bent around y                      fcontour.go
//	             else                                   mixture, A < 42                            poisson.go, quick.go
//	t(ν, δ) at   upper tail, δ < 2                      sum of normal tails over log s             t.go
//	t > 0        lower tail; upper tail, δ >= 2         noncentral F(1, ν, δ²) and P(T < -t)       t.go
//
// A and B are the dominating index of the mixture and x/(2U); ρ = y/(U-y) (chi2Path, fPath). What the
// contours leave out is below e^-42 of the integral, their nodes are at most maxNodes; a mixture
// has at most maxTerms terms.
//
// # Accuracy
//
// Against the reference tables of dist/testdata (degrees of freedom 0.1 to 1e10, λ to 1e6) no tail and no
// density is off by more than 1e-15 for χ² and F and 1.6e-15 for t. Over the domain 1e-3 <= degrees
// of freedom <= 1e12, λ <= 1e8 (|δ| <= 1e4) the consistency tests compare two paths and two
// ways at random points: the largest difference seen in some 10⁶ of them is 3e-15. 4e-15 is the stated
// bound. The derivative of a tail in the noncentrality is good for Newton steps only where
// the denominator has less than half a degree of freedom (1e-13, and 1e-10 for t).
package noncentral
