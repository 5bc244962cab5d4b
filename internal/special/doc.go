// Package special holds the special functions under the probability laws: the
// regularized incomplete gamma and beta functions with both tails and their
// logarithms, Stirling's error and the cancellation-free pieces x log x.
//
// Every tail is found as a Scaled number exp(L) M whose exponent and factor are
// double-doubles, so it neither underflows nor loses digits in the prefactor;
// float64 values are taken at the very end. All work is bounded.
package special
