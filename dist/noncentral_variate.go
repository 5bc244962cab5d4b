package dist

import (
	"math"
	"math/rand/v2"
)

// poissonVariate returns a Poisson variate of the given mean, by reduction of the mean
// with gamma and binomial variates (Ahrens and Dieter 1974, Computing 12, section 5): the
// m-th event of a unit process comes at a gamma time of shape m; if that is before mean,
// m events and the rest remain, else the events before it are uniform. Each
// round divides the mean by about 8, and below 30 events are counted.
func poissonVariate(src rand.Source, mean float64) float64 {
	n := 0.0
	for mean > 30 {
		m := math.Floor(0.875 * mean)
		t := math.Exp(logGammaVariate(src, m))
		if t > mean {
			return n + binomialVariate(src, m-1, mean/t)
		}
		n += m
		mean -= t
	}
	for t := 0.0; ; n++ {
		t -= math.Log(uniformVariate(src))
		if t > mean {
			return n
		}
	}
}

// binomialVariate returns a binomial variate of n trials (a whole number), by order
// statistics: the middle one of n uniform values is a beta variate, which halves
// the problem (Relles 1972, JASA 67).
func binomialVariate(src rand.Source, n, p float64) float64 {
	k := 0.0
	for n > 20 {
		i := math.Floor((n + 1) / 2)
		// the i-th of n uniform order statistics
		a, b := logGammaVariate(src, i), logGammaVariate(src, n+1-i)
		y := 1 / (1 + math.Exp(b-a))
		if y <= p {
			k += i
			n -= i
			p = (p - y) / (1 - y)
		} else {
			n = i - 1
			p /= y
		}
	}
	for range int(n) {
		if uniformVariate(src) < p {
			k++
		}
	}
	return k
}
