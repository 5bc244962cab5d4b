package lrt

import (
	"fmt"
	"reflect"
)

// optional lists the interfaces a space may meet, for lostInterfaces and for
// the report of the package spacetest.
var optional = []reflect.Type{
	reflect.TypeFor[PairFitter](), reflect.TypeFor[Restrictable](), reflect.TypeFor[Nester](),
	reflect.TypeFor[Improver](), reflect.TypeFor[ExactReferrer](), reflect.TypeFor[Simulator](),
	reflect.TypeFor[Companion](), reflect.TypeFor[Degrees](), reflect.TypeFor[Pivot](), reflect.TypeFor[BartlettCorrector](),
}

// lostInterfaces warns of optional interfaces that a type seems to have by
// intent but does not meet.
func lostInterfaces(c Comparison) []Warning {
	var ws []Warning
	for _, s := range []struct {
		place string
		space Space
	}{{"restricted", c.Restricted}, {"full", c.Full}} {
		for _, name := range Lost(s.space) {
			ws = append(ws, Warning{"optional-interface-lost", fmt.Sprintf(
				"%s space %T does not meet lrt.%s although its pointer or an embedded space does: pass the pointer, or forward the method",
				s.place, s.space, name)})
		}
	}
	return ws
}

// Lost names the optional interfaces that the pointer type of s, or a space
// embedded in s, meets while s itself does not: methods on the pointer of a
// value, or a wrapper that embeds a Space and so lends only its two methods.
func Lost(s Space) []string {
	if s == nil {
		return nil
	}
	t := reflect.TypeOf(s)
	var names []string
	for _, o := range optional {
		if t.Implements(o) {
			continue
		}
		if t.Kind() != reflect.Pointer && reflect.PointerTo(t).Implements(o) || embedsMeeting(reflect.ValueOf(s), o) {
			names = append(names, o.Name())
		}
	}
	return names
}

// Meets names the optional interfaces that s meets.
func Meets(s Space) []string {
	if s == nil {
		return nil
	}
	var names []string
	for _, o := range optional {
		if reflect.TypeOf(s).Implements(o) {
			names = append(names, o.Name())
		}
	}
	return names
}

func embedsMeeting(v reflect.Value, o reflect.Type) bool {
	if v.Kind() == reflect.Pointer {
		if v.IsNil() {
			return false
		}
		v = v.Elem()
	}
	if v.Kind() != reflect.Struct {
		return false
	}
	for i := range v.NumField() {
		f := v.Type().Field(i)
		if !f.Anonymous || f.Type.Kind() != reflect.Interface || v.Field(i).IsNil() {
			continue
		}
		if v.Field(i).Elem().Type().Implements(o) {
			return true
		}
	}
	return false
}
