// Package canon writes values as JSON in one form only, so that two runs give
// the same bytes: struct fields in their order, floats by their shortest
// decimal that reads back, no escapes for HTML, and one rule for what JSON has no
// number for. A float that is NaN or infinite is null, and the field after it,
// of the same name with "_reason" added, says why: "not-a-number",
// "plus-infinity" or "minus-infinity". In a list of floats the reasons are a list
// of the same length, null where there is a number.
package canon

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"reflect"
	"strings"
)

// Member is a field of an Object.
type Member struct {
	Name  string
	Value any
	// Reason replaces the reason code of a Value that is not finite.
	Reason string
}

// Object is a JSON object whose fields are known at run time, in order.
type Object []Member

// Marshal returns the canonical form without white space. It takes structs
// (field names by their json tags, ",omitempty" as in encoding/json), Objects,
// slices, arrays, pointers, strings, booleans, integers and floats; maps have no
// order and are refused.
func Marshal(v any) ([]byte, error) {
	var b bytes.Buffer
	if err := write(&b, reflect.ValueOf(v)); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// Indent is Marshal with two spaces for each level and a line end.
func Indent(v any) ([]byte, error) {
	c, err := Marshal(v)
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	if err := json.Indent(&b, c, "", "  "); err != nil {
		return nil, err
	}
	b.WriteByte('\n')
	return b.Bytes(), nil
}

// Reason returns the code of a float that JSON has no number for, "" for others.
func Reason(x float64) string {
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

func write(b *bytes.Buffer, v reflect.Value) error {
	if !v.IsValid() {
		b.WriteString("null")
		return nil
	}
	if o, ok := v.Interface().(Object); ok {
		return writeObject(b, o)
	}
	switch v.Kind() {
	case reflect.Interface, reflect.Pointer:
		if v.IsNil() {
			b.WriteString("null")
			return nil
		}
		return write(b, v.Elem())
	case reflect.Struct:
		o, err := members(v)
		if err != nil {
			return err
		}
		return writeObject(b, o)
	case reflect.Slice, reflect.Array:
		b.WriteByte('[')
		for i := range v.Len() {
			if i > 0 {
				b.WriteByte(',')
			}
			if err := write(b, v.Index(i)); err != nil {
				return err
			}
		}
		b.WriteByte(']')
		return nil
	case reflect.Float32, reflect.Float64:
		writeFloat(b, v.Float())
		return nil
	case reflect.String:
		return writeString(b, v.String())
	case reflect.Bool, reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64,
		reflect.Uint, reflect.Uint8, reflect.Uint16, reflect.Uint32, reflect.Uint64:
		fmt.Fprint(b, v.Interface())
		return nil
	}
	return fmt.Errorf("canon: no canonical form of %s", v.Type())
}

func writeFloat(b *bytes.Buffer, x float64) {
	if Reason(x) != "" {
		b.WriteString("null")
		return
	}
	if x == 0 {
		x = 0 // −0 is 0
	}
	s, _ := json.Marshal(x)
	b.Write(s)
}

func writeString(b *bytes.Buffer, s string) error {
	e := json.NewEncoder(b)
	e.SetEscapeHTML(false)
	if err := e.Encode(s); err != nil {
		return err
	}
	b.Truncate(b.Len() - 1) // the line end
	return nil
}

func writeObject(b *bytes.Buffer, o Object) error {
	b.WriteByte('{')
	for i, m := range o {
		if i > 0 {
			b.WriteByte(',')
		}
		if err := writeString(b, m.Name); err != nil {
			return err
		}
		b.WriteByte(':')
		v := reflect.ValueOf(m.Value)
		if err := write(b, v); err != nil {
			return err
		}
		if err := writeReasons(b, m, v); err != nil {
			return err
		}
	}
	b.WriteByte('}')
	return nil
}

// writeReasons adds the field that says why a number is null.
func writeReasons(b *bytes.Buffer, m Member, v reflect.Value) error {
	if !v.IsValid() {
		if m.Reason == "" {
			return nil
		}
		return writeNamed(b, m.Name+"_reason", m.Reason)
	}
	switch {
	case v.Kind() == reflect.Float64 || v.Kind() == reflect.Float32:
		r := Reason(v.Float())
		if r == "" {
			return nil
		}
		if m.Reason != "" {
			r = m.Reason
		}
		return writeNamed(b, m.Name+"_reason", r)
	case v.Kind() == reflect.Slice && v.Type().Elem().Kind() == reflect.Float64:
		rs := make([]any, v.Len())
		some := false
		for i := range rs {
			if r := Reason(v.Index(i).Float()); r != "" {
				rs[i], some = r, true
			}
		}
		if !some {
			return nil
		}
		b.WriteByte(',')
		if err := writeString(b, m.Name+"_reason"); err != nil {
			return err
		}
		b.WriteByte(':')
		return write(b, reflect.ValueOf(rs))
	}
	return nil
}

func writeNamed(b *bytes.Buffer, name, value string) error {
	b.WriteByte(',')
	if err := writeString(b, name); err != nil {
		return err
	}
	b.WriteByte(':')
	return writeString(b, value)
}

// members lists the fields of a struct that are to be written.
func members(v reflect.Value) (Object, error) {
	t := v.Type()
	var o Object
	for i := range t.NumField() {
		f := t.Field(i)
		if !f.IsExported() {
			continue
		}
		name, opt, _ := strings.Cut(f.Tag.Get("json"), ",")
		switch {
		case name == "-":
			continue
		case name == "":
			return nil, fmt.Errorf("canon: field %s of %s has no name in JSON", f.Name, t)
		case opt == "omitempty" && empty(v.Field(i)):
			continue
		}
		o = append(o, Member{Name: name, Value: v.Field(i).Interface()})
	}
	return o, nil
}

func empty(v reflect.Value) bool {
	switch v.Kind() {
	case reflect.Slice, reflect.String, reflect.Map:
		return v.Len() == 0
	}
	return v.IsZero()
}
