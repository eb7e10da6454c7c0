package report

import (
	"image/color"
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"tarnlight/eem"
)

// leftover gathers what a method left unexplained over the survey, cell by cell.
type leftover struct {
	sum, sq []float64
	n       []int
	bottles int
}

func newLeftover(cells int) *leftover {
	return &leftover{sum: make([]float64, cells), sq: make([]float64, cells), n: make([]int, cells)}
}

func (l *leftover) add(residual []float32) {
	any := false
	for i, v := range residual {
		if v == v {
			x := float64(v)
			l.sum[i] += x
			l.sq[i] += x * x
			l.n[i]++
			any = true
		}
	}
	if any {
		l.bottles++
	}
}

// maps returns mean and root mean square per cell, NaN where no bottle has it.
func (l *leftover) maps() (mean, rms []float64) {
	mean, rms = make([]float64, len(l.n)), make([]float64, len(l.n))
	for i, n := range l.n {
		mean[i] = l.sum[i] / float64(n)
		rms[i] = math.Sqrt(l.sq[i] / float64(n))
	}
	return mean, rms
}

// figUnexplained draws what no component accounts for: the mean and the rms of
// the residuals, and where each bottle's largest residual lies.
func (r *results) figUnexplained(method string, l *leftover, g eem.Grid) *figure {
	if l == nil || l.bottles == 0 {
		return nil
	}
	mean, rms := l.maps()
	num := &Table{Columns: []string{"excitation_nm", "emission_nm", "mean", "rms", "bottles"}}
	abs := make([]float64, len(mean))
	for i := range mean {
		num.Append(g.Ex.At(i/g.Em.Len()), g.Em.At(i%g.Em.Len()), mean[i], rms[i], l.n[i])
		abs[i] = math.Abs(mean[i])
	}
	if oneScan(g) {
		return r.figUnexplainedScan(method, mean, rms, g, num)
	}
	ms, rs := scale{ceilNice(topOf(abs, 0.999)), true}, scale{ceilNice(topOf(rms, 0.999)), false}
	a := r.num.newPlot("Mean residual", "Emission wavelength (nm)", "Excitation wavelength (nm)")
	a.Add(&heat{g, mean, ms})
	b := r.num.newPlot("Root mean square of the residuals", "Emission wavelength (nm)", "Excitation wavelength (nm)")
	b.Add(&heat{g, rms, rs})
	spots, shown := r.hotSpots(method)
	c := r.num.newPlot("Largest residual of each bottle", "Emission wavelength (nm)", "Excitation wavelength (nm)")
	xmin, xmax, ymin, ymax := (&heat{grid: g}).DataRange()
	if shown {
		c.Add(spots)
	}
	c.X.Min, c.X.Max, c.Y.Min, c.Y.Max = xmin, xmax, ymin, ymax
	return &figure{name: "unexplained-" + method, numbers: num, height: 70 * vg.Millimeter,
		caption: "What the components leave (" + methodName(method) + "), over all bottles. Right: circles mark where a bottle's largest residual lies (left out where it is within five times the noise); a larger circle is a larger residual.",
		draw: func(k draw.Canvas) {
			drawGrid(draw.Crop(k, 0, 0, 13*vg.Millimeter, 0), 3, []*plot.Plot{a, b, c})
			third := figureWidth / 3
			bar := func(i vg.Length, s scale) {
				r.num.drawScale(draw.Crop(k, i*third+14*vg.Millimeter, -figureWidth+(i+1)*third-5*vg.Millimeter, 2*vg.Millimeter, -k.Max.Y+12*vg.Millimeter), s, r.unit)
			}
			bar(0, ms)
			bar(1, rs)
			st := textStyle(smallPoints, inkGrey)
			st.XAlign = draw.XCenter
			k.FillText(st, vg.Point{X: k.Min.X + 2.5*third + 5*vg.Millimeter, Y: k.Min.Y + 10*vg.Millimeter}, "larger circle: larger residual")
		}}
}

// hotSpots are the largest residuals that stand out of the noise, where it is
// known.
func (r *results) hotSpots(method string) (d *dots, any bool) {
	t := r.table["samples.csv"]
	ex, em, v, noise, of := t.Own("hottest_ex_nm"), t.Own("hottest_em_nm"), t.Own("hottest_value"), t.Own("noise_rms"), t.Own("fit_method")
	d = &dots{}
	top := 0.0
	var size []float64
	for _, b := range r.bottles {
		h, n := math.Abs(t.Float(b.row, v)), zero(t.Float(b.row, noise))
		if m := t.Text(b.row, of); !(h > 5*n) || b.worst == eem.Reject || (m != "" && m != method) {
			continue
		}
		d.x, d.y = append(d.x, t.Float(b.row, em)), append(d.y, t.Float(b.row, ex))
		d.glyph, d.color = append(d.glyph, draw.RingGlyph{}), append(d.color, color.Color(series(3)))
		size = append(size, h)
		top = max(top, h)
	}
	for _, s := range size {
		d.radii = append(d.radii, vg.Length(1.5+5*math.Sqrt(s/top)))
	}
	return d, len(d.x) > 0
}
