package survey

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"io"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"github.com/xuri/excelize/v2"
)

// A list that a person made a table of, or put a filter on, states which rows it
// has (ECMA-376, part 1, 18.5.1.2 and 18.3.1.2): rows that come behind it are
// neither sorted nor filtered with it. So what ends where the list ended is
// stretched over the new rows.

// stretch brings what ended in row last, or in empty rows behind it, down to row to,
// where it frames the column col, from 1: another table may stand beside the list.
type stretch struct{ last, to, col int }

var frameEnd = regexp.MustCompile(`(ref=["']([A-Z]+)[0-9]+:([A-Z]+))([0-9]+)`)

// tag stretches the ref of a start tag.
func (s stretch) tag(tag []byte) []byte {
	return frameEnd.ReplaceAllFunc(tag, func(m []byte) []byte { return s.end(m, frameEnd) })
}

func (s stretch) end(m []byte, at *regexp.Regexp) []byte {
	part := at.FindSubmatch(m)
	from, err1 := excelize.ColumnNameToNumber(string(part[2]))
	to, err2 := excelize.ColumnNameToNumber(string(part[3]))
	n, err3 := strconv.Atoi(string(part[4]))
	if err1 != nil || err2 != nil || err3 != nil || s.col < from || s.col > to || n < s.last || n >= s.to {
		return m
	}
	return fmt.Appendf(nil, "%s%d", part[1], s.to)
}

// tags stretches the start tags of these names in the XML of a part. A table with a
// row of totals stays: what comes behind that row is no part of it.
func (s stretch) tags(text []byte, names ...string) ([]byte, error) {
	d := xml.NewDecoder(bytes.NewReader(text))
	var out []byte
	done := 0
	for {
		at := int(d.InputOffset())
		tok, err := d.RawToken()
		if err == io.EOF { //nolint:errorlint // the decoder gives it as it is
			return append(out, text[done:]...), nil
		}
		if err != nil {
			return nil, err
		}
		e, ok := tok.(xml.StartElement)
		if !ok || !slices.Contains(names, e.Name.Local) {
			continue
		}
		if n := attribute(e, "totalsRowCount"); e.Name.Local == "table" && n != "" && n != "0" {
			return text, nil
		}
		end := int(d.InputOffset())
		out = append(append(out, text[done:at]...), s.tag(text[at:end])...)
		done = end
	}
}

// filterName finds the hidden name that spreadsheets keep for the filter of the
// first sheet, and the row in which it ends.
var filterName = regexp.MustCompile(`(<(?:[a-z]+:)?definedName\b[^>]*_xlnm\._FilterDatabase[^>]*>[^<]*\$([A-Z]+)\$[0-9]+:\$([A-Z]+)\$)([0-9]+)`)

// names stretches that name in the XML of the workbook.
func (s stretch) names(text []byte) []byte {
	return filterName.ReplaceAllFunc(text, func(m []byte) []byte {
		if head, _, _ := bytes.Cut(m, []byte(">")); !strings.Contains(strings.ReplaceAll(string(head), "'", `"`), `localSheetId="0"`) {
			return m
		}
		return s.end(m, filterName)
	})
}
