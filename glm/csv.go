package glm

import (
	"context"
	"fmt"
	"io"
	"runtime"
	"slices"
)

// CSVOptions steer ReadCSV. nil and every zero field mean the default.
type CSVOptions struct {
	// Name names the source in errors and in the Account: a file name, say.
	Name string
	// Delimiter stands between fields: an ASCII punctuation mark or a tab. 0: a
	// comma, or a semicolon where DecimalComma is set.
	Delimiter byte
	// DecimalComma says that numbers are written with a decimal comma, as in
	// 12,5. Points are not accepted in numbers then.
	DecimalComma bool
	// Missing lists texts that stand for "missing" in any column, beside the empty field,
	// which always does. They are compared exactly, upper and lower case apart.
	Missing []string
	// MissingIn lists further such texts for single columns, by name.
	MissingIn map[string][]string
	// Kinds sets what columns hold, by name; the others are found out: a column is
	// numeric if every value in it is a number or missing, else it holds labels.
	Kinds map[string]Kind
	// Levels declares the levels of columns of labels and their order, by
	// column; a label that is not among them is an error. Such a column holds
	// labels, also where they look like numbers. Other levels stand in order of appearance.
	Levels map[string][]string
	// Only lists the columns to keep, in any order; nil keeps all.
	Only []string
	// Header names the columns of a file that has no line of names.
	Header []string
	// Plain keeps no digits beyond float64. It halves the memory of columns of decimals.
	Plain bool
	// MaxBytes and MaxRows refuse larger input with a *LimitError; 0: no limit.
	MaxBytes, MaxRows int64
	// Workers is the largest number of goroutines; 0: GOMAXPROCS. The data are
	// the same for any number.
	Workers int
}

// Kind is what a column of a file holds.
type Kind uint8

// The kinds of column.
const (
	Detect   Kind = iota // numbers if every value is one, else labels
	Numeric              // numbers; anything else is an error
	Labelled             // labels, also where they look like numbers
)

// ReadCSV reads a table of comma-separated values as RFC 4180 describes it, with
// these choices where the RFC leaves one or files differ:
//
//   - The first line names the columns. Two columns with one name, or one without a
//     name, are refused, and so is a line with more or fewer fields than names.
//   - Lines end in LF or CR LF; a byte order mark is skipped; text is UTF-8.
//   - A field in quotes may hold delimiters, quotes written twice, and line ends.
//     Spaces and tabs around a field that is not in quotes do not count.
//   - Empty lines at the end are skipped, and all of them where there are
//     several columns; with one column an empty line is a missing value.
//   - A number has an optional sign, digits with at most one decimal mark, an
//     optional exponent; no separators of thousands. Every digit is kept, as by
//     Decimals. NaN and infinities, and numbers beyond the float64 range, are errors
//     in a column of numbers unless declared missing; one too small for float64 is zero.
//   - Whole numbers stay numbers; where they name groups, use Kinds or
//     Data.Categorical.
//
// Errors in the text are *CSVError with line and position, and wrap ErrEmpty,
// ErrName, ErrDuplicateColumn, ErrUnknownColumn, ErrFieldCount, ErrQuote,
// ErrEncoding, ErrNotNumber, ErrNotFinite or ErrUnknownLevel; unusable options
// wrap ErrOptions; too large input is a *LimitError. An error of r or of the
// context is returned wrapped. The whole text is held in memory while it is read.
func ReadCSV(ctx context.Context, r io.Reader, options *CSVOptions) (*Data, error) {
	var o CSVOptions
	if options != nil {
		o = *options
	}
	s := &csvScan{options: &o}
	if err := s.configure(); err != nil {
		return nil, err
	}
	buf, err := readAll(ctx, r, &o)
	if err != nil {
		return nil, err
	}
	if err := s.open(buf); err != nil {
		return nil, err
	}
	if err := s.run(ctx); err != nil {
		return nil, err
	}
	return s.data()
}

// configure checks the options that need no file.
func (s *csvScan) configure() error {
	o := s.options
	s.mark = '.'
	if o.DecimalComma {
		s.mark = ','
	}
	s.delimiter = o.Delimiter
	if s.delimiter == 0 {
		s.delimiter = ','
		if o.DecimalComma {
			s.delimiter = ';'
		}
	}
	d := s.delimiter
	switch {
	case d == s.mark:
		return s.fail(-1, "", "", fmt.Errorf("%w: delimiter and decimal mark are both %q", ErrOptions, d))
	case d != '\t' && (d <= ' ' || d >= 0x7F) || d == '"' || d == '+' || d == '-' || d == '.' || d >= '0' && d <= '9' || d|0x20 >= 'a' && d|0x20 <= 'z':
		return s.fail(-1, "", "", fmt.Errorf("%w: delimiter %q, want a tab or an ASCII punctuation mark, but not a quote, sign or point", ErrOptions, d))
	case o.MaxBytes < 0 || o.MaxRows < 0 || o.Workers < 0:
		return s.fail(-1, "", "", fmt.Errorf("%w: negative limit or number of workers", ErrOptions))
	}
	for name, levels := range o.Levels {
		if o.Kinds[name] == Numeric {
			return s.fail(-1, name, "", fmt.Errorf("%w: declared numeric and with levels", ErrOptions))
		}
		c := Column{name: name, order: levels, ordered: true}
		if _, _, err := c.declared(); err != nil {
			return s.fail(-1, name, "", ErrLevels)
		}
	}
	for name, k := range o.Kinds {
		if k > Labelled {
			return s.fail(-1, name, "", fmt.Errorf("%w: kind %d", ErrOptions, k))
		}
	}
	s.workers = o.Workers
	if s.workers == 0 {
		s.workers = runtime.GOMAXPROCS(0)
	}
	s.ends = 0x0101010101010101 * uint64(d)
	for i := range s.special {
		s.special[i] = byte(i) == d || i == '\n' || i == '"'
	}
	return nil
}

// readAll reads r to its end, within the limit, looking at the context between blocks.
func readAll(ctx context.Context, r io.Reader, o *CSVOptions) ([]byte, error) {
	size := 1 << 16
	switch known := r.(type) {
	case interface{ Len() int }:
		size = known.Len() + 1
	case io.Seeker:
		if here, err := known.Seek(0, io.SeekCurrent); err == nil {
			if end, err := known.Seek(0, io.SeekEnd); err == nil {
				size = int(max(end-here, 0)) + 1
			}
			if _, err := known.Seek(here, io.SeekStart); err != nil {
				return nil, fmt.Errorf("glm: reading %s: %w", sourceName(o), err)
			}
		}
	}
	if o.MaxBytes > 0 {
		size = int(min(int64(size), o.MaxBytes+1))
	}
	const block = 1 << 20
	buf := make([]byte, 0, size)
	for {
		if err := ctx.Err(); err != nil {
			return nil, fmt.Errorf("glm: reading %s: %w", sourceName(o), err)
		}
		if len(buf) == cap(buf) {
			buf = slices.Grow(buf, max(len(buf)/2, 1<<16))
		}
		n, err := r.Read(buf[len(buf):min(cap(buf), len(buf)+block)])
		buf = buf[:len(buf)+n]
		if o.MaxBytes > 0 && int64(len(buf)) > o.MaxBytes {
			return nil, &LimitError{Name: o.Name, What: "bytes", Limit: o.MaxBytes}
		}
		if err == io.EOF {
			return buf, nil
		}
		if err != nil {
			return nil, fmt.Errorf("glm: reading %s: %w", sourceName(o), err)
		}
	}
}

// sourceName names the source for a message.
func sourceName(o *CSVOptions) string {
	if o.Name == "" {
		return "csv"
	}
	return o.Name
}
