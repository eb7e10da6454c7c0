package survey

import (
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"

	"github.com/xuri/excelize/v2"
)

// WriteSheetCSV writes a run sheet that ReadSheet takes: commas, points, UTF-8.
// Columns that are known are written from the rows' fields, others from their
// Cells; without Columns every known one is written, and the concentrations that
// the rows have.
func WriteSheetCSV(w io.Writer, s *Sheet) error {
	c := csv.NewWriter(w)
	d := newDraft(s)
	record := make([]string, len(d.headers))
	if err := c.Write(d.headers); err != nil {
		return err
	}
	for i := range s.Rows {
		for j := range record {
			record[j] = d.text(&s.Rows[i], j)
		}
		if err := c.Write(record); err != nil {
			return err
		}
	}
	c.Flush()
	return c.Error()
}

// draft says how the columns of a sheet are written.
type draft struct {
	headers []string
	cols    []headed
}

func newDraft(s *Sheet) draft {
	d := draft{headers: s.Columns}
	if len(d.headers) == 0 {
		for _, c := range columns {
			d.headers = append(d.headers, c.name)
		}
		for i := range s.Rows {
			for _, c := range s.Rows[i].Conc {
				if h := concHeader(c); !slices.Contains(d.headers, h) {
					d.headers = append(d.headers, h)
				}
			}
		}
	}
	for _, name := range d.headers {
		h := headed{}
		if c, ok := columnOf(name); ok {
			h.known = &c
		} else if isConc(name) {
			c, _ := concOf(name)
			h.conc = &c
		}
		d.cols = append(d.cols, h)
	}
	return d
}

func concHeader(c Conc) string {
	if c.Unit == "" {
		return "conc:" + c.Name
	}
	return "conc:" + c.Name + " [" + c.Unit + "]"
}

// text is cell j of a row, with a decimal point.
func (d draft) text(r *Row, j int) string {
	switch h := d.cols[j]; {
	case h.known != nil:
		if h.known.name == "absorbance_dilution" && r.AbsorbanceDilution == r.Dilution {
			return ""
		}
		return h.known.get(r)
	case h.conc != nil:
		for _, c := range r.Conc {
			if c.Name == h.conc.Name && !math.IsNaN(c.Value) {
				return strconv.FormatFloat(c.Value, 'g', -1, 64)
			}
		}
		return ""
	case j < len(r.Cells):
		return r.Cells[j]
	}
	return ""
}

// maxCell is the longest text of a workbook's cell, characters; excelize cuts
// longer ones without a word.
const maxCell = 32767

// widths are column widths, in characters, for what usually stands there.
var widths = map[string]float64{"id": 18, "kind": 12, "scans": 34, "absorbance": 34, "measured": 20, "sampled": 20,
	"blanks": 18, "exclude": 28, "exclude_from_fit": 28}

// WriteSheetXLSX writes the same as WriteSheetCSV as a workbook that is pleasant to
// fill in: the header stays in view, kinds are chosen from a list, and columns of
// ids and names are text, so that 001 stays 001 and 3-4 does not become a date.
func WriteSheetXLSX(w io.Writer, s *Sheet) (err error) {
	f := excelize.NewFile()
	defer f.Close()
	b := book{f: f, name: "run sheet", d: newDraft(s)}
	if err := f.SetSheetName("Sheet1", b.name); err != nil {
		return err
	}
	for _, step := range []func(*Sheet) error{b.styles, b.columns, b.rows, b.kinds, b.prompts, b.view} {
		if err := step(s); err != nil {
			return fmt.Errorf("run sheet as a workbook: %w", err)
		}
	}
	_, err = f.WriteTo(w)
	return err
}

// book writes a draft into a workbook.
type book struct {
	f                *excelize.File
	name             string
	d                draft
	head, text, date int // styles
}

func (b *book) styles(*Sheet) error {
	dateFormat := "yyyy-mm-dd"
	for _, s := range []struct {
		id    *int
		style excelize.Style
	}{
		{&b.head, excelize.Style{Font: &excelize.Font{Bold: true}, NumFmt: 49}},
		{&b.text, excelize.Style{NumFmt: 49}}, // "@"
		{&b.date, excelize.Style{CustomNumFmt: &dateFormat}},
	} {
		id, err := b.f.NewStyle(&s.style)
		if err != nil {
			return err
		}
		*s.id = id
	}
	return nil
}

// columns sets width and style of whole columns, for the rows that people add.
func (b *book) columns(*Sheet) error {
	for j, h := range b.d.cols {
		letter, err := excelize.ColumnNumberToName(j + 1)
		if err != nil {
			return err
		}
		width := float64(max(12, len(b.d.headers[j])+2))
		if h.known != nil && widths[h.known.name] > 0 {
			width = widths[h.known.name]
		}
		if err := b.f.SetColWidth(b.name, letter, letter, width); err != nil {
			return err
		}
		if style := b.style(h); style != 0 {
			if err := b.f.SetColStyle(b.name, letter, style); err != nil {
				return err
			}
		}
	}
	return nil
}

func (b *book) style(h headed) int {
	switch {
	case h.numeric():
		return 0
	case h.known != nil && (h.known.name == "measured" || h.known.name == "sampled"):
		return b.date
	}
	return b.text
}

func (b *book) rows(s *Sheet) error {
	for j, name := range b.d.headers {
		if err := b.cell(j, 1, name, b.head); err != nil {
			return err
		}
	}
	for i := range s.Rows {
		for j, h := range b.d.cols {
			text := b.d.text(&s.Rows[i], j)
			if text == "" {
				continue
			}
			if err := b.cell(j, i+2, value(h, text), b.style(h)); err != nil {
				return err
			}
		}
	}
	return nil
}

// value is a number for columns of numbers, else text. Text is never taken for a
// formula.
func value(h headed, text string) any {
	if v, err := strconv.ParseFloat(text, 64); err == nil && h.numeric() {
		return v
	}
	return text
}

func (b *book) cell(col, row int, v any, style int) error {
	at, err := excelize.CoordinatesToCellName(col+1, row)
	if err != nil {
		return err
	}
	if t, ok := v.(string); ok && len(t) > maxCell {
		return fmt.Errorf("cell %s: %d characters do not fit; write the sheet as CSV", at, len(t))
	}
	if err := b.f.SetCellValue(b.name, at, v); err != nil {
		return err
	}
	return b.f.SetCellStyle(b.name, at, at, style)
}

// kinds lets people choose the kind from a list, also in rows they add.
func (b *book) kinds(s *Sheet) error {
	for j, h := range b.d.cols {
		if h.known == nil || h.known.name != "kind" {
			continue
		}
		letter, err := excelize.ColumnNumberToName(j + 1)
		if err != nil {
			return err
		}
		v := excelize.NewDataValidation(true)
		v.Sqref = fmt.Sprintf("%s2:%s%d", letter, letter, len(s.Rows)+2000)
		names := make([]string, len(Kinds))
		for i, k := range Kinds {
			names[i] = string(k)
		}
		if err := v.SetDropList(names); err != nil {
			return err
		}
		v.SetError(excelize.DataValidationErrorStyleStop, "kind", "one of "+kindNames())
		return b.f.AddDataValidation(b.name, v)
	}
	return nil
}

// prompts tell whoever stands on a drafted concentration what belongs there.
func (b *book) prompts(s *Sheet) error {
	for j, h := range b.d.cols {
		if h.conc == nil || h.conc.drafted() == "" {
			continue
		}
		letter, err := excelize.ColumnNumberToName(j + 1)
		if err != nil {
			return err
		}
		v := excelize.NewDataValidation(true)
		v.Sqref = fmt.Sprintf("%s1:%s%d", letter, letter, len(s.Rows)+1)
		v.SetInput("known concentrations", "Header: the component and its unit in place of NAME [unit], a column for each component. Rows: the concentration in the liquid scanned, 0 where a component is absent.")
		if err := b.f.AddDataValidation(b.name, v); err != nil {
			return err
		}
	}
	return nil
}

// view keeps the header in sight.
func (b *book) view(*Sheet) error {
	return b.f.SetPanes(b.name, &excelize.Panes{Freeze: true, YSplit: 1, TopLeftCell: "A2", ActivePane: "bottomLeft"})
}
