package main

import (
	"flag"
	"fmt"
	"io"
	"math"
	"strings"
)

// job is what was asked for.
type job struct {
	file         string // "": the built-in tiles
	response     string
	group        string
	covariates   list
	delimiter    string
	decimalComma bool
	missing      list
	level        float64
	difference   float64 // of interest, for the plan; 0: no plan
	sd           float64 // expected, for the plan
	power        float64
	draws        int
	seed         uint64
	record       string
}

// list collects the values of a flag that may be given several times.
type list []string

func (l *list) String() string     { return strings.Join(*l, ", ") }
func (l *list) Set(s string) error { *l = append(*l, s); return nil }

const usage = `ovens compares groups: do they differ in a numeric response by more than chance allows?

usage: ovens [flags]                                     the built-in tiles
       ovens -file F -response COL -group COL [flags]    any CSV file

`

// parse reads the command line.
func parse(args []string, errs io.Writer) (*job, error) {
	j := &job{}
	f := flag.NewFlagSet("ovens", flag.ContinueOnError)
	f.SetOutput(errs)
	f.Usage = func() {
		fmt.Fprint(errs, usage)
		f.PrintDefaults()
	}
	f.StringVar(&j.file, "file", "", "CSV `file` with a line of column names; - reads standard input")
	f.StringVar(&j.response, "response", "", "`column` of numbers to explain")
	f.StringVar(&j.group, "group", "", "`column` of labels or codes whose groups are compared")
	f.Var(&j.covariates, "covariate", "numeric `column` to allow for in both models; may be repeated")
	f.StringVar(&j.delimiter, "delimiter", "", "`character` between fields, or tab (default a comma, a semicolon with -decimal-comma)")
	f.BoolVar(&j.decimalComma, "decimal-comma", false, "numbers are written 12,5 rather than 12.5")
	f.Var(&j.missing, "missing", "`word` that stands for a missing value, beside the empty field; may be repeated")
	f.Float64Var(&j.level, "level", 0.95, "confidence `level`")
	f.Float64Var(&j.difference, "difference", 0, "smallest difference of interest between two groups, for the plan")
	f.Float64Var(&j.sd, "sd", 0, "expected standard deviation within groups, from earlier work, for the plan")
	f.Float64Var(&j.power, "power", 0.9, "wanted `probability` of finding that difference, for the plan")
	f.IntVar(&j.draws, "draws", 1999, "`number` of simulated data sets for the checks of residuals")
	f.Uint64Var(&j.seed, "seed", 1, "seed of the simulation: the same seed gives the same output")
	f.StringVar(&j.record, "record", "", "write the record of the analysis as JSON to this `file`; - writes it after the report")
	if err := f.Parse(args); err != nil {
		return nil, err
	}
	if f.NArg() > 0 {
		return nil, fmt.Errorf("unexpected argument %q: columns and files are given by flags", f.Arg(0))
	}
	return j, j.complete()
}

// complete fills in what the built-in tiles need and checks the rest.
func (j *job) complete() error {
	if j.file == "" {
		if j.response != "" || j.group != "" || j.covariates != nil || j.delimiter != "" || j.decimalComma {
			return fmt.Errorf("-response, -group, -covariate, -delimiter and -decimal-comma describe a file: give it by -file")
		}
		j.response, j.group, j.covariates = "strength", "oven", list{"moisture"}
		if j.difference == 0 && j.sd == 0 {
			j.difference, j.sd = 15, 22
		}
	}
	switch {
	case j.response == "" || j.group == "":
		return fmt.Errorf("-file needs -response and -group, the names of two columns")
	case j.response == j.group:
		return fmt.Errorf("-response and -group are both %q", j.group)
	case !(j.level > 0 && j.level < 1):
		return fmt.Errorf("-level %g: want a number between 0 and 1, such as 0.95", j.level)
	case !(j.power > 0 && j.power < 1):
		return fmt.Errorf("-power %g: want a number between 0 and 1, such as 0.9", j.power)
	case (j.difference != 0) != (j.sd != 0):
		return fmt.Errorf("the plan needs both -difference and -sd")
	case j.difference < 0 || j.sd < 0 || math.IsNaN(j.difference+j.sd) || math.IsInf(j.difference+j.sd, 0):
		return fmt.Errorf("-difference %g and -sd %g: want positive numbers", j.difference, j.sd)
	case j.draws < 99 || j.draws > 1_000_000:
		return fmt.Errorf("-draws %d: want 99 to 1000000", j.draws)
	}
	for i, c := range j.covariates {
		if c == j.response || c == j.group {
			return fmt.Errorf("-covariate %q is the response or the group", c)
		}
		for _, other := range j.covariates[:i] {
			if c == other {
				return fmt.Errorf("-covariate %q is given twice", c)
			}
		}
	}
	switch {
	case j.delimiter == "tab" || j.delimiter == `\t`:
		j.delimiter = "\t"
	case len(j.delimiter) > 1:
		return fmt.Errorf("-delimiter %q: want one ASCII character, or tab", j.delimiter)
	}
	return nil
}

// name is the file's name for messages and the record.
func (j *job) name() string {
	switch j.file {
	case "":
		return "tiles.csv"
	case "-":
		return "standard input"
	}
	return j.file
}
