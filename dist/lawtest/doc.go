// Package lawtest checks a probability law of one's own: whether it keeps the
// promises that the laws of package dist keep, so that a comparison may be
// referred to it.
//
//	func TestMyLaw(t *testing.T) {
//		lawtest.Check(t, MyLaw{Shape: 2}, &lawtest.Settings{
//			Invalid: []lawtest.Law{MyLaw{Shape: -1}},
//		})
//	}
//
// Check reports through testing; Problems returns the same findings as values.
//
// # What is checked
//
//	valid      Validate returns nil, String is not empty; invalid parameters give an error and NaN everywhere
//	ends       0, 1, -Inf and NaN where they belong: at ±Inf, at the ends of the support, for NaN
//	range      tails within [0, 1], densities and logarithms with the right sign, nothing NaN
//	sum        CDF + Survival = 1 to 2 ulp
//	logs       LogCDF, LogSurvival and LogProb agree with the logarithms of the values
//	monotone   tails ordered along the points
//	inverse    Quantile(CDF(x)) and UpperQuantile(Survival(x)) return x within conditioning and tolerance
//	extremes   quantiles of tails down to 1e-300 are met by the tails
//	density    the integral of the density between points is the difference of the tails
//	moments    the mean of the draws lies within 6 standard errors of Mean, when Variance is finite
//	variates   Kolmogorov-Smirnov and Anderson-Darling at about 0.1 % with a fixed seed; same seed, same bits
//	parallel   the same bits from several goroutines at once
//
// What is not checked: whether the law is the one its name says. That takes reference
// values from outside.
package lawtest
