package unmix

import "fmt"

// SpectraError is one cause by which the spectra of a set may be off, as far as
// contributions see it. It goes with the set into model files, so that a bottle that
// is scored elsewhere has the cause in its budget.
type SpectraError struct {
	Cause  string  `json:"cause"`
	Scope  string  `json:"scope"`                        // who shares the error: standard, batch, survey
	DF     float64 `json:"degrees_of_freedom,omitempty"` // 0: known
	Source string  `json:"source"`
	// Shifts are independent errors, each one standard uncertainty large: F × F,
	// row-major, by how much contribution h changes for one unit of contribution g.
	// Nil: the cause acts and nobody stated its size.
	Shifts [][]float64 `json:"shifts"`
}

// check says whether an error is one of n components.
func (e SpectraError) check(n int) error {
	for _, s := range e.Shifts {
		if len(s) != n*n {
			return fmt.Errorf("error %q of the spectra does not have the length of the components (%d × %d)", e.Cause, n, n)
		}
	}
	return nil
}
