package glm

import (
	"bytes"
	"context"
	"encoding/csv"
	"errors"
	"math"
	"strconv"
	"strings"
	"testing"

	"subsume.example/internal/decimal"
)

// FuzzReadCSV: no text panics, every error is typed, the workers do not matter,
// and what was read is read again from its own CSV text. Where the text has no empty
// line and no quote, it is also compared with the standard library's reader.
func FuzzReadCSV(f *testing.F) {
	for _, s := range []string{
		"y,g\n1.5,a\n2,b\n", "\xEF\xBB\xBFy;g\r\n1,5;\"a\"\"b\"\r\n", "y\n\n1\n\n", "y,g\n1,\"a\nb\"\nx,c\n", "a,b\n,\n,\n",
		"y\n1e400\n", "y,g\r\n1,a\r\n2,\r\n3,bc\r\n,a\r\n", "y,y\n1,2\n", "y,g\n1\n", "\"y\"\n\"-0.10\"\n12345678901234567890.12345\n", "y\r1\r", "y,g\n1,a\x00\n",
	} {
		f.Add([]byte(s), byte(','), false)
		f.Add([]byte(s), byte(';'), true)
	}
	f.Fuzz(func(t *testing.T, text []byte, delimiter byte, comma bool) {
		o := &CSVOptions{Delimiter: delimiter, DecimalComma: comma, Workers: 1}
		d, err := ReadCSV(context.Background(), bytes.NewReader(text), o)
		if err != nil {
			var e *CSVError
			if !errors.As(err, &e) || e.Err == nil || e.Error() == "" {
				t.Fatalf("untyped error %v", err)
			}
			return
		}
		o.Workers = 3
		other, err := ReadCSV(context.Background(), bytes.NewReader(text), o)
		if err != nil || !d.Observations("").Rows.Same(other.Observations("").Rows) {
			t.Fatalf("other workers: %v", err)
		}
		for i := range d.Len() {
			if i > 0 && d.Line(i) <= d.Line(i-1) {
				t.Fatalf("row %d on line %d after line %d", i, d.Line(i), d.Line(i-1))
			}
		}
		again := writeCSV(d, &o.Kinds)
		e, err := ReadCSV(context.Background(), strings.NewReader(again), &CSVOptions{Kinds: o.Kinds})
		if err != nil || !d.Observations("").Rows.Same(e.Observations("").Rows) {
			t.Fatalf("%q written as %q reads as other rows, %v", text, again, err)
		}
		against(t, text, delimiter, comma, d)
	})
}

// writeCSV writes data as CSV text with every field in quotes.
func writeCSV(d *Data, kinds *map[string]Kind) string {
	*kinds = map[string]Kind{}
	var b strings.Builder
	quote := func(s string) { b.WriteString(`"` + strings.ReplaceAll(s, `"`, `""`) + `"`) }
	for i, f := range d.schema {
		if i > 0 {
			b.WriteByte(',')
		}
		quote(f.Name)
		(*kinds)[f.Name] = Labelled
		if f.Numeric() {
			(*kinds)[f.Name] = Numeric
		}
	}
	for r := range d.n {
		b.WriteByte('\n')
		for i := range d.columns {
			c := &d.columns[i]
			if i > 0 {
				b.WriteByte(',')
			}
			switch {
			case c.isMissing(r):
				quote("")
			case c.index != nil:
				quote(c.field.Levels[c.index[r]])
			case c.lo != nil:
				quote(decimal.Text(c.hi[r], c.lo[r]))
			default:
				quote(strconv.FormatFloat(c.hi[r], 'f', -1, 64))
			}
		}
	}
	b.WriteByte('\n')
	return b.String()
}

// against compares with encoding/csv where both read the same language.
func against(t *testing.T, text []byte, delimiter byte, comma bool, d *Data) {
	text = bytes.ReplaceAll(text, []byte("\r\n"), []byte("\n"))
	if comma || bytes.ContainsAny(text, "\" \t") || bytes.Contains(text, []byte("\xEF\xBB\xBF")) || bytes.Contains(text, []byte("\r")) ||
		bytes.HasPrefix(text, []byte("\n")) || bytes.Contains(text, []byte("\n\n")) || delimiter == 0 {
		return
	}
	r := csv.NewReader(bytes.NewReader(text))
	r.Comma = rune(delimiter)
	records, err := r.ReadAll()
	if err != nil || len(records) != d.n+1 {
		t.Fatalf("encoding/csv: %d records, %v; here %d rows", len(records), err, d.n)
	}
	for i, record := range records[1:] {
		for j, s := range record {
			c := &d.columns[j]
			switch {
			case s == "":
				if !c.isMissing(i) {
					t.Fatalf("row %d column %d is not missing", i, j)
				}
			case c.index != nil:
				if c.field.Levels[c.index[i]] != s {
					t.Fatalf("row %d column %d: %q, want %q", i, j, c.field.Levels[c.index[i]], s)
				}
			default:
				if x, err := strconv.ParseFloat(s, 64); err != nil || x != c.hi[i] && !math.IsNaN(x) {
					t.Fatalf("row %d column %d: %v, want %v, %v", i, j, c.hi[i], x, err)
				}
			}
		}
	}
}
