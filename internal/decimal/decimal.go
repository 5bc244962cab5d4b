// Package decimal reads decimal text into double-double pairs: hi is the
// nearest float64 and lo the nearest float64 to what hi leaves, so that a value
// of up to about 32 significant digits keeps every one of them.
//
// Up to 19 digits and 22 places need no big arithmetic: with the digits as an
// integer m and d = 10^k both exact, hi = m/d is correctly rounded by one division
// (Clinger, "How to read floating point numbers accurately", PLDI 1990), its
// remainder m − hi·d is a float64 and comes exactly from one fused
// multiply-add, and lo = remainder/d is correctly rounded by one more division.
// Everything else goes through strconv and exact rational arithmetic.
package decimal

import (
	"bytes"
	"encoding/binary"
	"math"
	"math/big"
	"math/bits"
	"strconv"
	"strings"
)

// Status says what a text is.
type Status uint8

// The kinds of text.
const (
	Number    Status = iota // a finite number
	NotNumber               // anything else
	NotFinite               // NaN, an infinity, or a number beyond the float64 range
)

// MaxLength is the longest number that is read, in bytes; a longer text is NotNumber.
const MaxLength = 4096

var pow10 = [...]float64{1, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

// Scan reads the number at the start of b, with mark as its decimal mark, and
// returns how many bytes it takes. It answers ok = false for whatever needs the
// general route: no number at all, more than 19 digits, an exponent that leaves
// more than 22 places. The caller looks at what follows the number.
func Scan(b []byte, mark byte) (hi, lo float64, n int, ok bool) {
	i, negative := 0, false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		negative = b[0] == '-'
		i = 1
	}
	if len(b) >= 32 {
		// At most seven digits before the mark and seven after it, no exponent: the common case.
		w := binary.LittleEndian.Uint64(b[i:]) ^ 0x3030303030303030
		whole := run(w)
		m, places, j := join(w, whole), 0, i+whole
		if whole < 8 && b[j] == mark {
			w = binary.LittleEndian.Uint64(b[j+1:]) ^ 0x3030303030303030
			places = run(w)
			m = m*tens[places] + join(w, places)
			j += 1 + places
		}
		if whole < 8 && places < 8 && whole+places > 0 && b[j]|0x20 != 'e' {
			x, d := float64(m), pow10[places]
			hi = x / d
			if places > 0 {
				lo = math.FMA(-hi, d, x) / d
			}
			if negative {
				hi, lo = -hi, -lo
			}
			if lo == 0 {
				lo = 0
			}
			return hi, lo, j, true
		}
	}
	var m uint64
	start := i
	i, m = digits(b, i, m)
	count := i - start
	places := 0
	if i < len(b) && b[i] == mark {
		i++
		from := i
		i, m = digits(b, i, m)
		places = i - from
		count += places
	}
	if count == 0 || count > 19 && count-leadingZeros(b[start:i], mark) > 19 {
		return 0, 0, 0, false
	}
	exp := -places
	if i < len(b) && b[i]|0x20 == 'e' {
		e, j := exponent(b, i+1)
		if j < 0 {
			return 0, 0, 0, false
		}
		exp += e
		i = j
	}
	switch {
	case m <= 1<<53 && exp <= 0 && exp >= -22:
		x, d := float64(m), pow10[-exp]
		hi = x / d
		lo = math.FMA(-hi, d, x) / d
	case m <= 1<<53 && exp > 0 && exp <= 22:
		x, d := float64(m), pow10[exp]
		hi = float64(x * d)
		lo = math.FMA(x, d, -hi)
	case exp <= 0 && exp >= -22:
		hi, lo = long(m, b[start:i], mark, pow10[-exp])
	default:
		return 0, 0, 0, false
	}
	if negative {
		hi, lo = -hi, -lo
	}
	if lo == 0 {
		lo = 0 // one zero, without a sign
	}
	return hi, lo, i, true
}

// leadingZeros counts the zeros before the first significant digit.
func leadingZeros(b []byte, mark byte) int {
	count := 0
	for _, c := range b {
		switch c {
		case '0':
			count++
		case mark:
		default:
			return count
		}
	}
	return count
}

// long divides 2^53 < m < 10^19 by d = 10^k, k <= 22. The remainder m − hi·d is a
// multiple of min(1, ulp(hi)·2^k) and below 2^53 of them, so it is a float64, and
// the exact sums below end in it.
func long(m uint64, text []byte, mark byte, d float64) (hi, lo float64) {
	hi = nearest(text, mark)
	mh := float64(m)
	ml := float64(int64(m - uint64(mh)))
	p := float64(hi * d)
	e := math.FMA(hi, d, -p)
	s, f := twoSum(mh-p, ml)
	s, g := twoSum(s, -e)
	return hi, (s + (f + g)) / d
}

func twoSum(a, b float64) (s, e float64) {
	s = a + b
	t := s - a
	return s, (a - (s - t)) + (b - t)
}

// digits reads decimal digits from b[i:] on, up to eight at once.
func digits(b []byte, i int, m uint64) (int, uint64) {
	for i+8 <= len(b) {
		w := binary.LittleEndian.Uint64(b[i:]) ^ 0x3030303030303030
		n := run(w)
		m = m*tens[n] + join(w, n)
		i += n
		if n < 8 {
			return i, m
		}
	}
	for i < len(b) {
		c := b[i] - '0'
		if c > 9 {
			break
		}
		m = m*10 + uint64(c)
		i++
	}
	return i, m
}

// run returns how many of the first bytes of the word are below ten, 0 to 8.
func run(w uint64) int {
	return bits.TrailingZeros64((w|(w+0x7676767676767676))&0x8080808080808080) >> 3
}

// join returns the number that the first n bytes of the word are the digits
// of, n at most 8: a shift makes leading zeros of the rest, and three
// multiplications join pairs, fours and eights.
func join(w uint64, n int) uint64 {
	w <<= uint(64 - 8*n)
	w = w*10 + w>>8
	return ((w&0x000000FF000000FF)*0x000F424000000064 + (w>>16&0x000000FF000000FF)*0x0000271000000001) >> 32
}

var tens = [9]uint64{1, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8}

// exponent reads a signed exponent at b[i:]; j < 0 when there is none or it is huge.
func exponent(b []byte, i int) (e, j int) {
	negative := false
	if i < len(b) && (b[i] == '-' || b[i] == '+') {
		negative = b[i] == '-'
		i++
	}
	start := i
	for i < len(b) && b[i]-'0' <= 9 {
		if i-start > 5 {
			return 0, -1
		}
		e = e*10 + int(b[i]-'0')
		i++
	}
	if i == start {
		return 0, -1
	}
	if negative {
		e = -e
	}
	return e, i
}

// Parse reads the whole of b as one number with mark as its decimal mark: an
// optional sign, digits with at most one mark, an optional exponent. For a
// status other than Number both parts are NaN.
func Parse(b []byte, mark byte) (hi, lo float64, s Status) {
	if hi, lo, n, ok := Scan(b, mark); ok && n == len(b) {
		return hi, lo, Number
	}
	nan := math.NaN()
	if len(b) > MaxLength {
		return nan, nan, NotNumber
	}
	if !grammar(b, mark) {
		if word(b) {
			return nan, nan, NotFinite
		}
		return nan, nan, NotNumber
	}
	hi = nearest(b, mark)
	switch {
	case math.IsInf(hi, 0):
		return nan, nan, NotFinite
	case hi == 0:
		return hi, 0, Number
	}
	return hi, remainder(b, mark, hi), Number
}

// ParseString is Parse for a string with a decimal point.
func ParseString(s string) (hi, lo float64, status Status) { return Parse([]byte(s), '.') }

// grammar reports whether b is a number, of any length.
func grammar(b []byte, mark byte) bool {
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		b = b[1:]
	}
	i, count := 0, 0
	for ; i < len(b) && b[i]-'0' <= 9; i++ {
		count++
	}
	if i < len(b) && b[i] == mark {
		for i++; i < len(b) && b[i]-'0' <= 9; i++ {
			count++
		}
	}
	if count == 0 {
		return false
	}
	if i == len(b) {
		return true
	}
	if b[i]|0x20 != 'e' {
		return false
	}
	i++
	if i < len(b) && (b[i] == '-' || b[i] == '+') {
		i++
	}
	start := i
	for i < len(b) && b[i]-'0' <= 9 {
		i++
	}
	return i > start && i == len(b)
}

// word reports whether b spells NaN or an infinity.
func word(b []byte) bool {
	s := strings.ToLower(string(bytes.TrimLeft(b, "+-")))
	return s == "nan" || s == "inf" || s == "infinity"
}

// nearest returns the float64 nearest to a text that follows the grammar, ±Inf
// beyond the range.
func nearest(b []byte, mark byte) float64 {
	var buf [64]byte
	t := append(buf[:0], b...)
	if mark != '.' {
		if i := bytes.IndexByte(t, mark); i >= 0 {
			t[i] = '.'
		}
	}
	x, _ := strconv.ParseFloat(string(t), 64)
	return x
}

// remainder returns the float64 nearest to (the number b) − hi, hi finite and not 0.
func remainder(b []byte, mark byte, hi float64) float64 {
	negative := false
	if b[0] == '-' || b[0] == '+' {
		negative = b[0] == '-'
		b = b[1:]
	}
	exp := 0
	if i := bytes.IndexAny(b, "eE"); i >= 0 {
		exp, _ = strconv.Atoi(string(b[i+1:])) // within ±(308 + length), or hi would be 0 or infinite
		b = b[:i]
	}
	if i := bytes.IndexByte(b, mark); i >= 0 {
		exp -= len(b) - i - 1
		b = append(append([]byte(nil), b[:i]...), b[i+1:]...)
	}
	m, _ := new(big.Int).SetString(string(b), 10)
	r := new(big.Rat)
	if exp >= 0 {
		r.SetInt(m.Mul(m, power(exp)))
	} else {
		r.SetFrac(m, power(-exp))
	}
	if negative {
		r.Neg(r)
	}
	r.Sub(r, new(big.Rat).SetFloat64(hi))
	lo, _ := r.Float64()
	return lo
}

func power(k int) *big.Int { return new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(k)), nil) }

// Text writes hi + lo as the shortest decimal that Parse reads back to the same
// pair: the shortest of hi where lo is what that text leaves, else up to 40 digits.
func Text(hi, lo float64) string {
	s := strconv.FormatFloat(hi, 'g', -1, 64)
	if h, l, ok := ParseString(s); ok == Number && h == hi && l == lo || lo == 0 {
		return s
	}
	x := new(big.Rat).SetFloat64(hi)
	x.Add(x, new(big.Rat).SetFloat64(lo))
	f := new(big.Float).SetPrec(256).SetRat(x)
	for n := 17; n < 40; n++ {
		t := f.Text('g', n)
		if h, l, ok := ParseString(t); ok == Number && h == hi && l == lo {
			return t
		}
	}
	return f.Text('g', 40)
}
