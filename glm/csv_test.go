package glm

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"testing/iotest"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

// table shows data as texts, one slice a column, for comparison.
func table(t testing.TB, d *Data) map[string][]string {
	t.Helper()
	out := map[string][]string{}
	for _, f := range d.Schema() {
		var col []string
		if f.Numeric() {
			v, err := d.Values(f.Name)
			if err != nil {
				t.Fatal(err)
			}
			for _, x := range v {
				col = append(col, fmt.Sprint(x))
			}
		} else {
			idx, levels, err := d.LevelIndex(f.Name)
			if err != nil {
				t.Fatal(err)
			}
			for _, i := range idx {
				if i < 0 {
					col = append(col, "missing")
				} else {
					col = append(col, "'"+levels[i]+"'")
				}
			}
		}
		out[f.Name] = col
	}
	return out
}

func read(text string, o *CSVOptions) (*Data, error) {
	return ReadCSV(context.Background(), strings.NewReader(text), o)
}

func TestReadCSV(t *testing.T) {
	type columns = map[string][]string
	cases := []struct {
		name, text string
		options    *CSVOptions
		want       columns
	}{
		{"plain", "y,g\n1.5,a\n2,b\n", nil, columns{"y": {"1.5", "2"}, "g": {"'a'", "'b'"}}},
		{"no last line end", "y,g\n1.5,a\n2,b", nil, columns{"y": {"1.5", "2"}, "g": {"'a'", "'b'"}}},
		{"CR LF and mark", "\xEF\xBB\xBFy,g\r\n1.5,a\r\n2,b\r\n", nil, columns{"y": {"1.5", "2"}, "g": {"'a'", "'b'"}}},
		{"CR LF, numbers last", "g,y\r\na,1.5\r\nb,2\r\n", nil, columns{"y": {"1.5", "2"}, "g": {"'a'", "'b'"}}},
		{"carriage return at the end", "g,y\r\na,1.5\r\nb,2\r", nil, columns{"y": {"1.5", "2"}, "g": {"'a'", "'b'"}}},
		{"CR LF after nothing", "y,g\r\n1,a\r\n2,\r\n3,a\r\n4,b\r\n5,\r\n6,b\r\n", nil,
			columns{"y": {"1", "2", "3", "4", "5", "6"}, "g": {"'a'", "missing", "'a'", "'b'", "missing", "'b'"}}},
		{"quotes", "\"y\",\"a \"\"b\"\", c\"\n\"1.5\",\" x\"\n2,\"line 1\nline 2\"\n", nil,
			columns{"y": {"1.5", "2"}, "a \"b\", c": {"' x'", "'line 1\nline 2'"}}},
		{"quoted CR LF", "y,g\r\n1,\"p\r\nq\"\r\n", nil, columns{"y": {"1"}, "g": {"'p\r\nq'"}}},
		{"spaces", " y , g \n 1.5 ,  a b \n\t2\t,b\n", nil, columns{"y": {"1.5", "2"}, "g": {"'a b'", "'b'"}}},
		{"missing", "y,g\n,a\n2,\n3,b\n", nil, columns{"y": {"NaN", "2", "3"}, "g": {"'a'", "missing", "'b'"}}},
		{"quoted nothing", "y,g\n\"\",a\n2,\"\"\n", nil, columns{"y": {"NaN", "2"}, "g": {"'a'", "missing"}}},
		{"missing words", "y,g\nNA,a\n2,?\n-99,-\n", &CSVOptions{Missing: []string{"NA", "?"}, MissingIn: map[string][]string{"y": {"-99"}}},
			columns{"y": {"NaN", "2", "NaN"}, "g": {"'a'", "missing", "'-'"}}},
		{"semicolon", "y;g\n1.5;a,b\n", &CSVOptions{Delimiter: ';'}, columns{"y": {"1.5"}, "g": {"'a,b'"}}},
		{"tab", "y\tg\n1.5\ta\n\t\n", &CSVOptions{Delimiter: '\t'}, columns{"y": {"1.5", "NaN"}, "g": {"'a'", "missing"}}},
		{"decimal comma", "y;g\n1,5;a\n-2;b\n1,25e2;a\n", &CSVOptions{DecimalComma: true}, columns{"y": {"1.5", "-2", "125"}, "g": {"'a'", "'b'", "'a'"}}},
		{"decimal comma in quotes", "y|g\n\"1,5\"|a\n\"-2,25\"|b\n", &CSVOptions{DecimalComma: true, Delimiter: '|'}, columns{"y": {"1.5", "-2.25"}, "g": {"'a'", "'b'"}}},
		{"points are no numbers under a decimal comma", "y;g\n1.500;a\n", &CSVOptions{DecimalComma: true}, columns{"y": {"'1.500'"}, "g": {"'a'"}}},
		{"numbers until a late label", "y,g\n" + strings.Repeat("1,2\n", 200) + "x,2\n", nil,
			columns{"y": append(slices.Repeat([]string{"'1'"}, 200), "'x'"), "g": slices.Repeat([]string{"2"}, 201)}},
		{"labels that look like numbers", "y,g\n1,01\n2,1\n", &CSVOptions{Kinds: map[string]Kind{"g": Labelled}}, columns{"y": {"1", "2"}, "g": {"'01'", "'1'"}}},
		{"declared levels", "y,g\n1,lo\n2,hi\n", &CSVOptions{Levels: map[string][]string{"g": {"hi", "lo"}}}, columns{"y": {"1", "2"}, "g": {"'lo'", "'hi'"}}},
		{"only", "y,note,g\n1,\"what, ever\",a\n2,NaN,b\n", &CSVOptions{Only: []string{"g", "y"}}, columns{"y": {"1", "2"}, "g": {"'a'", "'b'"}}},
		{"names given", "1,a\n2,b\n", &CSVOptions{Header: []string{"y", "g"}}, columns{"y": {"1", "2"}, "g": {"'a'", "'b'"}}},
		{"empty lines", "\n\ny,g\n\n1,a\n\r\n\n2,b\n\n\n", nil, columns{"y": {"1", "2"}, "g": {"'a'", "'b'"}}},
		{"one column", "y\n1\n\n3\n\n\n", nil, columns{"y": {"1", "NaN", "3"}}},
		{"one column of labels", "g\na\n\"\"\nb", nil, columns{"g": {"'a'", "missing", "'b'"}}},
		{"all missing", "y,g\n,a\n,b\n", nil, columns{"y": {"NaN", "NaN"}, "g": {"'a'", "'b'"}}},
		{"NaN as a label", "y,g\n1,NaN\n2,b\n", nil, columns{"y": {"1", "2"}, "g": {"'NaN'", "'b'"}}},
		{"other alphabets", "größe,плитка\n1,бук\n2,ель\n", nil, columns{"größe": {"1", "2"}, "плитка": {"'бук'", "'ель'"}}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			d, err := read(c.text, c.options)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(c.want, table(t, d)); diff != "" {
				t.Error(diff)
			}
			if a := d.Account(); a.Read != d.Len() || a.Used != d.Len() {
				t.Errorf("account %+v of %d rows", a, d.Len())
			}
		})
	}
}

func TestReadCSVErrors(t *testing.T) {
	tiles := &CSVOptions{Name: "tiles.csv"}
	cases := []struct {
		name, text string
		options    *CSVOptions
		want       error
		text2      string // of the error
	}{
		{"empty", "", tiles, ErrEmpty, "glm: tiles.csv: no data: the file is empty"},
		{"only empty lines", "\n\r\n\n", tiles, ErrEmpty, "glm: tiles.csv: no data: the file is empty"},
		{"no rows", "y,g\n", tiles, ErrEmpty, "glm: tiles.csv: no data: names but no rows"},
		{"names twice", "y,g, y\n1,2,3\n", tiles, ErrDuplicateColumn, `glm: tiles.csv:1:6: column "y": column name is used twice: as number 1 and 3`},
		{"no name", "y,,g\n1,2,3\n", tiles, ErrName, "glm: tiles.csv:1:3: column has no name: number 2 of 3"},
		{"delimiter after the last name", "y,g,\n1,2,\n", tiles, ErrName, "glm: tiles.csv:1:5: column has no name: number 3 of 3"},
		{"too few", "y,g\n1,2\n3\n", tiles, ErrFieldCount, "glm: tiles.csv:3:2: wrong number of fields: the line ends after 1 of 2"},
		{"too many", "y,g\n1,2,3\n", tiles, ErrFieldCount, "glm: tiles.csv:2:5: wrong number of fields: the line goes on after the 2 named columns"},
		{"no number", "y,g\n1,2\nä,n/a\n", &CSVOptions{Name: "tiles.csv", Kinds: map[string]Kind{"g": Numeric}}, ErrNotNumber,
			`glm: tiles.csv:3:3: column "g": "n/a": not a number and not declared missing`},
		{"NaN", "y,g\na,2\nb,NaN\n", tiles, ErrNotFinite, `glm: tiles.csv:3:3: column "g": "NaN": value is not finite and not declared missing`},
		{"infinite", "y\n1\n-Inf\n", nil, ErrNotFinite, `glm: line 3 position 1: column "y": "-Inf": value is not finite and not declared missing`},
		{"beyond range", "y\n1\n\"1e400\"\n", nil, ErrNotFinite, `glm: line 3 position 1: column "y": "1e400": value is not finite and not declared missing`},
		{"quote inside", "y,g\n1,a\"b\n", tiles, ErrQuote, `glm: tiles.csv:2:4: column "g": misplaced quote: inside a field that does not begin with one`},
		{"quote not closed", "y,g\n1,\"a\n2,b\n", tiles, ErrQuote, `glm: tiles.csv:2:3: column "g": misplaced quote: not closed`},
		{"text after a quote", "y,g\n1,\"a\" \n", tiles, ErrQuote, `glm: tiles.csv:2:6: column "g": misplaced quote: text follows a closing quote`},
		{"after lines in quotes", "y,g\n1,\"a\n\nb\"\n\n2,x\"\n", tiles, ErrQuote, `glm: tiles.csv:6:4: column "g": misplaced quote: inside a field that does not begin with one`},
		{"carriage returns alone", "y,g\r1,2\r3,4\r", tiles, ErrEncoding, "glm: tiles.csv:1:3: not plain UTF-8 text: a carriage return without a line feed"},
		{"not UTF-8", "y,g\n1,k\xE4se\n", tiles, ErrEncoding, "glm: tiles.csv:2:3: column \"g\": \"k\\xe4se\": not plain UTF-8 text: it holds bytes that are not UTF-8"},
		{"UTF-16", "\xFF\xFEy\x00\n\x00", tiles, ErrEncoding, "glm: tiles.csv:1:1: not plain UTF-8 text: it looks like UTF-16, save it as UTF-8"},
		{"zero byte", "y,g\n1,a\x00b\n", tiles, ErrEncoding, "glm: tiles.csv:2:3: column \"g\": \"a\\x00b\": not plain UTF-8 text: it holds a zero byte"},
		{"unknown level", "y,g\n1,lo\n2,mid\n", &CSVOptions{Levels: map[string][]string{"g": {"lo", "hi"}}}, ErrUnknownLevel,
			`glm: line 3 position 3: column "g": "mid": label is not among the declared levels`},
		{"unknown column", "y,g\n1,2\n", &CSVOptions{Kinds: map[string]Kind{"depth": Numeric}}, ErrUnknownColumn, `glm: column "depth": no such column; there are "y", "g" (option Kinds)`},
		{"unknown column kept", "y,g\n1,2\n", &CSVOptions{Only: []string{"depth"}}, ErrUnknownColumn, `glm: column "depth": no such column; there are "y", "g" (option Only)`},
		{"delimiter", "y\n1\n", &CSVOptions{Delimiter: 'x'}, ErrOptions, `glm: unusable options: delimiter 'x', want a tab or an ASCII punctuation mark, but not a quote, sign or point`},
		{"delimiter and mark", "y\n1\n", &CSVOptions{Delimiter: ',', DecimalComma: true}, ErrOptions, "glm: unusable options: delimiter and decimal mark are both ','"},
		{"levels twice", "g\na\n", &CSVOptions{Levels: map[string][]string{"g": {"a", "a"}}}, ErrLevels, `glm: column "g": levels must be distinct and not empty`},
		{"numeric with levels", "g\na\n", &CSVOptions{Levels: map[string][]string{"g": {"a"}}, Kinds: map[string]Kind{"g": Numeric}}, ErrOptions, `glm: column "g": unusable options: declared numeric and with levels`},
		{"negative limit", "g\na\n", &CSVOptions{MaxRows: -1}, ErrOptions, "glm: unusable options: negative limit or number of workers"},
		{"no columns kept", "g\na\n", &CSVOptions{Only: []string{}}, ErrEmpty, "glm: no data: no columns"},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			d, err := read(c.text, c.options)
			var e *CSVError
			if d != nil || !errors.Is(err, c.want) || !errors.As(err, &e) {
				t.Fatalf("got %v, %v, want an error wrapping %v", d, err, c.want)
			}
			if err.Error() != c.text2 {
				t.Errorf("error %q\nwant  %q", err, c.text2)
			}
		})
	}
}

func TestReadCSVLimits(t *testing.T) {
	text := "y,g\n1,a\n2,b\n3,a\n"
	for _, c := range []struct {
		o    CSVOptions
		what string
	}{
		{CSVOptions{MaxBytes: int64(len(text))}, ""}, {CSVOptions{MaxBytes: int64(len(text)) - 1}, "bytes"},
		{CSVOptions{MaxRows: 3}, ""}, {CSVOptions{MaxRows: 2}, "rows"},
	} {
		for _, r := range []io.Reader{strings.NewReader(text), iotest.OneByteReader(strings.NewReader(text))} {
			_, err := ReadCSV(context.Background(), r, &c.o)
			var e *LimitError
			if c.what == "" && err != nil || c.what != "" && (!errors.Is(err, ErrTooLarge) || !errors.As(err, &e) || e.What != c.what) {
				t.Errorf("%+v: %v", c.o, err)
			}
		}
	}
}

func TestReadCSVReaderAndContext(t *testing.T) {
	broken := errors.New("the line went dead")
	if _, err := ReadCSV(context.Background(), iotest.ErrReader(broken), nil); !errors.Is(err, broken) {
		t.Errorf("reader's error: %v", err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := ReadCSV(ctx, strings.NewReader("y\n1\n"), nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

func TestReadCSVKeepsDigits(t *testing.T) {
	texts := []string{"1000000000000.3", "0.1", "3.14159265358979323846264338327950", "9007199254740993", "-12345678901234.56789"}
	text := "y\n" + strings.Join(texts, "\n") + "\n"
	d, err := read(text, nil)
	if err != nil {
		t.Fatal(err)
	}
	want := mustData(t, Decimals("y", texts))
	if err := d.Observations("y").Check(want.Observations("y")); err != nil {
		t.Errorf("CSV and Decimals differ: %v", err)
	}
	plain, err := read(text, &CSVOptions{Plain: true})
	if err != nil {
		t.Fatal(err)
	}
	if _, lo, _ := plain.Pairs("y"); lo != nil {
		t.Error("Plain kept low parts")
	}
}

func TestNotNumericSaysWhere(t *testing.T) {
	d, err := read("y,g\n1,a\n2,b\nn/a,a\n3,b\n", &CSVOptions{Name: "tiles.csv"})
	if err != nil {
		t.Fatal(err)
	}
	_, err = d.Values("y")
	var e *CSVError
	if !errors.Is(err, ErrNotNumeric) || !errors.As(err, &e) || e.Line != 4 || e.Column != 1 || e.Text != "n/a" {
		t.Errorf("%v", err)
	}
	_, err = Normal(context.Background(), d, "y", []Term{Constant{}}, nil)
	if !errors.Is(err, ErrNotNumeric) || !errors.As(err, &e) || e.Line != 4 {
		t.Errorf("as a response: %v", err)
	}
}

func TestLines(t *testing.T) {
	d, err := read("y,g\n1,a\n2,b\n", nil)
	if err != nil || d.Line(0) != 2 || d.Line(1) != 3 {
		t.Errorf("lines %d, %d, %v", d.Line(0), d.Line(1), err)
	}
	d, err = read("\ny,g\n\n1,\"a\nb\"\n2,c\n\n,d\n5,e\n", nil)
	if err != nil {
		t.Fatal(err)
	}
	d, err = d.Complete()
	if err != nil {
		t.Fatal(err)
	}
	var lines []int
	for i := range d.Len() {
		lines = append(lines, d.Line(i))
	}
	if !slices.Equal(lines, []int{4, 6, 9}) {
		t.Errorf("lines %v, want 4, 6, 9", lines)
	}
}

// TestChunks reads a text of several chunks, with line ends in quotes and empty lines at their borders and
// a label that comes late, with several numbers of workers and against small pieces.
func TestChunks(t *testing.T) {
	var b bytes.Buffer
	b.WriteString("y,g,h,late\n")
	n := 0
	var line []int
	at := 2
	for b.Len() < 3*chunkBytes+1000 {
		line = append(line, at)
		switch {
		case n%7 == 3:
			fmt.Fprintf(&b, "%d.%04d,\"level\n%d\",%d,%d\n", n, n%9973, n%11, n%5, n)
			at += 2
		case n%13 == 5:
			fmt.Fprintf(&b, "%d.%04d,\"q\"\"%d\",,%d\n\n", n, n%9973, n%3, n)
			at += 2
		default:
			fmt.Fprintf(&b, ",plain%d,%d,%d\r\n", n%17, n%5, n)
			at++
		}
		n++
	}
	b.WriteString("1,end,1,x\n")
	line = append(line, at)
	n++
	var first *Data
	for _, workers := range []int{1, 2, 5} {
		d, err := ReadCSV(context.Background(), bytes.NewReader(b.Bytes()), &CSVOptions{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		if d.Len() != n {
			t.Fatalf("%d rows, want %d", d.Len(), n)
		}
		for i, want := range line {
			if d.Line(i) != want {
				t.Fatalf("row %d on line %d, want %d", i, d.Line(i), want)
			}
		}
		if first == nil {
			first = d
		} else if !first.Observations("y").Rows.Same(d.Observations("y").Rows) {
			t.Error("the data depend on the workers")
		}
	}
	y, _ := first.Values("y")
	g, levels, _ := first.LevelIndex("g")
	late, lates, _ := first.LevelIndex("late")
	for i := range n - 1 {
		want := fmt.Sprintf("plain%d", i%17)
		number := math.NaN()
		switch {
		case i%7 == 3:
			want = fmt.Sprintf("level\n%d", i%11)
			number = readFloat(t, fmt.Sprintf("%d.%04d", i, i%9973))
		case i%13 == 5:
			want = fmt.Sprintf("q\"%d", i%3)
			number = readFloat(t, fmt.Sprintf("%d.%04d", i, i%9973))
		}
		if levels[g[i]] != want || y[i] != number && (y[i] == y[i] || number == number) || lates[late[i]] != fmt.Sprint(i) {
			t.Fatalf("row %d: %v, %q, %q, want %v, %q, %d", i, y[i], levels[g[i]], lates[late[i]], number, want, i)
		}
	}
}

func readFloat(t *testing.T, s string) float64 {
	var x float64
	if _, err := fmt.Sscan(s, &x); err != nil {
		t.Fatal(err)
	}
	return x
}

// TestErrorInLaterChunk: the error that comes first in the text is reported, by any number of workers.
func TestErrorInLaterChunk(t *testing.T) {
	var b bytes.Buffer
	b.WriteString("y,g\n")
	rows := 0
	for b.Len() < 2*chunkBytes+5000 {
		b.WriteString("1.25,\"a\"\n")
		rows++
	}
	b.WriteString("2,a\"b\n")
	for b.Len() < 4*chunkBytes {
		b.WriteString("1.25,\"a\n\"\n")
	}
	for _, workers := range []int{1, 2, 4} {
		_, err := ReadCSV(context.Background(), bytes.NewReader(b.Bytes()), &CSVOptions{Workers: workers})
		var e *CSVError
		if !errors.As(err, &e) || e.Line != rows+2 || e.Column != 4 || !errors.Is(err, ErrQuote) {
			t.Errorf("%d workers: %v, want line %d", workers, err, rows+2)
		}
	}
}

// TestFiles reads a regular file, from its middle too, and a pipe.
func TestFiles(t *testing.T) {
	path := filepath.Join(t.TempDir(), "f.csv")
	if err := os.WriteFile(path, []byte("not this\ny,g\n1.5,a\n,b\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if _, err := f.Seek(9, io.SeekStart); err != nil {
		t.Fatal(err)
	}
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	go func() {
		_, _ = io.WriteString(w, "y,g\n1.5,a\n,b\n")
		_ = w.Close()
	}()
	for _, in := range []io.Reader{f, r} {
		d, err := ReadCSV(context.Background(), in, nil)
		if err != nil {
			t.Fatal(err)
		}
		if got := table(t, d); len(got["y"]) != 2 || got["g"][1] != "'b'" {
			t.Errorf("read %v", got)
		}
	}
	if _, err := ReadCSV(context.Background(), f, nil); err == nil { // at its end now
		t.Error("an exhausted file is read")
	}
}

func TestMessages(t *testing.T) {
	_, err := read("y\n1\n2\n", &CSVOptions{Name: "upload", MaxRows: 1})
	if got := fmt.Sprint(err); got != "glm: upload: input is larger than the limit of 1 rows" {
		t.Errorf("%s", got)
	}
	_, err = read("y\n1\n"+strings.Repeat("ä", 200)+"\n", &CSVOptions{Kinds: map[string]Kind{"y": Numeric}})
	if got := fmt.Sprint(err); len(got) > 150 || !strings.Contains(got, "…") || !utf8.ValidString(got) {
		t.Errorf("%s", got)
	}
	names := make([]string, 30)
	for i := range names {
		names[i] = fmt.Sprint("c", i)
	}
	line := strings.Join(names, ",") + "\n"
	_, err = read(line+line, &CSVOptions{Only: []string{"z"}})
	if got := fmt.Sprint(err); !strings.Contains(got, `"c11" and 18 more`) {
		t.Errorf("%s", got)
	}
}

// TestReaders: a text gives the same data whatever reader delivers it.
func TestReaders(t *testing.T) {
	text := "y,g\n1.5,a\n,b\n"
	want, err := read(text, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range []io.Reader{iotest.OneByteReader(strings.NewReader(text)), iotest.DataErrReader(strings.NewReader(text)), iotest.HalfReader(strings.NewReader(text)), bytes.NewBufferString(text)} {
		d, err := ReadCSV(context.Background(), r, nil)
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(table(t, want), table(t, d), cmpopts.EquateEmpty()); diff != "" {
			t.Error(diff)
		}
	}
}
