package glm

import (
	"bytes"
	"fmt"

	"subsume.example/internal/decimal"
)

// open finds the names of the columns and sets them up.
func (s *csvScan) open(buf []byte) error {
	s.buf = bytes.TrimPrefix(buf, []byte("\xEF\xBB\xBF"))
	if bytes.HasPrefix(s.buf, []byte("\xFF\xFE")) || bytes.HasPrefix(s.buf, []byte("\xFE\xFF")) {
		return s.fail(0, "", "", fmt.Errorf("%w: it looks like UTF-16, save it as UTF-8", ErrEncoding))
	}
	for bytes.HasSuffix(s.buf, []byte("\n\n")) {
		s.buf = s.buf[:len(s.buf)-1]
	}
	for bytes.HasSuffix(s.buf, []byte("\n\r\n")) {
		s.buf = s.buf[:len(s.buf)-2]
	}
	p := 0
	for p < len(s.buf) && s.blank(p) > 0 {
		p += s.blank(p)
	}
	if p == len(s.buf) {
		return s.fail(-1, "", "", fmt.Errorf("%w: the file is empty", ErrEmpty))
	}
	names := s.options.Header
	var offsets []int
	s.body = p
	if names == nil {
		var err error
		if names, offsets, err = s.header(p); err != nil {
			return err
		}
	}
	place := make(map[string]int, len(names))
	for i, name := range names {
		at := -1
		if offsets != nil {
			at = offsets[i]
		}
		if name == "" {
			return s.fail(at, "", "", fmt.Errorf("%w: number %d of %d", ErrName, i+1, len(names)))
		}
		if j, twice := place[name]; twice {
			return s.fail(at, name, "", fmt.Errorf("%w: as number %d and %d", ErrDuplicateColumn, j+1, i+1))
		}
		place[name] = i
	}
	if len(names) == 0 {
		return s.fail(-1, "", "", fmt.Errorf("%w: no columns", ErrEmpty))
	}
	return s.setup(names, place)
}

// header reads the line of names at p.
func (s *csvScan) header(p int) (names []string, offsets []int, err error) {
	var scratch []byte
	for {
		text, begin, next, _, err := s.field(p, &scratch)
		if err == nil {
			err = plainText(text)
		}
		if err != nil {
			return nil, nil, s.fail(begin, "", "", err)
		}
		names = append(names, string(text))
		offsets = append(offsets, begin)
		s.body = min(next+1, len(s.buf))
		if next == len(s.buf) || s.buf[next] == '\n' {
			return names, offsets, nil
		}
		p = next + 1
	}
}

// setup makes the columns and hands them the options that name them.
func (s *csvScan) setup(names []string, place map[string]int) error {
	o := s.options
	s.columns = make([]csvColumn, len(names))
	for i, name := range names {
		c := &s.columns[i]
		c.name, c.skip, c.forced, c.levels = name, o.Only != nil, o.Kinds[name], o.Levels[name]
		if c.levels != nil {
			c.forced = Labelled
		}
		c.labels.Store(c.forced == Labelled)
		for _, list := range [][]string{o.Missing, o.MissingIn[name]} {
			for _, word := range list {
				if word == "" {
					continue
				}
				c.missing = append(c.missing, []byte(word))
				if _, _, status := decimal.Parse([]byte(word), s.mark); status == decimal.Number {
					c.likeNumber = true
				}
			}
		}
	}
	if o.Only != nil && len(o.Only) == 0 {
		return s.fail(-1, "", "", fmt.Errorf("%w: no columns", ErrEmpty))
	}
	check := func(name, option string) error {
		if _, ok := place[name]; !ok {
			return s.fail(-1, name, "", fmt.Errorf("%w; there are %s (option %s)", ErrUnknownColumn, quoteNames(names), option))
		}
		return nil
	}
	for _, name := range o.Only {
		if err := check(name, "Only"); err != nil {
			return err
		}
		s.columns[place[name]].skip = false
	}
	for _, name := range sortedKeys(o.Kinds) {
		if err := check(name, "Kinds"); err != nil {
			return err
		}
	}
	for _, name := range sortedKeys(o.Levels) {
		if err := check(name, "Levels"); err != nil {
			return err
		}
	}
	for _, name := range sortedKeys(o.MissingIn) {
		if err := check(name, "MissingIn"); err != nil {
			return err
		}
	}
	return nil
}
