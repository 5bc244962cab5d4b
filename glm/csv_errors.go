package glm

import (
	"bytes"
	"errors"
	"fmt"
	"strings"
	"unicode/utf8"
)

// What can be wrong with a text beside what can be wrong with any data.
var (
	// ErrFieldCount: a line has more or fewer fields than there are names.
	ErrFieldCount = errors.New("wrong number of fields")
	// ErrQuote: a quote stands inside a field without quotes, or is not closed, or is followed by more text.
	ErrQuote = errors.New("misplaced quote")
	// ErrEncoding: the text is not UTF-8, or a carriage return or a zero byte stands inside a field without quotes.
	ErrEncoding = errors.New("not plain UTF-8 text")
	// ErrOptions: the options contradict each other or the file.
	ErrOptions = errors.New("unusable options")
	// ErrTooLarge: the input is larger than the limit.
	ErrTooLarge = errors.New("input is larger than the limit")
)

// CSVError says where in a text the fault is.
type CSVError struct {
	Name   string // of the source
	Line   int    // from 1; 0: the text as a whole
	Column int    // position in the line in characters, from 1
	Field  string // name of the column; "" where it has none
	Text   string // the field at fault
	Err    error  // the cause
}

// Error returns a text such as `glm: tiles.csv:17:9: column "thickness": "n/a":
// not a number and not declared missing`.
func (e *CSVError) Error() string {
	var b strings.Builder
	b.WriteString("glm: ")
	switch {
	case e.Name != "" && e.Line > 0:
		fmt.Fprintf(&b, "%s:%d:%d: ", e.Name, e.Line, e.Column)
	case e.Name != "":
		fmt.Fprintf(&b, "%s: ", e.Name)
	case e.Line > 0:
		fmt.Fprintf(&b, "line %d position %d: ", e.Line, e.Column)
	}
	if e.Field != "" {
		fmt.Fprintf(&b, "column %q: ", clip(e.Field))
	}
	if e.Text != "" {
		fmt.Fprintf(&b, "%q: ", clip(e.Text))
	}
	b.WriteString(e.Err.Error())
	return b.String()
}

// Unwrap returns the cause.
func (e *CSVError) Unwrap() error { return e.Err }

// LimitError says which limit the input exceeds; it wraps ErrTooLarge.
type LimitError struct {
	Name  string // of the source
	What  string // "bytes" or "rows"
	Limit int64
}

// Error returns a text such as "glm: upload: input is larger than the limit of 1000 rows".
func (e *LimitError) Error() string {
	name := ""
	if e.Name != "" {
		name = e.Name + ": "
	}
	return fmt.Sprintf("glm: %s%s of %d %s", name, ErrTooLarge, e.Limit, e.What)
}

// Unwrap returns ErrTooLarge.
func (e *LimitError) Unwrap() error { return ErrTooLarge }

// fail returns the error at a byte of the text; offset −1: of the text as a whole.
func (s *csvScan) fail(offset int, field, text string, err error) *CSVError {
	e := &CSVError{Name: s.options.Name, Field: field, Text: text, Err: err}
	if offset >= 0 {
		offset = min(offset, len(s.buf))
		begin := bytes.LastIndexByte(s.buf[:offset], '\n') + 1
		e.Line = 1 + bytes.Count(s.buf[:offset], []byte{'\n'})
		e.Column = 1 + utf8.RuneCount(s.buf[begin:offset])
	}
	return e
}
