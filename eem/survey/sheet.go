package survey

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/scanfile"
)

// sheetNames are the names that a run sheet may have.
var sheetNames = []string{"runsheet.csv", "runsheet.xlsx"}

// ReadSheet reads the run sheet of the survey folder dir, runsheet.csv or
// runsheet.xlsx, and merges the exclusions that the settings name. s may be nil
// for the defaults. Faults of the sheet are of type Problems: all of them at
// once, each with line, column and remedy.
func ReadSheet(dir string, s *Settings) (*Sheet, error) {
	if s == nil {
		s = Default()
	}
	path, err := findSheet(dir)
	if err != nil {
		return nil, err
	}
	t, err := scanfile.ReadTable(path)
	if err != nil {
		return nil, err
	}
	var x *scanfile.Table
	if s.Sheet.Exclusions != "" {
		if x, err = scanfile.ReadTable(rel(dir, s.Sheet.Exclusions)); err != nil {
			return nil, fmt.Errorf("exclusions of [sheet] in the settings: %w", err)
		}
	}
	return sheetOf(t, x, s)
}

// findSheet finds the one run sheet of a survey folder.
func findSheet(dir string) (string, error) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return "", fmt.Errorf("the survey folder cannot be read: %w", err)
	}
	var found []string
	like := ""
	for _, e := range entries {
		for _, n := range sheetNames {
			if e.Name() == n {
				found = append(found, filepath.Join(dir, n))
			} else if strings.EqualFold(e.Name(), n) {
				like = e.Name() + " must be named " + n
			}
		}
		if strings.EqualFold(e.Name(), "runsheet.xls") || strings.EqualFold(e.Name(), "runsheet.ods") {
			like = e.Name() + " must be saved as runsheet.xlsx"
		}
	}
	switch {
	case len(found) == 2:
		return "", fmt.Errorf("%s: both %s and %s are there, and nobody can know which counts; move one away", dir, sheetNames[0], sheetNames[1])
	case len(found) == 1:
		return found[0], nil
	case like != "":
		return "", fmt.Errorf("%s: there is no run sheet; %s", dir, like)
	}
	return "", &noSheet{dir}
}

// noSheet is the error of a survey folder without any run sheet.
type noSheet struct{ dir string }

func (e *noSheet) Error() string {
	return fmt.Sprintf("%s: there is no run sheet (%s); `tarnlight begin %s` drafts one from the raw files",
		e.dir, strings.Join(sheetNames, " or "), e.dir)
}

// sheetOf makes a sheet of a table, and of the table of exclusions where there is
// one.
func sheetOf(t, exclusions *scanfile.Table, s *Settings) (*Sheet, error) {
	r := &sheetReader{t: t, s: s, sheet: &Sheet{Path: t.Path, Notes: t.Notes}}
	if !r.header() {
		return nil, r.problems.err()
	}
	r.decimalMark()
	for i := range t.Rows {
		r.row(&t.Rows[i])
	}
	r.draftedColumns()
	if len(t.Rows) == 0 {
		r.problems.add(t.Path, 0, "", "the run sheet has a header and no rows; write one row for every bottle, blank and standard")
	}
	r.index()
	if exclusions != nil {
		r.exclude(exclusions)
	}
	r.checkRows()
	if err := r.problems.err(); err != nil {
		return nil, err
	}
	return r.sheet, nil
}

// sheetReader turns a table into rows.
type sheetReader struct {
	t        *scanfile.Table
	s        *Settings
	sheet    *Sheet
	cols     []headed
	decimal  string         // mark of the whole sheet; empty when it could not be decided
	ids      map[string]int // index of a row by id
	problems Problems
}

// headed is a column of the table: one that is known, a concentration, or
// another one that is carried along.
type headed struct {
	known *column
	conc  *Conc
}

func (h headed) numeric() bool { return h.conc != nil || (h.known != nil && h.known.numeric) }

func (r *sheetReader) add(line int, col, format string, args ...any) {
	r.problems.add(r.t.Path, line, col, format, args...)
}

// cell returns cell i of a record, empty where the record is shorter.
func cell(rec *scanfile.Record, i int) string {
	if i < len(rec.Cells) {
		return strings.TrimSpace(rec.Cells[i])
	}
	return ""
}

// row reads one record.
func (r *sheetReader) row(rec *scanfile.Record) {
	row := NewRow()
	row.Line, row.AbsorbanceDilution = rec.Line, math.NaN()
	row.Cells = make([]string, len(r.cols))
	for i, h := range r.cols {
		text := cell(rec, i)
		row.Cells[i] = text
		if text == "" || (h.numeric() && (noValue(text) || r.decimal == "")) {
			continue
		}
		switch {
		case h.known != nil:
			if msg := h.known.set(&row, text, r.decimal); msg != "" {
				r.add(rec.Line, h.known.name, "%s", msg)
			}
		case h.conc != nil:
			r.conc(&row, *h.conc, text, i)
		}
	}
	for i := len(r.cols); i < len(rec.Cells); i++ {
		if cell(rec, i) != "" {
			r.add(rec.Line, "", "the row has more cells than the header (cell %d is %s); name the column, or put a cell that holds the delimiter in quotes",
				i+1, quote(cell(rec, i)))
			break
		}
	}
	if math.IsNaN(row.AbsorbanceDilution) {
		row.AbsorbanceDilution = row.Dilution
	}
	r.missing(&row)
	r.sheet.Rows = append(r.sheet.Rows, row)
}

// missing reports an empty id or kind; scans are checked when exclusions are
// known, since a bottle that is excluded may have lost them.
func (r *sheetReader) missing(row *Row) {
	for i, h := range r.cols {
		if h.known == nil || row.Cells[i] != "" {
			continue
		}
		switch h.known.name {
		case "id":
			r.add(row.Line, "id", "the id is missing; every row needs one of its own")
		case "kind":
			r.add(row.Line, "kind", "the kind is missing; write %s", kindNames())
		}
	}
}

// conc reads a concentration.
func (r *sheetReader) conc(row *Row, c Conc, text string, i int) {
	v, err := scanfile.ParseNumber(text, r.decimal)
	switch {
	case err != nil:
		r.add(row.Line, r.sheet.Columns[i], "%s is not a number; write the concentration in the liquid scanned, 0 for none, or nothing where it is unknown", quote(text))
	case v < 0:
		r.add(row.Line, r.sheet.Columns[i], "%s is negative; write the concentration in the liquid scanned", quote(text))
	default:
		c.Value = v
		row.Conc = append(row.Conc, c)
	}
}

// draftedColumns reports concentrations under a header that was left as drafted.
func (r *sheetReader) draftedColumns() {
	for j, h := range r.cols {
		if h.conc == nil || h.conc.drafted() == "" {
			continue
		}
		if slices.ContainsFunc(r.sheet.Rows, func(row Row) bool { return !noValue(row.Cells[j]) }) {
			r.add(r.t.HeadLine, r.sheet.Columns[j], "%s; write its own in this header, such as conc:tryptophan [µg/L], and a column for each further component", h.conc.drafted())
		}
	}
}

// noValue says whether a cell of numbers stands for nothing. Marks of overflow
// are not among them: a width of #### hides a number that counts.
func noValue(cell string) bool {
	switch strings.ToLower(cell) {
	case "", "-", "--", "---", "–", "—", "na", "n/a", "nan":
		return true
	}
	return false
}

// decimalMark decides the decimal mark of all cells of numbers together.
func (r *sheetReader) decimalMark() {
	var cells []string
	for i := range r.t.Rows {
		for j, h := range r.cols {
			if text := cell(&r.t.Rows[i], j); h.numeric() && !noValue(text) {
				cells = append(cells, text)
			}
		}
	}
	mark, err := scanfile.DecimalMark(cells)
	if err == nil {
		r.decimal = mark
		return
	}
	line, name := r.firstComma()
	r.add(line, name, "%v; write all numbers of the sheet with one decimal mark, and no thousands marks", err)
}

// firstComma finds the first number with a comma.
func (r *sheetReader) firstComma() (line int, name string) {
	for i := range r.t.Rows {
		for j, h := range r.cols {
			if h.numeric() && strings.Contains(cell(&r.t.Rows[i], j), ",") {
				return r.t.Rows[i].Line, r.sheet.Columns[j]
			}
		}
	}
	return r.t.HeadLine, ""
}

// note appends a note about the sheet.
func (r *sheetReader) note(test string, sev eem.Severity, line int, format string, args ...any) {
	r.sheet.Notes = append(r.sheet.Notes, eem.Note{Step: "run sheet", Test: test, Severity: sev,
		Msg: fmt.Sprintf(format, args...), File: r.t.Path, Line: line})
}

// rel is a path of the settings, which are relative to the survey folder.
func rel(dir, path string) string {
	if path = filepath.FromSlash(path); filepath.IsAbs(path) {
		return path
	}
	return filepath.Join(dir, path)
}
