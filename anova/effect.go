package anova

import (
	"errors"
	"fmt"
	"math"
	"strconv"

	"subsume.example/dist"
	"subsume.example/lrt"
)

// Effect says how large the effect of a row is. The population values are
// λ/(λ+N), the part of the variance that the effect adds (partial), and f² = λ/N, with
// λ the noncentrality of the row's F and N the observations that its likelihood
// ratio is over: all rows, or the stratum of the row and its error. The four
// estimators estimate the same; they share one interval.
type Effect struct {
	// N and Of say what the effect is a share of: "rows, n = 36", "stratum, m = 12".
	N  float64
	Of string
	// Share is the sum of squares over the total (η²); NaN where the table has no
	// total. It has no interval.
	Share float64
	// PartialShare is SS/(SS + SS of the error) (partial η²), biased upwards.
	PartialShare float64
	// Omega (partial ω², Hays 1963) and Epsilon (partial ε², Kelley 1935) correct the
	// bias. Both are below zero where F < 1, and are left so.
	Omega, Epsilon float64
	// CohenF is √(SS/SS of the error), the estimate of f (Cohen 1988).
	CohenF float64

	// Lower and Upper bound the population value of the partial share at Level,
	// FLower and FUpper that of f, LambdaLower and LambdaUpper the noncentrality: all by
	// inverting the noncentral F (Steiger 2004), equal tails.
	Lower, Upper, FLower, FUpper, LambdaLower, LambdaUpper float64
	// Level is 2·level − 1 where the settings have level, so that the lower limit is
	// above zero exactly when p < 1 − level. ZeroLower tells a lower limit of zero.
	Level     float64
	ZeroLower bool
}

// Effect returns the size of the effect of a row; level is that of tests and
// intervals elsewhere, 0: 0.95. The error wraps ErrNotARow for a row without an
// F that is certified exact under a fixed effect, saying why.
func (r Row) Effect(level float64) (Effect, error) {
	if level == 0 {
		level = 0.95
	}
	fail := func(why string) (Effect, error) {
		return Effect{}, &LayoutError{Place: r.Name(), Err: fmt.Errorf("%w: %s", ErrNotARow, why)}
	}
	l := r.pair.Linear
	switch {
	case !(level > 0.5 && level < 1):
		return Effect{}, fmt.Errorf("anova: %w: level %g, want above 0.5 and below 1", lrt.ErrInvalid, level)
	case r.err != nil:
		return fail("the row was not tested")
	case l.M == 0:
		return fail("its spaces are not linear")
	case l.Known > 0:
		return fail("with known variance there is no share of an estimated variance")
	case !l.Certified:
		return fail("its F is not certified exact")
	}
	d1, d2 := l.DF()
	f, _, _ := l.F()
	e := Effect{N: l.M, Of: r.result.Stratum(), Share: math.NaN(), Level: doubled(level),
		PartialShare: d1 * f / (d1*f + d2), Omega: d1 * (f - 1) / (d1*(f-1) + l.M), Epsilon: d1 * (f - 1) / (d1*f + d2), CohenF: math.Sqrt(d1 * f / d2)}
	if math.IsInf(f, 1) {
		e.PartialShare, e.Omega, e.Epsilon = 1, 1, 1
		e.Lower, e.Upper, e.FLower, e.FUpper, e.LambdaLower, e.LambdaUpper = math.NaN(), math.NaN(), math.NaN(), math.NaN(), math.NaN(), math.NaN()
		return e, nil
	}
	tail := 1 - level
	var err error
	if e.LambdaLower, err = noncentrality(d1, d2, f, tail); err != nil {
		return Effect{}, err
	}
	if e.LambdaUpper, err = noncentrality(d1, d2, f, 1-tail); err != nil {
		return Effect{}, err
	}
	e.ZeroLower = e.LambdaLower == 0
	e.Lower, e.Upper = e.LambdaLower/(e.LambdaLower+e.N), e.LambdaUpper/(e.LambdaUpper+e.N)
	e.FLower, e.FUpper = math.Sqrt(e.LambdaLower/e.N), math.Sqrt(e.LambdaUpper/e.N)
	return e, nil
}

// doubled returns 2·level − 1, rounded so that 0.95 gives 0.9.
func doubled(level float64) float64 { return math.Round((2*level-1)*1e14) / 1e14 }

// noncentrality finds the λ at which F exceeds f with the given probability, 0
// where it does so more often at 0 already.
func noncentrality(d1, d2, f, survival float64) (float64, error) {
	x, err := dist.NoncentralityF(d1, d2, f, survival)
	if errors.Is(err, dist.ErrCentralTail) {
		return 0, nil
	}
	return x, err
}

// Effects returns the sizes of the effects of all rows, as a report of schema
// "anova.effects/1": its facts are response and level; its lines have name, share,
// partial_share, omega, epsilon, cohen_f, lower and upper (of the partial
// share), f_lower, f_upper, lambda_lower, lambda_upper, n, of, and note (why a row has none).
// A number that does not exist has the reason "no-effect-size" or, for the share
// of the total, "no-total".
func (t Table) Effects() Report {
	level := percent(doubled(t.level))
	r := Report{Schema: "anova.effects/1", Title: "Sizes of effects",
		Facts: []Fact{{"response", "", Text(t.Response())}, {"level", "intervals of level", level}},
		Columns: []Column{
			{Key: "name", Title: "source"},
			{Key: "share", Title: "η²", Numeric: true},
			{Key: "partial_share", Title: "partial η²", Numeric: true},
			{Key: "lower", Title: "lower", Numeric: true},
			{Key: "upper", Title: "upper", Numeric: true},
			{Key: "omega", Title: "partial ω²", Numeric: true},
			{Key: "epsilon", Title: "partial ε²", Numeric: true},
			{Key: "cohen_f", Title: "f", Numeric: true},
			{Key: "f_lower", Numeric: true},
			{Key: "f_upper", Numeric: true},
			{Key: "lambda_lower", Numeric: true},
			{Key: "lambda_upper", Numeric: true},
			{Key: "n", Numeric: true},
			{Key: "of", Title: "share of"},
			{Key: "note"},
		}}
	if m := t.Response(); m != "" {
		r.Title = "Sizes of effects on " + m
	}
	total, hasTotal := t.Total()
	zero := false
	for _, row := range t.rows {
		e, err := row.Effect(t.level)
		if err != nil {
			r.add("no-effect-size", map[string]Value{"name": Text(row.Name()), "note": Text(err.Error())})
			r.Notes = append(r.Notes, err.Error())
			continue
		}
		if hasTotal && total.SS > 0 {
			e.Share = row.SS() / total.SS
		}
		zero = zero || e.ZeroLower
		v := map[string]Value{"name": Text(row.Name()), "n": Number(e.N), "of": Text(e.Of), "share": toDigits(e.Share, 4).because("no-total")}
		for key, x := range map[string]float64{"partial_share": e.PartialShare, "lower": e.Lower, "upper": e.Upper, "omega": e.Omega, "epsilon": e.Epsilon,
			"cohen_f": e.CohenF, "f_lower": e.FLower, "f_upper": e.FUpper, "lambda_lower": e.LambdaLower, "lambda_upper": e.LambdaUpper} {
			v[key] = toDigits(x, 4)
		}
		r.add("no-effect-size", v)
	}
	r.Notes = append(r.Notes, "partial η², ω² and ε² estimate one share of variance, to which the interval belongs; η² is the share of the total and has none")
	if zero {
		r.Notes = append(r.Notes, "a lower limit of 0 goes with p above "+strconv.FormatFloat(1-t.level, 'g', 6, 64))
	}
	return r
}

// Standardized is a contrast in units of the error standard deviation.
type Standardized struct {
	// Value is the estimate over SD; Corrected is Value times the factor J that makes
	// it unbiased (Hedges 1981).
	Value, Corrected float64
	// Lower and Upper bound the population value, by inverting the noncentral t, at Level.
	Lower, Upper, Level float64
	// SD is the root of the error mean square of the model: the denominator. DF are its
	// degrees of freedom.
	SD, DF float64
}

// Standardized returns the contrast less its null value in units of the error
// standard deviation of the model, which holds covariates and other factors
// alike: say so beside the number. The error wraps ErrNotARow where the contrast
// has no exact t.
func (l ContrastResult) Standardized(level float64) (Standardized, error) {
	if level == 0 {
		level = 0.95
	}
	p := l.Row.pair.Linear
	_, nu := p.DF()
	switch {
	case !(level > 0 && level < 1):
		return Standardized{}, fmt.Errorf("anova: %w: level %g, want above 0 and below 1", lrt.ErrInvalid, level)
	case l.Row.err != nil || p.Known > 0 || !p.Certified || p.Nil || math.IsNaN(l.Estimate.T):
		return Standardized{}, &LayoutError{Place: l.Name, Err: fmt.Errorf("%w: the contrast has no exact t", ErrNotARow)}
	}
	sd := math.Sqrt(l.Row.ErrorMeanSquare())
	s := Standardized{SD: sd, DF: nu, Level: level, Value: (l.Estimate.Value - l.Null) / sd}
	s.Corrected = hedges(nu) * s.Value
	unit := l.Estimate.SE / sd
	for i, q := range []float64{(1 - level) / 2, (1 + level) / 2} {
		d, err := dist.NoncentralityT(nu, l.Estimate.T, q)
		if err != nil {
			return Standardized{}, err
		}
		if i == 0 {
			s.Lower = d * unit
		} else {
			s.Upper = d * unit
		}
	}
	return s, nil
}

// hedges returns J(ν) = Γ(ν/2)/(√(ν/2) Γ((ν−1)/2)) (Hedges 1981, eq. 4), NaN for
// ν ≤ 1. Beyond ν = 200 it is √(y/x)·(1 − 1/8y + 1/128y² + 5/1024y³ − 21/32768y⁴ −
// 399/262144y⁵) with x = ν/2 and y = x − ½ (DLMF 5.11.13), whose next term is below 1e-14.
func hedges(nu float64) float64 {
	x := nu / 2
	y := x - 0.5
	switch {
	case !(nu > 1):
		return math.NaN()
	case math.IsInf(nu, 1):
		return 1
	case nu > 200:
		u := 1 / y
		return math.Sqrt(y/x) * (1 + u*(-1./8+u*(1./128+u*(5./1024-u*(21./32768+u*399./262144)))))
	}
	a, _ := math.Lgamma(x)
	b, _ := math.Lgamma(y)
	return math.Exp(a-b) / math.Sqrt(x)
}
