package glm

import (
	"encoding/binary"
	"hash/maphash"
	"math/bits"
)

// levelTable numbers the labels of a chunk in order of appearance: an open
// table of hashes, since a chunk looks up every row.
type levelTable struct {
	seed   maphash.Seed
	slots  []int32 // level + 1; 0: free
	hashes []uint64
	names  []string
	short  [shortSlots]shortLevel
}

// shortLevel is a level of at most seven bytes, held as a word, so that it is found
// by one comparison. The last byte of the word is its length.
type shortLevel struct {
	word uint64
	at   int32
}

const shortSlots = 64

// begin empties the table and puts the declared levels into it.
func (t *levelTable) begin(seed maphash.Seed, declared []string) {
	t.seed, t.slots, t.hashes, t.names = seed, make([]int32, 16), nil, nil
	t.short = [shortSlots]shortLevel{}
	for _, s := range declared {
		t.add([]byte(s))
	}
}

// place is where a word may stand among the short levels.
func place(word uint64) uint64 { return word * 0x9E3779B97F4A7C15 >> 58 }

// quick finds the label at b[p:] that is short, known, and stands between
// delimiters or line ends without quotes or spaces around it. next is the
// offset of what follows; 0: the label needs the general route.
func (t *levelTable) quick(b []byte, p int, ends uint64) (at int32, next int) {
	if p+8 > len(b) {
		return 0, 0
	}
	w := binary.LittleEndian.Uint64(b[p:])
	n := min(zeroByte(w^ends), zeroByte(w^0x0A0A0A0A0A0A0A0A))
	if n == 0 || n == 8 {
		return 0, 0
	}
	next = p + n
	if b[next] == '\n' && b[next-1] == '\r' {
		if n--; n == 0 {
			return 0, 0 // nothing: it may stand for "missing"
		}
	}
	w = w&(1<<uint(8*n)-1) | uint64(n)<<56
	s := &t.short[place(w)]
	if s.word != w {
		return 0, 0
	}
	return s.at, next
}

// zeroByte returns the number of the first byte of w that is zero, 8 for none.
func zeroByte(w uint64) int {
	return bits.TrailingZeros64((w-0x0101010101010101)&^w&0x8080808080808080) / 8
}

// remember puts a label among the short levels, in the place of another that
// hashes alike. Labels that the general route reads differently (quotes, spaces at
// an end, a carriage return) never are.
func (t *levelTable) remember(label []byte, at int32) {
	n := len(label)
	if n == 0 || n > 7 || label[0] <= ' ' || label[n-1] <= ' ' {
		return
	}
	var buf [8]byte
	for i, c := range label {
		if c == '"' || c == '\n' {
			return
		}
		buf[i] = c
	}
	buf[7] = byte(n)
	w := binary.LittleEndian.Uint64(buf[:])
	t.short[place(w)] = shortLevel{w, at}
}

// add returns the number of the label and whether it is a new one.
func (t *levelTable) add(label []byte) (at int32, fresh bool) {
	h := maphash.Bytes(t.seed, label)
	mask := uint64(len(t.slots) - 1)
	i := h & mask
	for ; t.slots[i] != 0; i = (i + 1) & mask {
		at := t.slots[i] - 1
		if t.hashes[at] == h && t.names[at] == string(label) {
			t.remember(label, at)
			return at, false
		}
	}
	at = int32(len(t.names))
	t.names = append(t.names, string(label))
	t.hashes = append(t.hashes, h)
	t.slots[i] = at + 1
	if 2*len(t.names) > len(t.slots) {
		t.grow()
	}
	return at, true
}

// grow doubles the table.
func (t *levelTable) grow() {
	t.slots = make([]int32, 2*len(t.slots))
	mask := uint64(len(t.slots) - 1)
	for at, h := range t.hashes {
		i := h & mask
		for t.slots[i] != 0 {
			i = (i + 1) & mask
		}
		t.slots[i] = int32(at) + 1
	}
}
