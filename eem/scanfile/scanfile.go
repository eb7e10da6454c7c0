// Package scanfile reads what fluorometers and spectrophotometers export, and
// the tables that people keep beside it (CSV, XLSX), with their line numbers.
//
// A scan file is read in one of a few forms: one file per excitation (stack),
// one file per sample (grid), three columns (long), JCAMP-DX. Form, delimiter,
// decimal mark and encoding are decided from the content of each file; what was
// decided is in its Notes, and every decision can be overridden by Settings.
// Where the content allows two readings the file is refused and the error names
// the setting that decides.
//
// No file causes a panic, and none costs more memory than a small multiple of
// its size: files above the limits below are refused.
package scanfile

import (
	"math"

	"tarnlight/eem"
)

// Limits on what is read.
const (
	MaxFileBytes = 256 << 20 // a raw file; a delimited table at most 32 MB
	MaxBookBytes = 64 << 20  // an XLSX workbook, unpacked
	MaxColumns   = 10_000    // columns of a raw file
)

// Form is the way a raw file lays out its scans.
type Form string

// The forms. The empty Form is Auto.
const (
	Auto  Form = "auto"  // decided from the content
	Stack Form = "stack" // one emission scan a file, or several below or beside each other; excitation in file name or header
	Grid  Form = "grid"  // one sample a file: excitations across, emissions down, or the transpose
	Long  Form = "long"  // a row a cell: excitation, emission, intensity
	JCAMP Form = "jcamp" // JCAMP-DX
)

// Settings override what is otherwise decided from the content of each file. The
// zero value, or nil, decides everything.
type Settings struct {
	Form      Form
	Delimiter string // ",", ";", "\t" or " " (blanks); "" decides
	Decimal   string // "." or ","; "" decides
	Skip      int    // lines left out at the top; 0 finds the first numbers by itself
	// Excitation is a Pattern with {nm}, such as "_ex{nm}", that finds the
	// excitation in the file name or a header line; "" tries header lines
	// ("excitation: 240", "EX WL = 350.0 nm"), then the file name ("S1_ex240").
	Excitation string
	// Across says what runs across a grid file: "excitation" or "emission"; ""
	// decides by the header's words, else by physics (emission reaches further
	// and lies above excitation).
	Across string
}

// File is a raw file and what it was taken for.
type File struct {
	Path        string
	Form        Form
	Delimiter   string // as in Settings; empty for JCAMP
	Decimal     string
	Encoding    string // "UTF-8", "UTF-16 LE", "UTF-16 BE", "Windows-1252"
	HeaderLines int    // lines above the first numbers
	FooterLines int    // lines below the last numbers
	Scans       []eem.Scan
	// Samples names the sample of each scan where the file itself holds several
	// samples and names them; otherwise nil. Same length as Scans.
	Samples []string
	// Notes hold one "read-guess" with what was decided (the same words for
	// files of the same kind), then "unsorted", "repeated-point", "saturated".
	Notes []eem.Note
}

// Names lists the samples that the file itself names, in the order of the file.
func (f *File) Names() []string {
	var out []string
	seen := map[string]bool{}
	for _, s := range f.Samples {
		if !seen[s] {
			seen[s] = true
			out = append(out, s)
		}
	}
	return out
}

// Of returns the scans of one sample that the file names.
func (f *File) Of(sample string) []eem.Scan {
	var out []eem.Scan
	for i, s := range f.Samples {
		if s == sample {
			out = append(out, f.Scans[i])
		}
	}
	return out
}

// Read reads one raw file of any form. s may be nil. Errors name file, line and
// remedy; the path stands in them as given.
func Read(path string, s *Settings) (*File, error) {
	st := stores.Get().(*store)
	defer st.release()
	data, err := load(path, st.text)
	if err != nil {
		return nil, err
	}
	st.text = data
	return read(path, data, s, st)
}

// Factors is a spectral correction: what intensities are multiplied with.
type Factors struct {
	Axis   eem.Axis
	Factor []float64 // finite, > 0, same length as Axis
	U      []float64 // standard uncertainty of each factor, ≥ 0; nil where the file has none
}

// ReadAbsorbance reads a spectrum of two columns: wavelength (nm, or 1/cm where
// the header says so) and decadic absorbance of a path of 1 cm (PathCM is 1; the
// caller knows better). More columns are refused unless one is named absorbance.
func ReadAbsorbance(path string, s *Settings) (*eem.Absorbance, []eem.Note, error) {
	data, err := Load(path)
	if err != nil {
		return nil, nil, err
	}
	return ReadAbsorbanceBytes(path, data, s)
}

// ReadFactors reads a file "wavelength_nm,factor", with an optional third column
// of standard uncertainties.
func ReadFactors(path string, s *Settings) (*Factors, []eem.Note, error) {
	data, err := Load(path)
	if err != nil {
		return nil, nil, err
	}
	return ReadFactorsBytes(path, data, s)
}

// Table is a CSV or XLSX table with the line (row) number of each record.
type Table struct {
	Path      string
	Header    []string // as written, blanks trimmed
	HeadLine  int      // line of the header, from 1
	Rows      []Record
	Delimiter string // empty for XLSX
	Encoding  string // empty for XLSX
	Notes     []eem.Note

	slots int // cells so far
}

// Record is one row of a Table. Cells has the length of the header, or more
// where a row has cells beyond it; blanks around a cell are trimmed.
type Record struct {
	Line  int // of the first character of the record, or the row of the sheet, from 1
	Cells []string
}

// ReadTable reads a .csv, .tsv or .txt table (delimiter comma, semicolon or tab,
// decided from the content; quoted cells may hold line breaks) or the first sheet
// of an .xlsx workbook: the stored result of a formula counts, numbers come with
// a decimal point in shortest form, dates as ISO 8601 (2026-05-03 or
// 2026-05-03T14:05:00), hidden rows are read and noted ("sheet-hidden"); merged
// cells and error values are errors that name the cell. Rows without any content
// are left out.
func ReadTable(path string) (*Table, error) {
	data, err := Load(path)
	if err != nil {
		return nil, err
	}
	return ReadTableBytes(path, data)
}

// Content is what a file probably holds.
type Content string

// What Look can say.
const (
	Unknown         Content = "unknown"
	ScanContent     Content = "scans"
	AbsorbContent   Content = "absorbance"
	FactorContent   Content = "factors"
	TableContent    Content = "table"
	WorkbookContent Content = "workbook"
)

// Guess is what a file probably is, by its content.
type Guess struct {
	Content     Content
	Form        Form       // of scans
	Excitations int        // how many scans
	Ex, Em      [2]float64 // nm, shortest and longest; for absorbance and factors only Em; NaN where unknown
	Samples     []string   // where the file itself names several samples
	Why         string     // in words: what decided it, or why it could not be read
	Err         error      // what Read (or ReadAbsorbance, …) says about it, nil where it can be read
	NoText      bool       // it is empty, or no text
}

func newGuess(c Content) Guess {
	nan := [2]float64{math.NaN(), math.NaN()}
	return Guess{Content: c, Ex: nan, Em: nan}
}
