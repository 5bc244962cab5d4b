package lrt

import (
	"context"
	"fmt"
	"math"
)

var inf = math.Inf(1)

func logInt(n int) float64 { return math.Log(float64(n)) }

// Settings steer a comparison. nil and every zero field mean the default.
type Settings struct {
	// Level is the confidence level, strictly between 0 and 1; 0: 0.95. The
	// nominal level of tests is 1 − Level.
	Level float64
	// References are asked for beside the automatic ones.
	References []Reference
	// Workers is the largest number of goroutines; 0: GOMAXPROCS. Results have the same
	// bits for any number.
	Workers int
	// Seed starts every random stream: draw i has its own source made from (Seed, i).
	Seed uint64
	// Progress is called with the work done and the total, from one goroutine
	// at a time. nil: nobody is told.
	Progress func(done, total int)
}

// level returns the confidence level with its default.
func (s *Settings) level() float64 {
	if s == nil || s.Level == 0 {
		return 0.95
	}
	return s.Level
}

func (s *Settings) validate() error {
	if s == nil {
		return nil
	}
	if s.Level != 0 && !(s.Level > 0 && s.Level < 1) {
		return &ComparisonError{Place: "settings", Err: fmt.Errorf("%w: level %g, want strictly between 0 and 1", ErrInvalid, s.Level)}
	}
	if s.Workers < 0 {
		return &ComparisonError{Place: "settings", Err: fmt.Errorf("%w: %d workers", ErrInvalid, s.Workers)}
	}
	return nil
}

// Reference is a null law asked for by name, beside the automatic ones.
type Reference interface {
	Refer(ctx context.Context, c Comparison, p Pair, s *Settings) (Test, error)
}
