package lrt

import (
	"fmt"
	"math"
	"strings"
)

// Real declares a parameter that may be any real number.
func Real(name string) Param { return Param{Name: name, Lower: -inf, Upper: inf} }

// Positive declares a parameter in [0, ∞). It is fitted on the log scale; a
// maximum at 0 is found and reported when the likelihood is finite there.
func Positive(name string) Param { return Param{Name: name, Lower: 0, Upper: inf} }

// Unit declares a parameter in [0, 1], fitted on the logit scale.
func Unit(name string) Param { return Param{Name: name, Lower: 0, Upper: 1} }

// Between declares a parameter in [lower, upper]; an infinite end is open.
func Between(name string, lower, upper float64) Param {
	return Param{Name: name, Lower: lower, Upper: upper}
}

// Block declares n parameters of the same range named name[1] … name[n], the
// names that Names returns.
func Block(n int, like Param) []Param {
	ps := make([]Param, max(n, 0))
	for i := range ps {
		ps[i] = Param{Name: fmt.Sprintf("%s[%d]", like.Name, i+1), Lower: like.Lower, Upper: like.Upper}
	}
	return ps
}

// Names returns the n names that Block gives, for Equate and the like.
func Names(name string, n int) []string {
	names := make([]string, max(n, 0))
	for i := range names {
		names[i] = fmt.Sprintf("%s[%d]", name, i+1)
	}
	return names
}

// checkParams reports the first parameter that cannot be used.
func checkParams(ps []Param) error {
	seen := make(map[string]bool, len(ps))
	for i, p := range ps {
		switch {
		case strings.TrimSpace(p.Name) == "":
			return fmt.Errorf("%w: parameter %d has no name", ErrInvalid, i+1)
		case seen[p.Name]:
			return fmt.Errorf("%w: two parameters are named %q", ErrInvalid, p.Name)
		case math.IsNaN(p.Lower) || math.IsNaN(p.Upper) || !(p.Lower < p.Upper):
			return fmt.Errorf("%w: parameter %q has the range [%g, %g], want lower < upper", ErrInvalid, p.Name, p.Lower, p.Upper)
		case math.IsInf(p.Lower, 1) || math.IsInf(p.Upper, -1):
			return fmt.Errorf("%w: parameter %q has an empty range [%g, %g]", ErrInvalid, p.Name, p.Lower, p.Upper)
		}
		seen[p.Name] = true
	}
	return nil
}
