// Command rates compares failure rates with a model of its own, declared in a
// few functions: nothing in the library knows about lifetimes.
//
//	go run ./examples/rates
//
// The data, seals.csv, are invented: 63 seals of conveyor bearings at three
// sites of a quarry, each watched for a planned time; some failed in that time, the
// others were still sound at its end. Three questions are asked, each as a space inside another:
//
//   - Do the sites share one shape of the lifetime's law? The restricted space has no
//     closed form: both fits are numerical.
//   - Is that shape 1, so that seals fail at a constant rate and do not wear?
//   - Given a constant rate, do the sites share it? Both spaces have a closed form.
//
// Where lives or health depend on such a rate, the figures need qualified review
// and the rules of the field; nothing here is a safety assessment.
package main

import (
	"bytes"
	"context"
	_ "embed"
	"fmt"
	"io"
	"log"
	"os"

	"subsume.example/lrt"
)

//go:embed seals.csv
var seals []byte

func main() {
	if err := run(context.Background(), os.Stdout); err != nil {
		log.Fatal(err)
	}
}

// run answers the three questions.
func run(ctx context.Context, out io.Writer) error {
	d, err := read(ctx, bytes.NewReader(seals))
	if err != nil {
		return err
	}
	fmt.Fprintf(out, "%-8s %7s %9s %12s %22s\n", "site", "seals", "failures", "hours", "failures per 1000 h")
	for s, site := range d.sites {
		n, failures, time := d.count(s)
		fmt.Fprintf(out, "%-8s %7d %9.0f %12.0f %22.3f\n", site, n, failures, 1000*time, failures/time)
	}
	q, err := spaces(d)
	if err != nil {
		return err
	}
	settings := &lrt.Settings{Seed: 1, References: []lrt.Reference{lrt.Bootstrap{Draws: 999}}}
	for _, c := range []lrt.Comparison{
		{Name: "Do the sites share one shape?", Restricted: q.oneShape, Full: q.free},
		{Name: "Given one shape, is it 1, a constant rate?", Restricted: q.constant, Full: q.oneShape},
		{Name: "Given constant rates, do the sites share one?", Restricted: q.oneRate, Full: q.constant},
	} {
		r, err := c.Run(ctx, settings)
		if err != nil {
			return err
		}
		fmt.Fprintf(out, "\n%s\n", c.Name)
		fmt.Fprintf(out, "  restricted: %v\n  full:       %v\n", c.Restricted, c.Full)
		fmt.Fprintf(out, "  −2 log λ = %.4f; χ² with %g df: p = %.4f\n", r.Statistic, r.Pair.DF, r.ChiSquared.P)
		for _, t := range r.Others {
			fmt.Fprintf(out, "  %s, %d draws: p = %.3f (%.3f to %.3f)\n", t.Name, t.Simulation.Draws, t.P, t.Simulation.Lower, t.Simulation.Upper)
		}
	}
	return estimates(ctx, out, d, q)
}

// estimates gives each rate, and the ratio of each to the first, given constant rates.
func estimates(ctx context.Context, out io.Writer, d lifetimes, q questions) error {
	fmt.Fprintf(out, "\nRates per 1000 h, given constant rates, with 95 %% profile likelihood intervals\n")
	k := len(d.sites)
	for s, name := range rates(d.sites) {
		i, err := lrt.Profile(ctx, q.constant, name, 0.95, nil)
		if err != nil {
			return err
		}
		fmt.Fprintf(out, "  %-16s %.3f (%.3f to %.3f)\n", d.sites[s], i.Estimate, i.Lower, i.Upper)
	}
	for s := 1; s < k; s++ {
		i, err := lrt.ProfileOf(ctx, q.constant, lrt.Quantity{Name: "ratio", Of: func(theta []float64) float64 {
			return theta[k+s] / theta[k]
		}}, 0.95, nil)
		if err != nil {
			return err
		}
		fmt.Fprintf(out, "  %-16s %.3f (%.3f to %.3f)\n", d.sites[s]+" / "+d.sites[0], i.Estimate, i.Lower, i.Upper)
	}
	return nil
}
