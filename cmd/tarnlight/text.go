package main

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"tarnlight/eem"
	"tarnlight/eem/survey"
)

// text is a table for a terminal: columns of numbers to the right.
type text struct {
	head []string
	rows [][]string
}

func newText(head ...string) *text { return &text{head: head} }

func (t *text) add(cells ...string) { t.rows = append(t.rows, cells) }

func (t *text) print(w io.Writer) error {
	width := make([]int, len(t.head))
	number := make([]bool, len(t.head))
	for c := range t.head {
		width[c] = utf8.RuneCountInString(t.head[c])
		number[c] = true
		for _, r := range t.rows {
			width[c] = max(width[c], utf8.RuneCountInString(r[c]))
			if _, err := strconv.ParseFloat(strings.TrimSuffix(r[c], " %"), 64); err != nil && r[c] != "" {
				number[c] = false
			}
		}
	}
	for _, r := range append([][]string{t.head}, t.rows...) {
		var b strings.Builder
		for c, cell := range r {
			pad := strings.Repeat(" ", width[c]-utf8.RuneCountInString(cell))
			if c > 0 {
				b.WriteString("  ")
			}
			if number[c] {
				b.WriteString(pad + cell)
			} else {
				b.WriteString(cell + pad)
			}
		}
		if _, err := fmt.Fprintln(w, strings.TrimRight(b.String(), " ")); err != nil {
			return err
		}
	}
	return nil
}

// short gives four significant digits.
func short(v float64) string { return fmt.Sprintf("%.4g", v) }

// inFull gives v with so many significant digits at most, without an exponent where
// that can be read.
func inFull(v float64, digits int) string {
	short := strconv.FormatFloat(v, 'g', digits, 64)
	if size := math.Abs(v); size >= 1e-4 && size < 1e15 {
		v, _ = strconv.ParseFloat(short, 64)
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	return short
}

// line is the outcome in one line: of the new bottles where the status speaks of them.
func (st status) line() string {
	found := fmt.Sprintf("%s, %s", eem.Count(st.Findings["doubts"], "doubt"), eem.Count(st.Findings["notes"], "note"))
	if st.SinceLast {
		return fmt.Sprintf("%s that the last results lack: %s; %s\nthe folder in all: %s: %s", eem.Count(st.Bottles["new"], "bottle"), st.states("new_"), found,
			eem.Count(st.Bottles["all"], "bottle"), st.states(""))
	}
	return fmt.Sprintf("%s: %s; %s", eem.Count(st.Bottles["all"], "bottle"), st.states(""), found)
}

// states counts bottles by their state, those of the keys with this prefix.
func (st status) states(of string) string {
	return fmt.Sprintf("%d usable, %d rejected, %d excluded", st.Bottles[of+"usable"], st.Bottles[of+"rejected"], st.Bottles[of+"excluded"])
}

// median of sorted values.
func median(v []float64) float64 {
	n := len(v)
	if n%2 == 1 {
		return v[n/2]
	}
	return (v[n/2-1] + v[n/2]) / 2
}

// detectedValues returns the sorted values of component f in samples that show
// it, of how many usable samples, and their unit.
func (j *job) detectedValues(k, f int) (v []float64, n int, unit string) {
	comps := j.res[k].Set.Len()
	for i, c := range j.judge[k].Contributions {
		if i%comps != f || j.bottle(c.ID).Row.Kind != survey.Sample {
			continue
		}
		unit = c.Unit
		if c.Qualifier == "R" {
			continue
		}
		n++
		if c.Detected {
			v = append(v, c.Value)
		}
	}
	slices.Sort(v)
	return v, n, unit
}
