package scanfile

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestParseNumber(t *testing.T) {
	for _, c := range []struct {
		in, dec string
		want    float64
	}{
		{"1,23E+03", ",", 1230}, {"1,23E+03", "", 1230}, {"1.23e3", "", 1230}, {"1,5", "", 1.5}, {"0,858", "", 0.858},
		{"1,234.5", "", 1234.5}, {"1.234,5", "", 1234.5}, {"1.234.567", ",", 1234567}, {"1,234,567", "", 1234567},
		{"1.234.567", "", 1234567}, {"1,234", ".", 1234}, {"1,234", ",", 1.234}, {"1.234", "", 1.234}, {"1.234", ",", 1234},
		{"12'345.5", "", 12345.5}, {"12 345,5", "", 12345.5}, {"12\u00a0345,5", "", 12345.5}, {"12\u202f345", "", 12345},
		{"\u22125", "", -5}, {"+5", "", 5}, {" 7 ", "", 7}, {".5", "", 0.5}, {"5.", "", 5}, {"1D3", "", 1000}, {"-0,175", ",", -0.175},
		{"0.1", "", 0.1}, {"123456789012345678901234567890", "", 1.2345678901234568e29}, {"1e-400", "", 0},
	} {
		got, err := ParseNumber(c.in, c.dec)
		if err != nil || got != c.want {
			t.Errorf("ParseNumber(%q, %q) = %v, %v; want %v", c.in, c.dec, got, err, c.want)
		}
	}
	for _, c := range [][2]string{{"1,234", ""}, {"-1,234", ""}, {"", ""}, {"NaN", ""}, {"inf", ""}, {"1e999", ""}, {"0x1p3", ""}, {"1_000", ""},
		{"12,34.5", ""}, {"1,23,456", "."}, {"0,123", "."}, {"1'23", ""}, {"1 2", ""}, {"1e", ""}, {"e5", ""}, {"--1", ""}, {".", ""}, {"1.2.3", "."}, {"1", ";"}} {
		if got, err := ParseNumber(c[0], c[1]); err == nil {
			t.Errorf("ParseNumber(%q, %q) = %v without error", c[0], c[1], got)
		}
	}
}

// Every number that strconv writes reads to the bits that strconv reads, with a
// point and with a comma, by the fast path or the slow one.
func TestParseNumberBits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64().Draw(t, "v")
		format := rapid.SampledFrom([]byte("efg")).Draw(t, "format")
		prec := rapid.IntRange(-1, 20).Draw(t, "precision")
		text := strconv.FormatFloat(v, format, prec, 64)
		want, err := strconv.ParseFloat(text, 64)
		if err != nil || len(text) > maxNumberBytes {
			return
		}
		for _, dec := range []string{".", ","} {
			got, err := ParseNumber(strings.Replace(text, ".", dec, 1), dec)
			if err != nil || math.Float64bits(got) != math.Float64bits(want) {
				t.Fatalf("%q with %q: %v, %v; want %v", text, dec, got, err, want)
			}
		}
	})
}

func TestDecimalMark(t *testing.T) {
	for _, c := range []struct {
		cells []string
		want  string
	}{
		{nil, "."}, {[]string{"1", "S1", ""}, "."}, {[]string{"1,5", "2"}, ","}, {[]string{"1,234", "0,5"}, ","}, {[]string{"1,234", "0.5"}, "."},
		{[]string{"1.234"}, "."}, {[]string{"1.234", "1,5"}, ","}, {[]string{"03.05.2026", "1,5"}, ","},
	} {
		if got, err := DecimalMark(c.cells); err != nil || got != c.want {
			t.Errorf("DecimalMark(%q) = %q, %v; want %q", c.cells, got, err, c.want)
		}
	}
	for _, cells := range [][]string{{"1,234"}, {"1,234", "12"}, {"0.5", "0,5"}} {
		if got, err := DecimalMark(cells); err == nil {
			t.Errorf("DecimalMark(%q) = %q without error", cells, got)
		}
	}
}

func TestMissing(t *testing.T) {
	for _, s := range []string{"", " ", "NaN", "nan", "NA", "N/A", "n.a.", "---", "-", "####", "OVER", "over", "OVERFLOW", "inf", "*****", "#N/A", "–"} {
		if !Missing(s) {
			t.Errorf("%q is not taken as missing", s)
		}
	}
	for _, s := range []string{"0", "-1", "1e5", "abc", "S1", ".", "overall", "-x"} {
		if Missing(s) {
			t.Errorf("%q is taken as missing", s)
		}
	}
}

// The eight-digit path, the loop over digits and strconv agree on every text,
// whatever follows.
func TestRowsAgree(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		field := rapid.StringMatching(`[-+]?[0-9]{0,10}([.,][0-9]{0,10})?([eE][-+]?[0-9]{0,3})?[ xµºý]?`)
		fields := rapid.SliceOfN(field, 1, 5).Draw(t, "fields")
		eol := rapid.SampledFrom([]string{"", "\n", "\r\n"}).Draw(t, "end")
		for _, delim := range []byte("\t;") {
			for _, dec := range []byte(".,") {
				line := strings.Join(fields, string(delim))
				quick, slow := newRowReader(new(store), delim, dec, 0), newRowReader(new(store), delim, dec, 0)
				n, used := quick.plainRow([]byte(line + eol))
				if n == 0 {
					continue
				}
				m, kind := slow.row([]byte(line), false)
				if used != len(line+eol) || m != n || kind != numberRow {
					t.Fatalf("%q: %d cells in %d bytes, and %d of kind %d", line, n, used, m, kind)
				}
				for i := range n {
					want := math.NaN()
					if f := strings.TrimSpace(fields[i]); f != "" {
						var err error
						if want, err = strconv.ParseFloat(strings.Replace(f, string(dec), ".", 1), 64); err != nil {
							t.Fatal(err)
						}
					}
					a, b := math.Float64bits(quick.cells[i]), math.Float64bits(slow.cells[i])
					if a != b || a != math.Float64bits(want) && want == want {
						t.Fatalf("%q: %v and %v, want %v", line, quick.cells[i], slow.cells[i], want)
					}
				}
			}
		}
	})
}

// Every byte that is no digit ends the digits, whatever stands around it.
func TestEightDigits(t *testing.T) {
	for n := range 9 {
		for c := range 256 {
			b := []byte("12345678")
			if n < 8 {
				if byte(c)-'0' <= 9 {
					continue
				}
				b[n] = byte(c)
			}
			want := 0
			for _, d := range b[:n] {
				want = want*10 + int(d-'0')
			}
			if v, got := eightDigits(b); got != n || v != uint64(want) {
				t.Fatalf("%q: %d of %d digits", b, v, got)
			}
		}
	}
}
