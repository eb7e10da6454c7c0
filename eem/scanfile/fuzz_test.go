package scanfile

import (
	"archive/zip"
	"bytes"
	"math"
	"reflect"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

// named fails for an error that does not begin with the file or the setting.
func named(t *testing.T, name string, err error) {
	t.Helper()
	if !strings.HasPrefix(err.Error(), name+":") && !strings.HasPrefix(err.Error(), "setting ") {
		t.Errorf("error without place: %v", err)
	}
}

func checkAxis(t *testing.T, a eem.Axis, f []float64) {
	t.Helper()
	if a.Len() < 2 || len(f) != a.Len() {
		t.Fatalf("axis %v with %d values", a, len(f))
	}
	for i := range f {
		if math.IsInf(f[i], 0) || i > 0 && a.At(i)-a.At(i-1) <= sameNM {
			t.Fatalf("%v: value %g at %g nm", a, f[i], a.At(i))
		}
	}
}

func checkNotes(t *testing.T, notes []eem.Note) {
	t.Helper()
	for _, n := range notes {
		if _, ok := eem.FindTest(n.Test); !ok || n.Msg == "" {
			t.Fatalf("note %+v", n)
		}
	}
}

func fuzzScan(f *testing.F, forms []string, s Settings) {
	e := small(&testing.T{})
	for _, form := range forms {
		for _, st := range []style{{",", ".", "\n", ""}, {";", ",", "\r\n", ""}, {" ", ".", "\r", ""}, {"\t", ",", "\n", ""}} {
			for name, text := range written(e, form, st) {
				f.Add(name, []byte(text), "")
			}
		}
	}
	f.Fuzz(func(t *testing.T, name string, data []byte, pattern string) {
		s := s
		s.Excitation = pattern
		testkit.Bounded(t, len(data)+len(name), func() {
			for _, set := range []*Settings{nil, &s} {
				file, err := ReadBytes(name, data, set)
				if err != nil {
					named(t, name, err)
					continue
				}
				if len(file.Scans) == 0 || len(file.Samples) != 0 && len(file.Samples) != len(file.Scans) {
					t.Fatalf("%d scans, %d samples", len(file.Scans), len(file.Samples))
				}
				for _, sc := range file.Scans {
					checkAxis(t, sc.Em, sc.F)
					if sc.File != name || sc.Line < 1 || !(sc.Ex >= lowestNM && sc.Ex <= highestNM) {
						t.Fatalf("scan of %q, line %d, ex %g", sc.File, sc.Line, sc.Ex)
					}
				}
				checkNotes(t, file.Notes)
			}
		})
	})
}

func FuzzStack(f *testing.F) {
	fuzzScan(f, []string{"stack name", "stack header", "pairs", "below"}, Settings{Form: Stack})
}
func FuzzGrid(f *testing.F) {
	fuzzScan(f, []string{"grid", "transpose", "transpose bare"}, Settings{Form: Grid})
}
func FuzzLong(f *testing.F) { fuzzScan(f, []string{"long", "long bare"}, Settings{Form: Long}) }

func FuzzAbsorbance(f *testing.F) {
	f.Add([]byte("wavelength_nm,absorbance\n240,0.25\n250,0.1875\n"))
	f.Add([]byte("x\ty\r\nnm\tAbs\r\n270\t0,0125\r\n260\tNaN\r\n250\t0,25\r\nend"))
	f.Fuzz(func(t *testing.T, data []byte) {
		testkit.Bounded(t, len(data), func() {
			a, notes, err := ReadAbsorbanceBytes("a.csv", data, nil)
			if err != nil {
				named(t, "a.csv", err)
				return
			}
			checkAxis(t, a.Axis, a.A)
			checkNotes(t, notes)
			if a.PathCM != 1 {
				t.Fatalf("path %g", a.PathCM)
			}
		})
	})
}

func FuzzFactors(f *testing.F) {
	f.Add([]byte("wavelength_nm,factor,standard_uncertainty\n240,1.25,0.01\n250,1.5,0.02\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		testkit.Bounded(t, len(data), func() {
			v, notes, err := ReadFactorsBytes("f.csv", data, nil)
			if err != nil {
				named(t, "f.csv", err)
				return
			}
			checkAxis(t, v.Axis, v.Factor)
			if v.U != nil {
				checkAxis(t, v.Axis, v.U)
			}
			checkNotes(t, notes)
		})
	})
}

func checkTable(t *testing.T, name string, tab *Table, err error) {
	t.Helper()
	if err != nil {
		named(t, name, err)
		return
	}
	for _, r := range tab.Rows {
		if len(r.Cells) < len(tab.Header) || r.Line < 1 {
			t.Fatalf("line %d has %d cells of %d", r.Line, len(r.Cells), len(tab.Header))
		}
	}
	checkNotes(t, tab.Notes)
}

func FuzzTableCSV(f *testing.F) {
	f.Add([]byte("id,kind,scans\nS1,sample,\"a, b\"\n"))
	f.Add([]byte("id;kind\r\nS1;\"x\r\ny\"\r\n\r\n;\r\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		// A wide header makes every short row as wide: bounded by maxTableCells,
		// not by the size of the file.
		tab, err := ReadTableBytes("t.csv", data)
		checkTable(t, "t.csv", tab, err)
	})
}

// The parts are mutated, not the archive, whose check sums would stop nearly
// every change.
func FuzzTableXLSX(f *testing.F) {
	const head = `<?xml version="1.0"?>`
	f.Add([]byte(head+`<worksheet><sheetData><row r="1"><c r="A1" t="s"><v>0</v></c><c r="B1" t="inlineStr"><is><t>kind</t></is></c></row>`+
		`<row r="3" hidden="1"><c r="A3" s="1"><v>45000.5</v></c><c r="B3"><f>1+1</f><v>2</v></c></row></sheetData><mergeCells><mergeCell ref="A9"/></mergeCells></worksheet>`),
		[]byte(head+`<sst><si><t>id</t></si><si><r><t>a</t></r><r><t>b</t></r></si></sst>`),
		[]byte(head+`<styleSheet><numFmts><numFmt numFmtId="164" formatCode="yyyy"/></numFmts><cellXfs><xf numFmtId="0"/><xf numFmtId="164"/></cellXfs></styleSheet>`))
	f.Fuzz(func(t *testing.T, sheet, texts, styles []byte) {
		var b bytes.Buffer
		z := zip.NewWriter(&b)
		for name, part := range map[string][]byte{
			"_rels/.rels":     []byte(`<Relationships><Relationship Id="r1" Type="x/officeDocument" Target="xl/workbook.xml"/></Relationships>`),
			"xl/workbook.xml": []byte(`<workbook><sheets><sheet name="S" id="r1"/></sheets></workbook>`),
			"xl/_rels/workbook.xml.rels": []byte(`<Relationships><Relationship Id="r1" Type="x/worksheet" Target="s.xml"/>` +
				`<Relationship Id="r2" Type="x/sharedStrings" Target="t.xml"/><Relationship Id="r3" Type="x/styles" Target="/xl/y.xml"/></Relationships>`),
			"xl/s.xml": sheet, "xl/t.xml": texts, "xl/y.xml": styles,
		} {
			w, err := z.CreateHeader(&zip.FileHeader{Name: name, Method: zip.Store})
			if err != nil {
				t.Fatal(err)
			}
			if _, err := w.Write(part); err != nil {
				t.Fatal(err)
			}
		}
		if err := z.Close(); err != nil {
			t.Fatal(err)
		}
		tab, err := ReadTableBytes("t.xlsx", b.Bytes())
		checkTable(t, "t.xlsx", tab, err)
	})
}

func FuzzPattern(f *testing.F) {
	f.Add("{id}_ex{nm}", "S1_ex240.txt")
	f.Add("{date}/{kind}*{n}", "a/2026-05-03/blank_1")
	f.Fuzz(func(t *testing.T, pattern, name string) {
		testkit.Bounded(t, len(pattern)+len(name), func() {
			p, err := CompilePattern(pattern)
			if err != nil {
				return
			}
			if p.String() != pattern {
				t.Fatal(p.String())
			}
			got, ok := p.Match(name)
			if ok && len(got) != len(p.names) {
				t.Fatalf("%v", got)
			}
			if id, has := got["id"]; has && (id == "" || strings.Contains(id, "/")) {
				t.Fatalf("id %q", id)
			}
		})
	})
}

func FuzzNumber(f *testing.F) {
	for _, s := range []string{"1,234.5", "1.23E+03", "-0,858", "12'345", "\u22125", "99999999999999999999"} {
		f.Add(s, ".")
		f.Add(s, ",")
		f.Add(s, "")
	}
	f.Fuzz(func(t *testing.T, s, dec string) {
		v, err := ParseNumber(s, dec)
		if err == nil && (math.IsNaN(v) || math.IsInf(v, 0)) {
			t.Fatalf("%q is %v", s, v)
		}
		if err == nil && Missing(s) {
			t.Fatalf("%q is a number and missing", s)
		}
	})
}

func FuzzLook(f *testing.F) {
	for _, form := range []string{"stack name", "grid", "long", "below"} {
		for name, text := range written(small(&testing.T{}), form, style{",", ".", "\n", ""}) {
			f.Add(name, []byte(text))
		}
	}
	f.Add("runsheet.csv", []byte("id,kind\nS1,sample\n"))
	f.Fuzz(func(t *testing.T, name string, data []byte) {
		a, b := Look(name, data, nil), Look(name, data, nil)
		a.Err, b.Err = nil, nil
		for _, g := range []*Guess{&a, &b} {
			if math.IsNaN(g.Ex[0]) {
				g.Ex = [2]float64{}
			}
			if math.IsNaN(g.Em[0]) {
				g.Em = [2]float64{}
			}
		}
		if !reflect.DeepEqual(a, b) {
			t.Fatalf("%+v and %+v", a, b)
		}
	})
}

func FuzzJCAMP(f *testing.F) {
	for _, name := range []string{"affn", "pac", "sqz", "dif", "difdup", "xypoints", "compound"} {
		f.Add(jcampFile(f, name+".dx"))
	}
	f.Add([]byte(jcampText()))
	f.Fuzz(func(t *testing.T, data []byte) {
		// A run of equal ordinates is three bytes however long it is: what comes
		// out is bounded by maxJCAMPPoints, not by the size of the file.
		const runs = 8 * 8 * maxJCAMPPoints / 40
		testkit.Bounded(t, len(data)+runs, func() {
			file, err := ReadBytes("s.dx", data, &Settings{Form: JCAMP})
			if err != nil {
				named(t, "s.dx", err)
				return
			}
			for _, s := range file.Scans {
				checkAxis(t, s.Em, s.F)
			}
			checkNotes(t, file.Notes)
		})
	})
}
