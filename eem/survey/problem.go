package survey

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
)

// maxProblems is how many problems one message lists; who sees twenty at once
// mends the cause, not the rest of the list.
const maxProblems = 20

// Problem is one thing that must be mended before the survey can be run.
type Problem struct {
	File   string
	Line   int    // from 1; 0: the whole file
	Column string // of a run sheet, or key of the settings; may be empty
	Msg    string // what is wrong and the remedy
}

// Error gives "file:line: column: message".
func (p *Problem) Error() string {
	var b strings.Builder
	b.WriteString(p.File)
	if p.Line > 0 {
		fmt.Fprintf(&b, ":%d", p.Line)
	}
	b.WriteString(": ")
	if p.Column != "" {
		b.WriteString(p.Column + ": ")
	}
	b.WriteString(p.Msg)
	return b.String()
}

// Problems are all problems of a file, in the order of its lines. It is an error
// that lists the first twenty, one a line.
type Problems []*Problem

// Error lists the problems.
func (p Problems) Error() string {
	var b strings.Builder
	for i, q := range p {
		if i == maxProblems {
			fmt.Fprintf(&b, "\nand %d more like these", len(p)-i)
			break
		}
		if i > 0 {
			b.WriteByte('\n')
		}
		b.WriteString(q.Error())
	}
	return b.String()
}

// Unwrap gives every problem to errors.As.
func (p Problems) Unwrap() []error {
	out := make([]error, len(p))
	for i := range p {
		out[i] = p[i]
	}
	return out
}

// err returns p in the order of files and lines, or nil when there is none.
func (p Problems) err() error {
	if len(p) == 0 {
		return nil
	}
	slices.SortStableFunc(p, func(a, b *Problem) int {
		return cmp.Or(cmp.Compare(a.File, b.File), cmp.Compare(a.Line, b.Line))
	})
	return p
}

// add appends a problem.
func (p *Problems) add(file string, line int, column, format string, args ...any) {
	*p = append(*p, &Problem{File: file, Line: line, Column: column, Msg: fmt.Sprintf(format, args...)})
}

// shown is the longest text quoted from a user's file.
const shown = 60

// quote quotes text of a user's file for a message: escaped, at most 60
// characters.
func quote(s string) string {
	r := []rune(s[:min(len(s), 4*shown+4)])
	if len(r) > shown {
		return fmt.Sprintf("%q", string(r[:shown])+"…")
	}
	return fmt.Sprintf("%q", string(r))
}
