package glm

import (
	"bytes"
	"context"
	"encoding/csv"
	"fmt"
	"io"
	"math/rand/v2"
	"strconv"
	"testing"
	"time"
)

// benchmarkText is a table of four columns of numbers and two of labels.
func benchmarkText(rows int) []byte {
	rng := rand.New(rand.NewPCG(4, 2))
	var b bytes.Buffer
	b.WriteString("thickness,density,moisture,minutes,oven,shift\n")
	for range rows {
		fmt.Fprintf(&b, "%.4f,%.6f,%.3f,%d,oven %c,%s\n", 4+rng.NormFloat64(), 180+20*rng.NormFloat64(), 8+rng.Float64(),
			rng.IntN(90), 'A'+rune(rng.IntN(12)), []string{"early", "late", "night"}[rng.IntN(3)])
	}
	return b.Bytes()
}

// standard reads the text by encoding/csv and ParseFloat into the same columns.
func standard(text []byte) (float64, error) {
	r := csv.NewReader(bytes.NewReader(text))
	r.ReuseRecord = true
	if _, err := r.Read(); err != nil {
		return 0, err
	}
	var numbers [4][]float64
	var index [2][]int32
	levels := [2]map[string]int32{{}, {}}
	for {
		record, err := r.Read()
		if err == io.EOF {
			return numbers[0][0], nil
		}
		if err != nil {
			return 0, err
		}
		for i := range numbers {
			x, err := strconv.ParseFloat(record[i], 64)
			if err != nil {
				return 0, err
			}
			numbers[i] = append(numbers[i], x)
		}
		for i := range index {
			at, ok := levels[i][record[4+i]]
			if !ok {
				at = int32(len(levels[i]))
				levels[i][string([]byte(record[4+i]))] = at
			}
			index[i] = append(index[i], at)
		}
	}
}

// BenchmarkReadCSV races the reader, with and without low parts and with one
// worker or all, against the standard library in the same process, turn by turn;
// "x" is how many times faster its best turn is. Other metrics are of a round of all.
func BenchmarkReadCSV(b *testing.B) {
	for _, rows := range []int{1000, 1000000} {
		text := benchmarkText(rows)
		ours := func(o CSVOptions) func() error {
			return func() error {
				_, err := ReadCSV(context.Background(), bytes.NewReader(text), &o)
				return err
			}
		}
		racers := []struct {
			name string
			run  func() error
			best time.Duration
		}{
			{name: "standard", run: func() error { _, err := standard(text); return err }},
			{name: "pairs", run: ours(CSVOptions{})},
			{name: "pairs-1", run: ours(CSVOptions{Workers: 1})},
			{name: "plain", run: ours(CSVOptions{Plain: true})},
			{name: "plain-1", run: ours(CSVOptions{Plain: true, Workers: 1})},
		}
		b.Run(fmt.Sprintf("rows=%d", rows), func(b *testing.B) {
			for b.Loop() {
				for i := range racers {
					r := &racers[i]
					begin := time.Now()
					if err := r.run(); err != nil {
						b.Fatal(err)
					}
					if t := time.Since(begin); r.best == 0 || t < r.best {
						r.best = t
					}
				}
			}
			for _, r := range racers {
				b.ReportMetric(float64(racers[0].best)/float64(r.best), r.name+"-x")
				b.ReportMetric(float64(r.best)/1e6, r.name+"-ms")
			}
		})
	}
	b.Run("rows=1000000/alone", func(b *testing.B) {
		text := benchmarkText(1000000)
		b.SetBytes(int64(len(text)))
		b.ReportAllocs()
		for b.Loop() {
			if _, err := ReadCSV(context.Background(), bytes.NewReader(text), nil); err != nil {
				b.Fatal(err)
			}
		}
	})
}
