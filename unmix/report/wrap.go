package report

import (
	"strings"
	"sync"
)

// The letters of the workbooks, 9-point Arial on a screen of 96 dpi; the font that
// is built in has the same widths.
var (
	cellLetters = sync.OnceValue(func() *lettering { return regular(12) })
	boldLetters = sync.OnceValue(func() *lettering { return bold(12) })
)

// columnPixels is how wide a column of w letters is: a digit of the workbooks'
// default font, Arial 11, takes 8 pixels and the edges of a cell take 5.
func columnPixels(w float64) int { return int(8*w) + 5 }

// lineHeight is the height, in points, of text wrapped between words in a cell px
// pixels wide. Programs differ by a few pixels, so that a little is kept free.
func lineHeight(text string, px int, l *lettering) float64 {
	room := px*97/100 - 6
	space, lines := l.width(" "), 0
	for _, s := range strings.Split(text, "\n") {
		at := 0
		lines++
		for _, word := range strings.Fields(s) {
			n := l.width(word)
			if at > 0 && at+space+n > room {
				lines++
				at = 0
			}
			if n > room { // a word longer than the line is broken
				lines += (n - 1) / room
				n %= room
			}
			at += n + space
		}
	}
	return 3 + 12*float64(lines)
}
