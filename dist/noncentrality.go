package dist

import (
	"errors"
	"math"

	"subsume.example/internal/dd"
	"subsume.example/internal/noncentral"
	"subsume.example/internal/special"
)

// ErrCentralTail is returned by the noncentrality finders when the central tail
// already exceeds the tail asked for, so that no noncentrality reaches it; the
// returned value is then 0. In a confidence interval for a noncentrality this is
// a limit of 0.
var ErrCentralTail = errors.New("dist: the tail at noncentrality 0 already exceeds the request")

// NoncentralityChiSquared returns the Lambda for which
// NoncentralChiSquared{k, Lambda}.Survival(x) = survival. With x a critical value and
// survival a power it is the noncentrality a test needs; with survival = 1 - α/2 and
// α/2 it gives the confidence limits of a noncentrality.
//
// It wants 0 < k < +Inf, 0 <= x < +Inf and 0 <= survival < 1 and returns NaN and a *ParamError
// otherwise, 0 and ErrCentralTail when ChiSquared{k}.Survival(x) > survival (always so for x = 0).
func NoncentralityChiSquared(k, x, survival float64) (float64, error) {
	const name = "NoncentralityChiSquared"
	if !finitePositive(k) {
		return math.NaN(), &ParamError{name, "k", k, wantPositive}
	}
	if err := checkFinder(name, x, survival); err != nil {
		return math.NaN(), err
	}
	central := ChiSquared{k}.Survival(x)
	return findNoncentrality(central, survival, k, x, 0, func(lambda float64) (special.Scaled, bool, special.Scaled) {
		p := noncentral.AtChiSquared(k, lambda, dd.From(x))
		t, upper, _, slope := p.All()
		return t, upper, slope
	})
}

// NoncentralityF returns the Lambda for which NoncentralF{d1, d2, Lambda}.Survival(x) =
// survival, as NoncentralityChiSquared does; d2 = +Inf is allowed.
func NoncentralityF(d1, d2, x, survival float64) (float64, error) {
	const name = "NoncentralityF"
	if !finitePositive(d1) {
		return math.NaN(), &ParamError{name, "d1", d1, wantPositive}
	}
	if !(d2 > 0) {
		return math.NaN(), &ParamError{name, "d2", d2, wantPositiveOrInf}
	}
	if err := checkFinder(name, x, survival); err != nil {
		return math.NaN(), err
	}
	central := F{d1, d2}.Survival(x)
	if math.IsInf(d2, 1) {
		y := dd.Prod(d1, x)
		if !(y.Hi <= math.MaxFloat64) {
			return math.NaN(), &ParamError{name, "x", x, "d1 x a finite number"}
		}
		return findNoncentrality(central, survival, d1, y.Hi, 0, func(lambda float64) (special.Scaled, bool, special.Scaled) {
			p := noncentral.AtChiSquared(d1, lambda, y)
			t, upper, _, slope := p.All()
			return t, upper, slope
		})
	}
	return findNoncentrality(central, survival, d1, d1*x, d1*x*(d1*x/d2), func(lambda float64) (special.Scaled, bool, special.Scaled) {
		p := noncentral.AtF(d1, d2, lambda, x)
		t, upper, _, slope := p.All()
		return t, upper, slope
	})
}

// NoncentralityT returns the Delta, of either sign, for which NoncentralT{nu, Delta}.Survival(t) =
// survival; the confidence limits of a standardized difference come from it.
//
// It wants 0 < nu <= +Inf, a finite t and 0 < survival < 1 and returns NaN and a
// *ParamError otherwise.
func NoncentralityT(nu, t, survival float64) (float64, error) {
	const name = "NoncentralityT"
	switch {
	case !(nu > 0):
		return math.NaN(), &ParamError{name, "nu", nu, wantPositiveOrInf}
	case !(math.Abs(t) <= math.MaxFloat64):
		return math.NaN(), &ParamError{name, "t", t, "a finite number"}
	case !(survival > 0 && survival < 1):
		return math.NaN(), &ParamError{name, "survival", survival, "a number between 0 and 1"}
	}
	if math.IsInf(nu, 1) {
		return t - special.NormalUpperQuantile(survival), nil
	}
	if t == 0 {
		return -special.NormalUpperQuantile(survival), nil
	}
	upper := survival <= 0.5
	goal := survival
	if !upper {
		goal = 1 - survival // exact
	}
	logGoal := dd.Log(dd.From(goal))
	z := -normalStart(survival)
	delta := t + z*math.Hypot(1, t/math.Sqrt(2*nu))
	lo, hi := math.Inf(-1), math.Inf(1)
	best, bestR := delta, math.Inf(1)
	for range 200 {
		v, up := noncentral.TTail(nu, t, delta)
		r, h := logResidual(v, up, noncentral.TSlope(nu, t, delta), upper, logGoal)
		if math.Abs(r) < bestR {
			best, bestR = delta, math.Abs(r)
		}
		if r == 0 {
			break
		}
		if (r > 0) == upper {
			hi = delta
		} else {
			lo = delta
		}
		next := delta - r/h
		if math.Abs(next-delta) <= 0x1p-53*math.Abs(delta) {
			return next, nil
		}
		if !(next > lo && next < hi) {
			switch {
			case math.IsInf(hi, 1):
				next = delta + 4*(1+math.Abs(delta))
			case math.IsInf(lo, -1):
				next = delta - 4*(1+math.Abs(delta))
			default:
				next = lo + (hi-lo)/2
			}
		}
		if next == delta || next == lo || next == hi {
			break
		}
		delta = next
	}
	return best, nil
}

func checkFinder(name string, x, survival float64) error {
	if !(x >= 0 && x <= math.MaxFloat64) {
		return &ParamError{name, "x", x, "a finite number at or above 0"}
	}
	if !(survival >= 0 && survival < 1) {
		return &ParamError{name, "survival", survival, "a number at or above 0 and below 1"}
	}
	return nil
}

// findNoncentrality solves P(X > x; λ) = survival for λ >= 0. at returns one
// tail at λ, whether it is the upper one, and the derivative of the upper tail.
// The start is the normal approximation of W = U - cV, whose variance is 2(k + 2λ + extra);
// then Newton's iteration on the logarithm of the smaller tail, which is
// concave in λ, so that it converges from one side; a bracket and bisection stand by.
func findNoncentrality(central, survival, k, x, extra float64, at func(lambda float64) (special.Scaled, bool, special.Scaled)) (float64, error) {
	switch {
	case central > survival:
		return 0, ErrCentralTail
	case central == survival:
		return 0, nil
	}
	upper := survival <= 0.5
	goal := survival
	if !upper {
		goal = 1 - survival // exact
	}
	logGoal := dd.Log(dd.From(goal))

	z := -normalStart(survival)
	d := 2*z*z + z*math.Sqrt(max(0, 4*z*z+4*x-2*k+2*extra))
	lambda := d + x - k
	lo, hi := 0.0, math.Inf(1)
	if !(lambda > 0 && lambda < 1e100) {
		lambda = min(max(x, 1e-3), 1)
	}
	best, bestR := lambda, math.Inf(1)
	for range 200 {
		t, up, slope := at(lambda)
		r, h := logResidual(t, up, slope, upper, logGoal)
		if math.Abs(r) < bestR {
			best, bestR = lambda, math.Abs(r)
		}
		if r == 0 {
			return lambda, nil
		}
		if (r > 0) == upper {
			hi = lambda
		} else {
			lo = lambda
		}
		next := lambda - r/h
		if math.Abs(next-lambda) <= 0x1p-53*lambda {
			return next, nil
		}
		if !(next > lo && next < hi) || math.IsNaN(next) {
			switch {
			case math.IsInf(hi, 1):
				next = 4 * lambda
			case lo == 0:
				next = hi / 16
			case hi > 4*lo:
				next = math.Sqrt(lo) * math.Sqrt(hi)
			default:
				next = lo + (hi-lo)/2
			}
		}
		if next == lambda || next == lo || next == hi || next == 0 || next > 1e100 {
			break
		}
		lambda = next
	}
	if !(bestR <= 0.1) {
		return math.NaN(), &ParamError{"noncentrality", "survival", survival, "a tail that a noncentrality below 1e100 reaches"}
	}
	return best, nil
}

// logResidual returns log(tail/goal) for the wanted tail and its derivative in λ,
// given one tail and the derivative of the upper one.
func logResidual(t special.Scaled, up bool, slope special.Scaled, upper bool, logGoal dd.DD) (r, h float64) {
	l := dd.DD{}
	if up == upper {
		l = t.LogDD()
	} else {
		l = dd.Log1p(t.DD().Neg())
	}
	r = l.Sub(logGoal).Float64()
	h = math.Exp(slope.Log() - l.Hi)
	if !upper {
		h = -h
	}
	return r, h
}
