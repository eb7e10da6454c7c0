package report

import (
	"path/filepath"
)

// reportable says whether a bottle belongs into the client's results: samples and
// field blanks do; water, standards and controls are told of elsewhere.
func (b *bottle) reportable() bool {
	return b.kind == "" || b.kind == "sample" || b.kind == "field-blank"
}

// sample says whether a bottle is a sample, not one that shows how good the samples are.
func (b *bottle) sample() bool { return b.kind == "" || b.kind == "sample" }

// writeClient writes report.xlsx, the workbook that is handed over. It names no
// path, user or machine.
func (r *results) writeClient() error {
	b := newBook(r.title(), r.title()+joinNonEmpty(" · ", "", r.s.Number), "Result mark "+r.mark)
	r.summarySheet(b)
	r.resultsSheet(b)
	r.flagsSheet(b)
	r.methodsSheet(b)
	return b.write(filepath.Join(r.dir, "report.xlsx"))
}

func joinNonEmpty(sep string, parts ...string) string {
	out := ""
	for i, p := range parts {
		if p == "" {
			continue
		}
		if out != "" || i > 0 {
			out += sep
		}
		out += p
	}
	return out
}

var (
	headLook   = look{bold: true, fill: paleBlue, color: inkBlue, wrap: true, middle: true, line: true}
	headRight  = look{bold: true, fill: paleBlue, color: inkBlue, wrap: true, middle: true, line: true, right: true}
	headIndent = look{bold: true, fill: paleBlue, color: inkBlue, wrap: true, middle: true, line: true, indent: true}
	partLook   = look{bold: true, size: 11, color: inkBlue, line: true}
	plainLook  = look{}
	wrapLook   = look{wrap: true}
)
