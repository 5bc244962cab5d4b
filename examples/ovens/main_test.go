package main

import (
	"bytes"
	"context"
	"encoding/json"
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"gonum.org/v1/gonum/stat"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// call runs the command on a file of the given text and returns exit code and both outputs.
func call(t *testing.T, text string, args ...string) (code int, out, errs string) {
	t.Helper()
	if text != "" {
		path := filepath.Join(t.TempDir(), "mine.csv")
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		args = append([]string{"-file", path}, args...)
	}
	var o, e bytes.Buffer
	code = run(context.Background(), args, &o, &e)
	return code, o.String(), e.String()
}

func golden(t *testing.T, name, got string) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), got); diff != "" {
		t.Errorf("%s (-want +got, -update rewrites it):\n%s", name, diff)
	}
}

func TestTiles(t *testing.T) {
	code, out, errs := call(t, "")
	if code != 0 || errs != "" {
		t.Fatalf("exit %d, %s", code, errs)
	}
	golden(t, "tiles.txt", out)
}

func TestRecord(t *testing.T) {
	dir := t.TempDir()
	var first []byte
	for i := range 2 {
		path := filepath.Join(dir, fmt.Sprint(i, ".json"))
		if code, _, errs := call(t, "", "-draws", "199", "-record", path); code != 0 {
			t.Fatalf("exit %d, %s", code, errs)
		}
		b, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = b
		} else if !bytes.Equal(first, b) {
			t.Error("two runs wrote different records")
		}
	}
	if bytes.Contains(first, []byte(dir)) {
		t.Error("the record holds a path")
	}
	var r struct {
		Data struct {
			Read    int `json:"rows_read"`
			Used    int `json:"rows_used"`
			Dropped []struct{ Lines []int }
			Rows    string `json:"rows_sha256"`
		}
		Rows []struct {
			Name, Hypothesis, Reading string
			MS, Value, P, LogP        float64
			DF                        float64 `json:"df"`
			DFError                   float64 `json:"df_error"`
			MSError                   float64 `json:"ms_error"`
			LogLambda                 float64 `json:"log_lambda"`
			Certified                 bool
		}
		Reports  []json.RawMessage
		Declared struct {
			Checks []struct{ Name string }
		}
	}
	if err := json.Unmarshal(first, &r); err != nil {
		t.Fatal(err)
	}
	n := r.Rows[len(r.Rows)-1]
	if want := n.MS / n.MSError; n.Name != "oven" || !n.Certified || math.Abs(n.Value/want-1) > 1e-13 {
		t.Errorf("row %+v, mean squares give F = %v", n, want)
	}
	// λ of the default error pair is (1 + F d1/d2)^(−n/2).
	if want := -0.5 * float64(r.Data.Used) * math.Log1p(n.Value*n.DF/n.DFError); math.Abs(n.LogLambda/want-1) > 1e-14 {
		t.Errorf("log λ = %v, want %v", n.LogLambda, want)
	}
	if d := r.Data; len(d.Dropped) != 1 || !slices.Equal(d.Dropped[0].Lines, []int{89}) || len(d.Rows) != 64 || d.Read != 312 || d.Used != 311 {
		t.Errorf("data %+v", r.Data)
	}
	if len(r.Reports) != 5 || len(r.Declared.Checks) != 7 {
		t.Errorf("%d reports, checks %v", len(r.Reports), r.Declared.Checks)
	}
}

func TestHelpAndFlags(t *testing.T) {
	if code, _, errs := call(t, "", "-help"); code != 0 || !strings.Contains(errs, "-response") {
		t.Errorf("exit %d, %s", code, errs)
	}
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"-speed"}, "flag provided but not defined"},
		{[]string{"extra"}, `unexpected argument "extra"`},
		{[]string{"-response", "strength"}, "give it by -file"},
		{[]string{"-file", "x.csv"}, "-file needs -response and -group"},
		{[]string{"-file", "x.csv", "-response", "y", "-group", "y"}, `are both "y"`},
		{[]string{"-file", "x.csv", "-response", "y", "-group", "g", "-covariate", "g"}, "is the response or the group"},
		{[]string{"-file", "x.csv", "-response", "y", "-group", "g", "-covariate", "x", "-covariate", "x"}, "given twice"},
		{[]string{"-file", "x.csv", "-response", "y", "-group", "g", "-delimiter", ";;"}, "want one ASCII character"},
		{[]string{"-file", "x.csv", "-response", "y", "-group", "g", "-sd", "1"}, "needs both"},
		{[]string{"-level", "95"}, "-level 95"},
		{[]string{"-power", "0"}, "-power 0"},
		{[]string{"-draws", "5"}, "-draws 5"},
		{[]string{"-difference", "-1", "-sd", "1"}, "want positive"},
		{[]string{"-file", filepath.Join(t.TempDir(), "none.csv"), "-response", "y", "-group", "g"}, "no such file"},
	} {
		code, out, errs := call(t, "", c.args...)
		if code != 2 || out != "" || !strings.Contains(errs, c.want) {
			t.Errorf("%v: exit %d, out %q, errors %q, want %q", c.args, code, out, errs, c.want)
		}
	}
}

func TestBadFiles(t *testing.T) {
	for _, c := range []struct{ name, text, want string }{
		{"empty", "\n", "mine.csv: no data: the file is empty"},
		{"no rows", "y,g\n", "mine.csv: no data: names but no rows"},
		{"text in the response", "y,g\n1,a\n2,b\nn/a,a\n", `mine.csv:4:1: column "y": "n/a": not a number and not declared missing`},
		{"NaN", "y,g\n1,a\nNaN,b\n", `mine.csv:3:1: column "y": "NaN": value is not finite`},
		{"ragged", "y,g\n1,a\n2\n", "mine.csv:3:2: wrong number of fields"},
		{"names twice", "y,g,y\n1,a,2\n", `mine.csv:1:5: column "y": column name is used twice`},
		{"unknown column", "y,h\n1,a\n", `column "g": no such column`},
		{"semicolons", "y;g\n1,5;a\n2,5;b\n", "-delimiter ';'"},
		{"all missing", "y,g\n,a\n,b\n", `no row is left of 2: 2 missing in "y"`},
		{"one group", "y,g\n1,a\n2,a\n3,a\n", `has only the group "a"`},
		{"one row a group", "y,g\n1,a\n2,b\n3,c\n", "too few rows"},
		{"constant response", "y,g\n4,a\n4,a\n4,b\n4,b\n", `"y" does not vary`},
		{"quote", "y,g\n1,\"a\n", `mine.csv:2:3: column "g": misplaced quote: not closed`},
	} {
		t.Run(c.name, func(t *testing.T) {
			code, out, errs := call(t, c.text, "-response", "y", "-group", "g")
			if code != 2 || out != "" || !strings.Contains(errs, c.want) {
				t.Errorf("exit %d, out %q, errors %q, want %q", code, out, errs, c.want)
			}
		})
	}
	code, _, errs := call(t, "y,g,x\n1,a,0\n2,a,0\n3,b,1\n5,b,1\n", "-response", "y", "-group", "g", "-covariate", "x")
	if code != 2 || !strings.Contains(errs, "the covariates already tell the groups") {
		t.Errorf("confounded covariate: exit %d, %s", code, errs)
	}
}

// yields is a small clean table in the given dialect.
func yields(delimiter, mark string, quoted bool, end string) string {
	var b strings.Builder
	b.WriteString(strings.Join([]string{"yield", "plot"}, delimiter) + end)
	for i := range 40 {
		y := strings.Replace(fmt.Sprintf("%d.%02d", 10+i%4, (i*37)%100), ".", mark, 1)
		g := fmt.Sprint(i % 4)
		if quoted {
			y, g = `"`+y+`"`, `"`+g+`"`
		}
		b.WriteString(y + delimiter + g + end)
	}
	return b.String()
}

// TestDialects: the same table in several dialects gives the same report.
func TestDialects(t *testing.T) {
	base := []string{"-response", "yield", "-group", "plot", "-draws", "99"}
	code, want, errs := call(t, yields(",", ".", false, "\n"), base...)
	if code != 0 {
		t.Fatalf("exit %d, %s", code, errs)
	}
	strip := func(s string) string { // the line that names the file
		_, s, _ = strings.Cut(s, "rows read")
		return s
	}
	for _, c := range []struct {
		name, text string
		args       []string
	}{
		{"CR LF and byte order mark", "\xEF\xBB\xBF" + yields(",", ".", false, "\r\n"), nil},
		{"semicolon and decimal comma", yields(";", ",", false, "\n"), []string{"-decimal-comma"}},
		{"tab", yields("\t", ".", false, "\n"), []string{"-delimiter", "tab"}},
		{"quoted", yields(",", ".", true, "\n"), nil},
		{"no last line end", strings.TrimSuffix(yields(",", ".", false, "\n"), "\n"), nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			code, out, errs := call(t, c.text, append(c.args, base...)...)
			if code != 0 {
				t.Fatalf("exit %d, %s", code, errs)
			}
			if diff := cmp.Diff(strip(want), strip(out)); diff != "" {
				t.Error(diff)
			}
		})
	}
}

// TestOddData: legal but unusual data are answered, and the record stays valid JSON.
func TestOddData(t *testing.T) {
	scaled := func(scale string) string {
		var b strings.Builder
		b.WriteString("y,g\n")
		for i := range 20 {
			fmt.Fprintf(&b, "%d.%d%s,%c\n", 1+i%3, (i*7)%10, scale, 'a'+rune(i%2))
		}
		return b.String()
	}
	for _, c := range []struct {
		name, text string
		want       []string
	}{
		{"perfect fit", "y,g\n1,a\n1,a\n2,b\n2,b\n", []string{"F                    ∞", "not checked"}},
		{"group of one row", "y,g\n1,a\n2,a\n3,b\n4,b\n9,c\n", []string{"group c has only 1 row"}},
		{"huge", scaled("e300"), []string{"e+300"}},
		{"tiny", scaled("e-300"), []string{"e-30"}},
		{"missing words and codes", "y,g\n1,10\n2,10\nNA,10\n3,9\n4,9\n6,\n", []string{"y missing: line 4", "g missing: line 7", "9   10"}},
		{"long names", "y,g\n1," + strings.Repeat("x", 300) + "\n2," + strings.Repeat("x", 300) + "\n3,b\n4,b\n", nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			path := filepath.Join(t.TempDir(), "record.json")
			code, out, errs := call(t, c.text, "-response", "y", "-group", "g", "-missing", "NA", "-draws", "99", "-record", path)
			if code != 0 {
				t.Fatalf("exit %d, %s", code, errs)
			}
			for _, w := range c.want {
				if !strings.Contains(out, w) {
					t.Errorf("no %q in\n%s", w, out)
				}
			}
			b, err := os.ReadFile(path)
			if err != nil || !json.Valid(b) {
				t.Errorf("record: %v", err)
			}
		})
	}
}

func TestOutputFailures(t *testing.T) {
	var e bytes.Buffer
	if code := run(context.Background(), []string{"-draws", "99", "-record", filepath.Join(t.TempDir(), "no", "folder")}, new(bytes.Buffer), &e); code != 1 {
		t.Errorf("record that cannot be written: exit %d, %s", code, e.String())
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if code := run(ctx, nil, new(bytes.Buffer), &e); code != 1 {
		t.Errorf("cancelled: exit %d", code)
	}
}

// TestSpread checks the declared likelihood of standard deviations, numerically
// maximised, against the closed form where there is no covariate:
// −2 log λ = n log s² − Σ nᵢ log sᵢ² with maximum likelihood variances.
func TestSpread(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 1))
	var b strings.Builder
	b.WriteString("y,g\n")
	var total, n, separate float64
	for g, k := range []int{5, 9, 14} {
		var y []float64
		for range k {
			y = append(y, math.Round(1000*(3+float64(g)*rng.NormFloat64()+rng.NormFloat64()))/1000)
			fmt.Fprintf(&b, "%.3f,%c\n", y[len(y)-1], 'a'+rune(g))
		}
		m, ss := stat.Mean(y, nil), 0.0
		for _, v := range y {
			ss += (v - m) * (v - m)
		}
		total, n, separate = total+ss, n+float64(k), separate+float64(k)*math.Log(ss/float64(k))
	}
	want := n*math.Log(total/n) - separate
	path := filepath.Join(t.TempDir(), "in.csv")
	if err := os.WriteFile(path, []byte(b.String()), 0o600); err != nil {
		t.Fatal(err)
	}
	j, err := parse([]string{"-file", path, "-response", "y", "-group", "g", "-draws", "99"}, new(bytes.Buffer))
	if err != nil {
		t.Fatal(err)
	}
	s := &study{job: j}
	for _, step := range []func(context.Context) error{s.read, s.plan, s.compare, s.follow, s.check} {
		if err := step(context.Background()); err != nil {
			t.Fatal(err)
		}
	}
	if got := s.spread.Statistic; math.Abs(got-want) > 1e-9*want {
		t.Errorf("−2 log λ = %v, want %v", got, want)
	}
}

func TestHardestPair(t *testing.T) {
	for _, c := range []struct {
		counts []int
		a, b   int
	}{{[]int{5, 5}, 0, 1}, {[]int{9, 3, 8, 4}, 1, 3}, {[]int{3, 3, 3}, 0, 1}, {[]int{1, 100, 90}, 0, 2}} {
		if a, b := hardestPair(c.counts); a != c.a || b != c.b {
			t.Errorf("hardestPair(%v) = %d, %d, want %d, %d", c.counts, a, b, c.a, c.b)
		}
	}
}

func TestFigures(t *testing.T) {
	for _, c := range []struct {
		x    float64
		want string
	}{{0, "0"}, {1234.5678, "1234.6"}, {-0.00123456, "−0.0012346"}, {1.5e300, "1.5000e+300"}, {-2e-9, "−2.0000e-09"}, {math.Inf(1), "∞"}, {math.Inf(-1), "−∞"}, {math.NaN(), "–"}} {
		if got := fig(c.x, 5); got != c.want {
			t.Errorf("fig(%v, 5) = %q, want %q", c.x, got, c.want)
		}
	}
	for _, c := range []struct {
		p, logP float64
		want    string
	}{{0.0123, 0, "0.0123"}, {0, -1000, "10^-434.3"}, {0, math.Inf(-1), "0"}, {math.NaN(), 0, "unknown"}} {
		if got := prob(c.p, c.logP); got != c.want {
			t.Errorf("prob(%v, %v) = %q, want %q", c.p, c.logP, got, c.want)
		}
	}
}
