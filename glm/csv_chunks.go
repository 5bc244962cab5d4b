package glm

import (
	"bytes"
	"context"
	"fmt"
	"hash/maphash"
	"maps"
	"slices"
	"sync"
	"sync/atomic"

	"subsume.example/internal/decimal"
	"subsume.example/lrt"
)

// run finds out what the columns hold and parses the chunks. A chunk that parsed as
// numbers a column that another chunk finds to hold labels is parsed again.
func (s *csvScan) run(ctx context.Context) error {
	s.seed = maphash.MakeSeed()
	s.cut()
	s.sniff()
	s.makeRoom()
	waiting := make([]int, len(s.chunks))
	for i := range waiting {
		waiting[i] = i
	}
	for len(waiting) > 0 {
		if err := s.each(ctx, waiting); err != nil {
			return fmt.Errorf("glm: reading %s: %w", sourceName(s.options), err)
		}
		waiting = waiting[:0]
		for i := range s.chunks {
			k := &s.chunks[i]
			if k.err != nil {
				return k.err
			}
			for f := range s.columns {
				if s.columns[f].labels.Load() != k.labelled[f] {
					waiting = append(waiting, i)
					break
				}
			}
		}
	}
	return nil
}

// cut sets the chunks: each begins after a line end that is outside quotes.
func (s *csvScan) cut() {
	b := s.buf
	quotes := bytes.IndexByte(b[s.body:], '"') >= 0
	odd := false
	counted := s.body // odd is the parity of the quotes before this
	first, slot := s.body, 0
	for first < len(b) {
		last := len(b)
		if raw := first + chunkBytes; raw < len(b) {
			if quotes {
				odd = odd != (bytes.Count(b[counted:raw], []byte{'"'})%2 == 1)
				counted, odd = lineEnd(b, raw, odd)
				last = counted
			} else if i := bytes.IndexByte(b[raw:], '\n'); i >= 0 {
				last = raw + i + 1
			}
		}
		k := csvChunk{first: first, last: last, slot: slot}
		k.bound = bytes.Count(b[first:last], []byte{'\n'})
		if b[last-1] != '\n' {
			k.bound++
		}
		k.bound = min(k.bound, (last-first+1)/len(s.columns))
		slot += k.bound
		s.chunks = append(s.chunks, k)
		first = last
	}
}

// lineEnd returns the offset after the first line end outside quotes at or after
// p, the length of b when there is none, and the parity of quotes there.
func lineEnd(b []byte, p int, odd bool) (int, bool) {
	for ; p < len(b); p++ {
		switch b[p] {
		case '"':
			odd = !odd
		case '\n':
			if !odd {
				return p + 1, false
			}
		}
	}
	return len(b), odd
}

// sniff looks at the first rows for columns of labels, so that few chunks are
// parsed twice. What it decides is certain: one text that is no number makes labels.
func (s *csvScan) sniff() {
	const most = 64
	var scratch []byte
	p := s.body
	for row := 0; row < most && p < len(s.buf); row++ {
		if size := s.blank(p); size > 0 {
			p += size
			continue
		}
		for f := range s.columns {
			text, _, next, _, err := s.field(p, &scratch)
			if err != nil {
				return
			}
			c := &s.columns[f]
			if !c.skip && c.forced == Detect && !c.isMissing(text) {
				if _, _, status := decimal.Parse(text, s.mark); status == decimal.NotNumber {
					c.labels.Store(true)
				}
			}
			p = min(next+1, len(s.buf))
			if next == len(s.buf) || s.buf[next] == '\n' {
				break
			}
		}
	}
}

// isMissing reports whether the text stands for "missing".
func (c *csvColumn) isMissing(text []byte) bool {
	if len(text) == 0 {
		return true
	}
	for _, word := range c.missing {
		if bytes.Equal(text, word) {
			return true
		}
	}
	return false
}

// makeRoom allocates the columns.
func (s *csvScan) makeRoom() {
	room := 0
	if len(s.chunks) > 0 {
		k := &s.chunks[len(s.chunks)-1]
		room = k.slot + k.bound
	}
	for i := range s.columns {
		c := &s.columns[i]
		c.room = room
		switch {
		case c.skip:
		case c.labels.Load():
			c.asLabels()
		default:
			c.hi = make([]float64, room)
		}
	}
}

// each parses the listed chunks.
func (s *csvScan) each(ctx context.Context, waiting []int) error {
	var next atomic.Int64
	work := func() {
		for {
			i := int(next.Add(1)) - 1
			if i >= len(waiting) || ctx.Err() != nil {
				return
			}
			s.parse(&s.chunks[waiting[i]])
		}
	}
	if workers := min(s.workers, len(waiting)); workers > 1 {
		var group sync.WaitGroup
		for range workers {
			group.Go(work)
		}
		group.Wait()
	} else {
		work()
	}
	return ctx.Err()
}

// data puts the chunks together.
func (s *csvScan) data() (*Data, error) {
	rows := 0
	for i := range s.chunks {
		rows += s.chunks[i].rows
	}
	if rows == 0 {
		return nil, s.fail(-1, "", "", fmt.Errorf("%w: names but no rows", ErrEmpty))
	}
	if m := s.options.MaxRows; m > 0 && int64(rows) > m {
		return nil, &LimitError{Name: s.options.Name, What: "rows", Limit: m}
	}
	var columns []column
	for f := range s.columns {
		c := &s.columns[f]
		if c.skip {
			continue
		}
		k := column{field: Field{Name: c.name}, declared: c.levels != nil}
		if c.labels.Load() {
			k.field.Levels = s.merge(f)
			k.index = compact(s, c.index, rows)
			k.note = s.note(f, &k)
		} else {
			for i := range s.chunks {
				if at := s.chunks[i].notFinite[f]; at > 0 {
					var scratch []byte
					text, _, _, _, _ := s.field(at-1, &scratch)
					return nil, s.fail(at-1, c.name, string(text), ErrNotFinite)
				}
			}
			k.hi, k.lo = compact(s, c.hi, rows), compact(s, c.lo, rows)
		}
		k.seal()
		columns = append(columns, k)
	}
	d, err := assemble(columns, rows)
	if err != nil {
		return nil, err
	}
	s.lines(d)
	d.rows = lrt.NewID(d.write)
	d.account = Account{Source: s.options.Name, Read: rows, Used: rows}
	return d, nil
}

// compact closes the gaps that chunks with fewer rows than bound have left.
func compact[T any](s *csvScan, values []T, rows int) []T {
	if values == nil {
		return nil
	}
	n := 0
	for i := range s.chunks {
		k := &s.chunks[i]
		if n != k.slot {
			copy(values[n:], values[k.slot:k.slot+k.rows])
		}
		n += k.rows
	}
	if rows < len(values)-len(values)/8 {
		return slices.Clone(values[:rows])
	}
	return values[:rows:rows]
}

// merge returns the levels of column f in order of appearance and numbers the
// rows of each chunk by them.
func (s *csvScan) merge(f int) []string {
	levels := []string{}
	place := make(map[string]int32)
	for i := range s.chunks {
		k := &s.chunks[i]
		to := make([]int32, len(k.tables[f].names))
		same := true
		for j, name := range k.tables[f].names {
			at, ok := place[name]
			if !ok {
				at = int32(len(levels))
				place[name] = at
				levels = append(levels, name)
			}
			to[j] = at
			same = same && at == int32(j)
		}
		if same {
			continue
		}
		index := s.columns[f].index[k.slot : k.slot+k.rows]
		for r, v := range index {
			if v >= 0 {
				index[r] = to[v]
			}
		}
	}
	return levels
}

// note returns the error of taking column f for numbers: where its first text
// stands that is no number. nil when the options made it labels.
func (s *csvScan) note(f int, k *column) error {
	if s.columns[f].forced == Labelled {
		return nil
	}
	for at, name := range k.field.Levels {
		if _, _, status := decimal.Parse([]byte(name), s.mark); status != decimal.Number {
			row := slices.Index(k.index, int32(at))
			return s.fail(s.locate(row, f), k.field.Name, name, ErrNotNumber)
		}
	}
	return nil
}

// locate returns the offset of field f in a row.
func (s *csvScan) locate(row, f int) int {
	c := 0
	for row >= s.chunks[c].rows {
		row -= s.chunks[c].rows
		c++
	}
	var scratch []byte
	p := s.chunks[c].first
	for ; ; row-- {
		for s.blank(p) > 0 && len(s.columns) > 1 {
			p += s.blank(p)
		}
		for i := range s.columns {
			_, begin, next, _, _ := s.field(p, &scratch)
			if row == 0 && i == f {
				return begin
			}
			p = next + 1
		}
	}
}

// lines records the line of each row, as the first where they are consecutive.
func (s *csvScan) lines(d *Data) {
	d.first = 1 + bytes.Count(s.buf[:s.chunks[0].first], []byte{'\n'})
	consecutive := true
	for i := range s.chunks {
		k := &s.chunks[i]
		last := i == len(s.chunks)-1
		consecutive = consecutive && k.lines == nil && (last || k.newlines == k.rows)
	}
	if consecutive {
		return
	}
	d.lines = make([]int32, 0, d.n)
	base := int32(d.first)
	for i := range s.chunks {
		k := &s.chunks[i]
		for r := range k.rows {
			if k.lines == nil {
				d.lines = append(d.lines, base+int32(r))
			} else {
				d.lines = append(d.lines, base+k.lines[r])
			}
		}
		base += int32(k.newlines)
	}
}

// sortedKeys returns the keys of m in ascending order.
func sortedKeys[V any](m map[string]V) []string { return slices.Sorted(maps.Keys(m)) }
