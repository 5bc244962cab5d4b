package dist

import (
	"errors"
	"fmt"
	"math"
)

// ErrParam is wrapped by every ParamError.
var ErrParam = errors.New("dist: parameter outside its range")

// ParamError says which parameter of which law is outside its range. It unwraps
// to ErrParam.
type ParamError struct {
	Law, Param string  // name of the law's type and of its field
	Value      float64 // the value found
	Want       string  // what would be accepted
}

// Error names the law, the parameter, its value and what was wanted.
func (e *ParamError) Error() string {
	return fmt.Sprintf("dist: %s.%s = %v: want %s", e.Law, e.Param, e.Value, e.Want)
}

// Unwrap returns ErrParam.
func (e *ParamError) Unwrap() error { return ErrParam }

const (
	wantPositive      = "a finite number above 0"
	wantPositiveOrInf = "a number above 0, +Inf included"
)

// finitePositive reports 0 < v < Inf; NaN is not.
func finitePositive(v float64) bool { return v > 0 && v <= math.MaxFloat64 }
