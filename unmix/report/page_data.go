package report

import (
	"encoding/json"
	"fmt"
	"image/color"
	"math"
	"slices"
	"strings"

	"tarnlight/eem"
)

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
	Parts [][4]string `json:"parts"`
	Flags [][3]string `json:"flags"` // severity, words, figures behind them
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
	for i, b := range r.bottles {
		x := r.bottleData(b)
		if p.scales != nil {
			x.Own = nums(p.scales[i])
		}
		d.Bottles = append(d.Bottles, x)
	}
	return d
}

// bottleData is what the page shows beside one bottle's maps.
func (r *results) bottleData(b *bottle) dataBottle {
	x := dataBottle{ID: b.id, Shown: visible(b.id), Parts: [][4]string{}, Flags: [][3]string{}, Facts: r.facts(b), Note: r.remarks(b, "Overview")}
	if r.s.Pictures && b.at >= 0 {
		x.File = r.mapFile(b.id)
	}
	for _, c := range r.series {
		k := b.of[c]
		if k == nil {
			x.Parts = append(x.Parts, [4]string{})
			continue
		}
		x.Parts = append(x.Parts, [4]string{r.num.stated(k.reported), r.num.stated(k.stated), r.num.stated(k.coverage()), strings.TrimSpace(k.qualifier + " " + strings.Join(r.distinct(b, c), "; "))})
	}
	f := r.table["flags.csv"]
	for _, k := range b.flags {
		what := f.Text(k, f.Col("message"))
		if c := f.Text(k, f.Col("component")); c != "" && !strings.HasPrefix(what, c) {
			what = c + ": " + what
		}
		_, detail, _ := strings.Cut(what, eem.InDetail)
		x.Flags = append(x.Flags, [3]string{f.Text(k, f.Col("severity")), eem.Brief(what), detail})
	}
	return x
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
			unit := r.unitOf(c)
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
