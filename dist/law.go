package dist

// Law is the part of a probability distribution that a test needs: its null
// distribution's tails and the inverse of the upper one. Every law of this
// package has the larger method set described in the package documentation.
type Law interface {
	// Validate reports which parameter is outside its range, nil when none is.
	Validate() error
	// CDF returns P(X <= x).
	CDF(x float64) float64
	// Survival returns P(X > x), computed directly.
	Survival(x float64) float64
	// LogSurvival returns log P(X > x), finite far beyond the underflow of
	// Survival.
	LogSurvival(x float64) float64
	// UpperQuantile returns the x with P(X > x) = q.
	UpperQuantile(q float64) float64
	// String names the law with its parameters.
	String() string
}
