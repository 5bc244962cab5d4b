package lrt

import (
	"encoding/json"
	"math"
	"os"
	"strconv"
	"testing"
)

// published is a file of testdata: open or published data with results that
// were recomputed to many digits. The source is in each file.
type published struct {
	ID, Source string
	Columns    map[string][]any
	Alpha      string
	Power      string `json:"target_power"`
	Expected   map[string]struct {
		Exact     any
		Published any
	}
}

func load(t testing.TB, name string) published {
	t.Helper()
	b, err := os.ReadFile("testdata/" + name + ".json")
	if err != nil {
		t.Fatal(err)
	}
	var p published
	if err := json.Unmarshal(b, &p); err != nil {
		t.Fatal(err)
	}
	return p
}

func number(t testing.TB, v any) float64 {
	t.Helper()
	switch x := v.(type) {
	case float64:
		return x
	case string:
		f, err := strconv.ParseFloat(x, 64)
		if err != nil {
			t.Fatal(err)
		}
		return f
	case nil:
		return math.NaN()
	}
	t.Fatalf("no number: %v", v)
	return 0
}

func numbers(t testing.TB, v any) []float64 {
	t.Helper()
	list, ok := v.([]any)
	if !ok {
		return []float64{number(t, v)}
	}
	out := make([]float64, len(list))
	for i, x := range list {
		out[i] = number(t, x)
	}
	return out
}

func (p published) column(t testing.TB, name string) []float64 {
	t.Helper()
	return numbers(t, any(p.Columns[name]))
}

func (p published) exact(t testing.TB, name string) []float64 {
	t.Helper()
	e, ok := p.Expected[name]
	if !ok {
		t.Fatalf("%s has no %q", p.ID, name)
	}
	return numbers(t, e.Exact)
}

// near fails unless got is within tol of want, relatively above 1.
func near(t testing.TB, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol*math.Max(1, math.Abs(want))) {
		t.Errorf("%s = %.15g, want %.15g (off by %.2g)", what, got, want, got-want)
	}
}
