package survey

import (
	"fmt"
	"regexp"
	"time"
)

// layouts are the forms of ISO 8601 that the sheet takes, those of a day first.
// Fractions of a second are read with any of them.
var layouts = []string{
	"2006-01-02", "20060102",
	"2006-01-02T15:04", "2006-01-02T15:04:05", "2006-01-02T15:04Z07:00", "2006-01-02T15:04:05Z07:00",
	"2006-01-02T15:04:05Z0700", "20060102T1504", "20060102T150405", "20060102T150405Z0700",
	"2006-01-02 15:04", "2006-01-02 15:04:05", "2006-01-02 15:04Z07:00", "2006-01-02 15:04:05Z07:00",
}

// dayLayouts is how many of the layouts hold a day only.
const dayLayouts = 2

var onlyNumber = regexp.MustCompile(`^[0-9]+([.,][0-9]+)?$`)

// parseTime reads a date or time and returns what is wrong with it, or nothing.
func parseTime(cell string) (Time, string) {
	for i, l := range layouts {
		t, err := time.Parse(l, cell)
		if err != nil {
			continue
		}
		if y := t.Year(); y < 1900 || y > 2199 {
			return Time{}, fmt.Sprintf("the year of %s cannot be right; write a date like 2026-05-03", quote(cell))
		}
		return Time{Time: t, DateOnly: i < dayLayouts, Text: cell}, ""
	}
	if onlyNumber.MatchString(cell) {
		return Time{}, quote(cell) + " is a number; format the cell as a date, or write it like 2026-05-03"
	}
	return Time{}, quote(cell) + " is no date that can be read in one way only; write it like 2026-05-03 or 2026-05-03T14:30"
}
