// Package noncentral computes tails and densities of the noncentral chi-squared,
// F and t laws with bounded work over the whole range of their parameters.
//
// Everything comes as a special.Scaled: prefactors and exponents are carried in
// double-double, so that the relative accuracy is the same at 1e-300 and beyond
// the range of a float64 as in the centre.
package noncentral
