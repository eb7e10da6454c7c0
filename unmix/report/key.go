package report

import (
	"image/color"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// keyEntry is a mark or a line with its word. Keys stand below the panels, where
// they hide nothing.
type keyEntry struct {
	word  string
	line  *draw.LineStyle
	glyph draw.GlyphDrawer // drawn over the line
	color color.Color      // of the glyph
}

// Sizes of a key.
const (
	keyRow    = vg.Length(11)
	keySample = vg.Length(18)
	keyGap    = vg.Length(14)
)

// keyRows breaks a key into rows that fit on a width.
func keyRows(key []keyEntry, width vg.Length) [][]keyEntry {
	var rows [][]keyEntry
	room := vg.Length(0)
	for _, e := range key {
		w := e.width()
		if rows == nil || room < w {
			rows, room = append(rows, nil), width
		}
		rows[len(rows)-1] = append(rows[len(rows)-1], e)
		room -= w
	}
	return rows
}

func (e keyEntry) width() vg.Length {
	st := textStyle(smallPoints, inkGrey)
	return keySample + 4 + st.Width(e.word) + keyGap
}

// drawKey draws a key, every row centred, from the top of c.
func drawKey(c draw.Canvas, key []keyEntry) {
	st := textStyle(smallPoints, inkGrey)
	st.YAlign = draw.YCenter
	y := c.Max.Y - keyRow/2
	for _, row := range keyRows(key, c.Max.X-c.Min.X) {
		total := -keyGap
		for _, e := range row {
			total += e.width()
		}
		x := (c.Min.X + c.Max.X - total) / 2
		for _, e := range row {
			if e.line != nil {
				c.StrokeLine2(*e.line, x, y, x+keySample, y)
			}
			if e.glyph != nil {
				c.DrawGlyph(draw.GlyphStyle{Color: e.color, Radius: 2, Shape: e.glyph}, vg.Point{X: x + keySample/2, Y: y})
			}
			c.FillText(st, vg.Point{X: x + keySample + 4, Y: y}, e.word)
			x += e.width()
		}
		y -= keyRow
	}
}

// panels gives a figure rows of cols panels, each high, and a key below them.
func (f *figure) panels(cols int, high vg.Length, plots []*plot.Plot, key ...keyEntry) *figure {
	foot := vg.Length(0)
	if len(key) > 0 {
		foot = keyRow*vg.Length(len(keyRows(key, figureWidth))) + 4
	}
	f.height = vg.Length((len(plots)+cols-1)/cols)*high + foot
	f.draw = func(c draw.Canvas) {
		drawGrid(draw.Crop(c, 0, 0, foot, 0), cols, plots)
		drawKey(draw.Crop(c, 0, 0, 0, foot-f.height), key)
	}
	return f
}
