package survey

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"golang.org/x/text/encoding"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"

	"tarnlight/eem/scanfile"
)

// Append returns the run sheet data with rows behind its last one. Every byte of
// a CSV sheet stays and the rows are written in its delimiter, encoding and line
// ends; of a workbook all stays but the first sheet's list of rows, which grows. Of
// a row only the columns that the sheet has are written. s are the settings that
// the sheet is checked by, nil for the defaults.
//
// The new sheet is read again before it is returned: the old rows must be as they
// were, and the sheet must be one that ReadSheet takes.
func Append(name string, data []byte, s *Settings, rows []Row) ([]byte, error) {
	if s == nil {
		s = Default()
	}
	t, err := scanfile.ReadTableBytes(name, data)
	if err != nil {
		return nil, err
	}
	d := newDraft(&Sheet{Columns: t.Header})
	records := make([][]string, len(rows))
	for i := range rows {
		records[i] = make([]string, len(d.headers))
		for j := range records[i] {
			records[i][j] = d.text(&rows[i], j)
		}
	}
	var out []byte
	if t.Delimiter == "" {
		out, err = appendXLSX(name, data, records)
	} else {
		out, err = appendCSV(t, data, records)
	}
	if err != nil {
		return nil, err
	}
	return out, sameAndMore(t, out, s, rows)
}

// sameAndMore reads the sheet that Append made.
func sameAndMore(before *scanfile.Table, out []byte, s *Settings, rows []Row) error {
	after, err := scanfile.ReadTableBytes(before.Path, out)
	if err != nil {
		return fmt.Errorf("the sheet with the new rows could not be read: %w", err)
	}
	n := len(before.Rows)
	same := len(after.Rows) == n+len(rows) && slices.Equal(before.Header, after.Header)
	for i := 0; same && i < n; i++ {
		same = before.Rows[i].Line == after.Rows[i].Line && slices.Equal(before.Rows[i].Cells, after.Rows[i].Cells)
	}
	if !same {
		return fmt.Errorf("%s: rows cannot be added without a change to those that are there; save it once from a spreadsheet program, or add them by hand", before.Path)
	}
	sheet, err := sheetOf(after, nil, s)
	if err != nil {
		return err
	}
	_, absorbance := before.Col("absorbance")
	for i := range rows {
		if got := sheet.Rows[n+i]; got.ID != rows[i].ID || got.Scans != rows[i].Scans || absorbance && got.Absorbance != rows[i].Absorbance {
			return fmt.Errorf("%s: the row of %s came out as another (%s); add it by hand", before.Path, quote(rows[i].ID), quote(got.ID))
		}
	}
	return nil
}

// appendCSV writes records in the manner of the table.
func appendCSV(t *scanfile.Table, data []byte, records [][]string) ([]byte, error) {
	plain := data
	if strings.HasPrefix(t.Encoding, "UTF-16") {
		plain = bytes.ReplaceAll(data, []byte{0}, nil)
	}
	if bytes.HasSuffix(plain, []byte("\x1a")) {
		return nil, fmt.Errorf("%s: ends with an end-of-file mark of old systems, behind which nothing can be added; save it again", t.Path)
	}
	end := lineEnd(plain)
	var b bytes.Buffer
	if !bytes.HasSuffix(plain, []byte("\n")) && !bytes.HasSuffix(plain, []byte("\r")) {
		b.WriteString("\n")
	}
	w := csv.NewWriter(&b)
	w.Comma = rune(t.Delimiter[0])
	if err := w.WriteAll(records); err != nil {
		return nil, err
	}
	text, err := encoderOf(t.Encoding).Bytes([]byte(strings.ReplaceAll(b.String(), "\n", end)))
	if err != nil {
		return nil, fmt.Errorf("%s: its encoding, %s, has no room for a character of the new rows; save it as UTF-8", t.Path, t.Encoding)
	}
	return slices.Concat(data, text), nil
}

// lineEnd is the one of the file's last line that has one.
func lineEnd(text []byte) string {
	i := bytes.LastIndexAny(text, "\r\n")
	switch {
	case i < 0 || text[i] == '\n' && (i == 0 || text[i-1] != '\r'):
		return "\n"
	case text[i] == '\r':
		return "\r"
	}
	return "\r\n"
}

func encoderOf(name string) *encoding.Encoder {
	switch name {
	case "UTF-16 LE":
		return unicode.UTF16(unicode.LittleEndian, unicode.IgnoreBOM).NewEncoder()
	case "UTF-16 BE":
		return unicode.UTF16(unicode.BigEndian, unicode.IgnoreBOM).NewEncoder()
	case "Windows-1252":
		return charmap.Windows1252.NewEncoder()
	}
	return encoding.Nop.NewEncoder()
}

// SheetPath finds the run sheet of a survey folder; it is empty where there is
// none. Two of them are an error.
func SheetPath(dir string) (string, error) {
	path, err := findSheet(dir)
	var none *noSheet
	if errors.As(err, &none) {
		return "", nil
	}
	return path, err
}

// ParseSheet is ReadSheet on the bytes of the sheet alone, without exclusions. A
// sheet that has a header and no row yet is taken.
func ParseSheet(name string, data []byte, s *Settings) (*Sheet, error) {
	t, err := scanfile.ReadTableBytes(name, data)
	if err != nil {
		return nil, err
	}
	if len(t.Rows) == 0 {
		r := &sheetReader{t: t, s: s, sheet: &Sheet{Path: t.Path, Notes: t.Notes}}
		r.header()
		return r.sheet, r.problems.err()
	}
	return sheetOf(t, nil, s)
}

// FoldID maps ids that file systems or people cannot tell apart to one text.
func FoldID(id string) string { return foldID(id) }

// PlainCell says whether a path below the root, written into a cell as it is, is
// read as the same path.
func PlainCell(path string) bool {
	var field string
	return path != "" && strings.TrimSpace(path) == path && !strings.ContainsRune(path, '\u00a0') && utf8.ValidString(path) &&
		setPath(&field, path) == "" && field == path
}

// PatternOf writes a piece of a path so that a pattern in a cell finds it:
// characters that a cell cannot hold, or that a pattern takes for more than
// themselves, become patterns of their own.
func PatternOf(text string) string {
	var b strings.Builder
	for i, r := range text {
		switch {
		case strings.ContainsRune("*?[", r):
			b.WriteString("[" + string(r) + "]")
		case r == '\\', r == '\u00a0', r == utf8.RuneError, isControl(r), r == ' ' && (i == 0 || i == len(text)-1):
			b.WriteByte('?')
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}
