package scanfile

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"golang.org/x/text/encoding"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"

	"tarnlight/eem"
)

// style is one way of writing a file.
type style struct {
	delim, dec, eol string
	enc             string
}

func (s style) String() string { return fmt.Sprintf("%q %q %q %s", s.delim, s.dec, s.eol, s.enc) }

// number writes v so that it reads back to the same bits.
func (s style) number(v float64) string {
	if math.IsNaN(v) {
		if s.delim == " " {
			return "NaN"
		}
		return ""
	}
	t := strings.Replace(fmt.Sprint(v), ".", s.dec, 1)
	if s.delim == "," && s.dec == "," {
		return `"` + t + `"`
	}
	return t
}

func (s style) row(cells ...string) string { return strings.Join(cells, s.delim) + s.eol }

func (s style) encode(t *testing.T, text string) []byte {
	t.Helper()
	var e encoding.Encoding
	switch s.enc {
	case "UTF-8":
		return []byte(text)
	case "UTF-8 BOM":
		return append([]byte("\xef\xbb\xbf"), text...)
	case "Windows-1252":
		e = charmap.Windows1252
	case "UTF-16 LE":
		e = unicode.UTF16(unicode.LittleEndian, unicode.IgnoreBOM)
	case "UTF-16 LE BOM":
		e = unicode.UTF16(unicode.LittleEndian, unicode.UseBOM)
	case "UTF-16 BE":
		e = unicode.UTF16(unicode.BigEndian, unicode.IgnoreBOM)
	case "UTF-16 BE BOM":
		e = unicode.UTF16(unicode.BigEndian, unicode.UseBOM)
	}
	b, err := e.NewEncoder().Bytes([]byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// styles are all lawful ways of writing.
func styles() (out []style) {
	for _, delim := range []string{",", ";", "\t", " "} {
		for _, dec := range []string{".", ","} {
			for _, eol := range []string{"\n", "\r\n", "\r"} {
				for _, enc := range []string{"UTF-8", "UTF-8 BOM", "Windows-1252", "UTF-16 LE", "UTF-16 LE BOM", "UTF-16 BE", "UTF-16 BE BOM"} {
					out = append(out, style{delim, dec, eol, enc})
				}
			}
		}
	}
	return out
}

// small is an EEM of 3 excitations and 9 emissions with numbers that need all
// their digits, a negative one, a tiny one and two missing cells.
func small(t *testing.T) *eem.EEM {
	ex, err := eem.NewAxis([]float64{240, 252.5, 300})
	if err != nil {
		t.Fatal(err)
	}
	em, err := eem.Steps(310, 350, 5)
	if err != nil {
		t.Fatal(err)
	}
	g := eem.Grid{Ex: ex, Em: em}
	f := make([]float64, g.Cells())
	for j := range ex.Len() {
		for k := range em.Len() {
			f[g.Index(j, k)] = 1000 * math.Exp(-math.Pow((em.At(k)-330-5*float64(j))/11.7, 2)) / float64(j+1)
		}
	}
	f[0], f[1], f[2], f[4] = -0.175, 3.25e-07, math.NaN(), 1234.5
	f[len(f)-1] = math.NaN()
	return eem.FromCells(g, eem.Counts, f)
}

// written returns the files of one EEM in one form.
func written(e *eem.EEM, form string, s style) map[string]string {
	files := map[string]string{}
	head := "Gerät µ-Lumen é" + s.eol
	var b strings.Builder
	switch form {
	case "stack name", "stack header":
		for j := range e.Ex.Len() {
			b.Reset()
			b.WriteString(head)
			name := fmt.Sprintf("S1_ex%v.txt", e.Ex.At(j))
			if form == "stack header" {
				name = fmt.Sprintf("scan%03d.txt", j)
				b.WriteString("Excitation wavelength (nm): " + s.number(e.Ex.At(j)) + s.eol)
			}
			b.WriteString(s.row("wavelength", "intensity"))
			for k := range e.Em.Len() {
				b.WriteString(s.row(s.number(e.Em.At(k)), s.number(e.At(j, k))))
			}
			files[name] = b.String()
		}
	case "grid":
		b.WriteString(s.row(append([]string{`em_nm\ex_nm`}, numbers(s, e.Ex)...)...))
		for k := range e.Em.Len() {
			row := []string{s.number(e.Em.At(k))}
			for j := range e.Ex.Len() {
				row = append(row, s.number(e.At(j, k)))
			}
			b.WriteString(s.row(row...))
		}
		files["S1.csv"] = b.String()
	case "transpose", "transpose bare":
		corner := "x" // says nothing: physics decides
		if form == "transpose" {
			corner = `ex_nm\em_nm`
		}
		b.WriteString(head + s.row(append([]string{corner}, numbers(s, e.Em)...)...))
		for j := range e.Ex.Len() {
			row := []string{s.number(e.Ex.At(j))}
			for k := range e.Em.Len() {
				row = append(row, s.number(e.At(j, k)))
			}
			b.WriteString(s.row(row...))
		}
		b.WriteString("End of data" + s.eol)
		files["S1.csv"] = b.String()
	case "long", "long bare":
		if form == "long" {
			b.WriteString(head + s.row("em_nm", "intensity", "ex_nm"))
		}
		for j := range e.Ex.Len() {
			for k := range e.Em.Len() {
				ex, em, f := s.number(e.Ex.At(j)), s.number(e.Em.At(k)), s.number(e.At(j, k))
				if form == "long" {
					b.WriteString(s.row(em, f, ex))
				} else {
					b.WriteString(s.row(ex, em, f))
				}
			}
		}
		files["S1.csv"] = b.String()
	case "pairs":
		var names, titles []string
		for j := range e.Ex.Len() {
			names = append(names, fmt.Sprintf("S1_ex%v", e.Ex.At(j)), "-")
			titles = append(titles, "nm", "counts")
		}
		b.WriteString(s.row(names...) + s.row(titles...))
		for k := range e.Em.Len() {
			var row []string
			for j := range e.Ex.Len() {
				row = append(row, s.number(e.Em.At(k)), s.number(e.At(j, k)))
			}
			b.WriteString(s.row(row...))
		}
		files["S1.csv"] = b.String()
	case "below":
		for j := range e.Ex.Len() {
			b.WriteString(s.eol + "EX: " + s.number(e.Ex.At(j)) + " nm" + s.eol + s.row("nm", "counts"))
			for k := range e.Em.Len() {
				b.WriteString(s.row(s.number(e.Em.At(k)), s.number(e.At(j, k))))
			}
		}
		files["S1.csv"] = b.String()
	}
	return files
}

func numbers(s style, a eem.Axis) []string {
	var out []string
	for _, v := range a.Values() {
		out = append(out, s.number(v))
	}
	return out
}

// One EEM in every form, delimiter, decimal mark, encoding and line end reads to
// the same bits, with nothing set.
func TestEveryFormReadsAlike(t *testing.T) {
	want := small(t)
	forms := map[string]Form{"stack name": Stack, "stack header": Stack, "grid": Grid, "transpose": Grid,
		"transpose bare": Grid, "long": Long, "long bare": Long, "pairs": Stack, "below": Stack}
	for form, want1 := range forms {
		for _, s := range styles() {
			var scans []eem.Scan
			for name, text := range written(want, form, s) {
				f, err := ReadBytes(name, s.encode(t, text), nil)
				if err != nil {
					t.Fatalf("%s %v: %v\n%s", form, s, err, text)
				}
				if f.Form != want1 || f.Delimiter != s.delim || f.Decimal != s.dec || !strings.HasPrefix(s.enc, f.Encoding) && !(form[:4] == "grid" || form[:4] == "long" || form == "pairs" || form == "below") {
					t.Fatalf("%s %v: taken for %s %q %q %s", form, s, f.Form, f.Delimiter, f.Decimal, f.Encoding)
				}
				scans = append(scans, f.Scans...)
			}
			got, err := eem.FromScans(scans)
			if err != nil {
				t.Fatalf("%s %v: %v", form, s, err)
			}
			sameBits(t, form+" "+s.String(), got, want)
		}
	}
}
