package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"reflect"
	"strings"
)

// figure is a number of the record. JSON has no word for NaN and the
// infinities: they are written as null, and the list not_finite of the record
// says for each which one it is.
type figure float64

var nan = figure(math.NaN())

// MarshalJSON writes the shortest decimal that reads back to the same float64, or null.
func (f figure) MarshalJSON() ([]byte, error) {
	if reason(float64(f)) != "" {
		return []byte("null"), nil
	}
	return json.Marshal(float64(f))
}

// reason is the code for a number that JSON cannot hold; "" for the others.
func reason(x float64) string {
	switch {
	case math.IsNaN(x):
		return "not-a-number"
	case math.IsInf(x, 1):
		return "plus-infinity"
	case math.IsInf(x, -1):
		return "minus-infinity"
	}
	return ""
}

// absence says which null of the record stands for what.
type absence struct {
	Path   string `json:"path"`
	Reason string `json:"reason"`
}

// absences walks v in the order of its fields and lists the figures that are not finite.
func absences(v reflect.Value, path string, out []absence) []absence {
	switch v.Kind() {
	case reflect.Pointer, reflect.Interface:
		if !v.IsNil() {
			return absences(v.Elem(), path, out)
		}
	case reflect.Slice:
		for i := range v.Len() {
			out = absences(v.Index(i), fmt.Sprintf("%s[%d]", path, i), out)
		}
	case reflect.Struct:
		for i := range v.NumField() {
			name, _, _ := strings.Cut(v.Type().Field(i).Tag.Get("json"), ",")
			if path != "" {
				name = path + "." + name
			}
			out = absences(v.Field(i), name, out)
		}
	case reflect.Float64:
		if r := reason(v.Float()); r != "" {
			out = append(out, absence{path, r})
		}
	}
	return out
}

// encode writes the record, indented, the same bytes for the same values.
func encode(r *record) ([]byte, error) {
	r.NotFinite = absences(reflect.ValueOf(r), "", nil)
	if r.NotFinite == nil {
		r.NotFinite = []absence{}
	}
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	err := e.Encode(r)
	return b.Bytes(), err
}
