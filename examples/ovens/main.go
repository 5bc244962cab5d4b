// Command ovens answers one question from a file: do the groups differ in the
// response by more than chance allows, where, by how much, and can it be
// defended?
//
//	go run ./examples/ovens
//
// works on tiles.csv, which is built in: 312 invented cork tiles from a plant
// that cures them in five ovens, with the moisture of each tile's granulate before pressing (in
// per cent) and its tensile strength (in kPa), in the order of production. One strength is missing
// and one is suspicious.
//
//	go run ./examples/ovens -file mine.csv -response yield -group plot
//
// asks the same of any file. Run it with -help for the flags. Bad input ends
// it with exit code 2 and a message that names the place in the file; any other
// failure with exit code 1. (The go command prints "exit status 2" and itself
// ends with 1; build the program where the code matters.)
package main

import (
	"context"
	_ "embed"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
)

//go:embed tiles.csv
var tiles []byte

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	os.Exit(run(ctx, os.Args[1:], os.Stdout, os.Stderr))
}

// run is the whole command; it returns the exit code.
func run(ctx context.Context, args []string, out, errs io.Writer) int {
	j, err := parse(args, errs)
	if errors.Is(err, flag.ErrHelp) {
		return 0
	}
	if err != nil {
		fmt.Fprintln(errs, "ovens:", err)
		return 2
	}
	if err := j.answer(ctx, out); err != nil {
		fmt.Fprintln(errs, "ovens:", err)
		if errors.As(err, new(*outputError)) || ctx.Err() != nil {
			return 1
		}
		return 2
	}
	return 0
}

// answer reads, compares, follows up, checks and concludes, and writes it all.
func (j *job) answer(ctx context.Context, out io.Writer) error {
	s := &study{job: j}
	for _, step := range []func(context.Context) error{s.read, s.plan, s.compare, s.follow, s.check} {
		if err := step(ctx); err != nil {
			return err
		}
	}
	p := &page{}
	s.writeQuestion(p)
	s.writePlan(p)
	s.writeData(p)
	s.writeComparison(p)
	s.writeTable(p)
	s.writeGroups(p)
	s.writeChecks(p)
	s.writeConclusion(p)
	if err := p.to(out); err != nil {
		return &outputError{err}
	}
	if j.record == "" {
		return nil
	}
	return s.saveRecord(ctx, j.record, out)
}

// outputError is a failure to write, which is no fault of the input.
type outputError struct{ err error }

func (e *outputError) Error() string { return "writing: " + e.err.Error() }
func (e *outputError) Unwrap() error { return e.err }
