// Package linalg fits linear spaces by an orthogonal factorization computed in
// double-double arithmetic, one pass over the rows, without a design matrix.
//
// Columns come in groups: dense groups of numeric columns, and index groups of
// which each row has one non-zero (the levels of a factor). A Gram holds all
// cross-products of the columns and right-hand sides; dense pairs by
// compensated dot products (Ogita, Rump and Oishi 2005, algorithm 5.3), index
// groups by sums and counts by level. A Factor is the triangular factor R of
// X = QR in the order of the columns, with the coordinates Qᵀy of every
// right-hand side, obtained by Cholesky's method on the Gram in
// double-double; Q itself is never formed (Yamamoto, Nakatsukasa, Yanagisawa and
// Fukaya 2015). With unit roundoff v = 2^-104 the departure of Q from
// orthogonality is of order κ²v, κ the condition number of the equilibrated
// columns, so that it stays below the double precision roundoff up to κ = 10⁷ and R
// decides ranks to a relative 10⁻¹⁵, the square root of v, times the size of the
// coefficients that write a column in earlier ones: where these are so large that
// rounding explains what is left, the column is set aside, and the pivot says so. The largest index
// group is eliminated first as a diagonal, so that two crossed factors of 1,000
// levels cost one triangle of 1,000.
package linalg
