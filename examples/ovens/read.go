package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"slices"
	"strings"

	"subsume.example/glm"
)

// study is the work on one job, step by step.
type study struct {
	*job
	data   *glm.Data // the rows complete in every column used
	groups []string
	counts []int
	index  []int32 // group of each row

	planned *plan
	models
	ways
	checks
}

// read reads the columns that are used and keeps the rows complete in all of them.
func (s *study) read(ctx context.Context) error {
	var in io.Reader = bytes.NewReader(tiles)
	switch s.file {
	case "":
	case "-":
		in = os.Stdin
	default:
		f, err := os.Open(s.file)
		if err != nil {
			return err
		}
		defer f.Close()
		in = f
	}
	o := &glm.CSVOptions{
		Name:         s.name(),
		DecimalComma: s.decimalComma,
		Missing:      s.missing,
		Kinds:        map[string]glm.Kind{s.response: glm.Numeric},
		Only:         append([]string{s.response, s.group}, s.covariates...),
	}
	if s.delimiter != "" {
		o.Delimiter = s.delimiter[0]
	}
	for _, c := range s.covariates {
		o.Kinds[c] = glm.Numeric
	}
	all, err := glm.ReadCSV(ctx, in, o)
	if err != nil {
		return s.hint(err)
	}
	if s.data, err = all.Complete(o.Only...); err != nil {
		return err
	}
	// Whole numbers may name groups: they become levels, in ascending order.
	if s.data, err = s.data.Categorical(s.group); err != nil {
		return err
	}
	if s.index, s.groups, err = s.data.LevelIndex(s.group); err != nil {
		return err
	}
	s.counts = make([]int, len(s.groups))
	for _, g := range s.index {
		s.counts[g]++
	}
	if len(s.groups) < 2 {
		return fmt.Errorf("%s: column %q has only the group %q in the rows used: nothing to compare", s.name(), s.group, s.groups[0])
	}
	return nil
}

// hint adds what a user probably forgot.
func (s *study) hint(err error) error {
	_, names, _ := strings.Cut(err.Error(), "; there are ")
	if errors.Is(err, glm.ErrUnknownColumn) && s.delimiter == "" && strings.Contains(names, ";") {
		return fmt.Errorf("%w (do the fields stand between semicolons? -delimiter ';', and -decimal-comma where numbers are written 12,5)", err)
	}
	return err
}

// mostColumns is the largest number of groups shown side by side.
const mostColumns = 10

// writeData says what was read, used and left out.
func (s *study) writeData(p *page) {
	p.title("Data")
	a := s.data.Account()
	p.line("%s: %s read, %s used, %s left out.", a.Source, rows(a.Read), rows(a.Used), rows(a.Left()))
	for _, d := range a.Dropped {
		p.line("  left out, %s %s: %s", d.Column, d.Reason, linesOf(d.Lines))
	}
	for _, e := range a.Emptied {
		p.line("  %s %q has no row left and is not compared", e.Column, e.Level)
	}
	p.gap()
	if len(s.groups) > mostColumns {
		p.line("%s: %d groups of %d to %d rows", s.group, len(s.groups), slices.Min(s.counts), slices.Max(s.counts))
		p.line("digest of the values used: %s", s.data.Observations(s.response).Rows)
		return
	}
	t := p.table("l" + strings.Repeat("r", len(s.groups)))
	t.row(append([]string{s.group}, s.groups...)...)
	cells := []string{"rows"}
	for _, n := range s.counts {
		cells = append(cells, fmt.Sprint(n))
	}
	t.row(cells...)
	t.end()
	p.line("digest of the values used: %s", s.data.Observations(s.response).Rows)
}

// linesOf names rows by their lines in the file, the first few of them.
func linesOf(dropped []int) string {
	const most = 8
	var names []string
	for i, line := range dropped {
		if i == most {
			names = append(names, fmt.Sprintf("and %d more", len(dropped)-most))
			break
		}
		names = append(names, fmt.Sprint(line))
	}
	word := "line "
	if len(dropped) > 1 {
		word = "lines "
	}
	return word + strings.Join(names, ", ")
}

// rows counts rows in words.
func rows(n int) string {
	if n == 1 {
		return "1 row"
	}
	return fmt.Sprintf("%d rows", n)
}
