package decimal

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"
)

// exact returns the pair by rational arithmetic alone, the definition.
func exact(s string) (hi, lo float64) {
	hi, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return hi, math.NaN()
	}
	r, ok := new(big.Rat).SetString(s)
	if !ok {
		return math.NaN(), math.NaN()
	}
	lo, _ = r.Sub(r, new(big.Rat).SetFloat64(hi)).Float64()
	return hi, lo
}

func TestParseExact(t *testing.T) {
	cases := []string{"0", "1", "-1", "+1", "0.1", ".5", "5.", "-0.1", "1e3", "1E-3", "12.5e+2",
		"9007199254740992", "9007199254740993", "9999999999999999999", "18446744073709551615", "18446744073709551616",
		"1000000000000.4", "1000000000000.3", "-1000000000000.25", "0.1234567890123456789", "3.14159265358979323846264338327950288",
		"0.0000000000000000000001", "0.00000000000000000000012345", "1e22", "1e23", "123456789e22", "1e308", "4.9e-324", "1e-310",
		"179769313486231570814527423731704356798070567525844996598917476803157260780028538760589558632766878171540458953514382464234321326889464182768467546703537516986049910576551282076245490090389328944075868508455133942304583236903222948165808559332123347747879e-0",
		"00000000000000000000000000.1", "0e999999", "123456789012345678", "12345678.12345678", "87654321", "-1234567.7654321", "7.", ".7", "-.7"}
	rng := rand.New(rand.NewPCG(1, 2))
	for range 20000 {
		n := 1 + rng.IntN(24)
		var b strings.Builder
		if rng.IntN(2) == 0 {
			b.WriteByte('-')
		}
		mark := rng.IntN(n + 1)
		for i := range n {
			if i == mark {
				b.WriteByte('.')
			}
			b.WriteByte(byte('0' + rng.IntN(10)))
		}
		if rng.IntN(4) == 0 {
			fmt.Fprintf(&b, "e%d", rng.IntN(80)-40)
		}
		cases = append(cases, b.String())
	}
	for _, s := range cases {
		hi, lo, status := ParseString(s)
		wh, wl := exact(s)
		if status != Number || hi != wh || lo != wl {
			t.Errorf("ParseString(%q) = %v, %v, %d, want %v, %v", s, hi, lo, status, wh, wl)
		}
		c := strings.Replace(s, ".", ",", 1)
		if h, l, st := Parse([]byte(c), ','); h != hi || l != lo || st != status {
			t.Errorf("Parse(%q, ',') = %v, %v, %d, want %v, %v", c, h, l, st, hi, lo)
		}
	}
}

func TestParseStatus(t *testing.T) {
	for _, s := range []string{"", "-", "+", ".", "e5", "1e", "1e+", "1.2.3", "1,5", "0x10", "1_000", " 1", "1 ", "--1", "1f", "0000000\xa4", "12\xb5", "\xb01234567", "n/a", "infinit", strings.Repeat("1", MaxLength+1)} {
		if hi, lo, st := ParseString(s); st != NotNumber || !math.IsNaN(hi) || !math.IsNaN(lo) {
			t.Errorf("ParseString(%.20q) = %v, %v, %d, want NotNumber", s, hi, lo, st)
		}
	}
	for _, s := range []string{"NaN", "nan", "Inf", "-inf", "+Infinity", "1e309", "-1e400", "1e99999999999999999999"} {
		if hi, lo, st := ParseString(s); st != NotFinite || !math.IsNaN(hi) || !math.IsNaN(lo) {
			t.Errorf("ParseString(%q) = %v, %v, %d, want NotFinite", s, hi, lo, st)
		}
	}
	for _, s := range []string{"1e-400", "0e99999999999999999999", "1e-99999999999999999999", "-0"} {
		if hi, lo, st := ParseString(s); st != Number || hi != 0 || lo != 0 {
			t.Errorf("ParseString(%q) = %v, %v, %d, want 0", s, hi, lo, st)
		}
	}
}

func TestText(t *testing.T) {
	for _, s := range []string{"0.1", "12.5", "1000000000000.4", "3.14159265358979323846264338327950", "-2.5e-30", "9007199254740993", "0.30000000000000004441"} {
		hi, lo, _ := ParseString(s)
		got := Text(hi, lo)
		if h, l, _ := ParseString(got); h != hi || l != lo {
			t.Errorf("Text of %s = %s, which reads %v, %v", s, got, h, l)
		}
	}
	if got := Text(0.5, 0); got != "0.5" {
		t.Errorf("Text(0.5, 0) = %s", got)
	}
	hi, lo, _ := ParseString("0.1")
	if got := Text(hi, lo); got != "0.1" {
		t.Errorf("Text of 0.1 = %s", got)
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"0.1", "1e5", "-12.345e-6", "nan", "12345678901234567890.5", "1e-400"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		hi, lo, st := ParseString(s)
		if st != Number {
			if !math.IsNaN(hi) || !math.IsNaN(lo) {
				t.Fatalf("ParseString(%q) = %v, %v with status %d", s, hi, lo, st)
			}
			return
		}
		want, err := strconv.ParseFloat(s, 64)
		if err != nil || hi != want {
			t.Fatalf("ParseString(%q): hi %v, want %v, %v", s, hi, want, err)
		}
		if hi != 0 && len(s) < 200 {
			if _, wl := exact(s); lo != wl {
				t.Fatalf("ParseString(%q): lo %v, want %v", s, lo, wl)
			}
		}
	})
}

func BenchmarkParse(b *testing.B) {
	for _, s := range []string{"12.345", "-0.123456789012", "1000000000000.4", "0.1234567890123456789", "3.14159265358979323846264338"} {
		text := []byte(s)
		b.Run(s+"/pair", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				Parse(text, '.')
			}
		})
		b.Run(s+"/ParseFloat", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				_, _ = strconv.ParseFloat(s, 64)
			}
		})
	}
}

// TestScanInText reads numbers with text after them, which the quick way needs to see.
func TestScanInText(t *testing.T) {
	const rest = ";next field, long enough for whole words"
	for _, s := range []string{"0", "7", "-7", "+12.5", "12.", ".5", "-.5", "1234567", "12345678", "1234567.1234567", "0.0000001", "123.12345678",
		"1e3", "1.5e3", "1.5E-3", "9999999.9999999", "0000000.1", "12345678901234567890", "9007199254740993"} {
		for _, after := range []string{rest, "\n" + rest, ":" + rest, "\xa4" + rest} {
			hi, lo, n, ok := Scan([]byte(s+after), '.')
			if !ok {
				if _, _, m, alone := Scan([]byte(s), '.'); alone {
					t.Errorf("%q is read alone (%d bytes) and not before %q", s, m, after)
				}
				continue
			}
			if wh, wl := exact(s); n != len(s) || hi != wh || lo != wl {
				t.Errorf("Scan(%q) = %v, %v, %d, want %v, %v, %d", s+after, hi, lo, n, wh, wl, len(s))
			}
		}
	}
	for _, s := range []string{".", "-", "+.", "e5", "x", ""} {
		if _, _, n, ok := Scan([]byte(s+rest), '.'); ok {
			t.Errorf("Scan(%q) takes %d bytes for a number", s+rest, n)
		}
	}
}
