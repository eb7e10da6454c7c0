package report

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// results is a results folder as Render sees it.
type results struct {
	dir   string
	num   numbers
	s     *RenderSettings
	table map[string]*Table // by file name; empty ones where a file is missing
	store *Store            // nil where there is no survey.nc

	bottles []*bottle // in the order of samples.csv
	byID    map[string]*bottle
	shared  []shared  // doubts on more than one bottle
	series  []*column // method × component, in the order of contributions.csv
	unit    string    // of intensities; empty where unknown
	mark    string    // first letters of the SHA-256 of contributions.csv
}

// bottle is one row of samples.csv with what the other files say about it.
type bottle struct {
	id, kind string
	row      int // of samples.csv
	at       int // in the store, −1 where it has no EEM
	flags    []int
	worst    eem.Severity // of the flags that are not accepted
	excluded string       // why it takes part in nothing, empty where it does
	of       map[*column]*contribution
}

// column is one component by one method: a column of results.
type column struct {
	method, component, unit string
	rows                    []*contribution // by bottle; nil where there is none
}

// contribution is one row of contributions.csv.
type contribution struct {
	value, u, lower, upper, limit float64
	qualifier, reported, reasons  string
	stated                        string // the expanded uncertainty as it stands behind reported
	detected                      bool
}

// expanded is the half-width k·u of the expanded uncertainty.
func (c *contribution) expanded() float64 { return unmix.ExpandedOf(c.value, c.u, c.lower, c.upper) }

// coverage is the factor k behind a stated ±, empty where none is stated.
func (c *contribution) coverage() string {
	if c.stated == "" {
		return ""
	}
	return strconv.FormatFloat(c.expanded()/c.u, 'f', 1, 64)
}

// state rounds value and expanded uncertainty, where the result is a number, by the
// one rule for both; what an older version left in the file may be rounded by another.
func (c *contribution) state(digits int) {
	if _, err := strconv.ParseFloat(c.reported, 64); err == nil {
		c.reported, c.stated = merit.Rounded(c.value, c.expanded(), digits), merit.RoundedExpanded(c.value, c.expanded(), digits)
	}
}

// methodName is a method in words.
func methodName(method string) string {
	switch method {
	case "references":
		return "known references"
	case "parafac":
		return "PARAFAC"
	case "model":
		return "fixed model"
	case "unexplained":
		return "not explained"
	}
	return method
}

// loadResults reads the tables of dir and opens its store.
func loadResults(dir string, s *RenderSettings) (*results, error) {
	r := &results{dir: dir, s: s, num: numbers{comma: s.Decimal == "," || s.Decimal == "comma"}, table: map[string]*Table{}}
	for _, f := range Schema {
		t, err := ReadTable(filepath.Join(dir, f.Name))
		switch {
		case errors.Is(err, fs.ErrNotExist) && f.Name != "contributions.csv" && f.Name != "samples.csv":
			t = New(f.Name)
		case err != nil:
			return nil, err
		}
		for _, c := range f.Columns {
			if t.Own(c.Name) < 0 && f.Name != "samples.csv" {
				return nil, fmt.Errorf("%s:1: no column %q; results are not edited by hand: run again", f.Name, c.Name)
			}
		}
		r.table[f.Name] = t
		makeVisible(t)
	}
	raw, err := os.ReadFile(filepath.Join(dir, "contributions.csv"))
	if err != nil {
		return nil, err
	}
	sum := sha256.Sum256(raw)
	r.mark = hex.EncodeToString(sum[:6])
	r.store, err = OpenStore(filepath.Join(dir, StoreName))
	if errors.Is(err, fs.ErrNotExist) {
		r.store, err = nil, nil
	}
	if err != nil {
		return nil, err
	}
	if err := r.index(); err != nil {
		return nil, errors.Join(err, r.close())
	}
	return r, nil
}

// makeVisible takes from all cells but the ids, by which tables are joined, what
// would mislead the eye.
func makeVisible(t *Table) {
	for c, name := range t.Columns {
		if name == "id" {
			continue
		}
		for _, row := range t.Rows {
			row[c] = visible(row[c])
		}
	}
}

func (r *results) close() error {
	if r.store == nil {
		return nil
	}
	return r.store.Close()
}

// index joins the tables by bottle.
func (r *results) index() error {
	samples := r.table["samples.csv"]
	id, kind := samples.Col("id"), samples.Col("kind")
	if id < 0 {
		return errors.New(`samples.csv:1: no column "id"; results are not edited by hand: run again`)
	}
	byID := map[string]*bottle{}
	for i := range samples.Rows {
		b := &bottle{id: samples.Text(i, id), kind: samples.Text(i, kind), row: i, at: -1, of: map[*column]*contribution{}}
		if byID[b.id] != nil {
			return fmt.Errorf("samples.csv: two rows of id %q; results are not edited by hand: run again", b.id)
		}
		if why := samples.Text(i, samples.Col("exclude")); why != "" {
			b.excluded = "excluded: " + why
		}
		byID[b.id] = b
		r.bottles = append(r.bottles, b)
	}
	if r.store != nil {
		r.unit = string(r.store.Unit)
		for i, id := range r.store.IDs {
			if b := byID[id]; b != nil {
				b.at = i
			}
		}
	}
	r.byID = byID
	r.indexShared()
	r.indexFlags(byID)
	r.indexContributions(byID)
	return nil
}

func (r *results) indexFlags(byID map[string]*bottle) {
	t := r.table["flags.csv"]
	id, test, severity := t.Col("id"), t.Col("test"), t.Col("severity")
	for i := range t.Rows {
		b := byID[t.Text(i, id)]
		if b == nil {
			continue
		}
		b.flags = append(b.flags, i)
		if t.Text(i, test) == "excluded" {
			b.excluded = t.Text(i, t.Col("message"))
		}
		s := parseSeverity(t.Text(i, severity))
		if _, ok := r.s.Accepts[t.Text(i, test)]; ok && s == eem.Doubt {
			s = eem.Remark
		}
		b.worst = max(b.worst, s)
	}
}

func parseSeverity(s string) eem.Severity {
	for v := eem.Remark; v <= eem.Reject; v++ {
		if v.String() == s {
			return v
		}
	}
	return eem.Information
}

func (r *results) indexContributions(byID map[string]*bottle) {
	t := r.table["contributions.csv"]
	col := map[string]int{}
	for i, name := range t.Columns {
		col[name] = i
	}
	byKey := map[[2]string]*column{}
	for i := range t.Rows {
		b := byID[t.Text(i, col["id"])]
		if b == nil {
			continue
		}
		key := [2]string{t.Text(i, col["method"]), t.Text(i, col["component"])}
		s := byKey[key]
		if s == nil {
			s = &column{method: key[0], component: key[1], unit: t.Text(i, col["unit"])}
			byKey[key] = s
			r.series = append(r.series, s)
		}
		b.of[s] = &contribution{
			value: t.Float(i, col["value"]), u: t.Float(i, col["standard_uncertainty"]),
			lower: t.Float(i, col["lower95"]), upper: t.Float(i, col["upper95"]), limit: t.Float(i, col["detection_limit"]),
			qualifier: t.Text(i, col["qualifier"]), reported: t.Text(i, col["reported"]), reasons: t.Text(i, col["reasons"]),
			detected: t.Bool(i, col["detected"]),
		}
		b.of[s].state(r.s.Digits)
		// A doubt on a model or a batch has no flag of the bottle's own.
		switch b.of[s].qualifier {
		case "J":
			b.worst = max(b.worst, eem.Doubt)
		case "R":
			b.worst = max(b.worst, eem.Reject)
		}
	}
	for _, s := range r.series {
		for _, b := range r.bottles {
			s.rows = append(s.rows, b.of[s])
		}
	}
	slices.SortStableFunc(r.series, func(a, b *column) int { return methodRank(a.method) - methodRank(b.method) })
}

// methodRank orders the methods: known references before models, what nothing
// explains last.
func methodRank(m string) int {
	order := []string{"references", "parafac", "model"}
	switch i := slices.Index(order, m); {
	case i >= 0:
		return i
	case m == "unexplained":
		return len(order) + 1
	}
	return len(order)
}

// methods lists the methods that gave components, in order.
func (r *results) methods() []string {
	var out []string
	for _, s := range r.series {
		if s.method != "unexplained" && !slices.Contains(out, s.method) {
			out = append(out, s.method)
		}
	}
	return out
}

// label is the heading of a column; the method is named where there are several.
func (r *results) label(s *column) string {
	name := s.component
	if s.method == "unexplained" {
		if name == "" {
			name = "not explained"
		}
		return name
	}
	if len(r.methods()) > 1 {
		name += " (" + methodName(s.method) + ")"
	}
	return name
}

// sheetColumns are the columns of samples.csv that the run sheet brought.
func (r *results) sheetColumns() []string {
	t := r.table["samples.csv"]
	f, _ := FindFile("samples.csv")
	own := map[int]bool{}
	for _, c := range f.Columns {
		own[t.Own(c.Name)] = true
	}
	var out []string
	for i, name := range t.Columns {
		if !own[i] {
			out = append(out, name)
		}
	}
	return out
}

// mapFile is the file name of a bottle's picture.
func (r *results) mapFile(id string) string { return r.s.SafeName(id) + ".png" }

// title is the heading of everything.
func (r *results) title() string {
	if t := strings.TrimSpace(r.s.Title); t != "" {
		return t
	}
	return "Fluorescence survey"
}
