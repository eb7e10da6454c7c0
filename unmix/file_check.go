package unmix

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"math"
)

// maxModelCells bounds the grid of a model file: every bottle is brought to it, and
// the two axes of a short file multiply. 600 × 1,000 nm in steps of 1 nm is less.
const maxModelCells = 1_000_000

// maxModelComponents bounds a model file: a component that says nothing takes 3
// bytes of text and 200 of memory.
const maxModelComponents = 1000

// modelComponents are read one by one, so that too many are noticed in time.
type modelComponents []ModelComponent

// UnmarshalJSON reads an array of components, or null.
func (l *modelComponents) UnmarshalJSON(b []byte) error {
	d := json.NewDecoder(bytes.NewReader(b))
	switch t, err := d.Token(); {
	case err != nil:
		return err
	case t == nil:
		return nil
	case t != json.Delim('['):
		return errors.New("components is no list")
	}
	*l = nil
	for d.More() {
		if len(*l) == maxModelComponents {
			return fmt.Errorf("more than %d components", maxModelComponents)
		}
		var c ModelComponent
		if err := d.Decode(&c); err != nil {
			return err
		}
		*l = append(*l, c)
	}
	return nil
}

// check says what in a model file cannot be: lengths that do not belong together,
// and numbers that no fit gives. A caller may then trust the model.
func (m *Model) check() error {
	nj, nk := m.Grid.Ex.Len(), m.Grid.Em.Len()
	switch {
	case nj == 0 || nk == 0:
		return errors.New("the grid has no wavelengths")
	case nj > maxModelCells/nk:
		return fmt.Errorf("a grid of %d × %d cells, which no instrument scans", nj, nk)
	}
	for i := range m.Components {
		if err := m.Components[i].check(nj, nk); err != nil {
			return fmt.Errorf("component %d, %q: %w", i+1, clip(m.Components[i].Name), err)
		}
	}
	for _, i := range m.Cells {
		if i < 0 || i >= nj*nk {
			return fmt.Errorf("cell %d lies outside the grid (%s)", i, m.Grid)
		}
	}
	for _, e := range m.Errors {
		if err := e.check(len(m.Components)); err != nil {
			return err
		}
	}
	if in := m.Instrument; in != nil && min(in.ReadNoise, in.ShotNoise, in.Repeat, in.RepeatDF) < 0 {
		return errors.New("the noise or repeatability of the instrument is negative")
	}
	if m.Likeness != nil {
		return m.Likeness.check(len(m.Components))
	}
	return nil
}

// check holds a component against the size of the grid. JSON knows neither NaN nor
// infinity, so that every number is finite.
func (c *ModelComponent) check(nj, nk int) error {
	if len(c.Ex) != nj || len(c.Em) != nk || c.Surface != nil && len(c.Surface) != nj*nk {
		return fmt.Errorf("the spectra do not have the length of the grid, %d × %d", nj, nk)
	}
	if c.ExU != nil && len(c.ExU) != nj || c.EmU != nil && len(c.EmU) != nk {
		return fmt.Errorf("the uncertainties do not have the length of the grid, %d × %d", nj, nk)
	}
	if c.Scale < 0 || c.Highest < 0 || c.Levels < 0 {
		return errors.New("a scale, standard or number of levels below 0")
	}
	for _, v := range [][]*float64{c.Ex, c.Em} {
		for _, x := range v {
			if x != nil && !(*x >= 0 && *x <= maxLoading) {
				return fmt.Errorf("loading %g; a spectrum is not negative, and has maximum 1", *x)
			}
		}
	}
	for _, x := range c.Surface {
		if x != nil && math.Abs(*x) > largest {
			return fmt.Errorf("%g in its surface, which no instrument reports", *x)
		}
	}
	if c.Scale > largest {
		return fmt.Errorf("scale %g, which no instrument reports", c.Scale)
	}
	return nil
}

// Sizes beyond which sums of squares over all cells would lose their numbers.
const maxLoading, largest = 1e6, 1e100

// check holds the likeness against the number of components.
func (l *Likeness) check(n int) error {
	if len(l.Mean) != n || len(l.Floor) != n || len(l.Inverse) != n {
		return fmt.Errorf("likeness does not have the length of the components (%d)", n)
	}
	for _, row := range l.Inverse {
		if len(row) != n {
			return fmt.Errorf("likeness does not have the length of the components (%d)", n)
		}
	}
	for _, v := range l.Floor {
		if !(v > 0) {
			return fmt.Errorf("likeness with a floor of %g; it must be above 0", v)
		}
	}
	return nil
}

// clip shortens a name for a message.
func clip(s string) string {
	if r := []rune(s); len(r) > 40 {
		return string(r[:39]) + "…"
	}
	return s
}
