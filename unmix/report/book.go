package report

import (
	"errors"
	"fmt"
	"os"
	"strings"
	"unicode/utf8"

	"github.com/xuri/excelize/v2"
)

// book is a workbook being written. Styles are made once for each look.
type book struct {
	f      *excelize.File
	styles map[look]int
	// special are the number formats made for one number each.
	special map[string]bool
	footer  string // left part of every footer
	header  string
	err     error // the first error; what follows it does nothing
}

// look is how a cell looks. The zero look is plain text at the top left.
type look struct {
	format string // number format
	bold   bool
	italic bool
	size   float64
	color  string // of the letters, RRGGBB
	fill   string
	wrap   bool
	align  string // horizontal; default by type
	middle bool   // vertical centre instead of top
	line   bool   // a line below
	hair   bool   // a faint line below
	right  bool   // aligned right
	indent bool   // a step in from the left
}

// Colours of the workbooks, RRGGBB. Each has a word beside it: nothing is said by
// colour alone.
const (
	inkBlue   = "1F3A5F"
	paleBlue  = "E4ECF5"
	paleAmber = "FFF1D0"
	paleRed   = "F9DDD8"
	paleGrey  = "EDEDED"
	midGrey   = "6B6B6B"
)

const (
	fontName  = "Arial"
	rowHeight = 15.0 // points, of rows that say nothing else
)

func newBook(title, header, footer string) *book {
	b := &book{f: excelize.NewFile(), styles: map[look]int{}, special: map[string]bool{}, header: header, footer: footer}
	b.try(b.f.SetDefaultFont(fontName))
	b.try(b.f.SetDocProps(&excelize.DocProperties{Title: cut(title, 200), Creator: "tarnlight", LastModifiedBy: "tarnlight",
		Created: "2000-01-01T00:00:00Z", Modified: "2000-01-01T00:00:00Z"})) // no clock: same results, same bytes
	return b
}

func (b *book) try(err error) {
	if b.err == nil {
		b.err = err
	}
}

// style returns the style id of a look.
func (b *book) style(l look) int {
	id, ok := b.styles[l]
	if ok || b.err != nil {
		return id
	}
	st := &excelize.Style{
		Font:      &excelize.Font{Family: fontName, Size: 9, Bold: l.bold, Italic: l.italic, Color: l.color},
		Alignment: &excelize.Alignment{WrapText: l.wrap, Vertical: "top", Horizontal: l.align},
	}
	if l.size > 0 {
		st.Font.Size = l.size
	}
	if l.right {
		st.Alignment.Horizontal = "right"
	}
	if l.middle {
		st.Alignment.Vertical = "center"
	}
	if l.fill != "" {
		st.Fill = excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{l.fill}}
	}
	if l.line {
		st.Border = []excelize.Border{{Type: "bottom", Color: "B0B0B0", Style: 1}}
	}
	if l.hair {
		st.Border = []excelize.Border{{Type: "bottom", Color: "E2E2E2", Style: 1}}
	}
	if l.indent {
		st.Alignment.Horizontal, st.Alignment.Indent = "left", 1
	}
	if l.format != "" {
		st.CustomNumFmt = &l.format
	}
	id, err := b.f.NewStyle(st)
	b.try(err)
	b.styles[l] = id
	return id
}

// layout of a sheet.
type layout struct {
	portrait bool
	widths   []float64 // of the columns, in letters
	freeze   string    // cell below and right of the frozen rows and columns
	repeat   string    // rows printed on every page, "$1:$5"
	keep     []int     // columns, from 1, that print leaves on the page of the one before
	zoom     float64
	broken   bool // the sheet has page breaks between its rows
}

// add makes a sheet. Everything about its page is set here, because the stream
// writer keeps only what was there before its first row.
func (b *book) add(name string, l layout, before ...func(f *excelize.File, sheet string) error) *sheet {
	s := &sheet{b: b, name: name, row: 1, wide: l.widths, starts: l.starts()}
	if b.err != nil {
		return s
	}
	if len(b.f.GetSheetList()) == 1 && b.f.GetSheetList()[0] == "Sheet1" {
		b.try(b.f.SetSheetName("Sheet1", name))
	} else {
		_, err := b.f.NewSheet(name)
		b.try(err)
	}
	b.page(name, l)
	for i, width := range l.widths { // before pictures and charts: their places are counted from it
		c, _ := excelize.ColumnNumberToName(i + 1)
		b.try(b.f.SetColWidth(name, c, c, width))
	}
	for _, f := range before {
		if b.err == nil {
			b.try(f(b.f, name))
		}
	}
	if b.err != nil {
		return s
	}
	w, err := b.f.NewStreamWriter(name)
	b.try(err)
	s.w = w
	return s
}

func (b *book) page(name string, l layout) {
	always, no, zero, a4 := true, false, 0, 9
	starts := l.starts()
	one, fit := 1, len(starts) == 0 && !l.broken
	orientation := "landscape"
	if l.portrait {
		orientation = "portrait"
	}
	side, end, edge := 0.5, 0.6, 0.3 // inches; fits A4 and Letter
	order := "overThenDown"          // the halves of a wide sheet follow one another
	b.try(b.f.SetPageLayout(name, &excelize.PageLayoutOptions{Size: &a4, Orientation: &orientation, FitToWidth: &one, FitToHeight: &zero, PageOrder: &order}))
	if !fit { // programs overlook breaks on a sheet that is fitted
		scale := l.scale(starts)
		b.try(b.f.SetPageLayout(name, &excelize.PageLayoutOptions{AdjustTo: &scale}))
	}
	for _, c := range starts {
		at, _ := excelize.CoordinatesToCellName(c, 1)
		b.try(b.f.InsertPageBreak(name, at))
	}
	height := rowHeight
	b.try(b.f.SetSheetProps(name, &excelize.SheetPropsOptions{FitToPage: &fit, DefaultRowHeight: &height, CustomHeight: &always}))
	b.try(b.f.SetPageMargins(name, &excelize.PageLayoutMarginsOptions{Left: &side, Right: &side, Top: &end, Bottom: &end, Header: &edge, Footer: &edge}))
	b.try(b.f.SetHeaderFooter(name, &excelize.HeaderFooterOptions{
		OddHeader: "&L&8" + headerText(b.header) + "&R&8" + headerText(name),
		OddFooter: "&L&8" + headerText(b.footer) + "&R&8Page &P of &N"}))
	view := &excelize.ViewOptions{ShowGridLines: &no}
	if l.zoom > 0 {
		view.ZoomScale = &l.zoom
	}
	b.try(b.f.SetSheetView(name, 0, view))
	if l.freeze != "" {
		x, y, err := excelize.CellNameToCoordinates(l.freeze)
		b.try(err)
		pane := "bottomRight"
		if x == 1 {
			pane = "bottomLeft"
		}
		b.try(b.f.SetPanes(name, &excelize.Panes{Freeze: true, XSplit: x - 1, YSplit: y - 1, TopLeftCell: l.freeze, ActivePane: pane,
			Selection: []excelize.Selection{{SQRef: l.freeze, ActiveCell: l.freeze, Pane: pane}}}))
	}
	if l.repeat != "" {
		b.try(b.f.SetDefinedName(&excelize.DefinedName{Name: "_xlnm.Print_Titles", RefersTo: printTitles(name, l.repeat, len(starts) > 0), Scope: name}))
	}
}

// printTitles names the rows that every page repeats, and the first column where
// the sheet is cut into several pages side by side.
func printTitles(sheet, rows string, several bool) string {
	ref := "'" + sheet + "'!" + rows
	if several {
		ref = "'" + sheet + "'!$A:$A," + ref
	}
	return ref
}

// headerText prepares text for a header or footer: & begins a code there, and the
// whole may have 255 characters.
func headerText(s string) string { return strings.ReplaceAll(cut(plain(s), 90), "&", "&&") }

// cut shortens s to n runes.
func cut(s string, n int) string {
	if utf8.RuneCountInString(s) <= n {
		return s
	}
	return string([]rune(s)[:n-1]) + "…"
}

// write writes the workbook to path, the same bytes for the same content.
func (b *book) write(path string) error {
	if b.err != nil {
		return errors.Join(fmt.Errorf("%s: %w", path, b.err), b.f.Close())
	}
	raw, err := b.f.WriteToBuffer()
	err = errors.Join(err, b.f.Close())
	if err != nil {
		return err
	}
	out, err := steady(raw.Bytes())
	if err != nil {
		return err
	}
	return os.WriteFile(path, out, 0o666)
}
