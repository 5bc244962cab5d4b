package anova_test

import (
	"context"
	"fmt"

	"subsume.example/anova"
)

func ExampleNewRecord() {
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
	record, err := anova.NewRecord(ctx, table, data, anova.Declaration{
		Question:      "do tiles pressed with birch resin bend less than those with amber resin?",
		Units:         "tiles",
		Randomization: "resins drawn by lot for each batch",
		ChecksNotMade: []string{"independence of tiles of one batch"},
	}, nil, table.Effects())
	if err != nil {
		fmt.Println(err)
		return
	}
	r := record.Rows[0]
	fmt.Println(record.Declared.Question)
	fmt.Printf("%s: %s inside %s, %s\n", r.Name, r.Restricted, r.Full, r.Reading)
	fmt.Printf("ranks %d, %d, error %d to %d; F = %.4f, critical %.4f, p = %.6f\n",
		r.RankRestricted, r.RankFull, r.RankErrorLess, r.RankErrorMore, r.Value, r.Critical, r.P)
	fmt.Println(len(record.Data.RowsDigest), "hexadecimal digits of SHA-256")
	// Output:
	// do tiles pressed with birch resin bend less than those with amber resin?
	// resin: strength by constant inside strength by constant + resin, exact
	// ranks 1, 2, error 2 to 12; F = 16.9004, critical 4.9646, p = 0.002107
	// 64 hexadecimal digits of SHA-256
}
