package glm

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

var nan = math.NaN()

func mustData(t testing.TB, columns ...Column) *Data {
	t.Helper()
	d, err := NewData(columns...)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func TestNewDataErrors(t *testing.T) {
	one := []float64{1, 2}
	cases := []struct {
		name    string
		columns []Column
		want    error
		column  string
		row     int
	}{
		{"no columns", nil, ErrEmpty, "", -1},
		{"no rows", []Column{Numbers("y", nil)}, ErrEmpty, "y", -1},
		{"no name", []Column{Numbers("y", one), Numbers("", one)}, ErrName, "", -1},
		{"name twice", []Column{Numbers("y", one), Labels("y", []string{"a", "b"})}, ErrDuplicateColumn, "y", -1},
		{"lengths", []Column{Numbers("y", one), Numbers("x", []float64{1})}, ErrLengths, "x", -1},
		{"NaN", []Column{Numbers("y", []float64{1, nan})}, ErrNotFinite, "y", 1},
		{"infinite", []Column{Numbers("y", []float64{math.Inf(-1), 1})}, ErrNotFinite, "y", 0},
		{"NaN shared", []Column{SharedNumbers("y", []float64{1, nan})}, ErrNotFinite, "y", 1},
		{"infinite though NaN is missing", []Column{Numbers("y", []float64{nan, math.Inf(1)}).MissingNumbers(nan)}, ErrNotFinite, "y", 1},
		{"low part too large", []Column{NumberPairs("y", []float64{1, 2}, []float64{0, 1e-3})}, ErrNotNumber, "y", 1},
		{"low part NaN", []Column{NumberPairs("y", []float64{1, 2}, []float64{0, nan})}, ErrNotNumber, "y", 1},
		{"pairs of two lengths", []Column{NumberPairs("y", one, nil)}, ErrLengths, "y", -1},
		{"no decimal", []Column{Decimals("y", []string{"1.5", "n/a"})}, ErrNotNumber, "y", 1},
		{"empty decimal", []Column{Decimals("y", []string{"1.5", ""})}, ErrNotNumber, "y", 1},
		{"decimal beyond range", []Column{Decimals("y", []string{"1e999"})}, ErrNotFinite, "y", 0},
		{"empty label", []Column{Labels("g", []string{"a", ""})}, ErrMissing, "g", 1},
		{"label not declared", []Column{Labels("g", []string{"a", "b"}).Order("b")}, ErrUnknownLevel, "g", 0},
		{"levels twice", []Column{Labels("g", []string{"a"}).Order("a", "a")}, ErrLevels, "g", -1},
		{"no levels", []Column{Labels("g", []string{"a"}).Order()}, ErrLevels, "g", -1},
		{"levels written the same", []Column{Levels("g", []any{1, "1"})}, ErrLevels, "g", 1},
		{"level NaN", []Column{Levels("g", []float64{1, nan})}, ErrNotFinite, "g", 1},
		{"marks", []Column{Numbers("y", one).MissingRows([]bool{true})}, ErrLengths, "y", -1},
		{"order of numbers", []Column{Numbers("y", one).Order("1")}, ErrNotCategorical, "y", -1},
		{"missing number among labels", []Column{Labels("g", []string{"a"}).MissingNumbers(1)}, ErrNotNumeric, "g", -1},
		{"zero column", []Column{{}}, ErrColumn, "", -1},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			d, err := NewData(c.columns...)
			var e *ColumnError
			if d != nil || !errors.Is(err, c.want) || !errors.As(err, &e) {
				t.Fatalf("NewData = %v, %v, want an error wrapping %v", d, err, c.want)
			}
			if e.Column != c.column || e.Row != c.row {
				t.Errorf("error at column %q row %d, want %q, %d: %v", e.Column, e.Row, c.column, c.row, err)
			}
			if !strings.HasPrefix(err.Error(), "glm: ") {
				t.Errorf("text %q", err)
			}
		})
	}
}

func TestErrorText(t *testing.T) {
	_, err := NewData(Decimals("depth", []string{"1", "n/a"}))
	const want = `glm: column "depth" row 1: "n/a": not a number and not declared missing`
	if err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
}

func TestColumnsAreCopied(t *testing.T) {
	y, hi, g := []float64{1, 2}, []float64{1, 2}, []string{"a", "b"}
	shared := []float64{5, 6}
	d := mustData(t, Numbers("y", y), NumberPairs("p", hi, []float64{0, 1e-20}), Labels("g", g), SharedNumbers("s", shared))
	y[0], hi[0], g[0] = 9, 9, "z"
	var w Window
	d.Slice(&w, 0, 2)
	if w.Hi[0][0] != 1 || w.Hi[1][0] != 1 || w.Lo[1][1] != 1e-20 || d.Schema()[2].Levels[0] != "a" {
		t.Error("the data changed with the caller's slices")
	}
	if &w.Hi[3][0] != &shared[0] {
		t.Error("SharedNumbers copied")
	}
}

func TestMissing(t *testing.T) {
	shared := []float64{-99, 2, nan}
	d := mustData(t,
		SharedNumbers("s", shared).MissingNumbers(-99, nan),
		Decimals("d", []string{"0.1", "NA", "-99"}).MissingTexts("NA").MissingNumbers(-99),
		Decimals("e", []string{"0.1", "-99.9", "-99.90000000000000000001"}).MissingNumbers(-99.9),
		Labels("g", []string{"a", "", "?"}).MissingTexts("", "?"),
		Levels("l", []int{7, 8, 7}).MissingRows([]bool{false, true, false}),
		Integers("i", []int{1, 2, 3}).MissingRows([]bool{true, false, false}))
	if shared[0] != -99 {
		t.Error("a shared slice was written to")
	}
	for name, want := range map[string]int{"s": 2, "d": 2, "e": 1, "g": 2, "l": 1, "i": 1, "none": 0} {
		if got := d.Missing(name); got != want {
			t.Errorf("Missing(%q) = %d, want %d", name, got, want)
		}
	}
	l, levels, err := d.LevelIndex("l")
	if err != nil || !slices.Equal(l, []int32{0, -1, 0}) || !slices.Equal(levels, []string{"7"}) {
		t.Errorf("LevelIndex = %v, %v, %v", l, levels, err)
	}
}

func TestIntegersKeepEveryDigit(t *testing.T) {
	check := func(name string, d *Data, want ...string) {
		t.Helper()
		hi, lo, err := d.Pairs(name)
		if err != nil {
			t.Fatal(err)
		}
		for i, w := range want {
			l := 0.0
			if lo != nil {
				l = lo[i]
			}
			wh, wl := readPair(t, w)
			if hi[i] != wh || l != wl {
				t.Errorf("%s: got %v + %v, want %v + %v", w, hi[i], l, wh, wl)
			}
		}
	}
	d := mustData(t,
		Integers("int64", []int64{math.MinInt64, math.MinInt64 + 100, math.MaxInt64, 1<<53 + 1, -(1<<53 + 1)}),
		Integers("uint64", []uint64{math.MaxUint64, math.MaxUint64 - 1<<11, 1 << 63, 1<<63 + 1, 5}),
		Integers("small", []int8{-128, 127, 0, 1, 2}))
	check("int64", d, "-9223372036854775808", "-9223372036854775708", "9223372036854775807", "9007199254740993", "-9007199254740993")
	check("uint64", d, "18446744073709551615", "18446744073709549567", "9223372036854775808", "9223372036854775809", "5")
	if _, lo, _ := d.Pairs("small"); lo != nil {
		t.Error("small integers have low parts")
	}
}

func readPair(t *testing.T, s string) (hi, lo float64) {
	t.Helper()
	d := mustData(t, Decimals("x", []string{s}))
	h, l, err := d.Pairs("x")
	if err != nil {
		t.Fatal(err)
	}
	if l != nil {
		lo = l[0]
	}
	return h[0], lo
}

func TestDecimalsKeepConstantLeadingDigits(t *testing.T) {
	// 13 constant leading digits: the differences are exact in the pair, lost in a float64.
	d := mustData(t, Decimals("y", []string{"1000000000000.3", "1000000000000.4"}))
	hi, lo, _ := d.Pairs("y")
	if diff := (hi[1] - hi[0]) + (lo[1] - lo[0]); math.Abs(diff-0.1) > 1e-17 {
		t.Errorf("difference %v, want 0.1", diff)
	}
	if diff := hi[1] - hi[0]; math.Abs(diff-0.1) < 1e-6 {
		t.Errorf("the high parts alone give %v: the check is void", diff)
	}
}

func TestSummary(t *testing.T) {
	d := mustData(t, Numbers("y", []float64{1, -5, nan}).MissingNumbers(nan), Decimals("x", []string{"0.5", "2", "-0.25"}))
	y, x := &d.columns[0], &d.columns[1]
	if y.missing != 1 || y.maxAbs != 5 || y.lo != nil || x.lo != nil || x.maxAbs != 2 {
		t.Errorf("summaries %+v, %+v", y, x)
	}
}

func TestWindows(t *testing.T) {
	n := 2*windowRows + 7
	y, g := make([]float64, n), make([]int, n)
	for i := range y {
		y[i], g[i] = float64(i)+0.25, i%3
	}
	d := mustData(t, Numbers("y", y), Levels("g", g))
	var firsts, sizes []int
	for w, err := range d.Windows(context.Background()) {
		if err != nil {
			t.Fatal(err)
		}
		firsts, sizes = append(firsts, w.First), append(sizes, w.Rows)
		for i := range w.Rows {
			if w.Hi[0][i] != y[w.First+i] || w.Index[1][i] != int32((w.First+i)%3) {
				t.Fatalf("row %d", w.First+i)
			}
		}
		if w.Lo[0] != nil || w.Hi[1] != nil || w.Index[0] != nil || len(w.Hi[0]) != w.Rows || cap(w.Hi[0]) != w.Rows {
			t.Fatal("shape of a window")
		}
	}
	if !slices.Equal(firsts, []int{0, windowRows, 2 * windowRows}) || !slices.Equal(sizes, []int{windowRows, windowRows, 7}) {
		t.Errorf("windows at %v of %v rows", firsts, sizes)
	}
	for range d.Windows(context.Background()) {
		break // an early end is fine
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	for _, err := range d.Windows(ctx) {
		if !errors.Is(err, context.Canceled) {
			t.Errorf("cancelled pass: %v", err)
		}
	}
}

func TestSliceAllocatesNothing(t *testing.T) {
	d := mustData(t, Numbers("y", make([]float64, 100)), Levels("g", make([]int, 100)))
	var w Window
	d.Slice(&w, 0, 10)
	if a := testing.AllocsPerRun(100, func() { d.Slice(&w, 10, 50) }); a != 0 {
		t.Errorf("Slice allocates %v times", a)
	}
}

func TestIdentity(t *testing.T) {
	y, g := []float64{1, 2, 3}, []string{"a", "b", "a"}
	d := mustData(t, Numbers("y", y), Labels("g", g))
	e := mustData(t, Numbers("y", y), Labels("g", g))
	if err := d.Observations("y").Check(e.Observations("y")); err != nil {
		t.Errorf("equal content: %v", err)
	}
	if o := d.Observations("nothing"); !o.Response.IsZero() || o.Rows.IsZero() {
		t.Errorf("unknown response: %+v", o)
	}
	if d.Observations("y").Response.Same(d.Observations("g").Response) {
		t.Error("two columns are the same")
	}
	other := map[string]*Data{
		"value":   mustData(t, Numbers("y", []float64{1, 2, 4}), Labels("g", g)),
		"label":   mustData(t, Numbers("y", y), Labels("g", []string{"a", "b", "b"})),
		"name":    mustData(t, Numbers("z", y), Labels("g", g)),
		"levels":  mustData(t, Numbers("y", y), Labels("g", g).Order("b", "a")),
		"low":     mustData(t, NumberPairs("y", y, []float64{0, 0, 1e-20}), Labels("g", g)),
		"missing": mustData(t, Numbers("y", y).MissingNumbers(3), Labels("g", g)),
	}
	for name, o := range other {
		if d.Observations("y").Rows.Same(o.Observations("y").Rows) {
			t.Errorf("another %s is taken for the same rows", name)
		}
	}
	// −0 and 0 are one value, and so are all NaN.
	p := mustData(t, Numbers("y", []float64{0, nan}).MissingNumbers(nan))
	q := mustData(t, Numbers("y", []float64{math.Copysign(0, -1), math.Float64frombits(0x7FF8000000000123)}).MissingNumbers(nan))
	if !p.Observations("y").Response.Same(q.Observations("y").Response) {
		t.Error("−0 or NaN changes the identity")
	}
	// With and Categorical keep the rows.
	w, err := d.With(Numbers("x", []float64{4, 5, 6}))
	if err != nil || d.Observations("y").Check(w.Observations("y")) != nil {
		t.Errorf("With: %v", err)
	}
	c, err := d.Categorical("y")
	if err != nil || !d.Observations("g").Rows.Same(c.Observations("g").Rows) {
		t.Errorf("Categorical: %v", err)
	}
}

func TestComplete(t *testing.T) {
	d := mustData(t,
		Numbers("y", []float64{1, nan, 3, 4, 5}).MissingNumbers(nan),
		Labels("g", []string{"a", "", "", "b", "a"}).MissingTexts(""),
		Labels("h", []string{"p", "q", "q", "q", "p"}).Order("q", "p", "r"),
		Numbers("x", []float64{1, 2, 3, 4, nan}).MissingNumbers(nan))
	e, err := d.Complete("y", "g")
	if err != nil {
		t.Fatal(err)
	}
	want := Account{Read: 5, Used: 3, Dropped: []Drop{{"y", "missing", []int{1}, nil}, {"g", "missing", []int{2}, nil}}}
	if diff := cmp.Diff(want, e.Account()); diff != "" {
		t.Error(diff)
	}
	if e.Len() != 3 || e.Row(0) != 0 || e.Row(1) != 3 || e.Row(2) != 4 || e.Line(0) != 0 {
		t.Errorf("rows %d, %d, %d of %d", e.Row(0), e.Row(1), e.Row(2), e.Len())
	}
	if e.Observations("y").Check(d.Observations("y")) == nil {
		t.Error("fewer rows are taken for the same observations")
	}
	f, err := e.Complete()
	if err != nil {
		t.Fatal(err)
	}
	want = Account{Read: 5, Used: 2, Dropped: append(want.Dropped, Drop{"x", "missing", []int{4}, nil}), Emptied: nil}
	if diff := cmp.Diff(want, f.Account()); diff != "" {
		t.Error(diff)
	}
	if fh, _ := f.Field("h"); !slices.Equal(fh.Levels, []string{"q", "p", "r"}) {
		t.Errorf("declared levels became %v", fh.Levels)
	}
	b, err := e.Where("oven a is out of service", func(i int) bool { idx, _, _ := e.LevelIndex("g"); return idx[i] == 1 })
	if err != nil {
		t.Fatal(err)
	}
	a := b.Account()
	if a.Left() != 4 || a.Dropped[2].Reason != "oven a is out of service" || !slices.Equal(a.Dropped[2].Rows, []int{0, 4}) ||
		!slices.Equal(a.Emptied, []EmptiedLevel{{"g", "a"}}) {
		t.Errorf("account %+v", a)
	}
	if idx, levels, _ := b.LevelIndex("g"); !slices.Equal(idx, []int32{0}) || !slices.Equal(levels, []string{"b"}) {
		t.Errorf("levels %v, %v", idx, levels)
	}
	same, err := e.Complete("y")
	if err != nil || same != e {
		t.Errorf("nothing missing gave other data, %v", err)
	}
	// The same rows by another way are the same observations.
	g, err := d.Where("as Complete", func(i int) bool { return i != 1 && i != 2 })
	if err != nil || g.Observations("y").Check(e.Observations("y")) != nil {
		t.Errorf("same rows by Where: %v", err)
	}
}

func TestCompleteErrors(t *testing.T) {
	d := mustData(t, Numbers("y", []float64{nan, nan}).MissingNumbers(nan), Numbers("x", []float64{1, 2}))
	if _, err := d.Complete("y"); !errors.Is(err, ErrNoCompleteRows) || !strings.Contains(err.Error(), `2 missing in "y"`) {
		t.Errorf("all missing: %v", err)
	}
	if _, err := d.Complete("x", "depth"); !errors.Is(err, ErrUnknownColumn) || !strings.Contains(err.Error(), `there are "y", "x"`) {
		t.Errorf("unknown column: %v", err)
	}
	if _, err := d.Where("none", func(int) bool { return false }); !errors.Is(err, ErrNoCompleteRows) {
		t.Errorf("Where none: %v", err)
	}
	if _, err := d.With(Numbers("z", []float64{1})); !errors.Is(err, ErrLengths) {
		t.Errorf("With of another length: %v", err)
	}
	if _, err := d.With(Numbers("x", []float64{1, 2})); !errors.Is(err, ErrDuplicateColumn) {
		t.Errorf("With of a name in use: %v", err)
	}
	if _, err := d.Values("q"); !errors.Is(err, ErrUnknownColumn) {
		t.Errorf("Values of no column: %v", err)
	}
	if _, _, err := d.LevelIndex("x"); !errors.Is(err, ErrNotCategorical) {
		t.Errorf("LevelIndex of numbers: %v", err)
	}
	if _, err := d.Categorical("q"); !errors.Is(err, ErrUnknownColumn) {
		t.Errorf("Categorical of no column: %v", err)
	}
}

func TestCategorical(t *testing.T) {
	d := mustData(t, Decimals("code", []string{"10", "2", "0.1", "-3", "NA", "2.0", "-0"}).MissingTexts("NA"))
	e, err := d.Categorical("code")
	if err != nil {
		t.Fatal(err)
	}
	idx, levels, err := e.LevelIndex("code")
	if err != nil || !slices.Equal(levels, []string{"-3", "0", "0.1", "2", "10"}) || !slices.Equal(idx, []int32{4, 3, 2, 0, -1, 3, 1}) {
		t.Errorf("%v, %v, %v", levels, idx, err)
	}
	if _, err := e.Values("code"); !errors.Is(err, ErrNotNumeric) {
		t.Errorf("Values of labels: %v", err)
	}
	again, err := e.Categorical("code")
	if f, _ := again.Field("code"); err != nil || !slices.Equal(f.Levels, levels) {
		t.Errorf("Categorical twice: %v, %v", f, err)
	}
}

func TestLevelsNames(t *testing.T) {
	type place struct{ Hall, Row int }
	d := mustData(t, Levels("place", []place{{2, 1}, {1, 1}, {2, 1}}), Levels("done", []bool{true, false, true}).Order("false", "true"))
	idx, levels, _ := d.LevelIndex("place")
	if !slices.Equal(idx, []int32{0, 1, 0}) || levels[0] != fmt.Sprint(place{2, 1}) {
		t.Errorf("%v %v", idx, levels)
	}
	if idx, _, _ := d.LevelIndex("done"); !slices.Equal(idx, []int32{1, 0, 1}) {
		t.Errorf("%v", idx)
	}
}
