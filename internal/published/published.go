// Package published holds data sets with certified or published results, for
// tests and for the commands that print how many digits are reached. README.md
// describes the fields of the files; each file names its source.
package published

import (
	"embed"
	"encoding/json"
	"fmt"
	"math"
	"path"
	"strconv"
	"strings"
)

//go:embed data/*.json
var files embed.FS

// Set is one data set.
type Set struct {
	ID, Kind, Title, Source, Status, Design string
	Roles                                   map[string]string
	ColumnTypes                             map[string]string `json:"column_types"`
	Columns                                 map[string][]Text
	Order                                   []string `json:"-"` // columns in the order of the file
	Expected                                map[string]Expected
	Alpha                                   json.RawMessage
	TargetPower                             json.RawMessage `json:"target_power"`
	Groups                                  []Text
	EffectNames                             []string `json:"effect_names"`
	CoefficientNames                        []string `json:"coefficient_names"`
	Tolerance                               string

	raw []byte
}

// Text is a value as it stands in the file, a number or a string.
type Text string

// UnmarshalJSON keeps the digits of a number.
func (t *Text) UnmarshalJSON(b []byte) error {
	var s string
	if json.Unmarshal(b, &s) == nil {
		*t = Text(s)
		return nil
	}
	*t = Text(b)
	return nil
}

// Expected is a result: as printed in the source, and recomputed from the data.
type Expected struct {
	Published, Exact Values
	Note             string
}

// Values is a value or a list of them, as text.
type Values []string

// UnmarshalJSON takes a value or a list.
func (v *Values) UnmarshalJSON(b []byte) error {
	var list []Text
	if json.Unmarshal(b, &list) != nil {
		if string(b) == "null" {
			return nil
		}
		var one Text
		if err := json.Unmarshal(b, &one); err != nil {
			return err
		}
		list = []Text{one}
	}
	for _, t := range list {
		*v = append(*v, string(t))
	}
	return nil
}

// Names lists the sets whose name begins with prefix.
func Names(prefix string) []string {
	entries, err := files.ReadDir("data")
	if err != nil {
		return nil
	}
	var names []string
	for _, e := range entries {
		if n := strings.TrimSuffix(e.Name(), ".json"); strings.HasPrefix(n, prefix) {
			names = append(names, n)
		}
	}
	return names
}

// Load reads a set.
func Load(name string) (*Set, error) {
	b, err := files.ReadFile(path.Join("data", name+".json"))
	if err != nil {
		return nil, err
	}
	s := &Set{raw: b}
	if err := json.Unmarshal(b, s); err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	var outer struct{ Columns json.RawMessage }
	if err := json.Unmarshal(b, &outer); err != nil {
		return nil, err
	}
	d := json.NewDecoder(strings.NewReader(string(outer.Columns)))
	depth := 0
	for {
		t, err := d.Token()
		if err != nil {
			break
		}
		switch t := t.(type) {
		case json.Delim:
			if t == '{' || t == '[' {
				depth++
			} else {
				depth--
			}
		case string:
			if depth == 1 {
				s.Order = append(s.Order, t)
			}
		}
	}
	return s, nil
}

// Decode reads further fields of the file into v.
func (s *Set) Decode(v any) error { return json.Unmarshal(s.raw, v) }

// Texts returns a column as text.
func (s *Set) Texts(name string) []string {
	c := s.Columns[name]
	out := make([]string, len(c))
	for i, t := range c {
		out[i] = string(t)
	}
	return out
}

// Numbers returns a column as float64, NaN for what is no number.
func (s *Set) Numbers(name string) []float64 {
	c := s.Columns[name]
	out := make([]float64, len(c))
	for i, t := range c {
		x, err := strconv.ParseFloat(string(t), 64)
		if err != nil {
			x = math.NaN()
		}
		out[i] = x
	}
	return out
}

// Exact returns element i of an expected result; NaN where there is none.
func (s *Set) Exact(name string, i int) float64 {
	e, ok := s.Expected[name]
	if !ok || i >= len(e.Exact) {
		return math.NaN()
	}
	x, err := strconv.ParseFloat(e.Exact[i], 64)
	if err != nil {
		return math.NaN()
	}
	return x
}

// Has reports whether a result is expected.
func (s *Set) Has(name string) bool { return len(s.Expected[name].Exact) > 0 }

// Digits returns the correct digits of got, −log10 of its relative error (of the
// absolute error over scale where want is 0), at most 15.
func Digits(got, want, scale float64) float64 {
	d := math.Abs(got - want)
	if want != 0 {
		d /= math.Abs(want)
	} else if scale > 0 {
		d /= scale
	}
	switch {
	case d == 0:
		return 15
	case math.IsNaN(d):
		return math.NaN()
	}
	return math.Max(0, math.Min(15, -math.Log10(d)))
}
