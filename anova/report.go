package anova

import (
	"math"
	"strconv"
	"strings"
	"unicode"

	"subsume.example/lrt"
)

// Report is a result ready to be written: facts about the whole, one line for each
// thing reported, notes, and warnings. Text, Markdown and HTML are for people and
// round; CSV and JSON are for programs and keep every digit. The keys of facts
// and columns are the names in CSV and JSON, and a promise; texts are not.
type Report struct {
	// Schema names the layout of the JSON form, "anova.table/1".
	Schema string
	Title  string
	Facts  []Fact
	// Columns say what the cells of each line are.
	Columns  []Column
	Lines    [][]Value
	Notes    []string
	Warnings []lrt.Warning
}

// Fact is a named value about the whole.
type Fact struct {
	Key, Title string
	Value      Value
}

// Column is a column of a report.
type Column struct {
	Key     string
	Title   string // for people; "" keeps the column out of what people read
	Numeric bool   // holds numbers
	// Even: people see all numbers of the column with the same decimals.
	Even bool
}

// Value is a text or a number. Its zero value is an empty text.
type Value struct {
	Text   string // a text, or how people should read the number; "": rounded to 6 digits
	Number float64
	// Numeric tells numbers from texts.
	Numeric bool
	// Reason is the code written in JSON where the number is not finite: why there is none.
	Reason string
}

// Text is a value that is a text.
func Text(s string) Value { return Value{Text: s} }

// Number is a value that is a number.
func Number(x float64) Value { return Value{Number: x, Numeric: true} }

// absent is a number that does not exist, with the reason code.
func absent(reason string) Value { return Value{Number: math.NaN(), Numeric: true, Reason: reason} }

// because gives a number a reason for the case that it is not finite.
func (v Value) because(reason string) Value {
	if math.IsNaN(v.Number) || math.IsInf(v.Number, 0) {
		v.Reason = reason
	}
	return v
}

// shown is a number with a text of its own for people.
func shown(x float64, text string) Value { return Value{Number: x, Numeric: true, Text: text} }

// toDigits is a number that people see to so many digits.
func toDigits(x float64, digits int) Value {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return Number(x)
	}
	return shown(x, rounded(x, digits))
}

// percent is a level or a share that people read in percent.
func percent(x float64) Value {
	if math.IsNaN(x) {
		return Number(x)
	}
	return shown(x, strconv.FormatFloat(100*x, 'g', 6, 64)+" %")
}

// probability is a p-value.
func probability(p, logP float64) Value {
	return shown(p, strings.TrimPrefix(lrt.FormatP(p, logP), "p = "))
}

// String returns the value as people read it: numbers to 6 significant digits,
// nothing for a number that does not exist.
func (v Value) String() string {
	switch {
	case v.Text != "" || !v.Numeric:
		return v.Text
	case math.IsNaN(v.Number):
		return ""
	case math.IsInf(v.Number, 1):
		return "+Inf"
	case math.IsInf(v.Number, -1):
		return "−Inf"
	}
	return rounded(v.Number, 6)
}

// exact returns the value with every digit, "" for a number that does not exist.
func (v Value) exact() string {
	switch {
	case !v.Numeric:
		return v.Text
	case math.IsNaN(v.Number):
		return ""
	}
	return strconv.FormatFloat(v.Number, 'g', -1, 64)
}

// plain writes x to at most 6 significant digits, for a sentence.
func plain(x float64) string {
	return strings.Replace(strconv.FormatFloat(x, 'g', 6, 64), "-", "−", 1)
}

// rounded writes x to so many significant digits, without an exponent where
// that is readable, with the typographic minus.
func rounded(x float64, digits int) string {
	var s string
	a := math.Abs(x)
	switch {
	case x == 0:
		return "0"
	case a == math.Trunc(a) && a < 1e9:
		s = strconv.FormatFloat(x, 'f', -1, 64)
	case a >= 1e-4 && a < 1e9:
		places := max(digits-1-int(math.Floor(math.Log10(a))), 0)
		s = strconv.FormatFloat(x, 'f', places, 64)
	default:
		s = strconv.FormatFloat(x, 'e', digits-1, 64)
	}
	return strings.Replace(s, "-", "−", 1)
}

// visible returns the numbers of the columns that people see: those with a title in
// which some line has something to show.
func (r Report) visible() []int {
	var cols []int
	for c, col := range r.Columns {
		if col.Title == "" {
			continue
		}
		for _, l := range r.Lines {
			if l[c].String() != "" {
				cols = append(cols, c)
				break
			}
		}
	}
	return cols
}

// add appends a line by the keys of the columns. A number that is not given is
// absent for the reason.
func (r *Report) add(reason string, values map[string]Value) {
	l := make([]Value, len(r.Columns))
	for c, col := range r.Columns {
		v, ok := values[col.Key]
		switch {
		case ok && v.Numeric && v.Reason == "":
			v = v.because(reason)
		case !ok && col.Numeric:
			v = absent(reason)
		}
		l[c] = v
	}
	r.Lines = append(r.Lines, l)
}

// cells returns what people see of a column.
func (r Report) cells(c int) []string {
	text := make([]string, len(r.Lines))
	places := -1
	if r.Columns[c].Even {
		places = r.places(c)
	}
	for i, l := range r.Lines {
		v := l[c]
		if text[i] = oneLine(v.String()); places >= 0 && v.Text == "" && v.Numeric && !math.IsNaN(v.Number) && !math.IsInf(v.Number, 0) {
			text[i] = strings.Replace(strconv.FormatFloat(v.Number, 'f', places, 64), "-", "−", 1)
		}
	}
	return text
}

// oneLine writes control characters as spaces: a name may hold a line end.
func oneLine(s string) string {
	return strings.Map(func(c rune) rune {
		if unicode.IsControl(c) {
			return ' '
		}
		return c
	}, s)
}

// places returns how many decimals show 6 digits of the largest number of a
// column and 3 of the smallest; −1 where they lie too far apart for that.
func (r Report) places(c int) int {
	most, least := 0.0, math.Inf(1)
	for _, l := range r.Lines {
		if a := math.Abs(l[c].Number); l[c].Numeric && a > 0 && !math.IsInf(a, 0) {
			most, least = math.Max(most, a), math.Min(least, a)
		}
	}
	if most == 0 || most >= 1e9 || least < 1e-6 || most/least > 1e7 {
		return -1
	}
	return max(5-int(math.Floor(math.Log10(most))), 2-int(math.Floor(math.Log10(least))), 0)
}
