package scanfile

import (
	"strings"
)

// pairShape says whether a block holds scans side by side, each with its own
// column of wavelengths.
func (r *reader) pairShape(b *block, cols int) bool {
	if cols < 4 || cols%2 != 0 {
		return false
	}
	for c := 0; c < cols; c += 2 {
		v := r.col(b, c, 0)
		if !monotonic(v) || v[0] < lowestNM {
			return false
		}
	}
	return true
}

// beside is what the headers say about scans side by side.
type beside struct {
	ex   []float64 // nil where the headers give none
	name []string  // nil where they are all alike
}

// pairs reads scans side by side with a wavelength column each.
func (r *reader) pairs(b *block, i, cols int) error {
	r.how = "a stack: emission scans side by side, wavelengths beside each"
	n := cols / 2
	h := r.besideHeads(b, n, func(f [][]byte, p int) []string {
		var out []string
		for c := 2 * p; c < min(2*p+2, len(f)); c++ {
			out = append(out, string(f[c]))
		}
		return out
	})
	if err := r.besideEx(b, i, &h); err != nil {
		return err
	}
	for p := range n {
		if err := r.scanOf(b, 2*p, 2*p+1, h.ex[p], h.sample(p)); err != nil {
			return err
		}
	}
	return nil
}

// columns reads scans side by side on one column of wavelengths, which have no
// header row of excitations alone.
func (r *reader) columns(b *block, i, cols int) error {
	if c, found, err := r.intensityColumn(b, cols); err != nil {
		return err
	} else if found {
		r.how = "a stack: one emission scan a file, in the column named as intensity"
		ex, err := r.blockEx(i)
		if err != nil {
			return err
		}
		return r.scanOf(b, 0, c, ex, "")
	}
	r.how = "a stack: emission scans side by side on one column of wavelengths"
	h := r.besideHeads(b, cols-1, func(f [][]byte, p int) []string {
		if p+1 < len(f) {
			return []string{string(f[p+1])}
		}
		return nil
	})
	if h.ex == nil && h.name == nil {
		return errorf(r.name, b.first, "%d columns of numbers and nothing above them that says which excitation each one has; write the excitations above the columns, or set scans.form", cols)
	}
	if err := r.besideEx(b, i, &h); err != nil {
		return err
	}
	for p := range cols - 1 {
		if err := r.scanOf(b, 0, p+1, h.ex[p], h.sample(p)); err != nil {
			return err
		}
	}
	return nil
}

// besideEx completes the excitations: where the headers of the columns give none,
// all scans have that of the block.
func (r *reader) besideEx(b *block, i int, h *beside) error {
	if h.ex != nil {
		r.exFrom = "the headers of the columns"
		return nil
	}
	ex, err := r.blockEx(i)
	if err != nil {
		return err
	}
	h.ex = make([]float64, r.usedCols(b))
	for p := range h.ex {
		h.ex[p] = ex
	}
	return nil
}

// besideHeads reads the headers of n scans side by side. cells gives the header
// cells of scan p in one line.
func (r *reader) besideHeads(b *block, n int, cells func(f [][]byte, p int) []string) beside {
	var h beside
	for t := range b.headers {
		f := r.header(t)
		ex, names := make([]float64, 0, n), make([]string, 0, n)
		for p := range n {
			text := ""
			for _, c := range cells(f, p) {
				nm, rest, ok := cellEx(c, r.pat)
				if ok && nm > wavenumberAbove {
					nm = nmPerInvCM / nm
				}
				if ok && nm >= lowestNM && nm <= highestNM && len(ex) == p {
					ex = append(ex, nm)
					c = rest
				}
				if text == "" {
					text = c
				}
			}
			names = append(names, text)
		}
		if h.ex == nil && len(ex) == n {
			h.ex = ex
		}
		if h.name == nil && distinct(names) {
			h.name = names
		}
	}
	return h
}

func (h *beside) sample(p int) string {
	if h.name == nil {
		return ""
	}
	return h.name[p]
}

// distinct says whether names are all there and not all alike.
func distinct(names []string) bool {
	alike := true
	for _, s := range names {
		if strings.TrimSpace(s) == "" {
			return false
		}
		alike = alike && s == names[0]
	}
	return !alike
}

// intensityColumn finds the one column that a header names as the intensity.
// Several are an error: nobody could know which one counts.
func (r *reader) intensityColumn(b *block, cols int) (c int, found bool, err error) {
	for t := range b.headers {
		f := r.header(t)
		if len(f) != cols {
			continue
		}
		var named []string
		for i, cell := range f[1:] {
			if k, _ := roleOf(cell); k == intensityRole {
				if _, _, ok := cellEx(string(cell), r.pat); !ok {
					named = append(named, string(cell))
					c = i + 1
				}
			}
		}
		switch {
		case len(named) == 1:
			return c, true, nil
		case len(named) > 1:
			return 0, false, errorf(r.name, t.no, "several columns are named as intensity (%s); keep one of them", clip([]byte(strings.Join(named, ", "))))
		}
	}
	return 0, false, nil
}
