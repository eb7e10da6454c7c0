package scanfile

import (
	"bytes"
	"math"
	"path/filepath"
	"strings"

	"tarnlight/eem"
)

// Look says what a file probably is, by its content: words in the header first,
// then whether an excitation is given, then what the numbers look like. s says how
// scans are read, nil by their content. It never fails; Guess.Err says what the
// reader of that kind of file finds wrong.
func Look(name string, data []byte, s *Settings) Guess {
	switch ext := strings.ToLower(filepath.Ext(name)); {
	case ext == ".xlsx" || ext == ".xlsm" || bytes.HasPrefix(data, []byte("PK\x03\x04")):
		return lookTable(name, data, WorkbookContent)
	}
	r, err := open(name, data, s)
	if err != nil {
		g := newGuess(Unknown)
		g.Why, g.Err, g.NoText = strings.TrimLeft(strings.TrimPrefix(err.Error(), name), ":0123456789 "), err, true
		return g
	}
	if isJCAMP(r.text) {
		return lookJCAMP(name, data)
	}
	words := headWords(r.text)
	switch {
	case words[absorbanceRole] && !words[intensityRole] && !words[exRole]:
		return lookAbsorbance(name, data, "a header line names absorbance")
	case words[factorRole] && !words[intensityRole]:
		return lookFactors(name, data)
	}
	f, scanErr := ReadBytes(name, data, s)
	if scanErr == nil {
		return lookScans(f)
	}
	if isSheet(r.text) {
		return lookTable(name, data, TableContent)
	}
	if a, _, err := ReadAbsorbanceBytes(name, data, nil); err == nil && looksAbsorbing(name, a) {
		return lookAbsorbance(name, data, "two columns that fall off towards long wavelengths as absorbance does, and no excitation")
	}
	g := newGuess(Unknown)
	if err := r.cut(); err == nil && r.mainBlocks() == nil && len(r.main) > 0 {
		g.Content = ScanContent
		g.Form = r.form(&r.main[0])
		g.Why = "rows of numbers, but not readable as scans yet"
	} else if t, err := ReadTableBytes(name, data); err == nil && headsGrid(t) {
		g.Content, g.Form = ScanContent, Grid
		g.Why = "a header of wavelengths, but not readable as scans yet"
	} else if err == nil && len(t.Header) > 1 {
		return lookTable(name, data, TableContent)
	} else {
		g.Why = "no rows of numbers"
	}
	g.Err = scanErr
	return g
}

func lookScans(f *File) Guess {
	g := newGuess(ScanContent)
	g.Form, g.Excitations, g.Samples = f.Form, len(f.Scans), f.Names()
	g.Why = f.Notes[0].Msg
	g.Ex, g.Em = span{}.nan(), span{}.nan()
	for _, s := range f.Scans {
		g.Ex = span(g.Ex).with(s.Ex)
		g.Em = span(g.Em).with(s.Em.First())
		g.Em = span(g.Em).with(s.Em.Last())
	}
	return g
}

// span is a range of wavelengths, NaN while empty.
type span [2]float64

func (span) nan() [2]float64 { return [2]float64{math.NaN(), math.NaN()} }

func (s span) with(v float64) [2]float64 {
	if !(s[0] <= v) {
		s[0] = v
	}
	if !(s[1] >= v) {
		s[1] = v
	}
	return s
}

func lookAbsorbance(name string, data []byte, why string) Guess {
	g := newGuess(AbsorbContent)
	g.Why = why
	a, _, err := ReadAbsorbanceBytes(name, data, nil)
	if g.Err = err; err == nil {
		g.Em = [2]float64{a.Axis.First(), a.Axis.Last()}
	}
	return g
}

func lookFactors(name string, data []byte) Guess {
	g := newGuess(FactorContent)
	g.Why = "a header line names factors"
	f, _, err := ReadFactorsBytes(name, data, nil)
	if g.Err = err; err == nil {
		g.Em = [2]float64{f.Axis.First(), f.Axis.Last()}
	}
	return g
}

func lookTable(name string, data []byte, c Content) Guess {
	g := newGuess(c)
	t, err := ReadTableBytes(name, data)
	if g.Err = err; err == nil {
		g.Why = "a table with the columns " + clip([]byte(strings.Join(t.Header, ", ")))
	}
	return g
}

// headLines is how many lines at the top Look takes for a header.
const headLines = 60

// headWords says which quantities the words at the top of a file name.
func headWords(text []byte) (has [percentRole + 1]bool) {
	for range headLines {
		if len(text) == 0 {
			break
		}
		var line []byte
		line, text = cutLine(text)
		for _, d := range []byte("\t;,:") {
			if bytes.IndexByte(line, d) < 0 && d != '\t' {
				continue
			}
			for i, f := range splitFields(line[:min(len(line), 2000)], d) {
				if k, _ := roleOf(f); i < 50 {
					has[k] = true
				}
			}
		}
	}
	return has
}

// lookJCAMP says what a JCAMP-DX file holds by its own YUNITS.
func lookJCAMP(name string, data []byte) Guess {
	f, err := ReadBytes(name, data, nil)
	if err == nil {
		return lookScans(f)
	}
	if a := lookAbsorbance(name, data, "JCAMP-DX with YUNITS of absorbance"); a.Err == nil {
		return a
	}
	g := newGuess(ScanContent)
	g.Form, g.Why, g.Err = JCAMP, "JCAMP-DX, but not readable as scans yet", err
	return g
}

// headsGrid says whether a header has wavelengths alone behind its first cell, as a
// grid has that breaks off in the middle of a line.
func headsGrid(t *Table) bool {
	if len(t.Header) < 3 {
		return false
	}
	for _, h := range t.Header[1:] {
		if v, err := ParseNumber(h, ""); err != nil || !(v >= 150 && v <= 1500) {
			return false
		}
	}
	return true
}

// isSheet says whether the header names bottles and kinds: a run sheet, not a
// scan.
func isSheet(text []byte) bool {
	head, _ := cutLine(bytes.TrimLeft(text, "\r\n "))
	id, kind := false, false
	for _, f := range splitFields(head, tableDelimiter(head)) {
		id = id || strings.EqualFold(string(f), "id")
		kind = kind || strings.EqualFold(string(f), "kind")
	}
	return id && kind
}

// looksAbsorbing says whether a spectrum without words is likely an absorbance:
// it spans 100 nm or more, no value is above 6, and its short-wave third is on
// average at least as high as its long-wave third. The name may say so too.
func looksAbsorbing(name string, a *eem.Absorbance) bool {
	n := a.Axis.Len()
	if n < 6 || a.Axis.Last()-a.Axis.First() < 100 {
		return false
	}
	top := 0.0
	mean := func(v []float64) float64 {
		sum, k := 0.0, 0.0
		for _, x := range v {
			if x == x {
				sum += x
				k++
				top = max(top, math.Abs(x))
			}
		}
		return sum / k
	}
	short, mid, long := mean(a.A[:n/3]), mean(a.A[n/3:n-n/3]), mean(a.A[n-n/3:])
	if top > 6 {
		return false
	}
	base := strings.ToLower(lastElements(filepath.ToSlash(name), 2))
	named := strings.Contains(base, "abs") || strings.Contains(base, "uv")
	return named || short >= mid && mid >= long
}
