package report

import "slices"

// Width of a landscape and of an upright page in pixels of 1/96 inch, between the
// margins of the narrower of A4 and Letter, and the smallest print that is read
// without effort, %.
const (
	paperPixels   = 960
	uprightPixels = 698
	smallestPrint = 62
)

// starts are the columns, from 1, with which the second and later pages of a print
// begin, side by side; none where all columns fit on one. The first column is
// repeated on each, and a column to keep stays with the one before it.
func (l layout) starts() []int {
	most := paperPixels * 100 / smallestPrint
	if l.portrait || l.broken {
		return nil
	}
	out := l.cuts(most)
	for w := most; len(out) > 0 && w > most/3; w -= 20 { // pages of like width
		if even := l.cuts(w); len(even) == len(out) {
			out = even
		} else {
			break
		}
	}
	return out
}

// cuts are the starts of pages of at most the given pixels.
func (l layout) cuts(most int) []int {
	var out []int
	if len(l.widths) == 0 {
		return nil
	}
	first := columnPixels(l.widths[0])
	page := first
	for c := 1; c < len(l.widths); {
		end, unit := c+1, columnPixels(l.widths[c])
		for ; end < len(l.widths) && slices.Contains(l.keep, end+1); end++ {
			unit += columnPixels(l.widths[end])
		}
		if page+unit > most && page > first {
			out, page = append(out, c+1), first
		}
		page += unit
		c = end
	}
	return out
}

// printRows is how many points of rows fit on one page of a sheet that is as wide as
// paper: the lower of A4 and Letter, between its margins.
func (l layout) printRows() float64 {
	high := 508.0 // A4 landscape
	if l.portrait {
		high = 705 // Letter
	}
	return high * 100 / float64(l.scale(nil))
}

// scale is the size of print, %, that fits the widest page on paper.
func (l layout) scale(starts []int) uint {
	widest, page := 0, 0
	for c, w := range l.widths {
		if slices.Contains(starts, c+1) {
			page = columnPixels(l.widths[0])
		}
		page += columnPixels(w)
		widest = max(widest, page)
	}
	paper := paperPixels
	if l.portrait {
		paper = uprightPixels
	}
	return uint(min(max(100*paper/widest, 10), 100))
}
