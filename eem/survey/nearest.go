package survey

import "strings"

// nearest returns the candidate that needs the fewest edits to become s, case
// ignored; of equals the one that begins like s for longest, then the first. ok is
// false when even that one is far: more edits
// than a third of the longer of both, but at least two.
func nearest(s string, candidates []string) (best string, ok bool) {
	const longest = 80 // characters; a key or kind is shorter
	if len(s) > longest {
		return "", false
	}
	low := strings.ToLower(s)
	least, same := -1, 0
	for _, c := range candidates {
		if len(c) > longest {
			continue
		}
		d, p := edits(low, strings.ToLower(c)), prefix(low, strings.ToLower(c))
		if limit := max(2, max(len(s), len(c))/3); d <= limit && (least < 0 || d < least || (d == least && p > same)) {
			best, least, same = c, d, p
		}
	}
	return best, least >= 0
}

// prefix counts the bytes that a and b have in common at their beginning.
func prefix(a, b string) int {
	n := 0
	for n < len(a) && n < len(b) && a[n] == b[n] {
		n++
	}
	return n
}

// edits counts the insertions, deletions, replacements and swaps of neighbours
// that turn a into b (Damerau's optimal string alignment).
func edits(a, b string) int {
	x, y := []rune(a), []rune(b)
	before, last, row := make([]int, len(y)+1), make([]int, len(y)+1), make([]int, len(y)+1)
	for j := range last {
		last[j] = j
	}
	for i := range x {
		row[0] = i + 1
		for j := range y {
			replace := last[j]
			if x[i] != y[j] {
				replace++
			}
			row[j+1] = min(replace, last[j+1]+1, row[j]+1)
			if i > 0 && j > 0 && x[i] == y[j-1] && x[i-1] == y[j] {
				row[j+1] = min(row[j+1], before[j-1]+1)
			}
		}
		before, last, row = last, row, before
	}
	return last[len(y)]
}

// didYouMean gives `; did you mean "x"?`, or nothing when no candidate is near.
func didYouMean(s string, candidates []string) string {
	if c, ok := nearest(s, candidates); ok {
		return "; did you mean " + quote(c) + "?"
	}
	return ""
}
