package canon_test

import (
	"encoding/json"
	"math"
	"testing"

	"subsume.example/internal/canon"
)

type inner struct {
	Name string    `json:"name"`
	X    float64   `json:"x"`
	List []float64 `json:"list,omitempty"`
	Skip int       `json:"-"`
}

func TestMarshal(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		name string
		v    any
		want string
	}{
		{"numbers", []float64{0, math.Copysign(0, -1), 0.1, 1e21, 1e-7, 5e-324}, `[0,0,0.1,1e+21,1e-7,5e-324]`},
		{"text", "a<b & \"ü\"\n", `"a<b & \"ü\"\n"`},
		{"not finite", inner{Name: "q", X: nan}, `{"name":"q","x":null,"x_reason":"not-a-number"}`},
		{"infinite", inner{X: -inf}, `{"name":"","x":null,"x_reason":"minus-infinity"}`},
		{"list", inner{List: []float64{1, inf}}, `{"name":"","x":0,"list":[1,null],"list_reason":[null,"plus-infinity"]}`},
		{"object", canon.Object{{Name: "p", Value: nan, Reason: "no-error-df"}, {Name: "n", Value: 3}, {Name: "gone", Reason: "absent"}},
			`{"p":null,"p_reason":"no-error-df","n":3,"gone":null,"gone_reason":"absent"}`},
		{"nested", []any{nil, true, []inner{{Name: "a"}}, &inner{}}, `[null,true,[{"name":"a","x":0}],{"name":"","x":0}]`},
	} {
		got, err := canon.Marshal(c.v)
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		if string(got) != c.want {
			t.Errorf("%s: %s, want %s", c.name, got, c.want)
		}
		if !json.Valid(got) {
			t.Errorf("%s: %s is not JSON", c.name, got)
		}
	}
}

func TestMarshalRefuses(t *testing.T) {
	for _, v := range []any{map[string]int{"a": 1}, struct{ NoTag int }{}, make(chan int)} {
		if b, err := canon.Marshal(v); err == nil {
			t.Errorf("%T was written as %s", v, b)
		}
	}
}
