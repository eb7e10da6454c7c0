package main

import (
	"fmt"
	"strings"

	"tarnlight/eem/scanfile"
)

// readColumns reads a table of two or three columns of numbers. A first row of
// numbers counts too: scans are often exported without a header.
func readColumns(path string) (nm, y, u []float64, err error) {
	t, err := scanfile.ReadTable(path)
	if err != nil {
		return nil, nil, nil, err
	}
	decimal := decimalMark(t)
	add := func(cells []string, line int) error {
		if len(cells) < 2 {
			return fmt.Errorf("%s:%d: one column; a table has wavelength_nm, value and perhaps its standard uncertainty", path, line)
		}
		row := make([]float64, min(3, len(cells)))
		for i := range row {
			v, err := scanfile.ParseNumber(cells[i], decimal)
			if err != nil {
				return fmt.Errorf("%s:%d: column %d: %w", path, line, i+1, err)
			}
			row[i] = v
		}
		nm, y = append(nm, row[0]), append(y, row[1])
		if len(row) == 3 {
			if !(row[2] >= 0) {
				return fmt.Errorf("%s:%d: a standard uncertainty of %g; write 0 or more", path, line, row[2])
			}
			u = append(u, row[2])
		}
		return nil
	}
	if len(t.Header) > 1 {
		if _, e := scanfile.ParseNumber(t.Header[0], decimal); e == nil {
			if err := add(t.Header, 1); err != nil {
				return nil, nil, nil, err
			}
		}
	}
	for _, r := range t.Rows {
		if err := add(r.Cells, r.Line); err != nil {
			return nil, nil, nil, err
		}
	}
	switch {
	case len(nm) < 2:
		return nil, nil, nil, fmt.Errorf("%s: %d points; a curve needs at least two", path, len(nm))
	case u != nil && len(u) != len(nm):
		return nil, nil, nil, fmt.Errorf("%s: only some rows have an uncertainty; give one for each or none", path)
	}
	return nm, y, u, nil
}

// decimalMark is the one that a table's numbers are written with: a comma where
// commas stand in cells and points do not.
func decimalMark(t *scanfile.Table) string {
	comma, point := false, false
	for _, r := range t.Rows {
		for _, c := range r.Cells {
			comma, point = comma || strings.Contains(c, ","), point || strings.Contains(c, ".")
		}
	}
	if comma && !point {
		return ","
	}
	return "."
}
