package report

import (
	"bytes"
	"image"
	"image/png"
	"io"
	"math"
	"path/filepath"
	"strings"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"

	"tarnlight/eem"
)

// oneScan says whether EEMs are single emission scans, which are drawn as spectra:
// a map of one row shows nothing.
func oneScan(g eem.Grid) bool { return g.Ex.Len() == 1 }

// Panels of the picture of a scan: spectrum above residual.
const (
	scanHigh     = 62 * vg.Millimeter
	scanResidual = 36 * vg.Millimeter
	scanHead     = 8 * vg.Millimeter
)

var (
	residualLine = draw.LineStyle{Color: series(3), Width: 0.8}
	zeroLine     = draw.LineStyle{Color: inkGrey, Width: 0.4, Dashes: dotted}
)

// scanPlots are the panels of one bottle: measured as dots with the model as a
// line, and for each method the residual.
func (r *results) scanPlots(g eem.Grid, methods []string, ps []panels) (spectrum *plot.Plot, residuals []*plot.Plot) {
	em := g.Em.Values()
	lo, hi := edges(g.Em)
	unit := string(r.store.Unit)
	spectrum = r.num.newPlot("Measured and model at excitation "+r.num.nm(g.Ex.First())+" nm", "", unit)
	d := &dots{radius: 1.2}
	for i, v := range ps[0].measured {
		d.add(em[i], v, math.NaN(), math.NaN(), draw.CircleGlyph{}, series(0))
	}
	spectrum.Add(d)
	for n, p := range ps {
		if p.model == nil {
			continue
		}
		spectrum.Add(&curve{x: em, y: p.model, style: scanModel(n)})
		q := r.num.newPlot("Residual: measured − model ("+methodName(methods[n])+")", "Emission wavelength (nm)", unit)
		q.Add(&levelLine{at: 0, style: zeroLine}, &curve{x: em, y: p.residual, style: residualLine})
		q.X.Min, q.X.Max, q.Y.Min, q.Y.Max = lo, hi, -p.residualScale, p.residualScale
		residuals = append(residuals, q)
	}
	bottom, _ := bounds(ps[0].measured)
	spectrum.X.Min, spectrum.X.Max, spectrum.Y.Min, spectrum.Y.Max = lo, hi, min(0, bottom), ps[0].scale
	return spectrum, residuals
}

// scanModel is the line of the n-th method's model.
func scanModel(n int) draw.LineStyle {
	return draw.LineStyle{Color: series(1 + 2*n), Width: 1, Dashes: [][]vg.Length{solid, dashed}[n%2]}
}

// drawScan writes the picture of a bottle of one scan to maps/.
func (r *results) drawScan(b *bottle, methods []string, ps []panels) error {
	top, below := r.scanPlots(r.store.Grid, methods, ps)
	key := []keyEntry{{word: "measured", glyph: draw.CircleGlyph{}, color: series(0)}}
	for n := range below {
		style := scanModel(n)
		key = append(key, keyEntry{word: "model: " + methodName(methods[n]), line: &style})
	}
	text := r.pictureText(b)
	height := scanHead + scanHigh + vg.Length(len(below))*scanResidual + keyRow + 4
	img := vgimg.NewWith(vgimg.UseWH(figureWidth, height), vgimg.UseDPI(figureDPI))
	c := draw.New(img)
	st := textStyle(10, inkGrey)
	c.FillText(st, vg.Point{X: 3, Y: c.Max.Y - 3}, cut(plain(text.id), 60))
	st = textStyle(smallPoints, inkGrey)
	st.XAlign = draw.XRight
	c.FillText(st, vg.Point{X: c.Max.X - 9, Y: c.Max.Y - 5}, plain(text.what))
	foot := keyRow + 4
	if len(below) == 0 {
		top.X.Label.Text = "Emission wavelength (nm)"
	}
	rows := append([]*plot.Plot{top}, below...)
	heights := []vg.Length{scanHigh}
	for range below {
		heights = append(heights, scanResidual)
	}
	drawColumn(draw.Crop(c, 0, 0, foot, -scanHead), rows, heights)
	drawKey(draw.Crop(c, 0, 0, 0, foot-height), key)
	return writeFile(filepath.Join(r.dir, "maps", r.mapFile(b.id)), func(w io.Writer) error { return png.Encode(w, img.Image()) })
}

// drawColumn draws plots of the heights given under one another, their data areas
// aligned.
func drawColumn(c draw.Canvas, plots []*plot.Plot, heights []vg.Length) {
	left := vg.Length(0)
	for _, p := range plots {
		data := p.DataCanvas(c)
		left = max(left, data.Min.X-c.Min.X)
	}
	y := c.Max.Y
	for i, p := range plots {
		tile := c
		tile.Max.Y, tile.Min.Y = y-4, y-heights[i]
		tile.Min.X += 3 + left - (p.DataCanvas(c).Min.X - c.Min.X)
		tile.Max.X -= 9
		p.Draw(tile)
		y -= heights[i]
	}
}

// scanThumb is a small picture of a scan: measured beside residual, as lines.
func scanThumb(p panels, w, h int) []byte {
	c := newCanvas(2*w+6, h)
	c.spark(image.Rect(0, 0, w, h), p.measured, 0, p.scale)
	if p.residual != nil {
		c.spark(image.Rect(w+6, 0, 2*w+6, h), p.residual, -p.residualScale, p.residualScale)
	}
	var b bytes.Buffer
	e := png.Encoder{CompressionLevel: png.BestSpeed}
	if err := e.Encode(&b, c.Paletted); err != nil {
		panic("report: " + err.Error()) // a bytes.Buffer takes everything
	}
	return b.Bytes()
}

// spark draws v between lo and hi as a line across r.
func (c canvas) spark(r image.Rectangle, v []float64, lo, hi float64) {
	c.frame(r.Inset(1), gridLine)
	last := -1
	for x := r.Min.X + 1; x < r.Max.X-1; x++ {
		f := v[(x-r.Min.X)*len(v)/r.Dx()]
		if math.IsNaN(f) {
			c.fill(image.Rect(x, r.Min.Y+1, x+1, r.Max.Y-1), missing)
			last = -1
			continue
		}
		t := min(max((f-lo)/(hi-lo), 0), 1)
		y := r.Max.Y - 3 - int(t*float64(r.Dy()-6))
		from, to := y, y
		if last >= 0 {
			from, to = min(y, last), max(y, last)
		}
		c.fill(image.Rect(x, from, x+1, to+2), greys)
		last = y
	}
}

// figUnexplainedScan draws the mean and rms of the residuals of single scans.
func (r *results) figUnexplainedScan(method string, mean, rms []float64, g eem.Grid, num *Table) *figure {
	p := r.num.newPlot("Residuals over all bottles at excitation "+r.num.nm(g.Ex.First())+" nm", "Emission wavelength (nm)", strings.TrimSpace(r.unit))
	styles := []draw.LineStyle{{Color: series(0), Width: 1}, {Color: series(1), Width: 1, Dashes: dashed}}
	p.Add(&levelLine{at: 0, style: zeroLine}, &curve{x: g.Em.Values(), y: mean, style: styles[0]}, &curve{x: g.Em.Values(), y: rms, style: styles[1]})
	p.X.Min, p.X.Max = edges(g.Em)
	f := &figure{name: "unexplained-" + method, numbers: num,
		caption: "What the components leave (" + methodName(method) + "), over all bottles: mean and root mean square of the residuals."}
	return f.panels(1, 60*vg.Millimeter, []*plot.Plot{p}, keyEntry{word: "mean residual", line: &styles[0]}, keyEntry{word: "root mean square", line: &styles[1]})
}
