package anova_test

import (
	"context"
	"fmt"

	"subsume.example/anova"
	"subsume.example/lrt"
)

func ExampleDesign_SampleSize() {
	// Four ovens; it would matter if one of them dried 2 % more than the rest,
	// where single tiles scatter by 2.5 %. Trials in the last oven cost double, and one
	// tile in twenty breaks.
	design := anova.OneWayDesign([]float64{8, 8, 8, 10}, 1, 2.5)
	design.Cells[3].Cost = 2
	size, err := design.SampleSize(context.Background(), "group", 0.05, 0.9, &anova.SizeOptions{Free: true, Loss: 0.05})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(size)
	// Output:
	// Units needed to find the effect of group
	// alpha 0.05 · power wanted 0.9 · power reached 0.900224 · units 97 · cost 135 · loss allowed for
	// 5 % · units to start with 104
	//
	// group   expected mean   units   to start with   cost of a unit
	// ──────────────────────────────────────────────────────────────
	// 1                   8      19              20                1
	// 2                   8      20              22                1
	// 3                   8      20              22                1
	// 4                  10      38              40                2
	//
	// - cheaper neighbours tried: 106; the best of them has power 0.898226, below what is wanted
	// - noncentrality: squared length of the effect of the row over SD², SD² being the expected error
	//   mean square
	// - power is exact for independent normal errors of SD 2.5 in every cell; it is power at the
	//   stated means, not at estimated ones
}

func ExampleDesign_Power() {
	design, err := anova.CrossedDesign([]string{"press", "resin"}, [][]string{{"north", "south"}, {"amber", "birch"}},
		[]float64{30, 34, 33, 40}, 4, 2)
	if err != nil {
		fmt.Println(err)
		return
	}
	power, err := design.Power(context.Background(), 0.05)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(power)
	// Output:
	// Power of the design by press × resin
	// alpha 0.05 · SD 2 · units 16
	//
	// source          df   error df   noncentrality   F to exceed    power
	// ────────────────────────────────────────────────────────────────────
	// press            1         12         20.250         4.7472   0.9845
	// resin            1         12         30.250         4.7472   0.9989
	// press × resin    1         12          2.2500        4.7472   0.2818
	//
	// - units: north × amber: 4 of mean 30, north × birch: 4 of mean 34, south × amber: 4 of mean 33,
	//   south × birch: 4 of mean 40
	// - noncentrality: squared length of the effect of the row over SD², SD² being the expected error
	//   mean square
	// - power is exact for independent normal errors of SD 2 in every cell; it is power at the stated
	//   means, not at estimated ones
	// - sequential: each term is asked what it adds to the terms before it
}

func ExampleDesign_Detectable() {
	design := anova.OneWayDesign([]float64{-1, 0, 1}, 12, 4)
	least, err := design.Detectable(context.Background(), "group", 0.05, 0.8)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("with 12 units a group, evenly spread means are told apart with power %g from a range of %.2f\n", least.Power, least.Difference)
	// Output:
	// with 12 units a group, evenly spread means are told apart with power 0.8 from a range of 5.31
}

func ExampleTable_Effects() {
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
	fmt.Print(table.Effects().Text())
	// Output:
	// Sizes of effects on strength
	// intervals of level 90 %
	//
	// source       η²   partial η²    lower    upper   partial ω²   partial ε²       f   share of
	// ───────────────────────────────────────────────────────────────────────────────────────────────
	// resin    0.6283       0.6283   0.2158   0.7655       0.5699       0.5911   1.300   rows, n = 12
	//
	// - partial η², ω² and ε² estimate one share of variance, to which the interval belongs; η² is the
	//   share of the total and has none
}

func ExampleContrastResult_Standardized() {
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
	groups, err := anova.Means(ctx, table.Model(), []string{"resin"}, nil, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	family, err := groups.Test(ctx, groups.Pairs(), anova.Bonferroni, &lrt.Settings{Level: 0.9})
	if err != nil {
		fmt.Println(err)
		return
	}
	d, err := family.Lines()[0].Standardized(0.9)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%.3f error SDs (unbiased %.3f), 90 %% interval %.2f to %.2f\n", d.Value, d.Corrected, d.Lower, d.Upper)
	// Output:
	// 2.373 error SDs (unbiased 2.190), 90 % interval 1.05 to 3.61
}

func ExampleRow_Effect() {
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
	row := table.Rows()[0]
	effect, err := row.Effect(0.95)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(row)
	fmt.Printf("share of the variance %.2f (ω²), %.0f %% interval %.2f to %.2f, over %s\n",
		effect.Omega, 100*effect.Level, effect.Lower, effect.Upper, effect.Of)
	// Output:
	// resin: F(1, 10) = 16.9004, p = 0.002107 (exact); strength by constant, against strength by constant + resin
	// share of the variance 0.57 (ω²), 90 % interval 0.22 to 0.77, over rows, n = 12
}
