package glm

import (
	"bytes"
	"fmt"
	"unicode/utf8"
)

// field reads the field at p: its text, where the text begins, the offset of
// what follows (a delimiter, a line end or the end of the text), the line ends in it.
func (s *csvScan) field(p int, scratch *[]byte) (text []byte, begin, next, newlines int, err error) {
	b := s.buf
	if p < len(b) && b[p] == '"' {
		return s.quoted(p, scratch)
	}
	i := p
	for i < len(b) && !s.special[b[i]] {
		i++
	}
	if i < len(b) && b[i] == '"' {
		return nil, i, i, 0, fmt.Errorf("%w: inside a field that does not begin with one", ErrQuote)
	}
	next = i
	if i > p && b[i-1] == '\r' && (i == len(b) || b[i] == '\n') {
		i--
	}
	for p < i && (b[p] == ' ' || b[p] == '\t') {
		p++
	}
	for i > p && (b[i-1] == ' ' || b[i-1] == '\t') {
		i--
	}
	return b[p:i], p, next, 0, nil
}

// quoted reads the field in quotes at p.
func (s *csvScan) quoted(p int, scratch *[]byte) (text []byte, begin, next, newlines int, err error) {
	b := s.buf
	i := p + 1
	out := (*scratch)[:0]
	from := i
	doubled := false
	for {
		j := bytes.IndexByte(b[i:], '"')
		if j < 0 {
			return nil, p, p, 0, fmt.Errorf("%w: not closed", ErrQuote)
		}
		i += j
		if i+1 < len(b) && b[i+1] == '"' {
			out = append(out, b[from:i+1]...)
			i += 2
			from = i
			doubled = true
			continue
		}
		break
	}
	text = b[p+1 : i]
	if doubled {
		out = append(out, b[from:i]...)
		text = out
	}
	*scratch = out
	newlines = bytes.Count(b[p+1:i], []byte{'\n'})
	i++
	if i == len(b) || b[i] == s.delimiter || b[i] == '\n' || b[i] == '\r' && (i+1 == len(b) || b[i+1] == '\n') {
		if i < len(b) && b[i] == '\r' {
			i++
		}
		return text, p, i, newlines, nil
	}
	return nil, i, i, 0, fmt.Errorf("%w: text follows a closing quote", ErrQuote)
}

// blank returns the length of the empty line at p, 0 when it is not empty.
func (s *csvScan) blank(p int) int {
	b := s.buf
	switch {
	case b[p] == '\n':
		return 1
	case b[p] == '\r' && p+1 < len(b) && b[p+1] == '\n':
		return 2
	}
	return 0
}

// plainText refuses what has no place in a label or a name.
func plainText(b []byte) error {
	switch {
	case !utf8.Valid(b):
		return fmt.Errorf("%w: it holds bytes that are not UTF-8", ErrEncoding)
	case bytes.IndexByte(b, 0) >= 0:
		return fmt.Errorf("%w: it holds a zero byte", ErrEncoding)
	case bytes.IndexByte(b, '\r') >= 0 && bytes.IndexByte(b, '\n') < 0:
		return fmt.Errorf("%w: a carriage return without a line feed", ErrEncoding)
	}
	return nil
}
