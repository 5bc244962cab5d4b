package anova_test

import (
	"context"
	"errors"
	"fmt"
	"os"
	"strings"

	"subsume.example/anova"
	"subsume.example/glm"
	"subsume.example/lrt"
)

// tiles is an invented trial: bending strength of pressed tiles by press and resin,
// with the moisture of the mat as a covariate.
const tiles = `press,resin,moisture,strength
north,amber,7.1,31.2
north,amber,6.8,30.4
north,amber,7.9,29.1
north,birch,7.4,33.9
north,birch,7.0,35.2
south,amber,6.5,34.8
south,amber,7.7,32.9
south,amber,7.2,33.6
south,birch,7.3,40.1
south,birch,6.9,41.5
south,birch,7.6,39.4
south,birch,6.6,42.0
`

func readTiles(ctx context.Context) (*glm.Data, error) {
	return glm.ReadCSV(ctx, strings.NewReader(tiles), nil)
}

func Example() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Crossed(ctx, data, "strength", []string{"press", "resin"}, &anova.Options{Decomposition: anova.Hierarchical})
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(table)
	// Output:
	// What explains strength
	// n = 12 · R² = 0.9564
	//
	// source          sum of squares   df   mean square          F           p   reading      log λ
	// ─────────────────────────────────────────────────────────────────────────────────────────────
	// press                   64.960    1        64.960   55.8299    7.115e-05   exact      −9.3455
	// resin                  100.941    1       100.941   86.7534    1.439e-05   exact     −11.123
	// press × resin            5.020    1         5.020    4.31408   0.07144     exact      −2.5878
	// error                    9.308    8         1.164
	// total                  213.289   11
	//
	// - press: constant + resin inside constant + press + resin
	// - resin: constant + press inside constant + press + resin
	// - press × resin: constant + press + resin inside constant + press + resin + press × resin
	// - error: what constant + press + resin + press × resin leaves
	// - log λ is a ratio over all rows where the error of the row is what its own larger model leaves,
	//   else over the stratum of the row and its error
}

func ExampleOneWay() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.OneWay(ctx, data, "strength", "press", &anova.Options{Covariates: []string{"moisture"}})
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, r := range table.Rows() {
		d1, d2 := r.DF()
		fmt.Printf("%s: F(%g, %g) = %.3f, p = %.4f\n", r.Name(), d1, d2, r.Test().Statistic, r.Test().P)
	}
	// Output:
	// moisture: F(1, 9) = 1.922, p = 0.1990
	// press: F(1, 9) = 7.455, p = 0.0232
}

func ExampleTerms() {
	// Does a straight line in dose suffice, or do the dose groups depart from it?
	ctx := context.Background()
	data, err := glm.NewData(
		glm.Numbers("dose", []float64{1, 1, 2, 2, 4, 4, 8, 8}),
		glm.Numbers("growth", []float64{4.1, 4.5, 6.0, 5.6, 8.3, 8.9, 9.2, 9.8}))
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Terms(ctx, data, "growth", []glm.Term{glm.Covariate{Field: "dose"}, glm.Factor{Field: "dose"}}, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(table)
	// Output:
	// What explains growth
	// n = 8 · R² = 0.9854
	//
	// source           sum of squares   df   mean square          F           p   reading      log λ
	// ──────────────────────────────────────────────────────────────────────────────────────────────
	// dose                    29.3776    1       29.3776   225.981    0.0001141   exact     −10.129
	// dose as levels           5.6824    2        2.8412    21.8555   0.007029    exact      −9.9155
	// error                    0.5200    4        0.1300
	// total                   35.5800    7
	//
	// - dose: constant inside constant + dose
	// - dose as levels: constant + dose inside constant + dose + dose as levels
	// - error: what constant + dose + dose as levels leaves
	// - log λ is a ratio over all rows where the error of the row is what its own larger model leaves,
	//   else over the stratum of the row and its error
	// ! collinear: earlier columns span, and so set aside: dose=8
}

func ExampleTabulate() {
	// A row can be run again, alone, with the same answer.
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Crossed(ctx, data, "strength", []string{"press", "resin"}, &anova.Options{Decomposition: anova.Partial})
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, &lrt.Settings{Level: 0.99})
	if err != nil {
		fmt.Println(err)
		return
	}
	row, _ := table.Row("resin")
	again, err := row.Comparison().Run(ctx, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(again.P() == row.Test().P)
	fmt.Println(row.Hypothesis())
	// Output:
	// true
	// [press=north × resin=amber] − [press=north × resin=birch] + [press=south × resin=amber] − [press=south × resin=birch] = 0
}

func ExampleCrossed_emptyCells() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	resin, levels, err := data.LevelIndex("resin")
	if err != nil {
		fmt.Println(err)
		return
	}
	press, _, err := data.LevelIndex("press")
	if err != nil {
		fmt.Println(err)
		return
	}
	some, err := data.Where("north press out of birch", func(i int) bool { return press[i] == 1 || levels[resin[i]] != "birch" })
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Crossed(ctx, some, "strength", []string{"press", "resin"}, &anova.Options{Decomposition: anova.Partial})
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	row, _ := table.Row("press")
	var empty *anova.EmptyCellsError
	fmt.Println(errors.As(row.Err(), &empty), empty.Cells)
	// Output:
	// true [press=north × resin=birch]
}

func ExampleTable_WriteMarkdown() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.OneWay(ctx, data, "strength", "resin", nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	if err := table.WriteMarkdown(os.Stdout); err != nil {
		fmt.Println(err)
	}
	// Output:
	// ### What explains strength
	//
	// - n = 12
	// - R² = 0.6283
	//
	// | source | sum of squares | df | mean square | F | p | reading | log λ |
	// | --- | ---: | ---: | ---: | ---: | ---: | --- | ---: |
	// | resin | 134.001 | 1 | 134.001 | 16.9004 | 0.002107 | exact | −5.9373 |
	// | error | 79.288 | 10 | 7.929 |  |  |  |  |
	// | total | 213.289 | 11 |  |  |  |  |  |
	//
	// - resin: constant inside constant + resin
	// - error: what constant + resin leaves
}

func ExampleCountCells() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	cells, err := anova.CountCells(ctx, data, []string{"press", "resin"}, glm.Weights{})
	if err != nil {
		fmt.Println(err)
		return
	}
	for i, n := range cells.Count {
		fmt.Println(cells.Name(i), n)
	}
	// Output:
	// press=north × resin=amber 3
	// press=north × resin=birch 2
	// press=south × resin=amber 3
	// press=south × resin=birch 4
}

func ExampleReport_WriteCSV() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.OneWay(ctx, data, "strength", "resin", nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	report := table.Report()
	report.Columns = report.Columns[:4] // the first columns will do here
	for i := range report.Lines {
		report.Lines[i] = report.Lines[i][:4]
	}
	if err := report.WriteCSV(os.Stdout); err != nil {
		fmt.Println(err)
	}
	if err := report.WriteJSON(os.Stdout); err != nil {
		fmt.Println(err)
	}
	// Output:
	// line,name,ss,df
	// row,resin,134.00083333333333,1
	// error,error,79.28833333333333,10
	// total,total,213.28916666666666,11
	// {
	//   "schema": "anova.table/1",
	//   "title": "What explains strength",
	//   "response": "strength",
	//   "n": 12,
	//   "dropped": 0,
	//   "level": 0.95,
	//   "r_squared": 0.6282589754910196,
	//   "lines": [
	//     {
	//       "line": "row",
	//       "name": "resin",
	//       "ss": 134.00083333333333,
	//       "df": 1
	//     },
	//     {
	//       "line": "error",
	//       "name": "error",
	//       "ss": 79.28833333333333,
	//       "df": 10
	//     },
	//     {
	//       "line": "total",
	//       "name": "total",
	//       "ss": 213.28916666666666,
	//       "df": 11
	//     }
	//   ],
	//   "notes": [
	//     "resin: constant inside constant + resin",
	//     "error: what constant + resin leaves"
	//   ],
	//   "warnings": []
	// }
}

func ExampleReport_WriteHTML() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.OneWay(ctx, data, "strength", "resin", nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	if err := table.Report().WriteHTML(os.Stdout); err != nil {
		fmt.Println(err)
	}
	// Output:
	// <section class="subsume-report" data-schema="anova.table/1">
	// <h3>What explains strength</h3>
	// <dl>
	// <dt>n =</dt><dd>12</dd>
	// <dt>R² =</dt><dd>0.6283</dd>
	// </dl>
	// <table>
	// <thead><tr><th scope="col">source</th><th scope="col" style="text-align:right">sum of squares</th><th scope="col" style="text-align:right">df</th><th scope="col" style="text-align:right">mean square</th><th scope="col" style="text-align:right">F</th><th scope="col" style="text-align:right">p</th><th scope="col">reading</th><th scope="col" style="text-align:right">log λ</th></tr></thead>
	// <tbody>
	// <tr><td>resin</td><td style="text-align:right">134.001</td><td style="text-align:right">1</td><td style="text-align:right">134.001</td><td style="text-align:right">16.9004</td><td style="text-align:right">0.002107</td><td>exact</td><td style="text-align:right">−5.9373</td></tr>
	// <tr><td>error</td><td style="text-align:right">79.288</td><td style="text-align:right">10</td><td style="text-align:right">7.929</td><td style="text-align:right"></td><td style="text-align:right"></td><td></td><td style="text-align:right"></td></tr>
	// <tr><td>total</td><td style="text-align:right">213.289</td><td style="text-align:right">11</td><td style="text-align:right"></td><td style="text-align:right"></td><td style="text-align:right"></td><td></td><td style="text-align:right"></td></tr>
	// </tbody>
	// </table>
	// <ul>
	// <li>resin: constant inside constant &#43; resin</li>
	// <li>error: what constant &#43; resin leaves</li>
	// </ul>
	// </section>
}
