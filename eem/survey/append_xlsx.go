package survey

import (
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"regexp"
	"slices"
	"strconv"

	"github.com/xuri/excelize/v2"
)

// grownSheet knows where things stand in the XML of a sheet.
type grownSheet struct {
	xml     []byte
	prefix  string // of element names, such as "x:"
	columns []columnStyle
	rows    []sheetRow
	end     int // of the list of rows
	size    [2]int
}

// columnStyle is the style of the columns from, …, to, counted from 1.
type columnStyle struct {
	from, to int
	style    string
}

// sheetRow is one row: its bytes, and the styles of its cells by column.
type sheetRow struct {
	from, to int
	number   int
	content  bool
	styles   map[int]string
}

// scan walks the sheet once.
func (g *grownSheet) scan() error {
	d := xml.NewDecoder(bytes.NewReader(g.xml))
	number := 0
	var row *sheetRow
	for {
		at := int(d.InputOffset())
		tok, err := d.RawToken()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return err
		}
		switch e := tok.(type) {
		case xml.StartElement:
			switch e.Name.Local {
			case "dimension":
				g.size = [2]int{at, int(d.InputOffset())}
			case "col":
				g.column(e)
			case "sheetData":
				if g.prefix = e.Name.Space; g.prefix != "" {
					g.prefix += ":"
				}
			case "row":
				number++
				if n, err := strconv.Atoi(attribute(e, "r")); err == nil {
					number = n
				}
				row = &sheetRow{from: at, number: number, styles: map[int]string{}}
			case "c":
				if row != nil {
					row.cell(e)
				}
			case "v", "f", "is":
				if row != nil {
					row.content = true
				}
			}
		case xml.EndElement:
			switch {
			case e.Name.Local == "row" && row != nil:
				row.to = int(d.InputOffset())
				g.rows = append(g.rows, *row)
				row = nil
			case e.Name.Local == "sheetData":
				g.end = at
			}
		}
	}
	if g.end == 0 || len(g.rows) == 0 {
		return errors.New("the sheet has no rows; save the workbook again")
	}
	return nil
}

func (g *grownSheet) column(e xml.StartElement) {
	from, err1 := strconv.Atoi(attribute(e, "min"))
	to, err2 := strconv.Atoi(attribute(e, "max"))
	if style := attribute(e, "style"); err1 == nil && err2 == nil && style != "" {
		g.columns = append(g.columns, columnStyle{from, to, style})
	}
}

// cell notes the style of a cell; without a reference it follows the one before.
func (r *sheetRow) cell(e xml.StartElement) {
	col := len(r.styles) + 1
	if at, _, err := excelize.CellNameToCoordinates(attribute(e, "r")); err == nil {
		col = at
	}
	r.styles[col] = attribute(e, "s")
}

func attribute(e xml.StartElement, name string) string {
	for _, a := range e.Attr {
		if a.Name.Local == name {
			return a.Value
		}
	}
	return ""
}

// with returns the sheet with the records behind its last row with content, and how
// far that goes. Empty
// rows that a spreadsheet keeps there, because they were formatted once, make room
// and leave their styles to the new ones.
func (g *grownSheet) with(records [][]string) ([]byte, stretch) {
	last := 0
	for i, r := range g.rows {
		if r.content {
			last = i
		}
	}
	number, at := g.rows[last].number, g.rows[last].to
	s := stretch{last: number, to: number + len(records)}
	for _, record := range records {
		s.col = 1 + slices.IndexFunc(record, func(text string) bool { return text != "" })
	}
	from, empty := at, g.rows[last+1:]
	var b bytes.Buffer
	for _, record := range records {
		number++
		var styles map[int]string
		for ; len(empty) > 0 && empty[0].number <= number; empty = empty[1:] {
			from = empty[0].to
			if empty[0].number == number {
				styles = empty[0].styles
			}
		}
		g.writeRow(&b, number, record, styles)
	}
	return g.sized(joined(g.xml[:at], b.Bytes(), g.xml[from:]), number), s
}

func joined(parts ...[]byte) []byte { return bytes.Join(parts, nil) }

func (g *grownSheet) writeRow(b *bytes.Buffer, number int, record []string, styles map[int]string) {
	p := g.prefix
	fmt.Fprintf(b, `<%srow r="%d">`, p, number)
	for j, text := range record {
		style := styles[j+1]
		if style == "" && text == "" {
			continue
		}
		at, err := excelize.CoordinatesToCellName(j+1, number)
		if err != nil { // more columns or rows than a sheet can have: sameAndMore tells
			continue
		}
		fmt.Fprintf(b, `<%sc r="%s"`, p, at)
		if style == "" {
			style = g.styleOf(j + 1)
		}
		if style != "" {
			fmt.Fprintf(b, ` s="%s"`, style)
		}
		if text == "" {
			b.WriteString("/>")
			continue
		}
		fmt.Fprintf(b, ` t="inlineStr"><%sis><%st xml:space="preserve">`, p, p)
		_ = xml.EscapeText(b, []byte(text)) // a bytes.Buffer takes everything
		fmt.Fprintf(b, `</%st></%sis></%sc>`, p, p, p)
	}
	fmt.Fprintf(b, `</%srow>`, p)
}

func (g *grownSheet) styleOf(col int) string {
	for _, c := range g.columns {
		if c.from <= col && col <= c.to {
			return c.style
		}
	}
	return ""
}

var stated = regexp.MustCompile(`(ref="[A-Z]+[0-9]+:[A-Z]+)([0-9]+)"`)

// sized brings the stated size of the sheet up to its last row: programs that read
// a sheet as a stream go by it. It stands before the rows.
func (g *grownSheet) sized(out []byte, last int) []byte {
	if g.size[1] == 0 {
		return out
	}
	tag := stated.ReplaceAllFunc(out[g.size[0]:g.size[1]], func(m []byte) []byte {
		part := stated.FindSubmatch(m)
		if n, err := strconv.Atoi(string(part[2])); err != nil || n >= last {
			return m
		}
		return []byte(fmt.Sprintf(`%s%d"`, part[1], last))
	})
	return joined(out[:g.size[0]], tag, out[g.size[1]:])
}
