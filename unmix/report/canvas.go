package report

import (
	"image"
	"image/color"
	"image/png"
	"io"

	"tarnlight/eem"
)

// Palette of the raster pictures: white, greys of text, missing cells, the
// intensity map and the residual map. One byte a pixel keeps the files small and
// their writing fast.
const (
	greys     = 32 // 0 white … 32 ink
	missing   = greys + 1
	hatch     = greys + 2
	gridLine  = greys + 3
	seqFirst  = greys + 4
	seqLen    = 100
	divFirst  = seqFirst + seqLen
	divLen    = 101
	markLight = divFirst + divLen // rings that mark a spot, over both maps
	markDark  = markLight + 1
)

var mapPalette = func() color.Palette {
	p := color.Palette{}
	for i := range greys + 1 {
		f := float64(i) / greys
		mix := func(to uint8) uint8 { return uint8(255 + (float64(to)-255)*f + 0.5) }
		p = append(p, color.NRGBA{mix(inkGrey.R), mix(inkGrey.G), mix(inkGrey.B), 255})
	}
	p = append(p, missingGrey, hatchGrey, gridGrey)
	for _, c := range sequential(seqLen) {
		p = append(p, c)
	}
	for _, c := range diverging(divLen) {
		p = append(p, c)
	}
	return append(p, color.NRGBA{255, 255, 255, 255}, color.NRGBA{20, 20, 20, 255})
}()

// scale maps values to palette entries: 0 … top for intensities, −top … top for
// residuals. What lies outside takes the end colour.
type scale struct {
	top       float64
	diverging bool
}

// index returns the palette entry of v, missing for NaN.
func (s scale) index(v float64) uint8 {
	if v != v {
		return missing
	}
	if s.diverging {
		return divFirst + level(0.5+0.5*v/s.top, divLen)
	}
	return seqFirst + level(v/s.top, seqLen)
}

func level(t float64, n int) uint8 {
	return uint8(min(max(t, 0), 1)*float64(n-1) + 0.5)
}

// canvas is a picture with a palette and letters.
type canvas struct {
	*image.Paletted
}

func newCanvas(w, h int) canvas {
	return canvas{image.NewPaletted(image.Rect(0, 0, w, h), mapPalette)}
}

func (c canvas) fill(r image.Rectangle, index uint8) {
	r = r.Intersect(c.Rect)
	for y := r.Min.Y; y < r.Max.Y; y++ {
		row := c.Pix[y*c.Stride+r.Min.X : y*c.Stride+r.Max.X]
		for x := range row {
			row[x] = index
		}
	}
}

// frame draws a line of 1 px just outside r.
func (c canvas) frame(r image.Rectangle, index uint8) {
	o := r.Inset(-1)
	c.fill(image.Rect(o.Min.X, o.Min.Y, o.Max.X, r.Min.Y), index)
	c.fill(image.Rect(o.Min.X, r.Max.Y, o.Max.X, o.Max.Y), index)
	c.fill(image.Rect(o.Min.X, o.Min.Y, r.Min.X, o.Max.Y), index)
	c.fill(image.Rect(r.Max.X, o.Min.Y, o.Max.X, o.Max.Y), index)
}

// Where a text stands against its x.
type align int

const (
	left align = iota
	centre
	right
)

// text writes s with its baseline at y.
func (c canvas) text(l *lettering, s string, x, y int, a align) {
	switch a {
	case centre:
		x -= l.width(s) / 2
	case right:
		x -= l.width(s)
	}
	l.drawTo(c.cover, s, x, y, false)
}

// textUp writes s upwards, centred on y, its baseline at x.
func (c canvas) textUp(l *lettering, s string, x, y int) {
	l.drawTo(c.cover, s, x, y+l.width(s)/2, true)
}

// cover darkens a pixel of white ground.
func (c canvas) cover(x, y int, cover uint8) {
	if !(image.Point{x, y}.In(c.Rect)) {
		return
	}
	p := &c.Pix[y*c.Stride+x]
	if g := uint8(int(cover) * greys / 255); *p <= greys && g > *p {
		*p = g
	}
}

// ring marks the spot (x, y): a dark ring in a light one, seen on any colour.
func (c canvas) ring(x, y int, clip image.Rectangle) {
	const r = 10
	for dy := -r - 2; dy <= r+2; dy++ {
		for dx := -r - 2; dx <= r+2; dx++ {
			q := dx*dx + dy*dy
			if p := (image.Point{x + dx, y + dy}); p.In(clip) {
				switch {
				case q >= (r-1)*(r-1) && q <= r*r+r:
					c.Pix[p.Y*c.Stride+p.X] = markDark
				case q >= (r-3)*(r-3) && q <= (r+2)*(r+2):
					c.Pix[p.Y*c.Stride+p.X] = markLight
				}
			}
		}
	}
}

// encode writes the picture as PNG.
func (c canvas) encode(w io.Writer) error {
	e := png.Encoder{CompressionLevel: png.DefaultCompression}
	return e.Encode(w, c)
}

// mapping says which cell every pixel of a panel shows: the nearest point of the
// axis, with borders half-way between points, also where they are unequal.
type mapping struct {
	r  image.Rectangle
	ex []int // per pixel row, from the top: excitation runs upwards
	em []int // per pixel column
	g  eem.Grid
}

func newMapping(r image.Rectangle, g eem.Grid) *mapping {
	m := &mapping{r: r, g: g, ex: make([]int, r.Dy()), em: make([]int, r.Dx())}
	lo, hi := edges(g.Em)
	for x := range m.em {
		m.em[x] = g.Em.Nearest(lo + (float64(x)+0.5)/float64(r.Dx())*(hi-lo))
	}
	lo, hi = edges(g.Ex)
	for y := range m.ex {
		m.ex[y] = g.Ex.Nearest(hi - (float64(y)+0.5)/float64(r.Dy())*(hi-lo))
	}
	return m
}

// edges returns the outer borders of the first and last point of an axis, nm.
func edges(a eem.Axis) (lo, hi float64) {
	n := a.Len()
	if n == 1 {
		return a.First() - 2.5, a.First() + 2.5
	}
	return a.First() - (a.At(1)-a.At(0))/2, a.Last() + (a.At(n-1)-a.At(n-2))/2
}

// x and y return the pixel of a wavelength.
func (m *mapping) x(nm float64) int {
	lo, hi := edges(m.g.Em)
	return m.r.Min.X + int((nm-lo)/(hi-lo)*float64(m.r.Dx()))
}

func (m *mapping) y(nm float64) int {
	lo, hi := edges(m.g.Ex)
	return m.r.Max.Y - 1 - int((nm-lo)/(hi-lo)*float64(m.r.Dy()))
}

// drawTo paints the cells v (J × K) into the panel.
func (m *mapping) drawTo(c canvas, v []float64, s scale) {
	k := m.g.Em.Len()
	row := make([]uint8, k)
	for y, j := range m.ex {
		if y == 0 || j != m.ex[y-1] {
			for e := range row {
				row[e] = s.index(v[j*k+e])
			}
		}
		at := (m.r.Min.Y+y)*c.Stride + m.r.Min.X
		line := c.Pix[at : at+len(m.em)]
		for x, e := range m.em {
			p := row[e]
			if p == missing && (x+y)%8 == 0 {
				p = hatch
			}
			line[x] = p
		}
	}
}
