package scanfile

import (
	"archive/zip"
	"bytes"
	"encoding/xml"
	"fmt"
	"io"
	"path"
	"strconv"
	"strings"
)

// An .xlsx workbook (ECMA-376) is read as a stream here and not through the
// library that writes ours: that one fills every row up to its last cell before
// it tells types, styles and merged cells, and a file of 11 kB with 1,000 rows
// that end in column XFD cost it 3.1 GB and 29 s. Nothing below holds more than
// the parts that are read (MaxBookBytes) and the cells that come out
// (maxTableCells).

// book is the part of a workbook that a table needs.
type book struct {
	name    string
	parts   map[string]*zip.File // by lower-case path
	left    int64                // bytes that may still be unpacked
	sheet   string               // name of the first sheet
	main    string               // path of the workbook itself
	strings []string
	date    []bool // by style: the number is a date or time
	from04  bool   // dates count from 1904
}

// xmlRel is one relationship of a part to another.
type xmlRel struct {
	ID     string `xml:"Id,attr"`
	Type   string `xml:"Type,attr"`
	Target string `xml:"Target,attr"`
}

func readBook(name string, data []byte) (*Table, error) {
	b, sheet, err := openBook(name, data)
	if err != nil {
		return nil, err
	}
	return b.table(sheet)
}

// SheetParts are names, in the archive, of parts of a workbook: of the sheet that
// ReadTable reads, of the tables on it, and of the workbook itself.
type SheetParts struct {
	Sheet, Workbook string
	Tables          []string
}

// FirstSheet finds the parts that belong to the sheet that ReadTable reads.
func FirstSheet(name string, data []byte) (p SheetParts, err error) {
	b, sheet, err := openBook(name, data)
	if err != nil {
		return p, err
	}
	named := func(part string) string {
		if f := b.parts[strings.ToLower(part)]; f != nil {
			return f.Name
		}
		return ""
	}
	if p.Sheet = named(sheet); p.Sheet == "" {
		return p, errorf(name, 0, "the workbook lacks its part %s; save it again", sheet)
	}
	p.Workbook = named(b.main)
	rels, err := b.rels(sheet)
	if err != nil { // a sheet without relationships has no tables
		return p, nil //nolint:nilerr // it lacks the part
	}
	for _, r := range rels {
		if strings.HasSuffix(r.Type, "/table") && named(r.Target) != "" {
			p.Tables = append(p.Tables, named(r.Target))
		}
	}
	return p, nil
}

// openBook reads everything of a workbook but its first sheet, and returns the
// sheet's path.
func openBook(name string, data []byte) (*book, string, error) {
	if bytes.HasPrefix(data, []byte("\xd0\xcf\x11\xe0")) {
		return nil, "", errorf(name, 0, "is protected by a password or of the old binary format; save it as .xlsx without a password")
	}
	if len(data) == 0 {
		return nil, "", errorf(name, 0, "is empty; save the workbook again")
	}
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		return nil, "", errorf(name, 0, "is no .xlsx workbook, or was cut short (%w); save it again", err)
	}
	b := &book{name: name, parts: map[string]*zip.File{}, left: MaxBookBytes}
	for _, f := range z.File {
		b.parts[strings.ToLower(strings.TrimPrefix(strings.ReplaceAll(f.Name, `\`, "/"), "/"))] = f
	}
	sheet, err := b.open()
	return b, sheet, err
}

// part unpacks one part of the workbook.
func (b *book) part(name string) ([]byte, error) {
	f := b.parts[strings.ToLower(name)]
	if f == nil {
		return nil, errorf(b.name, 0, "the workbook lacks its part %s; save it again", name)
	}
	r, err := f.Open()
	if err != nil {
		return nil, errorf(b.name, 0, "%s: %w; save the workbook again", name, err)
	}
	defer r.Close()
	data, err := io.ReadAll(io.LimitReader(r, b.left+1))
	if int64(len(data)) > b.left {
		return nil, errorf(b.name, 0, "unpacks to more than %d MB, which no table needs; save the sheet as CSV", MaxBookBytes>>20)
	}
	b.left -= int64(len(data))
	if err != nil {
		return nil, errorf(b.name, 0, "%s: %w; save the workbook again", name, err)
	}
	return data, nil
}

func (b *book) decode(name string, into any) error {
	data, err := b.part(name)
	if err != nil {
		return err
	}
	if err := xml.Unmarshal(data, into); err != nil {
		return errorf(b.name, 0, "%s: %w; save the workbook again", name, err)
	}
	return nil
}

// rels reads the relationships of a part; their targets come as full paths.
func (b *book) rels(of string) ([]xmlRel, error) {
	dir, file := path.Split(of)
	var r struct {
		Rel []xmlRel `xml:"Relationship"`
	}
	if err := b.decode(dir+"_rels/"+file+".rels", &r); err != nil {
		return nil, err
	}
	for i := range r.Rel {
		if t := r.Rel[i].Target; strings.HasPrefix(t, "/") {
			r.Rel[i].Target = t[1:]
		} else {
			r.Rel[i].Target = path.Join(dir, t)
		}
	}
	return r.Rel, nil
}

// open reads everything but the sheet, and returns the sheet's path.
func (b *book) open() (string, error) {
	root, err := b.rels("")
	if err != nil {
		return "", err
	}
	main := "xl/workbook.xml"
	for _, r := range root {
		if strings.HasSuffix(r.Type, "/officeDocument") {
			main = r.Target
		}
	}
	b.main = main
	var wb struct {
		Props struct {
			Date1904 string `xml:"date1904,attr"`
		} `xml:"workbookPr"`
		Sheets []struct {
			Name string     `xml:"name,attr"`
			Attr []xml.Attr `xml:",any,attr"`
		} `xml:"sheets>sheet"`
	}
	if err := b.decode(main, &wb); err != nil {
		return "", err
	}
	if len(wb.Sheets) == 0 {
		return "", errorf(b.name, 0, "has no sheet; save the workbook again")
	}
	b.from04 = isTrue(wb.Props.Date1904)
	b.sheet = wb.Sheets[0].Name
	id := ""
	for _, a := range wb.Sheets[0].Attr {
		if a.Name.Local == "id" {
			id = a.Value
		}
	}
	rels, err := b.rels(main)
	if err != nil {
		return "", err
	}
	sheet := ""
	for _, r := range rels {
		switch {
		case r.ID == id:
			if sheet = r.Target; !strings.HasSuffix(r.Type, "/worksheet") {
				return "", errorf(b.name, 0, "the first sheet, %s, is no table; move the table to the front", b.sheet)
			}
		case strings.HasSuffix(r.Type, "/sharedStrings"):
			err = b.readStrings(r.Target)
		case strings.HasSuffix(r.Type, "/styles"):
			err = b.readStyles(r.Target)
		}
		if err != nil {
			return "", err
		}
	}
	if sheet == "" {
		return "", errorf(b.name, 0, "the part of sheet %s is not to be found; save the workbook again", b.sheet)
	}
	return sheet, nil
}

func isTrue(s string) bool { return s == "1" || s == "true" || s == "on" }

// richText is a string of a workbook: plain, or in runs of different looks.
type richText struct {
	T string `xml:"t"`
	R []struct {
		T string `xml:"t"`
	} `xml:"r"`
}

func (t *richText) String() string {
	if len(t.R) == 0 {
		return t.T
	}
	var s strings.Builder
	s.WriteString(t.T)
	for _, r := range t.R {
		s.WriteString(r.T)
	}
	return s.String()
}

func (b *book) readStrings(name string) error {
	var t struct {
		SI []richText `xml:"si"`
	}
	if err := b.decode(name, &t); err != nil {
		return err
	}
	for i := range t.SI {
		b.strings = append(b.strings, t.SI[i].String())
	}
	return nil
}

func (b *book) readStyles(name string) error {
	var t struct {
		Fmts []struct {
			ID   int    `xml:"numFmtId,attr"`
			Code string `xml:"formatCode,attr"`
		} `xml:"numFmts>numFmt"`
		Xf []struct {
			ID int `xml:"numFmtId,attr"`
		} `xml:"cellXfs>xf"`
	}
	if err := b.decode(name, &t); err != nil {
		return err
	}
	custom := map[int]bool{}
	for _, f := range t.Fmts {
		custom[f.ID] = dateCode(f.Code)
	}
	for _, x := range t.Xf {
		is, ok := custom[x.ID]
		if !ok {
			is = dateFormat(x.ID)
		}
		b.date = append(b.date, is)
	}
	return nil
}

// dateFormat says which of the built-in number formats show dates or times
// (ECMA-376 part 1, 18.8.30).
func dateFormat(id int) bool {
	return id >= 14 && id <= 22 || id >= 27 && id <= 36 || id >= 45 && id <= 47 || id >= 50 && id <= 58
}

// dateCode says whether a format code shows a date or time: it has a letter of
// one outside quotes, brackets and escapes, in its first section.
func dateCode(code string) bool {
	for i := 0; i < len(code); i++ {
		switch c := code[i] | 0x20; {
		case code[i] == ';':
			return false
		case code[i] == '\\' || code[i] == '_' || code[i] == '*':
			i++
		case code[i] == '"' || code[i] == '[':
			end := byte('"')
			if code[i] == '[' {
				end = ']'
				if i+1 < len(code) && strings.IndexByte("hHmMsS", code[i+1]) >= 0 {
					return true // elapsed time
				}
			}
			n := strings.IndexByte(code[i+1:], end)
			if n < 0 {
				return false
			}
			i += n + 1
		case c == 'g': // General
			return false
		case c == 'y' || c == 'd' || c == 'm' || c == 'h' || c == 's':
			return true
		}
	}
	return false
}

// cellError is an error at a cell of the sheet.
func (b *book) cellError(ref, format string, args ...any) error {
	return errorf(b.name, 0, "%s!%s: %s", b.sheet, ref, fmt.Sprintf(format, args...))
}

// cellRef splits a reference such as AB12 into column and row, both from 1.
func cellRef(ref string) (col, row int, ok bool) {
	i := 0
	for i < len(ref) && i < 4 && ref[i]|0x20 >= 'a' && ref[i]|0x20 <= 'z' {
		col = col*26 + int(ref[i]|0x20-'a') + 1
		i++
	}
	row, err := strconv.Atoi(ref[i:])
	return col, row, err == nil && col > 0 && row > 0 && row <= 1<<20
}

func cellName(col, row int) string {
	s := ""
	for ; col > 0; col = (col - 1) / 26 {
		s = string(rune('A'+(col-1)%26)) + s
	}
	return s + strconv.Itoa(row)
}
