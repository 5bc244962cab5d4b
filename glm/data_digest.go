package glm

import (
	"encoding/binary"
	"io"
	"math"
)

// write writes the content of the rows canonically: every column with its name, in order.
func (d *Data) write(w io.Writer) error {
	b := binary.LittleEndian.AppendUint64([]byte("rows/1 "), uint64(len(d.columns)))
	if _, err := w.Write(b); err != nil {
		return err
	}
	for i := range d.columns {
		if _, err := w.Write(appendText(nil, d.columns[i].field.Name)); err != nil {
			return err
		}
		if err := d.columns[i].write(w); err != nil {
			return err
		}
	}
	return nil
}

// write writes the values of a column canonically, the same bytes for the same
// values on every machine: the kind, the number of rows, then for numbers the bits of
// all high parts and, unless they are all zero, of all low parts (every NaN as
// one, −0 as 0); for labels the levels in order and the index of each row.
func (k column) write(w io.Writer) error {
	buf := make([]byte, 0, 1<<15)
	flush := func(least int) error {
		if len(buf) < least {
			return nil
		}
		_, err := w.Write(buf)
		buf = buf[:0]
		return err
	}
	if k.index != nil {
		buf = binary.LittleEndian.AppendUint64(append(buf, 'L'), uint64(len(k.index)))
		buf = binary.LittleEndian.AppendUint64(buf, uint64(len(k.field.Levels)))
		for _, s := range k.field.Levels {
			buf = appendText(buf, s)
			if err := flush(1 << 14); err != nil {
				return err
			}
		}
		for _, v := range k.index {
			buf = binary.LittleEndian.AppendUint32(buf, uint32(v))
			if err := flush(1 << 14); err != nil {
				return err
			}
		}
		return flush(1)
	}
	buf = binary.LittleEndian.AppendUint64(append(buf, 'N'), uint64(len(k.hi)))
	for part, values := range [][]float64{k.hi, k.lo} {
		if values == nil {
			continue
		}
		buf = append(buf, byte('H'+part*4))
		for _, x := range values {
			bits := math.Float64bits(x + 0) // −0 + 0 = 0
			if x != x {
				bits = 0x7FF8000000000001
			}
			buf = binary.LittleEndian.AppendUint64(buf, bits)
			if err := flush(1 << 14); err != nil {
				return err
			}
		}
	}
	return flush(1)
}

// appendText appends a text with its length before it.
func appendText(b []byte, s string) []byte {
	return append(binary.LittleEndian.AppendUint64(b, uint64(len(s))), s...)
}
