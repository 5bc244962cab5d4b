package glm_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"subsume.example/glm"
)

func ExampleNewData() {
	d, err := glm.NewData(
		glm.Numbers("strength", []float64{41.2, 39.8, 44.1, math.NaN()}).MissingNumbers(math.NaN()),
		glm.Labels("glue", []string{"bone", "bone", "resin", "resin"}))
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, f := range d.Schema() {
		fmt.Println(f.Name, f.Numeric(), f.Levels, "missing:", d.Missing(f.Name))
	}
	// Output:
	// strength true [] missing: 1
	// glue false [bone resin] missing: 0
}

func ExampleNewData_error() {
	_, err := glm.NewData(glm.Numbers("strength", []float64{41.2, math.NaN()}))
	var e *glm.ColumnError
	if errors.As(err, &e) && errors.Is(err, glm.ErrNotFinite) {
		fmt.Println("look at row", e.Row, "of", e.Column)
	}
	fmt.Println(err)
	// Output:
	// look at row 1 of strength
	// glm: column "strength" row 1: "NaN": value is not finite and not declared missing
}

func ExampleSharedNumbers() {
	readings := make([]float64, 1_000_000) // large, and not written to any more
	d, err := glm.NewData(glm.SharedNumbers("reading", readings))
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(d.Len())
	// Output: 1000000
}

func ExampleDecimals() {
	// 13 digits are the same: a float64 alone would lose most of the difference.
	d, err := glm.NewData(glm.Decimals("mass", []string{"1000000000000.3", "1000000000000.4"}))
	if err != nil {
		fmt.Println(err)
		return
	}
	high, low, _ := d.Pairs("mass")
	fmt.Printf("%.6f with the low parts, %.6f without\n", (high[1]-high[0])+(low[1]-low[0]), high[1]-high[0])
	// Output: 0.100000 with the low parts, 0.099976 without
}

func ExampleNumberPairs() {
	third := 1.0 / 3
	rest := math.FMA(-3, third, 1) / 3 // 1/3 − third
	d, err := glm.NewData(glm.NumberPairs("share", []float64{third}, []float64{rest}))
	if err != nil {
		fmt.Println(err)
		return
	}
	_, low, _ := d.Pairs("share")
	fmt.Printf("%.3g\n", low[0])
	// Output: 1.85e-17
}

func ExampleIntegers() {
	d, err := glm.NewData(glm.Integers("count", []int{3, -1, 7}).MissingNumbers(-1))
	if err != nil {
		fmt.Println(err)
		return
	}
	v, _ := d.Values("count")
	fmt.Println(v)
	// Output: [3 NaN 7]
}

func ExampleLabels() {
	d, err := glm.NewData(glm.Labels("size", []string{"small", "", "large"}).MissingTexts("").Order("small", "medium", "large"))
	if err != nil {
		fmt.Println(err)
		return
	}
	index, levels, _ := d.LevelIndex("size")
	fmt.Println(index, levels)
	// Output: [0 -1 2] [small medium large]
}

func ExampleLevels() {
	type bench struct{ Hall, Row int }
	d, err := glm.NewData(glm.Levels("bench", []bench{{2, 1}, {1, 4}, {2, 1}}))
	if err != nil {
		fmt.Println(err)
		return
	}
	index, levels, _ := d.LevelIndex("bench")
	fmt.Println(index, levels)
	// Output: [0 1 0] [{2 1} {1 4}]
}

func ExampleColumn_MissingRows() {
	d, err := glm.NewData(glm.Numbers("flow", []float64{1.5, 0, 2.5}).MissingRows([]bool{false, true, false}))
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(d.Missing("flow"))
	// Output: 1
}

func ExampleData_Complete() {
	d, err := glm.ReadCSV(context.Background(), strings.NewReader("yield,plot\n5.1,a\n,b\n4.7,\n6.0,a\n"), nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	c, err := d.Complete("yield", "plot")
	if err != nil {
		fmt.Println(err)
		return
	}
	a := c.Account()
	fmt.Println("read", a.Read, "used", a.Used)
	for _, drop := range a.Dropped {
		fmt.Println(drop.Column, drop.Reason, "on lines", drop.Lines)
	}
	for _, e := range a.Emptied {
		fmt.Println("level", e.Level, "of", e.Column, "has no rows left")
	}
	// Output:
	// read 4 used 2
	// yield missing on lines [3]
	// plot missing on lines [4]
	// level b of plot has no rows left
}

func ExampleData_Where() {
	d, err := glm.NewData(glm.Numbers("yield", []float64{5.1, 19, 4.7}))
	if err != nil {
		fmt.Println(err)
		return
	}
	v, _ := d.Values("yield")
	c, err := d.Where("scale was being repaired", func(row int) bool { return v[row] < 10 })
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(c.Len(), c.Row(1), c.Account().Dropped[0].Reason, c.Account().Dropped[0].Rows)
	// Output: 2 2 scale was being repaired [1]
}

func ExampleData_With() {
	d, err := glm.NewData(glm.Numbers("dose", []float64{1, 10, 100}))
	if err != nil {
		fmt.Println(err)
		return
	}
	dose, _ := d.Values("dose")
	for i := range dose {
		dose[i] = math.Log10(dose[i])
	}
	e, err := d.With(glm.Numbers("log dose", dose))
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(len(e.Schema()), e.Observations("dose").Check(d.Observations("dose")))
	// Output: 2 <nil>
}

func ExampleData_Categorical() {
	d, err := glm.NewData(glm.Integers("machine", []int{10, 2, 10}))
	if err != nil {
		fmt.Println(err)
		return
	}
	e, err := d.Categorical("machine")
	if err != nil {
		fmt.Println(err)
		return
	}
	index, levels, _ := e.LevelIndex("machine")
	fmt.Println(index, levels)
	// Output: [1 0 1] [2 10]
}

func ExampleData_Windows() {
	d, err := glm.NewData(glm.Numbers("x", make([]float64, 10_000)))
	if err != nil {
		fmt.Println(err)
		return
	}
	for w, err := range d.Windows(context.Background()) {
		if err != nil {
			fmt.Println(err)
			return
		}
		fmt.Println("rows from", w.First, "on:", w.Rows)
	}
	// Output:
	// rows from 0 on: 4096
	// rows from 4096 on: 4096
	// rows from 8192 on: 1808
}

func ExampleData_Slice() {
	d, err := glm.NewData(glm.Numbers("x", []float64{1, 2, 3, 4}))
	if err != nil {
		fmt.Println(err)
		return
	}
	var w glm.Window
	d.Slice(&w, 1, 2)
	fmt.Println(w.Hi[0])
	// Output: [2 3]
}

func ExampleReadCSV() {
	const text = "dicke;ofen;platz\n4,25;1;\"links; oben\"\n4,31;2;rechts\nk.A.;1;rechts\n"
	d, err := glm.ReadCSV(context.Background(), strings.NewReader(text), &glm.CSVOptions{
		Name:         "dicke.csv",
		DecimalComma: true,
		Missing:      []string{"k.A."},
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, f := range d.Schema() {
		fmt.Printf("%s %q missing: %d\n", f.Name, f.Levels, d.Missing(f.Name))
	}
	fmt.Println("row 2 is on line", d.Line(2))
	// Output:
	// dicke [] missing: 1
	// ofen [] missing: 0
	// platz ["links; oben" "rechts"] missing: 0
	// row 2 is on line 4
}

func ExampleReadCSV_error() {
	const text = "thickness,oven\n4.25,A\nn/a,B\n"
	_, err := glm.ReadCSV(context.Background(), strings.NewReader(text), &glm.CSVOptions{
		Name:  "tiles.csv",
		Kinds: map[string]glm.Kind{"thickness": glm.Numeric},
	})
	var e *glm.CSVError
	if errors.As(err, &e) {
		fmt.Println("line", e.Line, "position", e.Column)
	}
	fmt.Println(err)
	// Output:
	// line 3 position 1
	// glm: tiles.csv:3:1: column "thickness": "n/a": not a number and not declared missing
}
