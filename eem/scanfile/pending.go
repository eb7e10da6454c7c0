package scanfile

import (
	"errors"

	"tarnlight/eem"
)

var errPending = errors.New("scanfile: this reader is still to come")

// Load reads a file of at most MaxFileBytes for the readers that take bytes, so
// that a caller can hash and parse the same bytes. It refuses what is no regular
// file.
func Load(path string) ([]byte, error) { return nil, errPending }

// ReadBytes is Read on bytes; name stands in messages and may hold the excitation.
func ReadBytes(name string, data []byte, s *Settings) (*File, error) { return nil, errPending }

// ReadAbsorbanceBytes is ReadAbsorbance on bytes.
func ReadAbsorbanceBytes(name string, data []byte, s *Settings) (*eem.Absorbance, []eem.Note, error) {
	return nil, nil, errPending
}

// ReadFactorsBytes is ReadFactors on bytes.
func ReadFactorsBytes(name string, data []byte, s *Settings) (*Factors, []eem.Note, error) {
	return nil, nil, errPending
}

// ReadTableBytes is ReadTable on bytes; name's extension says which kind it is.
func ReadTableBytes(name string, data []byte) (*Table, error) { return nil, errPending }

// ParseNumber reads one number as people and instruments write it: a decimal
// mark of "." or "," (decimal; "" decides from s alone and refuses what can be
// read twice, such as "1,234"), groups of three digits set apart by the other
// mark, an apostrophe or a blank, exponents (1,23E+03), a true minus sign. The
// result is the nearest float64, always finite. An empty or missing cell is an
// error here; see Missing.
func ParseNumber(s, decimal string) (float64, error) { return 0, errPending }

// DecimalMark decides the decimal mark of a column or file from all its cells:
// "." or ",". Cells that are no numbers are left out; where no cell has either
// mark it is ".". Cells that all can be read twice ("1,234"), and cells that
// contradict each other, are an error.
func DecimalMark(cells []string) (string, error) { return "", errPending }

// Missing says whether a cell stands for "no value": blank, NaN, NA, n/a, dashes,
// or a mark of overflow (OVER, ####).
func Missing(cell string) bool { return cell == "" }

// Look says what a file probably is, by its content.
func Look(name string, data []byte) Guess { return newGuess(Unknown) }
