package lrt

import (
	"fmt"
	"math"
	"strings"

	"subsume.example/dist"
)

// Kind says how far a p-value can be trusted.
type Kind uint8

// The kinds of reference.
const (
	None        Kind = iota // no test
	Asymptotic              // holds as the data grow
	Exact                   // holds for these data under the stated assumptions
	Approximate             // a matched or corrected law
	Simulated               // from draws
)

// String names the kind in lower case.
func (k Kind) String() string {
	switch k {
	case None:
		return "none"
	case Asymptotic:
		return "asymptotic"
	case Exact:
		return "exact"
	case Approximate:
		return "approximate"
	case Simulated:
		return "simulated"
	}
	return fmt.Sprintf("kind %d", uint8(k))
}

// Test is a statistic referred to a law.
type Test struct {
	Kind      Kind
	Name      string // what was referred: "F", "χ²", "bootstrap"
	Statistic float64
	Law       dist.Law // nil when p comes from draws
	P, LogP   float64  // P may underflow to 0, LogP does not
	Why       string   // why this kind, or why there is no test
	// Simulation is what a simulated p rests on; nil elsewhere.
	Simulation *Simulation
}

// Result answers a Comparison.
type Result struct {
	Comparison Comparison
	Pair       Pair

	// LogLambda is log λ, λ the likelihood ratio; Lambda is λ itself, 0 when it
	// underflows; Statistic is −2 log λ.
	LogLambda, Lambda, Statistic float64

	// ChiSquared refers −2 log λ to χ² with Pair.DF degrees of freedom; it
	// holds as the data grow. TrueSize tells what it is worth here.
	ChiSquared Test
	// Boundary refers −2 log λ to the mixture of χ² laws that holds where
	// parameters are tested at the end of their range; ChiSquared is absent then.
	Boundary Test
	// Exact is the exact test where one exists: F for linear spaces with unknown
	// variance, χ² with known variance, or what the space proves about itself.
	// Where F is not certified its Kind is Approximate and Why says what failed.
	Exact Test
	// Others are the references asked for in Settings.
	Others []Test

	// Recommended is the kind of the test to read, and Why says so in a sentence.
	Recommended Kind
	Why         string

	// Level is the confidence level asked for.
	Level    float64
	Warnings []Warning
}

// Test returns the recommended test.
func (r Result) Test() Test {
	if r.Exact.Kind != None && r.Exact.Kind == r.Recommended {
		return r.Exact
	}
	for _, t := range r.Others {
		if t.Kind == r.Recommended && t.Kind != Asymptotic {
			return t
		}
	}
	if r.Boundary.Kind != None {
		return r.Boundary
	}
	return r.ChiSquared
}

// P returns the p-value of the recommended test.
func (r Result) P() float64 { return r.Test().P }

// LogP returns the logarithm of the p-value of the recommended test.
func (r Result) LogP() float64 { return r.Test().LogP }

// TrueSize returns the true size of the χ² test of nominal level alpha for these
// ranks, NaN where no exact law is known.
func (r Result) TrueSize(alpha float64) float64 { return r.Pair.Linear.TrueSize(alpha) }

// Stratum says what λ is a ratio of: "rows, n = 30", or "stratum, m = 12", or ""
// for spaces that are not linear and for known variance.
func (r Result) Stratum() string {
	l := r.Pair.Linear
	switch {
	case l.M == 0 || l.Known > 0:
		return ""
	case l.Stratum:
		return fmt.Sprintf("stratum, m = %g", l.M)
	}
	return fmt.Sprintf("rows, n = %g", l.M)
}

// HasWarning reports whether a warning of the code is among the result's.
func (r Result) HasWarning(code string) bool {
	for _, w := range r.Warnings {
		if w.Code == code {
			return true
		}
	}
	return false
}

// String returns the answer in a few lines of plain text.
func (r Result) String() string {
	var b strings.Builder
	if r.Comparison.Name != "" {
		fmt.Fprintf(&b, "%s\n", r.Comparison.Name)
	}
	fmt.Fprintf(&b, "log λ = %.6g, λ = %.6g, −2 log λ = %.6g", r.LogLambda, r.Lambda, r.Statistic)
	if s := r.Stratum(); s != "" {
		fmt.Fprintf(&b, " (%s)", s)
	}
	b.WriteByte('\n')
	if r.ChiSquared.Kind != None {
		fmt.Fprintf(&b, "%s: −2 log λ referred to %s, %s", r.ChiSquared.Kind, r.ChiSquared.Law, FormatP(r.ChiSquared.P, r.ChiSquared.LogP))
		if size := r.TrueSize(1 - r.Level); !math.IsNaN(size) {
			fmt.Fprintf(&b, "; at nominal %.3g %% its true size here is %.3g %%", 100*(1-r.Level), 100*size)
		}
		b.WriteByte('\n')
	}
	for _, t := range append([]Test{r.Boundary, r.Exact}, r.Others...) {
		if t.Kind == None {
			continue
		}
		fmt.Fprintf(&b, "%s: %s = %.6g", t.Kind, t.Name, t.Statistic)
		if t.Law != nil {
			fmt.Fprintf(&b, " referred to %s", t.Law)
		}
		fmt.Fprintf(&b, ", %s\n", FormatP(t.P, t.LogP))
	}
	fmt.Fprintf(&b, "read the %s test: %s\n", r.Recommended, r.Why)
	for _, w := range r.Warnings {
		fmt.Fprintf(&b, "warning %s: %s\n", w.Code, w.Text)
	}
	return b.String()
}

// FormatP writes a p-value for people: "p = 0.0123", never "p = 0.000"; below
// the smallest float64 it is written from its logarithm as a power of ten.
func FormatP(p, logP float64) string {
	switch {
	case math.IsNaN(p):
		return "p unknown"
	case p > 0:
		return fmt.Sprintf("p = %.4g", p)
	case math.IsInf(logP, -1):
		return "p = 0 (perfect fit)"
	}
	return fmt.Sprintf("p = 10^%.1f", logP/math.Ln10)
}
