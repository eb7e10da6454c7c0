package report

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
)

// Table is one CSV file of the results: header and cells exactly as written.
type Table struct {
	Name    string // file name, "samples.csv"
	Columns []string
	Rows    [][]string // each as long as Columns
}

// Append adds a row. Cells are strings, numbers (the shortest text that reads
// back as the same number; NaN is an empty cell), booleans (true, false), values
// with a String method, or nil for an empty cell. It panics when the number of
// cells is not that of the columns, or on another type.
func (t *Table) Append(cells ...any) {
	if len(cells) != len(t.Columns) {
		panic(fmt.Sprintf("report: %d cells for the %d columns of %s", len(cells), len(t.Columns), t.Name))
	}
	row := make([]string, len(cells))
	for i, c := range cells {
		row[i] = cellText(c)
	}
	t.Rows = append(t.Rows, row)
}

func cellText(c any) string {
	switch v := c.(type) {
	case nil:
		return ""
	case string:
		return v
	case float64:
		return Number(v)
	case float32:
		return Number(float64(v))
	case int:
		return strconv.Itoa(v)
	case bool:
		return strconv.FormatBool(v)
	case fmt.Stringer:
		return v.String()
	}
	panic(fmt.Sprintf("report: a cell of type %T", c))
}

// Number is the text of a number in a table: the shortest that reads back as the
// same number, without a sign on zero, empty for NaN.
func Number(v float64) string {
	switch {
	case math.IsNaN(v):
		return ""
	case v == 0:
		return "0"
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}

// Write writes the table as CSV with a header row and LF line ends.
func (t *Table) Write(w io.Writer) error {
	c := csv.NewWriter(w)
	if err := c.Write(t.Columns); err != nil {
		return err
	}
	return c.WriteAll(t.Rows)
}

// WriteFile writes the table to its file in dir.
func (t *Table) WriteFile(dir string) error {
	f, err := os.Create(filepath.Join(dir, t.Name))
	if err != nil {
		return err
	}
	return errors.Join(t.Write(f), f.Close())
}

// ReadTable reads a table that Write wrote. Errors name file, line and remedy.
func ReadTable(path string) (*Table, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	name := filepath.Base(path)
	c := csv.NewReader(f)
	rows, err := c.ReadAll()
	if err != nil {
		return nil, fmt.Errorf("%s: %w; results are not edited by hand: run again", name, err)
	}
	if len(rows) == 0 {
		return nil, fmt.Errorf("%s:1: no header row; results are not edited by hand: run again", name)
	}
	return &Table{Name: name, Columns: rows[0], Rows: rows[1:]}, nil
}

// Col returns the place of a column, -1 where there is none. Where a run sheet
// brought a column of the same name, it is the first of them.
func (t *Table) Col(name string) int { return slices.Index(t.Columns, name) }

// Text returns a cell; empty where col is -1.
func (t *Table) Text(row, col int) string {
	if col < 0 {
		return ""
	}
	return t.Rows[row][col]
}

// Float returns a cell as a number; NaN where it is empty or no number.
func (t *Table) Float(row, col int) float64 {
	v, err := strconv.ParseFloat(t.Text(row, col), 64)
	if err != nil {
		return math.NaN()
	}
	return v
}

// Bool says whether a cell reads "true".
func (t *Table) Bool(row, col int) bool { return t.Text(row, col) == "true" }

// floats returns a whole column as numbers.
func (t *Table) floats(name string) []float64 {
	v := make([]float64, len(t.Rows))
	for i := range v {
		v[i] = t.Float(i, t.Col(name))
	}
	return v
}

// groups returns the rows of every text of a column, the texts in the order in
// which they first appear.
func (t *Table) groups(name string) (texts []string, rows map[string][]int) {
	rows = map[string][]int{}
	for i := range t.Rows {
		v := t.Text(i, t.Col(name))
		if rows[v] == nil {
			texts = append(texts, v)
		}
		rows[v] = append(rows[v], i)
	}
	return texts, rows
}
