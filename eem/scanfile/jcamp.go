package scanfile

import (
	"bytes"
	"math"
	"strings"

	"tarnlight/eem"
)

// JCAMP-DX: McDonald & Wilks 1988, Appl. Spectrosc. 42, 151 (version 4.24), and
// version 5.01 (1999). Read are data tables of the forms (X++(Y..Y)), evenly
// spaced with ordinates in any of the standard's codes, and (XY..XY), in simple
// files and in the blocks of compound ones.

// maxJCAMPPoints bounds the points of one block.
const maxJCAMPPoints = 100_000

// isJCAMP says whether a text is labelled data records: ##LABEL= at its start.
func isJCAMP(text []byte) bool {
	text = bytes.TrimLeft(text, " \t\r\n")
	for bytes.HasPrefix(text, []byte("$$")) { // comments
		_, text = cutLine(text)
		text = bytes.TrimLeft(text, " \t\r\n")
	}
	line, _ := cutLine(text)
	return bytes.HasPrefix(line, []byte("##")) && bytes.IndexByte(line, '=') > 0
}

// jcampBlock is one block: its records by label, and its data table.
type jcampBlock struct {
	line   int // of ##TITLE=
	values map[string]string
	text   []string // the records as written, for the excitation
	form   string   // of the data table, such as (XY..XY)
	data   []textLine
	at     int // line of the table's label
}

// label brings a label into the form in which the standard compares them.
func jcampLabel(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r == ' ' || r == '-' || r == '/' || r == '_':
			return -1
		case r >= 'a' && r <= 'z':
			return r - 'a' + 'A'
		}
		return r
	}, s)
}

// jcampBlocks cuts a file into its blocks that hold a data table.
func (r *reader) jcampBlocks() ([]*jcampBlock, error) {
	var out, open []*jcampBlock
	table := false
	text := r.text
	for no := 1; len(text) > 0; no++ {
		var line []byte
		line, text = cutLine(text)
		if i := bytes.Index(line, []byte("$$")); i >= 0 {
			line = line[:i]
		}
		label, value, ok := bytes.Cut(line, []byte("="))
		if !ok || !bytes.HasPrefix(bytes.TrimLeft(label, " "), []byte("##")) {
			if table {
				b := open[len(open)-1]
				b.data = append(b.data, textLine{no, line})
			}
			continue
		}
		name, v := jcampLabel(strings.TrimSpace(string(label))[2:]), strings.TrimSpace(string(value[:min(len(value), 1000)]))
		table = false
		switch {
		case name == "TITLE" && len(open) == 100:
			return nil, errorf(r.name, no, "blocks within blocks a hundred deep; export the spectra one by one")
		case name == "TITLE":
			open = append(open, &jcampBlock{line: no, values: map[string]string{}})
		case len(open) == 0:
			return nil, errorf(r.name, no, "the record ##%s stands outside a block; a JCAMP-DX block begins with ##TITLE= and ends with ##END=", name)
		case name == "END":
			if b := open[len(open)-1]; b.form != "" {
				out = append(out, b)
			}
			open = open[:len(open)-1]
			continue
		}
		b := open[len(open)-1]
		switch name {
		case "XYDATA", "XYPOINTS", "PEAKTABLE", "PEAKASSIGNMENTS", "NTUPLES", "RADATA":
			if b.form != "" {
				return nil, errorf(r.name, no, "a second data table in one block; export the spectra one by one")
			}
			b.form, b.at, table = name+jcampLabel(v), no, true
		default:
			b.values[name] = v
			b.text = append(b.text, name+" = "+v)
		}
	}
	if len(open) > 0 {
		return nil, errorf(r.name, open[len(open)-1].line, "the block that begins here has no ##END=; was the file cut short? Export it again")
	}
	if len(out) == 0 {
		return nil, errorf(r.name, 0, "a JCAMP-DX file without a data table (##XYDATA= or ##XYPOINTS=); export the spectrum itself")
	}
	return out, nil
}

// jcamp reads the blocks of a file as emission scans.
func (r *reader) jcamp() error {
	if !isJCAMP(r.text) {
		return errorf(r.name, 0, "does not begin with ##TITLE=, so it is no JCAMP-DX file; set scans.form")
	}
	blocks, err := r.jcampBlocks()
	if err != nil {
		return err
	}
	r.file.Form = JCAMP
	r.how = "JCAMP-DX"
	r.file.HeaderLines = blocks[0].at
	points := 0
	for _, b := range blocks {
		if u := b.values["YUNITS"]; strings.HasPrefix(strings.ToUpper(u), "ABSORB") || strings.HasPrefix(strings.ToUpper(u), "TRANS") {
			return errorf(r.name, b.line, "YUNITS is %s: no emission scan; name the file as absorbance", clip([]byte(u)))
		}
		ex, err := r.jcampEx(b, len(blocks) == 1)
		if err != nil {
			return err
		}
		x, y, err := r.jcampTable(b, &points)
		if err != nil {
			return err
		}
		axis, o, err := r.axis(x, func(int) int { return b.at + 1 })
		if err != nil {
			return err
		}
		sample := ""
		if len(blocks) > 1 {
			sample = b.value("SAMPLEDESCRIPTION", "$SAMPLE", "SAMPLE", "$SAMPLEID", "SAMPLEID")
		}
		r.add(eem.Scan{Ex: ex, Em: axis, F: o.apply(y), Line: b.at + 1}, sample)
	}
	return nil
}

func (b *jcampBlock) value(labels ...string) string {
	for _, l := range labels {
		if v := b.values[l]; v != "" {
			return v
		}
	}
	return ""
}

// jcampEx finds the excitation of a block in its records, or in the file name.
func (r *reader) jcampEx(b *jcampBlock, only bool) (float64, error) {
	lines := block{first: b.line}
	for _, t := range b.text {
		lines.gap = append(lines.gap, textLine{b.line, []byte(t)})
	}
	nm, from, ok := r.excitation(&lines, only)
	if !ok {
		return 0, r.noExcitation(&lines)
	}
	if nm > wavenumberAbove {
		nm = nmPerInvCM / nm
	}
	if !(nm >= lowestNM && nm <= highestNM) {
		return 0, errorf(r.name, b.line, "excitation %g nm (from %s) is no wavelength of a fluorometer; set scans.excitation", nm, from)
	}
	r.exFrom = from
	return nm, nil
}

// jcampAbsorbance reads a file of one block as an absorbance spectrum.
func (r *reader) jcampAbsorbance() (*eem.Absorbance, []eem.Note, error) {
	blocks, err := r.jcampBlocks()
	if err != nil {
		return nil, nil, err
	}
	b := blocks[0]
	switch u := strings.ToUpper(b.values["YUNITS"]); {
	case len(blocks) > 1:
		return nil, nil, errorf(r.name, blocks[1].line, "a second spectrum; keep one spectrum a file")
	case !strings.HasPrefix(u, "ABSORB"):
		return nil, nil, errorf(r.name, b.line, "YUNITS is %q, not ABSORBANCE; export decadic absorbance", clip([]byte(b.values["YUNITS"])))
	}
	points := 0
	x, y, err := r.jcampTable(b, &points)
	if err != nil {
		return nil, nil, err
	}
	for _, v := range y {
		if v > largestAbsorbance {
			return nil, nil, errorf(r.name, b.at, "absorbance %g; no instrument measures that: check YFACTOR and YUNITS", v)
		}
	}
	axis, o, err := r.axis(x, func(int) int { return b.at + 1 })
	if err != nil {
		return nil, nil, err
	}
	r.notes()
	return &eem.Absorbance{Axis: axis, A: o.apply(y), PathCM: 1}, r.file.Notes, nil
}

// number reads a numeric record; ok is false where it is missing.
func (r *reader) jcampNumber(b *jcampBlock, label string) (v float64, ok bool, err error) {
	s, has := b.values[label]
	if !has || s == "" {
		return 0, false, nil
	}
	if v, ok = parseNumber([]byte(s), '.'); !ok {
		return 0, false, errorf(r.name, b.line, "##%s=%s is not a number; repair the record", label, clip([]byte(s)))
	}
	return v, true, nil
}

// jcampTable reads the data table of a block, in nm. points counts those of the
// whole file: a run of equal ordinates takes three bytes however long it is.
func (r *reader) jcampTable(b *jcampBlock, points *int) (x, y []float64, err error) {
	scale := [2]float64{1, 1}
	for i, l := range []string{"XFACTOR", "YFACTOR"} {
		v, ok, err := r.jcampNumber(b, l)
		if err != nil {
			return nil, nil, err
		}
		if ok && v != 0 {
			scale[i] = v
		}
	}
	switch {
	case strings.HasSuffix(b.form, "(X++(Y..Y))"):
		x, y, err = r.jcampOrdinates(b, scale)
	case strings.HasSuffix(b.form, "(XY..XY)") && strings.HasPrefix(b.form, "XY"):
		x, y, err = r.jcampPairs(b, scale)
	default:
		err = errorf(r.name, b.at, "a data table of the form %s is not read; export ##XYDATA=(X++(Y..Y)) or ##XYPOINTS=(XY..XY)", clip([]byte(b.form)))
	}
	if err != nil {
		return nil, nil, err
	}
	if *points += len(y); *points > 2*maxJCAMPPoints+4*len(r.text) {
		return nil, nil, errorf(r.name, b.at, "more points than a file of this size can mean; export it again")
	}
	return x, y, r.jcampUnits(b, x)
}

// jcampUnits brings abscissas to nm.
func (r *reader) jcampUnits(b *jcampBlock, x []float64) error {
	switch u := jcampLabel(b.values["XUNITS"]); {
	case u == "1CM" || u == "CM^1" || u == "CM1" || u == "WAVENUMBER":
		r.toNM(x, true)
	case strings.HasPrefix(u, "NANOMET") || u == "NM" || u == "WAVELENGTHNM)" || u == "":
		r.toNM(x, false)
	case strings.HasPrefix(u, "MICROMET") || u == "UM":
		for i := range x {
			x[i] *= 1000
		}
	default:
		return errorf(r.name, b.line, "XUNITS is %s; wavelengths are in NANOMETERS, MICROMETERS or 1/CM", clip([]byte(b.values["XUNITS"])))
	}
	return nil
}

// jcampPairs reads (XY..XY): abscissa and ordinate by turns, as plain numbers.
func (r *reader) jcampPairs(b *jcampBlock, scale [2]float64) (x, y []float64, err error) {
	last := b.at
	for _, t := range b.data {
		for _, f := range bytes.FieldsFunc(t.text, func(c rune) bool { return strings.ContainsRune(" \t,;", c) }) {
			v := math.NaN()
			if !bytes.Equal(f, []byte("?")) {
				var ok bool
				if v, ok = parseNumber(f, '.'); !ok {
					return nil, nil, errorf(r.name, t.no, "%q is not a number; repair the table, or export it again", clip(f))
				}
			}
			last = t.no
			if len(x) == len(y) {
				x = append(x, v*scale[0])
			} else {
				y = append(y, v*scale[1])
			}
		}
	}
	if len(x) != len(y) {
		return nil, nil, errorf(r.name, last, "the last abscissa has no ordinate; was the file cut short? Export it again")
	}
	if n, ok, err := r.jcampNumber(b, "NPOINTS"); err != nil {
		return nil, nil, err
	} else if ok && int(n) != len(y) {
		return nil, nil, errorf(r.name, b.at, "%d points where NPOINTS is %g; was the file cut short? Export it again", len(y), n)
	}
	return x, y, nil
}
