package report

import (
	"image"
	"image/color"
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"tarnlight/eem"
)

// heat draws a map of cells (ex × em) with every cell as large as it is on its
// axes, missing cells hatched grey. (The plot library's own map takes axes to be
// evenly spaced and smears missing cells into their neighbours.)
type heat struct {
	grid  eem.Grid
	v     []float64
	scale scale
}

// Plot implements plot.Plotter. The picture has 4 pixels a point at least.
func (h *heat) Plot(c draw.Canvas, p *plot.Plot) {
	w := max(1, int((c.Max.X-c.Min.X).Points()*3))
	t := max(1, int((c.Max.Y-c.Min.Y).Points()*3))
	m := newMapping(image.Rect(0, 0, w, t), h.grid)
	img := newCanvas(w, t)
	m.drawTo(img, h.v, h.scale)
	c.DrawImage(c.Rectangle, img.Paletted)
}

// DataRange implements plot.DataRanger.
func (h *heat) DataRange() (xmin, xmax, ymin, ymax float64) {
	xmin, xmax = edges(h.grid.Em)
	ymin, ymax = edges(h.grid.Ex)
	return xmin, xmax, ymin, ymax
}

// curve draws points (x, y) joined by lines, with gaps at NaN, and a band
// y ± half where half is given.
type curve struct {
	x, y, half []float64
	style      draw.LineStyle
}

// Plot implements plot.Plotter.
func (l *curve) Plot(c draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&c)
	for _, r := range runs(l.y) {
		if l.half != nil && r[1]-r[0] > 1 {
			var band []vg.Point
			for i := r[0]; i < r[1]; i++ {
				band = append(band, vg.Point{X: tx(l.x[i]), Y: ty(min(l.y[i]+zero(l.half[i]), p.Y.Max))})
			}
			for i := r[1] - 1; i >= r[0]; i-- {
				band = append(band, vg.Point{X: tx(l.x[i]), Y: ty(max(l.y[i]-zero(l.half[i]), p.Y.Min))})
			}
			c.FillPolygon(faint(l.style.Color), band)
		}
		var pts []vg.Point
		for i := r[0]; i < r[1]; i++ {
			pts = append(pts, vg.Point{X: tx(l.x[i]), Y: ty(l.y[i])})
		}
		c.StrokeLines(l.style, c.ClipLinesXY(pts)...)
	}
}

// DataRange implements plot.DataRanger.
func (l *curve) DataRange() (xmin, xmax, ymin, ymax float64) {
	xmin, xmax = bounds(l.x)
	ymin, ymax = bounds(l.y)
	return xmin, xmax, ymin, ymax
}

// faint is a colour for the band around a line.
func faint(c color.Color) color.Color {
	r, g, b, _ := c.RGBA()
	return color.NRGBA{uint8(r >> 8), uint8(g >> 8), uint8(b >> 8), 60}
}

func zero(v float64) float64 {
	if math.IsNaN(v) {
		return 0
	}
	return v
}

// bounds returns the least and greatest number of v; +Inf, −Inf without any.
func bounds(v []float64) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, x := range v {
		if !math.IsNaN(x) && !math.IsInf(x, 0) {
			lo, hi = min(lo, x), max(hi, x)
		}
	}
	return lo, hi
}

// runs returns the half-open ranges of v that are numbers.
func runs(v []float64) [][2]int {
	var out [][2]int
	for i := 0; i < len(v); {
		j := i
		for j < len(v) && !math.IsNaN(v[j]) {
			j++
		}
		if j > i {
			out = append(out, [2]int{i, j})
		}
		i = j + 1
	}
	return out
}

// dots draws marks with bars from lo to hi.
type dots struct {
	x, y, lo, hi []float64          // lo and hi: nil or NaN for no bar
	glyph        []draw.GlyphDrawer // per point
	color        []color.Color      // per point
	radius       vg.Length
	radii        []vg.Length // per point; nil: all of one radius
}

// add adds a mark; lo and hi may be NaN.
func (d *dots) add(x, y, lo, hi float64, g draw.GlyphDrawer, c color.Color) {
	d.x, d.y, d.lo, d.hi = append(d.x, x), append(d.y, y), append(d.lo, lo), append(d.hi, hi)
	d.glyph, d.color = append(d.glyph, g), append(d.color, c)
}

// Plot implements plot.Plotter.
func (d *dots) Plot(c draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&c)
	for i := range d.x {
		if math.IsNaN(d.x[i]) || math.IsNaN(d.y[i]) {
			continue
		}
		x := tx(d.x[i])
		radius := d.radius
		if d.radii != nil {
			radius = d.radii[i]
		}
		if d.lo != nil && !math.IsNaN(d.lo[i]) && !math.IsNaN(d.hi[i]) {
			lo, hi := ty(max(d.lo[i], p.Y.Min)), ty(min(d.hi[i], p.Y.Max))
			if hi-lo > 2*radius { // a shorter one hides behind its mark
				c.StrokeLine2(draw.LineStyle{Color: d.color[i], Width: 0.5}, x, lo, x, hi)
			}
		}
		c.DrawGlyph(draw.GlyphStyle{Color: d.color[i], Radius: radius, Shape: d.glyph[i]}, vg.Point{X: x, Y: ty(max(d.y[i], p.Y.Min))})
	}
}

// DataRange implements plot.DataRanger.
func (d *dots) DataRange() (xmin, xmax, ymin, ymax float64) {
	xmin, xmax = bounds(d.x)
	ymin, ymax = bounds(append(slices.Clone(d.y), d.hi...))
	return xmin, xmax, ymin, ymax
}

// level draws a straight line across the plot.
type levelLine struct {
	at    float64
	up    bool // at an x instead of a y
	style draw.LineStyle
}

// Plot implements plot.Plotter.
func (l *levelLine) Plot(c draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&c)
	switch {
	case math.IsNaN(l.at):
	case l.up && l.at >= p.X.Min && l.at <= p.X.Max:
		c.StrokeLine2(l.style, tx(l.at), c.Min.Y, tx(l.at), c.Max.Y)
	case !l.up && l.at >= p.Y.Min && l.at <= p.Y.Max:
		c.StrokeLine2(l.style, c.Min.X, ty(l.at), c.Max.X, ty(l.at))
	}
}
