package main

import (
	"context"
	"fmt"
	"io"

	"subsume.example/glm"
)

// lifetimes are the data of the model: for each seal its site, the time it ran
// in 1000 hours, whether it failed then, and how long it was to be watched.
type lifetimes struct {
	sites  []string
	site   []int32
	time   []float64
	failed []float64 // 1 or 0
	until  []float64
}

// read reads the table and refuses what cannot be a lifetime.
func read(ctx context.Context, r io.Reader) (lifetimes, error) {
	var d lifetimes
	data, err := glm.ReadCSV(ctx, r, &glm.CSVOptions{
		Name:  "seals.csv",
		Only:  []string{"site", "until", "hours", "failed"},
		Kinds: map[string]glm.Kind{"site": glm.Labelled, "until": glm.Numeric, "hours": glm.Numeric, "failed": glm.Numeric},
	})
	if err != nil {
		return d, err
	}
	if data, err = data.Complete(); err != nil {
		return d, err
	}
	if d.site, d.sites, err = data.LevelIndex("site"); err != nil {
		return d, err
	}
	for _, c := range []struct {
		name string
		to   *[]float64
		unit float64
	}{{"until", &d.until, 1000}, {"hours", &d.time, 1000}, {"failed", &d.failed, 1}} {
		if *c.to, err = data.Values(c.name); err != nil {
			return d, err
		}
		for i := range *c.to {
			(*c.to)[i] /= c.unit
		}
	}
	for i, t := range d.time {
		if !(t > 0) || t > d.until[i] || d.failed[i] != 0 && d.failed[i] != 1 || d.failed[i] == 0 && t != d.until[i] {
			return d, fmt.Errorf("seals.csv:%d: want 0 < hours <= until, failed 0 or 1, and hours = until for a seal that did not fail", data.Line(i))
		}
	}
	return d, nil
}

// count returns the number of seals at a site, the failures, and the time run.
func (d lifetimes) count(site int) (n int, failures, time float64) {
	for i, s := range d.site {
		if int(s) == site {
			n++
			failures += d.failed[i]
			time += d.time[i]
		}
	}
	return n, failures, time
}
