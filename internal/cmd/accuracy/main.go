// Command accuracy prints how far the laws of package dist are from
// high-precision reference values, gonum's laws beside them on the same rows, and
// how long the laws take. Run it at the root of the repository:
//
//	go run ./internal/cmd/accuracy
//
// Errors are relative. "tail" is the smaller tail of each row, "other" the larger;
// "everyday" takes rows whose degrees of freedom lie in 0.5 to 1e4 (noncentrality up to 1e4) and
// whose smaller tail is at least 1e-10. Values below the normal range are judged by
// their logarithms.
package main

import (
	"errors"
	"flag"
	"fmt"
	"io"
	"io/fs"
	"math"
	"os"
	"text/tabwriter"

	"subsume.example/internal/accuracy"
)

func main() {
	dir := flag.String("dir", "dist/testdata", "directory of the reference tables")
	worst := flag.Bool("worst", false, "print the worst row of each line")
	over := flag.Float64("over", 1e-12, "print every row of our laws with a larger error, and its conditioning")
	speed := flag.Bool("speed", true, "time the laws")
	doc := flag.Bool("doc", false, "print only the table of the package documentation of dist")
	flag.Parse()
	if *doc {
		if err := printDoc(os.Stdout, *dir); err != nil {
			fmt.Fprintln(os.Stderr, "accuracy:", err)
			os.Exit(1)
		}
		return
	}
	if err := run(os.Stdout, *dir, *worst, *over, *speed); err != nil {
		fmt.Fprintln(os.Stderr, "accuracy:", err)
		os.Exit(1)
	}
}

func run(out io.Writer, dir string, worst bool, over float64, speed bool) error {
	inverse, err := accuracy.LoadInverse(dir)
	if err != nil {
		return err
	}
	w := tabwriter.NewWriter(out, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprint(w, "Errors of package dist\n\n", head)
	failing, err := tables(w, dir, accuracy.Tables, inverse, worst, over)
	if err != nil {
		return err
	}
	switch rs, err := accuracy.MeasureFinders(dir); {
	case err == nil:
		line(w, "ncinv", "lambda", rs, worst)
	case !errors.Is(err, fs.ErrNotExist):
		return err
	}
	w.Flush()
	if len(failing) > 0 {
		fmt.Fprintf(out, "\nRows above %g, with |x density/tail|\n\n", over)
		for _, r := range failing {
			fmt.Fprintf(out, "row %d %v x = %v: %s = %v, want %s: error %.2g, conditioning %.2g\n", r.Row.Line, r.Row.P, r.Row.X, r.What, r.Got, r.Want, r.Err, r.Conditioning)
		}
	}
	fmt.Fprint(w, "\nErrors of gonum v0.17.0 on the same rows\n\n", head)
	if _, err := tables(w, dir, accuracy.Peers, nil, false, math.Inf(1)); err != nil {
		return err
	}
	w.Flush()
	if speed {
		times(out)
		if err := rowTimes(out, dir); err != nil {
			return err
		}
	}
	return nil
}

// printDoc prints the lines that stand in the package documentation.
func printDoc(out io.Writer, dir string) error {
	lines, err := docLines(dir)
	if err != nil {
		return err
	}
	fmt.Fprintf(out, "//\t%-10s  %-10s  %5s  %7s  %-12s  %7s\n", "table", "value", "rows", "median", "everyday max", "max")
	for _, l := range lines {
		day := "-"
		if l.Everyday > 0 {
			day = fmt.Sprintf("%.1e", l.MaxEveryday)
		}
		fmt.Fprintf(out, "//\t%-10s  %-10s  %5d  %.1e  %-12s  %.1e\n", l.table, l.kind, l.N, l.Median, day, l.Max)
	}
	return nil
}

type docLine struct {
	table, kind string
	accuracy.Summary
}

// docLines summarizes all tables but for the larger tails.
func docLines(dir string) (lines []docLine, err error) {
	inverse, err := accuracy.LoadInverse(dir)
	if err != nil {
		return nil, err
	}
	for _, t := range accuracy.Tables {
		rows, err := accuracy.Load(dir, t)
		if err != nil {
			return nil, err
		}
		m := accuracy.Measure(t, rows)
		m["quantile"] = accuracy.MeasureInverse(t, inverse)
		for _, kind := range []string{"tail", "log", "density", "logdensity", "quantile"} {
			if len(m[kind]) > 0 {
				lines = append(lines, docLine{t.File, kind, accuracy.Summarize(m[kind])})
			}
		}
	}
	rs, err := accuracy.MeasureFinders(dir)
	if err != nil {
		return nil, err
	}
	return append(lines, docLine{"ncinv", "lambda", accuracy.Summarize(rs)}), nil
}

// rowTimes prints the median and the slowest time of an upper tail over the rows of each table.
func rowTimes(out io.Writer, dir string) error {
	fmt.Fprint(out, "\nUpper tails over the rows of the tables\n\n")
	w := tabwriter.NewWriter(out, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "table\tmedian ns\tslowest ns\tat\t")
	for _, t := range accuracy.Tables {
		rows, err := accuracy.Load(dir, t)
		if errors.Is(err, fs.ErrNotExist) {
			continue
		}
		if err != nil {
			return err
		}
		ns, slowest := accuracy.RowTimes(t, rows)
		fmt.Fprintf(w, "%s\t%.0f\t%.0f\t%v x = %.6g\t\n", t.File, ns[len(ns)/2], ns[len(ns)-1], slowest.P, slowest.X)
	}
	return w.Flush()
}

const head = "table\tvalue\trows\tmedian\tmax everyday\tmax\t> 1e-12\tnot finite\t\n"

// tables prints one line for each kind of value and returns the rows above the limit.
func tables(w *tabwriter.Writer, dir string, ts []accuracy.Table, inverse []accuracy.InverseRow, worst bool, over float64) (failing []accuracy.Result, err error) {
	for _, t := range ts {
		rows, err := accuracy.Load(dir, t)
		if errors.Is(err, fs.ErrNotExist) {
			continue // another directory may hold only some of the tables
		}
		if err != nil {
			return nil, err
		}
		m := accuracy.Measure(t, rows)
		m["quantile"] = accuracy.MeasureInverse(t, inverse)
		for _, kind := range []string{"tail", "other", "log", "density", "logdensity", "quantile"} {
			if len(m[kind]) == 0 {
				continue
			}
			line(w, t.File, kind, m[kind], worst)
			for _, r := range m[kind] {
				if !(r.Err <= over) {
					failing = append(failing, r)
				}
			}
		}
	}
	return failing, nil
}

func line(w *tabwriter.Writer, table, kind string, rs []accuracy.Result, worst bool) {
	s := accuracy.Summarize(rs)
	day := "-"
	if s.Everyday > 0 {
		day = fmt.Sprintf("%.1e", s.MaxEveryday)
	}
	fmt.Fprintf(w, "%s\t%s\t%d\t%.1e\t%s\t%.1e\t%d\t%d\t", table, kind, s.N, s.Median, day, s.Max, s.Above12, s.NotFinite)
	if worst {
		fmt.Fprintf(w, "worst: %v x = %v, %s = %v, want %.19s\t", s.Worst.Row.P, s.Worst.Row.X, s.Worst.What, s.Worst.Got, s.Worst.Want)
	}
	fmt.Fprintln(w)
}

// times prints nanoseconds a call, the goal re-based by math.Exp on this machine, and gonum's time and
// relative difference at the same point.
func times(out io.Writer) {
	const ms = 20
	w := tabwriter.NewWriter(out, 0, 0, 2, ' ', tabwriter.AlignRight)
	erfc := accuracy.Nanoseconds(math.Erfc, 0.1, ms)
	exp := accuracy.Nanoseconds(math.Exp, -3.3, ms)
	fmt.Fprintf(out, "\nTimes on this machine, where math.Erfc(0.1) takes %.1f ns and math.Exp(-3.3) %.1f ns\n(goals are for 5.3 ns and re-based here)\n\n", erfc, exp)
	fmt.Fprintln(w, "call\tpoint\tx\tns\tgoal\tgonum ns\tgonum's error\t")
	for _, s := range accuracy.Speeds() {
		for _, p := range s.Points {
			goal, peer, diff := "-", "-", "-"
			if p.Goal > 0 {
				goal = fmt.Sprintf("%.0f", p.Goal*exp/5.3)
			}
			if s.Peer != nil {
				peer = fmt.Sprintf("%.0f", accuracy.Nanoseconds(s.Peer, p.X, ms))
				diff = fmt.Sprintf("%.1e", math.Abs(s.Peer(p.X)/s.F(p.X)-1))
			}
			fmt.Fprintf(w, "%s\t%s\t%.4g\t%.0f\t%s\t%s\t%s\t\n", s.Name, p.Name, p.X, accuracy.Nanoseconds(s.F, p.X, ms), goal, peer, diff)
		}
	}
	w.Flush()
}
