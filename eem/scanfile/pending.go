package scanfile

import (
	"errors"

	"tarnlight/eem"
)

var errPending = errors.New("scanfile: this reader is still to come")

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

// Look says what a file probably is, by its content.
func Look(name string, data []byte) Guess { return newGuess(Unknown) }

func isJCAMP(b []byte) bool    { return false }
func (r *reader) jcamp() error { return errPending }
