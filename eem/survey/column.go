package survey

import (
	"fmt"
	"math"
	"path"
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"tarnlight/eem/scanfile"
)

// column is one column that the run sheet knows. set reads a cell that is not
// empty and returns what is wrong with it, with the remedy, or nothing; get gives
// the text of a drafted row.
type column struct {
	name    string
	needed  bool
	numeric bool
	set     func(r *Row, cell, decimal string) string
	get     func(r *Row) string
}

// columns are the columns of the run sheet, but for the concentrations, in the
// order of the documents.
var columns = []column{
	{name: "id", needed: true, set: setID, get: func(r *Row) string { return r.ID }},
	{name: "kind", needed: true, set: setKind, get: func(r *Row) string { return string(r.Kind) }},
	{name: "scans", needed: true, set: func(r *Row, c, _ string) string { return setPath(&r.Scans, c) }, get: func(r *Row) string { return r.Scans }},
	{name: "absorbance", set: func(r *Row, c, _ string) string { return setPath(&r.Absorbance, c) }, get: func(r *Row) string { return r.Absorbance }},
	number1("absorbance_path_cm", func(r *Row) *float64 { return &r.AbsorbancePathCM }, above(0, "cm; the path of the absorbance cell, such as 1"), 1),
	words("setup", func(r *Row) *string { return &r.Setup }),
	when("measured", func(r *Row) *Time { return &r.Measured }),
	when("sampled", func(r *Row) *Time { return &r.Sampled }),
	words("site", func(r *Row) *string { return &r.Site }),
	words("batch", func(r *Row) *string { return &r.Batch }),
	{name: "blanks", set: func(r *Row, c, _ string) string { r.Blanks = []string{c}; return "" }, get: func(r *Row) string { return strings.Join(r.Blanks, "; ") }},
	number1("dilution", func(r *Row) *float64 { return &r.Dilution }, from(1, "final volume / sample volume; 1 + 9 is 10"), 1),
	number1("absorbance_dilution", func(r *Row) *float64 { return &r.AbsorbanceDilution }, from(1, "final volume / sample volume; 1 + 9 is 10"), math.NaN()),
	words("replicate_of", func(r *Row) *string { return &r.ReplicateOf }),
	{name: "replicate_kind", set: setReplicateKind, get: func(r *Row) string { return r.ReplicateKind }},
	words("spike_of", func(r *Row) *string { return &r.SpikeOf }),
	reason("exclude", func(r *Row) *string { return &r.Exclude }),
	reason("exclude_from_fit", func(r *Row) *string { return &r.ExcludeFromFit }),
	number1("doc_mg_per_l", func(r *Row) *float64 { return &r.DOC }, from(0, "mg/L"), math.NaN()),
	number1("temperature_c", func(r *Row) *float64 { return &r.TemperatureC }, from(-10, "°C"), math.NaN()),
}

// columnOf finds a known column by its header, case ignored.
func columnOf(header string) (column, bool) {
	for _, c := range columns {
		if strings.EqualFold(c.name, header) {
			return c, true
		}
	}
	return column{}, false
}

// NewRow returns a row in which nothing is given: numbers hold their defaults, or
// NaN.
func NewRow() Row {
	var r Row
	for _, c := range columns {
		if c.numeric {
			c.set(&r, "", "")
		}
	}
	r.AbsorbanceDilution = r.Dilution
	return r
}

// limit is a lower bound of a number and what the number is.
type limit struct {
	lo   float64
	open bool
	what string
}

func above(lo float64, what string) limit { return limit{lo, true, what} }
func from(lo float64, what string) limit  { return limit{lo, false, what} }

func setReplicateKind(r *Row, cell, _ string) string {
	switch cell = strings.ToLower(cell); cell {
	case "", Laboratory, Field:
		r.ReplicateKind = cell
		return ""
	}
	return quote(cell) + " is no kind of replicate; write laboratory (measured again) or field (a bottle of its own)"
}

// number1 is a column of one number; empty cells give def.
func number1(name string, field func(*Row) *float64, l limit, def float64) column {
	return column{
		name: name, numeric: true,
		set: func(r *Row, cell, decimal string) string {
			if cell == "" {
				*field(r) = def
				return ""
			}
			v, err := scanfile.ParseNumber(cell, decimal)
			switch {
			case err != nil:
				return fmt.Sprintf("%s is not a number; write %s", quote(cell), l.what)
			case v < l.lo || (l.open && v == l.lo):
				word := "of at least"
				if l.open {
					word = "above"
				}
				return fmt.Sprintf("%s is too small; write a number %s %g (%s)", quote(cell), word, l.lo, l.what)
			}
			*field(r) = v
			return ""
		},
		get: func(r *Row) string {
			v := *field(r)
			if math.IsNaN(v) || v == def || v < l.lo || (l.open && v == l.lo) {
				return ""
			}
			return strconv.FormatFloat(v, 'g', -1, 64)
		},
	}
}

// words is a column of free text in one line.
func words(name string, field func(*Row) *string) column {
	return column{
		name: name,
		set: func(r *Row, cell, _ string) string {
			if msg := controls(cell); msg != "" {
				return msg
			}
			*field(r) = cell
			return ""
		},
		get: func(r *Row) string { return *field(r) },
	}
}

// reason is a column that holds a reason, or nothing.
func reason(name string, field func(*Row) *string) column {
	c := words(name, field)
	c.set = func(r *Row, cell, _ string) string {
		if noReason(cell) {
			return quote(cell) + " is no reason; write why, or leave the cell empty to keep the row"
		}
		*field(r) = oneLine(cell)
		return ""
	}
	return c
}

// noReason tells answers from reasons: who writes "no" does not want the row out.
func noReason(cell string) bool {
	switch strings.ToLower(cell) {
	case "yes", "no", "y", "n", "true", "false", "x", "0", "1":
		return true
	}
	return false
}

// when is a column of dates or times.
func when(name string, field func(*Row) *Time) column {
	return column{
		name: name,
		set: func(r *Row, cell, _ string) string {
			t, msg := parseTime(cell)
			*field(r) = t
			return msg
		},
		get: func(r *Row) string { return field(r).Text },
	}
}

func setID(r *Row, cell, _ string) string {
	if msg := controls(cell); msg != "" {
		return msg
	}
	if msg := formula(cell); msg != "" {
		return msg
	}
	r.ID = cell
	return ""
}

func setKind(r *Row, cell, _ string) string {
	k := Kind(strings.ToLower(cell))
	names := make([]string, len(Kinds))
	for i := range Kinds {
		if names[i] = string(Kinds[i]); k == Kinds[i] {
			r.Kind = k
			return ""
		}
	}
	return quote(cell) + " is no kind; write " + kindNames() + didYouMean(cell, names)
}

var drive = regexp.MustCompile(`^[A-Za-z]:`)

// setPath takes a path below the root, with slashes or backslashes.
func setPath(field *string, cell string) string {
	if msg := controls(cell); msg != "" {
		return msg
	}
	p := strings.ReplaceAll(cell, `\`, "/")
	if strings.HasPrefix(p, "/") || drive.MatchString(p) {
		return quote(cell) + " is not below the root; write the path relative to it, and name the folder as root under [sheet] in survey.toml"
	}
	for _, part := range strings.Split(p, "/") {
		if part == ".." {
			return quote(cell) + " leaves the root by ..; write a path below it, or name the other folder as root under [sheet] in survey.toml"
		}
	}
	*field = path.Clean(p)
	return ""
}

// controls says that a cell holds control characters.
func controls(cell string) string {
	for _, r := range cell {
		if isControl(r) || r == '\ufffd' {
			return fmt.Sprintf("%s holds the character %+q; remove it", quote(cell), r)
		}
	}
	return ""
}

// formula says that a spreadsheet would take the text for a formula, as it does
// in every CSV file where the text would be written.
func formula(cell string) string {
	const marks = "=+-@＝＋－＠"
	if first, _ := utf8.DecodeRuneInString(cell); strings.ContainsRune(marks, first) {
		return quote(cell) + " begins with " + string(first) + ", which spreadsheets take for a formula; put a letter or digit before it"
	}
	return ""
}

// oneLine joins the lines of a cell.
func oneLine(cell string) string {
	return strings.Join(strings.FieldsFunc(cell, isControl), " ")
}

// DraftConc is the header of a drafted column of concentrations: a component's name
// and unit belong in the places of NAME and unit.
const DraftConc = "conc:NAME [unit]"

// drafted says what a header lacks that was left as it was drafted, or nothing.
func (c Conc) drafted() string {
	switch {
	case c.Name == "NAME":
		return "NAME stands for a component"
	case c.Unit == "unit":
		return "[unit] stands for the unit"
	}
	return ""
}

// isConc says whether a header names a concentration.
func isConc(header string) bool {
	before, _, ok := strings.Cut(header, ":")
	return ok && strings.EqualFold(strings.TrimSpace(before), "conc")
}

// concOf splits "conc:NAME [unit]". A name may hold brackets itself, like
// benzo[a]pyrene; the unit is the pair at the end.
func concOf(header string) (c Conc, msg string) {
	_, name, _ := strings.Cut(header, ":")
	name = strings.TrimSpace(name)
	if i := strings.LastIndexByte(name, '['); i > 0 && strings.HasSuffix(name, "]") {
		name, c.Unit = strings.TrimSpace(name[:i]), strings.TrimSpace(name[i+1:len(name)-1])
	}
	c.Name, c.Value = name, math.NaN()
	if name == "" || name[0] == '[' {
		return c, "the column names no component; write conc:NAME or conc:NAME [unit]"
	}
	if msg := formula(name); msg != "" {
		return c, msg
	}
	return c, controls(header)
}
