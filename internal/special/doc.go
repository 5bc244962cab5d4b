// Package special holds the special functions under the probability laws: the
// regularized incomplete gamma and beta functions with both tails and their
// logarithms, Stirling's error and the cancellation-free pieces x log x.
//
// Every tail is found as a Scaled number exp(L) M whose exponent and factor are
// double-doubles, so it neither underflows nor loses digits in the prefactor;
// float64 values are taken at the very end. All work is bounded.
//
// GammaTail and BetaTail have two paths that are tested against each other: a full one in
// double-double throughout (about 1 µs), and a quick one (50 to 250 ns) that keeps low parts only
// where they tell in a float64 result. Their comments hold the tables of regions.
package special
