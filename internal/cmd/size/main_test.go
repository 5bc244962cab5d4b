package main

import (
	"context"
	"math"
	"testing"
)

// Every case runs, names its references in one order, and gives p-values; the
// judgement sees a reference that rejects too often.
func TestCases(t *testing.T) {
	ctx := context.Background()
	for i, c := range cases(8, 4, 1) {
		if c.sets < 1 {
			c.sets = 1
		}
		rows, err := measure(ctx, c, uint64(i+1))
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		if len(rows) == 0 {
			t.Fatalf("%s: no references", c.name)
		}
		for _, r := range rows {
			if r.sets != c.sets || r.failed > 0 {
				t.Errorf("%s: %d sets, %d failed", r.name, r.sets, r.failed)
			}
		}
	}
}

func TestJudgement(t *testing.T) {
	good := &row{name: "good", exact: true, sets: 10000, rejected: [3]int{500, 100, 10}}
	bad := &row{name: "bad", exact: true, sets: 10000, rejected: [3]int{700, 100, 10}}
	shy := &row{name: "shy", exact: true, discrete: true, sets: 10000}
	if !report([]*row{good, shy}) {
		t.Error("good references are refused")
	}
	if report([]*row{good, bad}) {
		t.Error("a bad reference passes")
	}
	if z := bad.z(0); math.Abs(z-200/math.Sqrt(475)) > 1e-9 {
		t.Errorf("z = %g", z)
	}
}
