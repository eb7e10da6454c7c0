package report

import (
	"bufio"
	"bytes"
	"crypto/sha256"
	_ "embed"
	"encoding/base64"
	"encoding/json"
	"fmt"
	"html/template"
	"io"
	"path/filepath"
	"strings"
)

//go:embed page.html
var pageHTML string

//go:embed page.css
var pageCSS string

//go:embed page.js
var pageJS string

// pageTemplate escapes everything that comes from a user by where it stands.
var pageTemplate = template.Must(template.New("page").Parse(pageHTML))

// page is what the template shows.
type page struct {
	Title, Mark, Policy string
	CSS                 template.CSS
	JS, Data            template.JS
	Fields              [][2]string // client, order …
	Overview            [][2]string
	Columns             []pageColumn
	Rows                []pageRow
	Kinds, Tests        []string
	Others              bool // bottles that are not reported: water, standards, controls
	Methods             []pageChoice
	Unit                string
	Components          []pageFigure
	Survey              []pageViews
	Model, Quality      []pageFigure
	Models, Batches     pageTable
	Calibration         pageTable
	Steps               []pageStep
	Cautions            []string
	Qualifiers          [][2]string
	HasMaps, OneScan    bool
	MapNote             string
}

type pageChoice struct{ Value, Text string }

type pageFigure struct {
	Source  template.URL
	Caption string
	Choice  string
}

// pageViews are figures of the same numbers, of which one is shown at a time.
type pageViews []pageFigure

type pageStep struct {
	Name, What, Formula, Source string
	Params                      []string
}

// writePage writes report.html: one file that asks the network for nothing.
func (r *results) writePage(p *pass, figures []*figure) error {
	v := &page{Title: r.title(), Mark: r.mark, Unit: r.unit, Cautions: cautions, Qualifiers: qualifiers,
		CSS: template.CSS(pageCSS), JS: template.JS(pageJS), MapNote: p.note, HasMaps: p.packed != nil, OneScan: r.store != nil && oneScan(r.store.Grid)}
	v.Policy = fmt.Sprintf("default-src 'none'; script-src '%s'; style-src '%s'; img-src data:; base-uri 'none'; form-action 'none'",
		sourceHash(pageJS), sourceHash(pageCSS))
	for _, f := range [][2]string{{"Client", r.s.Client}, {"Order", r.s.Order}, {"Report number", r.s.Number}, {"Method", r.s.Method},
		{"Tested by", r.s.TestedBy}, {"Approved by", r.s.ApprovedBy}, {"Remarks", r.s.Remarks}} {
		if f[1] != "" {
			v.Fields = append(v.Fields, f)
		}
	}
	v.Overview = r.overview()
	r.pageRows(v)
	views := ""
	for _, f := range figures {
		source, err := f.source()
		if err != nil {
			return err
		}
		g := pageFigure{source, f.caption, f.choice}
		switch {
		case strings.HasPrefix(f.name, "component"):
			v.Components = append(v.Components, g)
		case strings.HasPrefix(f.name, "contributions"), strings.HasPrefix(f.name, "unexplained"):
			if of, _, _ := strings.Cut(f.name, "-by-"); of != views || f.choice == "" {
				v.Survey, views = append(v.Survey, nil), of
			}
			last := &v.Survey[len(v.Survey)-1]
			*last = append(*last, g)
		case strings.HasPrefix(f.name, "charts"), f.name == "blanks":
			v.Quality = append(v.Quality, g)
		default:
			v.Model = append(v.Model, g)
		}
	}
	v.Models = r.pageModels()
	v.Batches = r.pageTable("batches.csv", []string{"batch", "verdict", "reason"})
	v.Calibration = r.pageTable("calibration.csv", []string{"id", "batch", "kind", "component", "verdict", "reason"},
		"line_slope", "line_intercept", "line_intercept_standard_error") // the same for all standards of a component: in the workings
	for _, m := range r.methodSteps() {
		name := joinNonEmpty(" – ", m.name, m.setup)
		v.Steps = append(v.Steps, pageStep{strings.TrimSuffix(name, " – "), m.sentences(), m.words.formula, m.words.source, m.params})
	}
	data, err := json.Marshal(r.pageData(p)) // json.Marshal writes <, > and & as \u003c …: it cannot end the script
	if err != nil {
		return err
	}
	v.Data = template.JS(escapeMarks(string(data)))
	return writeFile(filepath.Join(r.dir, "report.html"), func(w io.Writer) error { return writePage(w, v, p) })
}

// largeSVG is from how many bytes on a figure is in the page as PNG: a browser lays
// out every mark of an SVG before the page can be used.
const largeSVG = 80 << 10

// source is the figure as a data URL.
func (f *figure) source() (template.URL, error) {
	kind, data := "svg+xml", f.svg()
	if len(data) > largeSVG {
		var b bytes.Buffer
		if err := f.png(&b); err != nil {
			return "", err
		}
		kind, data = "png", b.Bytes()
	}
	return template.URL("data:image/" + kind + ";base64," + base64.StdEncoding.EncodeToString(data)), nil
}

// writePage executes the template and puts the maps in at its end, behind the script:
// the table can be used while the browser still reads them.
func writePage(w io.Writer, v *page, p *pass) error {
	var b bytes.Buffer
	if err := pageTemplate.Execute(&b, v); err != nil {
		return err
	}
	head, tail, ok := bytes.Cut(b.Bytes(), []byte(`<template id="maps-here"></template>`))
	if !ok {
		panic("report: the page has no place for its maps")
	}
	o := bufio.NewWriterSize(w, 1<<20)
	put := func(s string) { _, _ = o.WriteString(s) } // the first error stays, and Flush returns it
	put(string(head))
	put("<script type=\"text/plain\" id=\"packed\">") // one block, a line a bottle: 1,500 of their own take a browser longer
	for _, text := range p.packed {
		put(text)
		put("\n")
	}
	put("</script>\n")
	put(string(tail))
	return o.Flush()
}

// sourceHash is the source expression by which a content security policy allows
// exactly this script or style (W3C Content Security Policy Level 3).
func sourceHash(s string) string {
	h := sha256.Sum256([]byte(s))
	return "sha256-" + base64.StdEncoding.EncodeToString(h[:])
}
