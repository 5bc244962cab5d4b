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
package lrt
