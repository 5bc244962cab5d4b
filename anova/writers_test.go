package anova_test

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"encoding/xml"
	"io"
	"math"
	"strconv"
	"strings"
	"sync"
	"testing"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// awkward is a table whose names would break a careless writer.
func awkward(t *testing.T) anova.Table {
	t.Helper()
	d, err := glm.NewData(
		glm.Labels("a|b", []string{"x|y", "x|y", "*z*", "*z*", `"q", r`, `"q", r`}),
		glm.Labels("line\nbreak", []string{"1", "2", "1", "2", "1", "2"}),
		glm.Numbers("y_<1>&", []float64{1, 2, 4, 4.5, 9, 8}))
	if err != nil {
		t.Fatal(err)
	}
	cs, err := anova.Crossed(context.Background(), d, "y_<1>&", []string{"a|b", "line\nbreak"}, &anova.Options{Order: 1})
	return tabulate(t, cs, err)
}

func TestWritersReadBack(t *testing.T) {
	tab := awkward(t)
	var b bytes.Buffer
	if err := tab.WriteCSV(&b); err != nil {
		t.Fatal(err)
	}
	records, err := csv.NewReader(&b).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	column := func(name string) int {
		for i, s := range records[0] {
			if s == name {
				return i
			}
		}
		t.Fatalf("no column %q in %q", name, records[0])
		return -1
	}
	b.Reset()
	if err := tab.WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	var doc struct {
		Schema string
		N      float64
		Lines  []map[string]any
	}
	if err := json.Unmarshal(b.Bytes(), &doc); err != nil {
		t.Fatal(err)
	}
	if doc.Schema != "anova.table/1" || doc.N != 6 || len(doc.Lines) != len(tab.Rows())+2 || len(records) != len(doc.Lines)+1 {
		t.Fatalf("%d lines of %s in JSON, %d records in CSV", len(doc.Lines), doc.Schema, len(records))
	}
	for i, r := range tab.Rows() {
		if got := records[i+1][column("name")]; got != r.Name() || doc.Lines[i]["name"] != r.Name() {
			t.Errorf("name %q in CSV, %q in JSON, want %q", got, doc.Lines[i]["name"], r.Name())
		}
		for key, want := range map[string]float64{"ss": r.SS(), "p": r.Test().P, "log_p": r.Test().LogP, "statistic": r.Test().Statistic} {
			x, err := strconv.ParseFloat(records[i+1][column(key)], 64)
			if err != nil || x != want || doc.Lines[i][key] != want {
				t.Errorf("%s of %q: %v (%v) in CSV, %v in JSON, want %v with every digit", key, r.Name(), x, err, doc.Lines[i][key], want)
			}
		}
	}
	last := doc.Lines[len(doc.Lines)-1]
	if v, there := last["p"]; !there || v != nil || last["p_reason"] != "not-a-row" {
		t.Errorf("total line: p = %v, reason %v", v, last["p_reason"])
	}
	b.Reset()
	if err := tab.WriteMarkdown(&b); err != nil {
		t.Fatal(err)
	}
	cells := -1
	for _, line := range strings.Split(b.String(), "\n") {
		if !strings.HasPrefix(line, "|") {
			continue
		}
		n := strings.Count(strings.ReplaceAll(line, `\|`, ""), "|")
		if cells >= 0 && n != cells {
			t.Errorf("a line of the table has %d bars, the others %d: %s", n, cells, line)
		}
		cells = n
	}
	if strings.Contains(b.String(), "<1>") {
		t.Errorf("unescaped markup:\n%s", b.String())
	}
	for _, line := range strings.Split(tab.String(), "\n") {
		if strings.Contains(line, "break") && !strings.Contains(line, "line") {
			t.Errorf("a name breaks its line:\n%s", tab)
		}
	}
}

// TestHTML: what is written is well formed, holds every name as text, and nothing as markup.
func TestHTML(t *testing.T) {
	tab := awkward(t)
	var b bytes.Buffer
	if err := tab.Report().WriteHTML(&b); err != nil {
		t.Fatal(err)
	}
	d := xml.NewDecoder(bytes.NewReader(b.Bytes()))
	var names []string
	var text strings.Builder
	for {
		tok, err := d.Token()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatalf("%v in\n%s", err, b.String())
		}
		switch tok := tok.(type) {
		case xml.StartElement:
			names = append(names, tok.Name.Local)
		case xml.CharData:
			text.Write(tok)
		}
	}
	for _, want := range []string{"y_<1>&", "a|b"} {
		if !strings.Contains(text.String(), want) {
			t.Errorf("%q is not in the text", want)
		}
	}
	rows := 0
	for _, n := range names {
		switch n {
		case "tr":
			rows++
		case "section", "h3", "dl", "dt", "dd", "table", "thead", "tbody", "th", "td", "ul", "li", "strong":
		default:
			t.Errorf("element %s", n)
		}
	}
	if rows != len(tab.Rows())+3 {
		t.Errorf("%d lines", rows)
	}
}

// failing is a writer that breaks.
type failing struct{ after int }

func (f *failing) Write(b []byte) (int, error) {
	if f.after -= len(b); f.after < 0 {
		return 0, errBroken
	}
	return len(b), nil
}

var errBroken = &glm.TermError{Term: "pipe"}

func TestWritersPassErrors(t *testing.T) {
	r := awkward(t).Report()
	for name, write := range map[string]func(*failing) error{
		"text":     func(w *failing) error { return r.WriteText(w) },
		"markdown": func(w *failing) error { return r.WriteMarkdown(w) },
		"csv":      func(w *failing) error { return r.WriteCSV(w) },
		"json":     func(w *failing) error { return r.WriteJSON(w) },
		"html":     func(w *failing) error { return r.WriteHTML(w) },
	} {
		if err := write(&failing{after: 5}); err == nil {
			t.Errorf("%s: an error of the writer is lost", name)
		}
	}
}

// TestEmptyReport: nothing to say is no reason to panic.
func TestEmptyReport(t *testing.T) {
	var b bytes.Buffer
	for _, r := range []anova.Report{{}, anova.Table{}.Report(), {Columns: []anova.Column{{Key: "k", Title: "t"}}}} {
		for _, err := range []error{r.WriteText(&b), r.WriteMarkdown(&b), r.WriteCSV(&b), r.WriteJSON(&b), r.WriteHTML(&b)} {
			if err != nil {
				t.Error(err)
			}
		}
	}
}

// TestConcurrent uses one table, one set of groups and their comparisons from many
// goroutines; the race detector watches, and the answers are the same.
func TestConcurrent(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(8, 60)
	cs, err := anova.Crossed(ctx, tr.data(t), "y", []string{"a", "b"}, &anova.Options{Decomposition: anova.Partial})
	tab := tabulate(t, cs, err)
	g := means(t, tab.Model(), nil, "a", "b")
	want := family(t, g, g.Pairs(), anova.Holm, 0.95).String() + tab.String()
	var wg sync.WaitGroup
	for range 8 {
		wg.Go(func() {
			for _, r := range tab.Rows() {
				again, err := r.Comparison().Run(ctx, nil)
				if err != nil || again.P() != r.Test().P {
					t.Errorf("%s: %v, p = %g, in the table %g", r.Name(), err, again.P(), r.Test().P)
				}
			}
			f, err := g.Test(ctx, g.Pairs(), anova.Holm, nil)
			if got := f.String() + tab.String(); err != nil || got != want {
				t.Errorf("%v: another answer:\n%s", err, got)
			}
		})
	}
	wg.Wait()
}

// TestKnownVariance: with the variance known tests are χ², intervals normal.
func TestKnownVariance(t *testing.T) {
	ctx := context.Background()
	tr := newTrial(3, 30)
	cs, err := anova.OneWay(ctx, tr.data(t), "y", "a", &anova.Options{Model: &glm.Options{KnownVariance: 1}})
	tab := tabulate(t, cs, err)
	r := tab.Rows()[0]
	if x := r.Test(); x.Name != "χ²" || math.Abs(x.Statistic-r.SS()) > 1e-12*x.Statistic || x.Kind != lrt.Exact {
		t.Errorf("%+v, SS %g", x, r.SS())
	}
	g := means(t, tab.Model(), nil, "a")
	// Upper 2.5 % and 2.5/3 % points of the normal law, and 0.95 points of χ² on 2 and the range
	// of three: 1.959963985, 2.393979800, √5.991464547, 3.314493/√2 (common tables; the last to 6 digits).
	for m, want := range map[anova.Method]float64{anova.Unadjusted: 1.959963985, anova.Bonferroni: 2.393979800, anova.Scheffe: math.Sqrt(5.991464547), anova.Tukey: 3.314493 / math.Sqrt2} {
		l := family(t, g, g.Pairs(), m, 0.95).Lines()[0]
		if got := (l.Upper - l.Lower) / 2 / l.Estimate.SE; math.Abs(got-want) > 1e-6 {
			t.Errorf("%v: %.9f standard errors, want %.9f", m, got, want)
		}
	}
	if s := tab.String(); !strings.Contains(s, "known variance: 1") || strings.Contains(s, "NaN") {
		t.Errorf("%s", s)
	}
}

// TestAmbiguousNames: levels that make two columns of one name are refused, not confused.
func TestAmbiguousNames(t *testing.T) {
	d, err := glm.NewData(
		glm.Labels("a", []string{"1 × b=2", "1", "1 × b=2", "1"}),
		glm.Labels("b", []string{"3", "2 × b=3", "3", "2 × b=3"}),
		glm.Numbers("y", []float64{1, 2, 4, 3}))
	if err != nil {
		t.Fatal(err)
	}
	_, err = anova.Crossed(context.Background(), d, "y", []string{"a", "b"}, &anova.Options{Decomposition: anova.Partial})
	if err == nil || !strings.Contains(err.Error(), "two columns") {
		t.Errorf("ambiguous cells: %v", err)
	}
}
