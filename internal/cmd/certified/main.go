// Command certified prints how many digits of the NIST Statistical Reference
// Datasets the fits reach, from inputs rounded to float64 and from decimal text:
//
//	go run ./internal/cmd/certified
//
// Digits are −log10 of the relative error, at most 15, the worst of a list. "want"
// is half a digit below what exact arithmetic on the rounded inputs gives, and 13
// or more from decimal text. It exits with 1 when a figure is missed.
package main

import (
	"context"
	"fmt"
	"os"
	"strings"

	"subsume.example/internal/certified"
)

func main() {
	rows, err := certified.Run(context.Background())
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
	missed := 0
	fmt.Println("| set | read as | digits (want) |")
	fmt.Println("|---|---|---|")
	for _, r := range rows {
		var parts []string
		for _, f := range r.Figures {
			parts = append(parts, fmt.Sprintf("%s %.1f (%.1f)", f.Name, f.Digits, f.Limit))
			if !(f.Digits >= f.Limit) {
				missed++
			}
		}
		if r.Perfect {
			parts = append(parts, "perfect fit, said so")
		}
		as := "float64"
		if r.Decimals {
			as = "decimal text"
		}
		fmt.Printf("| %s | %s | %s |\n", strings.TrimPrefix(r.Set, "nist-"), as, strings.Join(parts, ", "))
	}
	if missed > 0 {
		fmt.Printf("%d figures missed\n", missed)
		os.Exit(1)
	}
}
