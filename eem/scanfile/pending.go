package scanfile

import (
	"errors"

	"tarnlight/eem"
)

var errPending = errors.New("scanfile: this reader is still to come")

func isJCAMP(b []byte) bool                    { return false }
func (r *reader) jcamp() error                 { return errPending }
func lookJCAMP(name string, data []byte) Guess { return newGuess(Unknown) }

func (r *reader) jcampAbsorbance() (*eem.Absorbance, []eem.Note, error) { return nil, nil, errPending }
