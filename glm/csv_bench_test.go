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
// worker or all, against the standard library in the same process; "x" is how many
// times faster it is.
func BenchmarkReadCSV(b *testing.B) {
	for _, rows := range []int{1000, 1000000} {
		text := benchmarkText(rows)
		begin := time.Now()
		if _, err := standard(text); err != nil {
			b.Fatal(err)
		}
		peer := time.Since(begin)
		b.Run(fmt.Sprintf("rows=%d/standard", rows), func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(len(text)))
			for b.Loop() {
				if _, err := standard(text); err != nil {
					b.Fatal(err)
				}
			}
			peer = b.Elapsed() / time.Duration(b.N)
		})
		for _, c := range []struct {
			name string
			o    CSVOptions
		}{{"pairs", CSVOptions{}}, {"pairs/workers=1", CSVOptions{Workers: 1}}, {"plain", CSVOptions{Plain: true}}, {"plain/workers=1", CSVOptions{Plain: true, Workers: 1}}} {
			b.Run(fmt.Sprintf("rows=%d/%s", rows, c.name), func(b *testing.B) {
				b.ReportAllocs()
				b.SetBytes(int64(len(text)))
				for b.Loop() {
					if _, err := ReadCSV(context.Background(), bytes.NewReader(text), &c.o); err != nil {
						b.Fatal(err)
					}
				}
				b.ReportMetric(float64(peer)/float64(b.Elapsed()/time.Duration(b.N)), "x")
			})
		}
	}
}
