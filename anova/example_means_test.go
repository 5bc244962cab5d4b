package anova_test

import (
	"context"
	"fmt"

	"subsume.example/anova"
	"subsume.example/lrt"
)

func ExampleMeans() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Crossed(ctx, data, "strength", []string{"press", "resin"}, &anova.Options{Covariates: []string{"moisture"}, Order: 1})
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	groups, err := anova.Means(ctx, table.Model(), []string{"press"}, &anova.MeansOptions{At: map[string]float64{"moisture": 7}}, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(groups)
	// Output:
	// Means of strength by press
	// n = 12 · error df = 8 · error mean square = 0.860818 · level 95 %
	//
	// press   n      mean        SD   by the model         SE     lower     upper
	// ───────────────────────────────────────────────────────────────────────────
	// north   5   31.9600   2.52250        32.9986   0.445586   31.9710   34.0261
	// south   7   37.7571   3.86905        37.5618   0.361024   36.7293   38.3943
	//
	// - model: constant + moisture + press + resin
	// - moisture held at 7
	// - averaged over resin, every combination of levels counting equally
}

func ExampleGroups_Test() {
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Crossed(ctx, data, "strength", []string{"press", "resin"}, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	cells, err := anova.Means(ctx, table.Model(), []string{"press", "resin"}, nil, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	pairs, err := cells.Test(ctx, cells.Pairs(), anova.Holm, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(pairs)
	// Output:
	// Contrasts of strength by press × resin
	// adjusted: Holm · tests: 6 · level 95 % · all equal: F = 58.4368 · p = 8.77e-06
	//
	// contrast                        estimate         SE          t           p   adjusted p      lower     upper   reading
	// ──────────────────────────────────────────────────────────────────────────────────────────────────────────────────────
	// north × birch − north × amber     4.3167   0.984692    4.3838    0.002337     0.007011     0.89104    7.7423   exact
	// south × amber − north × amber     3.5333   0.880735    4.0118    0.003885     0.007771     0.46936    6.5973   exact
	// south × birch − north × amber    10.5167   0.823852   12.765     1.337e-06    8.02e-06     7.65058   13.3827   exact
	// south × amber − north × birch    −0.7833   0.984692   −0.79551   0.4493       0.4493      −4.20896    2.6423   exact
	// south × birch − north × birch     6.2000   0.934161    6.6370    0.000163     0.000652     2.95017    9.4498   exact
	// south × birch − south × amber     6.9833   0.823852    8.4764    2.873e-05    0.0001436    4.11725    9.8494   exact
	//
	// - intervals hold at once at 95 % (by Bonferroni: Holm has none of its own, so that an interval
	//   may hold the null value where the adjusted p is small)
}

func ExampleGroups_Test_custom() {
	// Does birch gain more in the south press than in the north one?
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Crossed(ctx, data, "strength", []string{"press", "resin"}, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	cells, err := anova.Means(ctx, table.Model(), []string{"press", "resin"}, nil, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	gain := anova.Contrast{Name: "gain of birch, south − north", Weights: []float64{1, -1, -1, 1}}
	family, err := cells.Test(ctx, []anova.Contrast{gain}, anova.Scheffe, &lrt.Settings{Level: 0.9})
	if err != nil {
		fmt.Println(err)
		return
	}
	l, _ := family.Line(gain.Name)
	fmt.Printf("%.3f, raw p = %.4f, for any contrast at once p = %.4f, interval %.2f to %.2f\n",
		l.Estimate.Value, l.P, l.AdjustedP, l.Lower, l.Upper)
	// Output:
	// 2.667, raw p = 0.0714, for any contrast at once p = 0.3021, interval -1.14 to 6.47
}

func ExampleGroups_AgainstControl() {
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
	contrasts, err := groups.AgainstControl("amber")
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, c := range contrasts {
		fmt.Println(c.Name, c.Weights)
	}
	// Output:
	// birch − amber [-1 1]
}

func ExampleGroups_Test_pairs() {
	// All pairs by the studentized range. The cells have different counts, so that
	// it errs on the safe side, and the report says so.
	ctx := context.Background()
	data, err := readTiles(ctx)
	if err != nil {
		fmt.Println(err)
		return
	}
	rows, err := anova.Crossed(ctx, data, "strength", []string{"press", "resin"}, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	table, err := anova.Tabulate(ctx, rows, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	cells, err := anova.Means(ctx, table.Model(), []string{"press", "resin"}, nil, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	pairs, err := cells.Test(ctx, cells.Pairs(), anova.Tukey, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(pairs)
	// Output:
	// Contrasts of strength by press × resin
	// adjusted: Tukey · tests: 6 · level 95 % · all equal: F = 58.4368 · p = 8.77e-06
	//
	// contrast                        estimate         SE          t           p   adjusted p      lower     upper   reading
	// ──────────────────────────────────────────────────────────────────────────────────────────────────────────────────────
	// north × birch − north × amber     4.3167   0.984692    4.3838    0.002337     0.01004      1.16334    7.4700   exact
	// south × amber − north × amber     3.5333   0.880735    4.0118    0.003885     0.01639      0.71291    6.3538   exact
	// south × birch − north × amber    10.5167   0.823852   12.765     1.337e-06    6.281e-06    7.87840   13.1549   exact
	// south × amber − north × birch    −0.7833   0.984692   −0.79551   0.4493       0.8546      −3.93666    2.3700   exact
	// south × birch − north × birch     6.2000   0.934161    6.6370    0.000163     0.0007404    3.20849    9.1915   exact
	// south × birch − south × amber     6.9833   0.823852    8.4764    2.873e-05    0.0001328    4.34507    9.6216   exact
	//
	// - intervals hold at once at 95 % or more for all pairs, by Kramer's approximation: the
	//   differences have different variances
}
