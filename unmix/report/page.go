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
	"image/color"
	"io"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"tarnlight/eem"
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
	Components, Survey  []pageFigure
	Model, Quality      []pageFigure
	Models, Batches     pageTable
	Calibration         pageTable
	Steps               []pageStep
	Cautions            []string
	Qualifiers          [][2]string
	HasMaps             bool
	MapNote             string
}

type pageChoice struct{ Value, Text string }

type pageColumn struct {
	Head, Title string
	Number      bool
}

// pageCell is a cell of the table of bottles: what is shown and, for numbers, what
// is sorted and filtered by.
type pageCell struct {
	Text, Sort string
	Class      string
}

type pageRow struct {
	Index                    int
	ID, Kind, Tests, Verdict string
	Class                    string
	Other                    bool
	Cells                    []pageCell
}

type pageFigure struct {
	Source  template.URL
	Caption string
	Name    string
}

type pageTable struct {
	Heads []string
	Rows  [][]string
}

type pageStep struct {
	Name, What, Formula, Source string
	Params                      []string
}

// writePage writes report.html: one file that asks the network for nothing.
func (r *results) writePage(p *pass, figures []*figure) error {
	v := &page{Title: r.title(), Mark: r.mark, Unit: r.unit, Cautions: cautions, Qualifiers: qualifiers,
		CSS: template.CSS(pageCSS), JS: template.JS(pageJS), MapNote: p.note, HasMaps: p.packed != nil}
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
	for _, f := range figures {
		g := pageFigure{template.URL("data:image/svg+xml;base64," + base64.StdEncoding.EncodeToString(f.svg())), f.caption, f.name}
		switch {
		case strings.HasPrefix(f.name, "component"):
			v.Components = append(v.Components, g)
		case strings.HasPrefix(f.name, "contributions"), strings.HasPrefix(f.name, "unexplained"):
			v.Survey = append(v.Survey, g)
		case f.name == "charts":
			v.Quality = append(v.Quality, g)
		default:
			v.Model = append(v.Model, g)
		}
	}
	v.Models = r.pageTable("models.csv", []string{"components", "chosen", "verdict", "reason", "explained_percent"}, "seed", "loss", "samples", "cells")
	v.Batches = r.pageTable("batches.csv", []string{"batch", "verdict", "reason"})
	v.Calibration = r.pageTable("calibration.csv", []string{"id", "batch", "kind", "component", "verdict", "reason"})
	for _, m := range r.methodSteps() {
		name := joinNonEmpty(" – ", m.name, m.setup)
		v.Steps = append(v.Steps, pageStep{strings.TrimSuffix(name, " – "), strings.TrimSpace(m.words.what + " " + strings.Join(m.done, "; ")), m.words.formula, m.words.source, m.params})
	}
	data, err := json.Marshal(r.pageData(p)) // json.Marshal writes <, > and & as \u003c …: it cannot end the script
	if err != nil {
		return err
	}
	v.Data = template.JS(escapeMarks(string(data)))
	return writeFile(filepath.Join(r.dir, "report.html"), func(w io.Writer) error { return writePage(w, v, p) })
}

// escapeMarks writes the marks that visible leaves out as escapes: ids keep them,
// but nothing in the file turns what a person reads in it.
func escapeMarks(data string) string {
	var b strings.Builder
	for _, r := range data {
		if visible(string(r)) == "" {
			fmt.Fprintf(&b, "\\u%04x", r)
		} else {
			b.WriteRune(r)
		}
	}
	return b.String()
}

// writePage executes the template and puts the maps in at its end.
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
	o.Write(head) // the first error stays and Flush returns it
	for i, text := range p.packed {
		if text != "" {
			fmt.Fprintf(o, "<script type=\"text/plain\" id=\"map%d\">", i)
			o.WriteString(text)
			o.WriteString("</script>\n")
		}
	}
	o.Write(tail)
	return o.Flush()
}

// sourceHash is the source expression by which a content security policy allows
// exactly this script or style (W3C Content Security Policy Level 3).
func sourceHash(s string) string {
	h := sha256.Sum256([]byte(s))
	return "sha256-" + base64.StdEncoding.EncodeToString(h[:])
}

// num is a number for the script: NaN becomes null. (Handing NaN to the template
// would make a whole list vanish.)
type num float64

// MarshalJSON implements json.Marshaler.
func (n num) MarshalJSON() ([]byte, error) {
	if !finite(float64(n)) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(n))
}

func nums(v []float64) []num {
	out := make([]num, len(v))
	for i, x := range v {
		out[i] = num(x)
	}
	return out
}

// pageData is what the script needs beside the table.
type pageData struct {
	Ex      []num        `json:"ex"`
	Em      []num        `json:"em"`
	Unit    string       `json:"unit"`
	Comma   bool         `json:"comma"`
	Methods []string     `json:"methods"` // of the residual layers
	Names   []string     `json:"names"`   // the methods in words
	Reasons []string     `json:"reasons"`
	Seq     string       `json:"seq"` // colours, six digits each
	Div     string       `json:"div"`
	Missing string       `json:"missing"`
	Hatch   string       `json:"hatch"`
	Common  []num        `json:"common"` // scale ends: measured, then each residual
	Columns []dataColumn `json:"columns"`
	Bottles []dataBottle `json:"bottles"`
}

type dataColumn struct {
	Name   string `json:"name"`
	Method string `json:"method"`
	Unit   string `json:"unit"`
}

type dataBottle struct {
	ID    string      `json:"id"`
	Shown string      `json:"shown"`
	Own   []num       `json:"own"` // scale ends of this bottle
	Parts [][3]string `json:"parts"`
	Flags [][2]string `json:"flags"`
	Facts [][2]string `json:"facts"`
	Note  string      `json:"note"`
	File  string      `json:"file"`
}

func (r *results) pageData(p *pass) *pageData {
	d := &pageData{Unit: r.unit, Comma: r.num.comma, Seq: hexColours(sequential(seqLen)), Div: hexColours(diverging(divLen)),
		Missing: hexColours([]color.NRGBA{missingGrey}), Hatch: hexColours([]color.NRGBA{hatchGrey}), Methods: []string{}, Names: []string{}, Columns: []dataColumn{}}
	if r.store != nil {
		d.Ex, d.Em = nums(r.store.Grid.Ex.Values()), nums(r.store.Grid.Em.Values())
		for _, m := range r.store.Methods {
			d.Methods, d.Names = append(d.Methods, m), append(d.Names, methodName(m))
		}
	}
	for k := range eem.NumReasons {
		d.Reasons = append(d.Reasons, k.String())
	}
	for _, c := range r.series {
		d.Columns = append(d.Columns, dataColumn{r.label(c), c.method, c.unit})
	}
	d.Common = nums(p.common())
	f := r.table["flags.csv"]
	for i, b := range r.bottles {
		x := dataBottle{ID: b.id, Shown: visible(b.id), Parts: [][3]string{}, Flags: [][2]string{}, Facts: r.facts(b), Note: r.remarks(b)}
		if p.scales != nil {
			x.Own = nums(p.scales[i])
		}
		if r.s.Pictures && b.at >= 0 {
			x.File = r.mapFile(b.id)
		}
		for _, c := range r.series {
			k := b.of[c]
			if k == nil {
				x.Parts = append(x.Parts, [3]string{"", "", ""})
				continue
			}
			pm := ""
			if k.qualifier != "U" && k.qualifier != "R" && k.u > 0 {
				pm = r.num.fixed(k.expanded(), decimals(k.u, r.s.Digits))
			}
			x.Parts = append(x.Parts, [3]string{k.reported, pm, joinNonEmpty(" ", strings.TrimSpace(k.qualifier+" "+k.reasons))})
		}
		for _, k := range b.flags {
			what := f.Text(k, f.Col("message"))
			if c := f.Text(k, f.Col("component")); c != "" {
				what = c + ": " + what
			}
			x.Flags = append(x.Flags, [2]string{f.Text(k, f.Col("severity")), what})
		}
		d.Bottles = append(d.Bottles, x)
	}
	return d
}

// facts are the run-sheet columns and fit figures shown beside a bottle.
func (r *results) facts(b *bottle) [][2]string {
	t := r.table["samples.csv"]
	var out [][2]string
	for _, name := range r.sheetColumns() {
		if v := t.Text(b.row, t.Col(name)); v != "" && name != "id" && name != "scans" && name != "absorbance" {
			out = append(out, [2]string{name, v})
		}
	}
	f, _ := FindFile("samples.csv")
	for _, c := range f.Columns {
		switch v := t.Float(b.row, t.Own(c.Name)); {
		case slices.Contains([]string{"notes", "doubts", "rejects", "fit_method"}, c.Name) || math.IsNaN(v):
		default:
			unit := c.Unit
			if unit == "intensity" {
				unit = r.unit
			}
			if unit == "z" || unit == "cells" {
				unit = ""
			}
			out = append(out, [2]string{strings.ReplaceAll(c.Name, "_", " "), strings.TrimSpace(r.num.sig(v, 4) + " " + unit)})
		}
	}
	return out
}

func hexColours(cs []color.NRGBA) string {
	var b strings.Builder
	for _, c := range cs {
		fmt.Fprintf(&b, "%02x%02x%02x", c.R, c.G, c.B)
	}
	return b.String()
}

// pageRows makes the table of bottles.
func (r *results) pageRows(v *page) {
	known := r.knownColumns()
	v.Columns = []pageColumn{{Head: "Bottle"}, {Head: "Check", Title: "the gravest finding: good, note, doubt or not usable"}}
	for _, k := range known {
		v.Columns = append(v.Columns, pageColumn{Head: k.head, Number: k.name == "dilution"})
	}
	for _, c := range r.series {
		v.Columns = append(v.Columns, pageColumn{Head: strings.TrimSpace(r.label(c) + " " + c.unit), Title: methodName(c.method), Number: true})
	}
	v.Columns = append(v.Columns, pageColumn{"Explained %", "share of the bottle's sum of squares that the components explain", true},
		pageColumn{"Structure z", "how alike neighbouring residuals are: Moran's I in standard deviations", true},
		pageColumn{"Hottest " + r.unit, "largest residual", true}, pageColumn{"at ex/em nm", "where the largest residual lies", false})
	t := r.table["samples.csv"]
	f := func(b *bottle, name string) float64 { return t.Float(b.row, t.Own(name)) }
	tests := map[string]bool{}
	for i, b := range r.bottles {
		word, _ := severityLook(b.worst)
		row := pageRow{Index: i, ID: visible(b.id), Kind: b.kind, Verdict: word, Class: strings.ReplaceAll(word, " ", "-")}
		if b.kind == "" {
			row.Kind = "sample"
		}
		if !slices.Contains(v.Kinds, row.Kind) {
			v.Kinds = append(v.Kinds, row.Kind)
		}
		if !b.reportable() {
			row.Other, v.Others = true, true
		}
		row.Tests = r.bottleTests(b, tests)
		for _, k := range known {
			c := pageCell{Text: t.Text(b.row, t.Col(k.name))}
			if _, ok := parseDay(c.Text); ok {
				c.Text = strings.Replace(c.Text, "T", " ", 1)
			}
			if n, ok := number(c.Text); ok && k.name == "dilution" {
				c.Sort = Number(n)
			}
			row.Cells = append(row.Cells, c)
		}
		for _, c := range r.series {
			row.Cells = append(row.Cells, valueCell(b.of[c]))
		}
		ex, em := f(b, "hottest_ex_nm"), f(b, "hottest_em_nm")
		hot := pageCell{}
		if finite(ex) && finite(em) {
			hot.Text = r.num.nm(ex) + "/" + r.num.nm(em)
		}
		row.Cells = append(row.Cells, r.numberCell(f(b, "explained_percent"), 4), r.numberCell(f(b, "structure"), 3), r.numberCell(f(b, "hottest_value"), 3), hot)
		v.Rows = append(v.Rows, row)
	}
	for name := range tests {
		v.Tests = append(v.Tests, name)
	}
	slices.Sort(v.Tests)
	if r.store != nil {
		for _, m := range r.store.Methods {
			v.Methods = append(v.Methods, pageChoice{m, methodName(m)})
		}
	}
}

// bottleTests lists the codes of a bottle's findings, between blanks.
func (r *results) bottleTests(b *bottle, all map[string]bool) string {
	f := r.table["flags.csv"]
	out := " "
	for _, k := range b.flags {
		code := f.Text(k, f.Col("test"))
		all[code] = true
		out += code + " "
	}
	return out
}

// valueCell shows a contribution as reported; it is sorted by its value.
func valueCell(c *contribution) pageCell {
	if c == nil {
		return pageCell{}
	}
	out := pageCell{Text: strings.TrimSpace(c.reported + " " + c.qualifier), Class: "q" + c.qualifier}
	if c.qualifier != "R" {
		out.Sort = Number(c.value)
	}
	return out
}

func (r *results) numberCell(v float64, digits int) pageCell {
	if math.IsNaN(v) {
		return pageCell{}
	}
	return pageCell{Text: r.num.sig(v, digits), Sort: Number(v)}
}

// pageTable is a results table for people: the columns named in ahead first,
// without those named in without and those that are empty, numbers rounded.
func (r *results) pageTable(name string, ahead []string, without ...string) pageTable {
	t := r.table[name]
	var out pageTable
	var cols []int
	for _, head := range append(slices.Clone(ahead), t.Columns...) {
		c := t.Col(head)
		used := slices.ContainsFunc(t.Rows, func(row []string) bool { return row[c] != "" })
		if used && !slices.Contains(without, head) && !slices.Contains(cols, c) {
			cols = append(cols, c)
			out.Heads = append(out.Heads, strings.ReplaceAll(head, "_", " "))
		}
	}
	for i := range t.Rows {
		var row []string
		for _, c := range cols {
			text := t.Text(i, c)
			if v := t.Float(i, c); finite(v) {
				text = r.num.short(v, 5)
			}
			row = append(row, map[string]string{"true": "yes", "false": "no"}[text])
			if row[len(row)-1] == "" {
				row[len(row)-1] = text
			}
		}
		out.Rows = append(out.Rows, row)
	}
	return out
}
