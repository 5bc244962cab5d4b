// Command accuracy prints how far the laws of package dist are from
// high-precision reference values. Run it at the root of the repository:
//
//	go run ./internal/cmd/accuracy
package main

import (
	"errors"
	"flag"
	"fmt"
	"io/fs"
	"log"
	"os"
	"text/tabwriter"

	"subsume.example/internal/accuracy"
)

func main() {
	log.SetFlags(0)
	dir := flag.String("dir", "dist/testdata", "directory of the reference tables")
	worst := flag.Bool("worst", false, "print the worst row of each line")
	flag.Parse()

	w := tabwriter.NewWriter(os.Stdout, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "table\tvalue\trows\tmedian\tmax everyday\tmax\t> 1e-12\tnot finite\t")
	inverse, err := accuracy.LoadInverse(*dir)
	if err != nil {
		log.Fatal(err)
	}
	for _, t := range accuracy.Tables {
		rows, err := accuracy.Load(*dir, t)
		if errors.Is(err, fs.ErrNotExist) {
			continue // another directory may hold only some of the tables
		}
		if err != nil {
			log.Fatal(err)
		}
		m := accuracy.Measure(t, rows)
		m["quantile"] = accuracy.MeasureInverse(t, inverse)
		for _, kind := range []string{"tail", "other", "log", "density", "logdensity", "quantile"} {
			if len(m[kind]) == 0 {
				continue
			}
			s := accuracy.Summarize(m[kind])
			fmt.Fprintf(w, "%s\t%s\t%d\t%.1e\t%.1e\t%.1e\t%d\t%d\t\n", t.File, kind, s.N, s.Median, s.MaxEveryday, s.Max, s.Above12, s.NotFinite)
			if *worst {
				fmt.Fprintf(w, "\t%v x=%v %s got %v want %.12s\t\n", s.Worst.Row.P, s.Worst.Row.X, s.Worst.What, s.Worst.Got, s.Worst.Want)
			}
		}
	}
	w.Flush()
}
