package glm

import (
	"fmt"
	"hash/maphash"
	"math"
	"sync"
	"sync/atomic"

	"subsume.example/internal/decimal"
)

// csvScan reads one text. The text is cut at line ends into chunks of a fixed
// size, which workers parse straight into the final columns: the line ends in a
// chunk bound its rows, so that each chunk knows where its rows may stand. A
// line end inside quotes does not cut, which the parity of quotes before it
// tells (in a text where it does not, because a quote is misplaced, the error
// that comes first in the text is in a chunk that was cut rightly).
type csvScan struct {
	options         *CSVOptions
	buf             []byte
	delimiter, mark byte
	workers         int
	special         [256]bool // ends a field without quotes, or is a quote
	ends            uint64    // eight delimiters
	body            int       // offset of the first row
	seed            maphash.Seed
	columns         []csvColumn
	chunks          []csvChunk
}

// csvColumn is a column of the text: what is known beforehand, and what the
// chunks put there.
type csvColumn struct {
	name       string
	skip       bool
	forced     Kind
	levels     []string // declared
	missing    [][]byte // texts beside the empty one
	likeNumber bool     // one of them looks like a number
	labels     atomic.Bool
	hi, lo     []float64
	index      []int32
	room       int // rows that hi, lo and index have room for
	lowOnce    sync.Once
	indexOnce  sync.Once
}

// csvChunk is a stretch of whole rows and what was found in it.
type csvChunk struct {
	first, last int // bytes
	slot, bound int // its rows stand from slot on, at most bound
	rows        int
	lines       []int32 // line of each row from the chunk's first; nil: consecutive
	newlines    int
	labelled    []bool // by column: parsed as labels
	tables      []levelTable
	notFinite   []int // by column: 1 + offset of the first value that is not finite
	err         error
}

const chunkBytes = 1 << 20

// parse reads the rows of chunk k. A column found to hold labels is parsed anew from
// the start of the chunk.
func (s *csvScan) parse(k *csvChunk) {
	for s.attempt(k) {
	}
}

// attempt parses the chunk and reports whether it has to be done again.
func (s *csvScan) attempt(k *csvChunk) (again bool) {
	k.rows, k.newlines, k.lines, k.err = 0, 0, nil, nil
	n := len(s.columns)
	k.labelled, k.tables = make([]bool, n), make([]levelTable, n)
	k.notFinite = make([]int, n)
	low := make([][]float64, n)
	for i := range s.columns {
		k.labelled[i] = s.columns[i].labels.Load()
		if k.labelled[i] {
			k.tables[i].begin(s.seed, s.columns[i].levels)
		}
	}
	b, p := s.buf, k.first
	var scratch []byte
	for p < k.last {
		if size := s.blank(p); size > 0 && n > 1 {
			p += size
			k.newlines++
			continue
		}
		if k.rows == k.bound { // fewer bytes are left than a row has fields
			k.err = s.short(p)
			return false
		}
		r := k.slot + k.rows
		if k.newlines != k.rows && k.lines == nil {
			k.lines = make([]int32, 0, k.bound)
			for i := range k.rows {
				k.lines = append(k.lines, int32(i))
			}
		}
		if k.lines != nil {
			k.lines = append(k.lines, int32(k.newlines))
		}
		for f := 0; ; f++ {
			c := &s.columns[f]
			q := -1
			if k.labelled[f] {
				if at, next := k.tables[f].quick(b, p, s.ends); next > 0 {
					c.index[r] = at
					q = next
				}
			} else if !c.skip && !c.likeNumber {
				if hi, lo, size, ok := decimal.Scan(b[p:], s.mark); ok {
					q = p + size
					if q < len(b) && b[q] == '\r' && q+1 < len(b) && b[q+1] == '\n' {
						q++
					}
					if q == len(b) || b[q] == s.delimiter || b[q] == '\n' {
						c.hi[r] = hi
						if lo != 0 && !s.options.Plain {
							if low[f] == nil {
								low[f] = c.low()
							}
							low[f][r] = lo
						}
					} else {
						q = -1
					}
				}
			}
			if q < 0 {
				text, begin, next, newlines, err := s.field(p, &scratch)
				if err != nil {
					k.err = s.fail(begin, c.name, "", err)
					return false
				}
				k.newlines += newlines
				q = next
				if !c.skip {
					done, err := s.store(k, f, r, text, begin, &low[f])
					if err != nil {
						k.err = err
						return false
					}
					if !done {
						return true
					}
				}
			}
			atEnd := q == len(b) || b[q] == '\n'
			if atEnd != (f == n-1) {
				k.err = s.ragged(q, f, n)
				return false
			}
			p = min(q+1, len(b))
			if atEnd {
				break
			}
		}
		k.newlines++
		k.rows++
	}
	return false
}

// ragged is the error of a row that ends early, or goes on after its n fields.
func (s *csvScan) ragged(q, f, n int) error {
	if f < n-1 {
		return s.fail(q, "", "", fmt.Errorf("%w: the line ends after %d of %d", ErrFieldCount, f+1, n))
	}
	return s.fail(q+1, "", "", fmt.Errorf("%w: the line goes on after the %d named columns", ErrFieldCount, n))
}

// short is the error of the row at p, known to have too few fields.
func (s *csvScan) short(p int) error {
	var scratch []byte
	for f := 0; ; f++ {
		_, begin, next, _, err := s.field(p, &scratch)
		if err != nil {
			return s.fail(begin, s.columns[f].name, "", err)
		}
		if next == len(s.buf) || s.buf[next] == '\n' {
			return s.ragged(next, f, len(s.columns))
		}
		p = next + 1
	}
}

// store puts a text into row r of column f. It answers done = false when the column
// turns out to hold labels and the chunk is to be parsed anew.
func (s *csvScan) store(k *csvChunk, f, r int, text []byte, begin int, low *[]float64) (done bool, err error) {
	c := &s.columns[f]
	missing := c.isMissing(text)
	if k.labelled[f] {
		if missing {
			c.index[r] = -1
			return true, nil
		}
		at, fresh := k.tables[f].add(text)
		if fresh {
			if c.levels != nil {
				return false, s.fail(begin, c.name, string(text), ErrUnknownLevel)
			}
			if err := plainText(text); err != nil {
				return false, s.fail(begin, c.name, string(text), err)
			}
		}
		c.index[r] = at
		return true, nil
	}
	if missing {
		c.hi[r] = math.NaN()
		return true, nil
	}
	hi, lo, status := decimal.Parse(text, s.mark)
	switch status {
	case decimal.NotFinite:
		if k.notFinite[f] == 0 {
			k.notFinite[f] = begin + 1
		}
	case decimal.NotNumber:
		if c.forced == Numeric {
			return false, s.fail(begin, c.name, string(text), ErrNotNumber)
		}
		c.asLabels()
		return false, nil
	}
	c.hi[r] = hi
	if lo != 0 && !s.options.Plain {
		if *low == nil {
			*low = c.low()
		}
		(*low)[r] = lo
	}
	return true, nil
}

// low returns the low parts of the column, made when the first is needed.
func (c *csvColumn) low() []float64 {
	c.lowOnce.Do(func() { c.lo = make([]float64, c.room) })
	return c.lo
}

// asLabels makes the column one of labels.
func (c *csvColumn) asLabels() {
	c.indexOnce.Do(func() { c.index = make([]int32, c.room) })
	c.labels.Store(true)
}
