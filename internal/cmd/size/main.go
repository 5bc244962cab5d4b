// Command size measures by simulation how often the tests of package lrt reject
// a true null hypothesis, at 5 %, 1 % and 0.1 %.
//
//	go run ./internal/cmd/size -sets 1000000 -numeric 100000 -resampled 2000
//
// The first table judges the exact references: every z-score is printed, and the
// largest is held against one Bonferroni bound over the table. Discrete exact
// tests are conservative by nature, so that only rates above the level count against them. The
// second table shows the asymptotic and corrected references as they are, so
// that a reader sees where they fail. Seeds are fixed.
package main

import (
	"context"
	"flag"
	"fmt"
	"math"
	"os"
	"runtime"
	"sync"
	"text/tabwriter"

	"subsume.example/dist"
)

var levels = [3]float64{0.05, 0.01, 0.001}

// row counts rejections of one reference in one case.
type row struct {
	name      string
	exact     bool
	discrete  bool
	sets      int
	rejected  [3]int
	failed    int
	onlyFirst bool // resampled references: the 5 % level alone
}

func (r *row) rate(i int) float64 { return float64(r.rejected[i]) / float64(r.sets) }

func (r *row) z(i int) float64 {
	a := levels[i]
	return (r.rate(i) - a) / math.Sqrt(a*(1-a)/float64(r.sets))
}

func main() {
	sets := flag.Int("sets", 1_000_000, "data sets for closed forms")
	numeric := flag.Int("numeric", 100_000, "data sets for numerical fits")
	resampled := flag.Int("resampled", 2_000, "data sets for bootstrap and simulated corrections")
	only := flag.String("only", "", "run the cases whose name begins so")
	flag.Parse()
	ctx := context.Background()
	var rows []*row
	for i, c := range cases(*sets, *numeric, *resampled) {
		if len(*only) > len(c.name) || c.name[:len(*only)] != *only {
			continue
		}
		rs, err := measure(ctx, c, uint64(i+1))
		if err != nil {
			fmt.Fprintf(os.Stderr, "size: %s: %v\n", c.name, err)
			os.Exit(1)
		}
		rows = append(rows, rs...)
	}
	if !report(rows) {
		os.Exit(1)
	}
}

// measure runs one case on all processors; set i has its own random source.
func measure(ctx context.Context, c testCase, seed uint64) ([]*row, error) {
	workers := runtime.GOMAXPROCS(0)
	type part struct {
		rows []*row
		err  error
	}
	parts := make([]part, workers)
	var wg sync.WaitGroup
	for w := range workers {
		wg.Go(func() {
			p := &parts[w]
			for i := w; i < c.sets; i += workers {
				ps, err := c.run(ctx, seed, i)
				if err != nil {
					p.err = err
					return
				}
				if p.rows == nil {
					for _, v := range ps {
						p.rows = append(p.rows, &row{name: c.name + ": " + v.name, exact: v.exact, discrete: v.discrete, onlyFirst: c.resampled})
					}
				}
				for k, v := range ps {
					r := p.rows[k]
					r.sets++
					if math.IsNaN(v.p) {
						r.failed++
					}
					for l, a := range levels {
						if v.p <= a {
							r.rejected[l]++
						}
					}
				}
			}
		})
	}
	wg.Wait()
	var out []*row
	for _, p := range parts {
		if p.err != nil {
			return nil, p.err
		}
		if out == nil {
			out = p.rows
			continue
		}
		for k, r := range p.rows {
			out[k].sets += r.sets
			out[k].failed += r.failed
			for l := range levels {
				out[k].rejected[l] += r.rejected[l]
			}
		}
	}
	return out, nil
}

// report prints both tables and reports whether the exact references hold.
func report(rows []*row) bool {
	tests := 0
	for _, r := range rows {
		if r.exact {
			tests += len(levels)
		}
	}
	bound := dist.StudentT{Nu: math.Inf(1)}.UpperQuantile(0.005 / math.Max(1, float64(tests)))
	worst, ok := 0.0, true
	for _, exact := range []bool{true, false} {
		w := tabwriter.NewWriter(os.Stdout, 0, 0, 2, ' ', tabwriter.AlignRight)
		if exact {
			fmt.Println("Exact references: rejection rate in percent (z)")
		} else {
			fmt.Println("\nAsymptotic, corrected and resampled references: rejection rate in percent (standard error)")
		}
		fmt.Fprintln(w, "5 %\t1 %\t0.1 %\tdata sets\tfailed\t  case\t")
		for _, r := range rows {
			if r.exact != exact {
				continue
			}
			for l := range levels {
				switch {
				case r.onlyFirst && l > 0:
					fmt.Fprint(w, "-\t")
				case exact:
					z := r.z(l)
					fmt.Fprintf(w, "%.4f (%+.1f)\t", 100*r.rate(l), z)
					if r.discrete {
						z = math.Max(z, 0)
					}
					worst = math.Max(worst, math.Abs(z))
				default:
					fmt.Fprintf(w, "%.4f (%.4f)\t", 100*r.rate(l), 100*math.Sqrt(r.rate(l)*(1-r.rate(l))/float64(r.sets)))
				}
			}
			fmt.Fprintf(w, "%d\t%d\t  %s\t\n", r.sets, r.failed, r.name)
		}
		w.Flush()
	}
	if tests > 0 {
		ok = worst <= bound
		verdict := "holds"
		if !ok {
			verdict = "FAILS"
		}
		fmt.Printf("\nlargest |z| of %d exact figures %.2f, Bonferroni bound at 1 %% %.2f: %s\n", tests, worst, bound, verdict)
	}
	return ok
}
