package report

import (
	"bytes"
	"errors"
	"image/color"
	"image/png"
	"io"
	"os"
	"path/filepath"
	"strings"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"
	"gonum.org/v1/plot/vg/vgsvg"
)

// Figures are drawn for print: the width of two text columns (170 mm), letters of
// 7 and 8 points, PNG at 200 dpi.
const (
	figureWidth = 170 * vg.Millimeter
	figureDPI   = 200
	smallPoints = 7
	headPoints  = 8
)

// figure is one picture of the folder figures/, with the numbers it shows.
type figure struct {
	name    string // file name without extension
	caption string // one sentence: what is to be seen, for the page and for screen readers
	choice  string // what it is one view by, where there are several of the same numbers
	height  vg.Length
	draw    func(c draw.Canvas)
	numbers *Table // written beside it as CSV
}

// write writes NAME.svg, NAME.png and NAME.csv to dir.
func (f *figure) write(dir string) error {
	f.numbers.Name = f.name + ".csv"
	return errors.Join(
		writeFile(filepath.Join(dir, f.name+".png"), f.png),
		writeFile(filepath.Join(dir, f.name+".svg"), func(w io.Writer) error { _, err := w.Write(f.svg()); return err }),
		f.numbers.WriteFile(dir))
}

// png writes the picture as PNG.
func (f *figure) png(w io.Writer) error {
	img := vgimg.NewWith(vgimg.UseWH(figureWidth, f.height), vgimg.UseDPI(figureDPI))
	f.draw(draw.New(img))
	return png.Encode(w, img.Image())
}

// svg returns the picture as SVG. Two properties of the library's writer are put
// right: images keep their own aspect instead of filling their rectangle, and
// are labelled as JPEG, so that some viewers draw nothing. Fonts are named with
// substitutes of the same widths.
func (f *figure) svg() []byte {
	c := vgsvg.New(figureWidth, f.height)
	f.draw(draw.New(c))
	var b bytes.Buffer
	if _, err := c.WriteTo(&b); err != nil {
		panic("report: " + err.Error()) // a bytes.Buffer takes everything
	}
	return []byte(strings.NewReplacer("<image ", `<image preserveAspectRatio="none" `, "data:image/jpg;", "data:image/png;",
		"font-family:Liberation Sans;", "font-family:Liberation Sans,Arimo,Arial,Helvetica,sans-serif;").Replace(b.String()))
}

func writeFile(path string, write func(io.Writer) error) error {
	f, err := os.Create(path)
	if err != nil {
		return err
	}
	return errors.Join(write(f), f.Close())
}

// newPlot returns a plot in the style of the figures.
func (n numbers) newPlot(title, x, y string) *plot.Plot {
	p := plot.New()
	p.Title.Text, p.X.Label.Text, p.Y.Label.Text = plain(title), x, y
	p.Title.Padding = 3
	for _, s := range []*text.Style{&p.Title.TextStyle, &p.X.Label.TextStyle, &p.Y.Label.TextStyle,
		&p.X.Tick.Label, &p.Y.Tick.Label} {
		s.Font.Typeface, s.Font.Variant, s.Font.Size, s.Color = "Liberation", "Sans", smallPoints, inkGrey
	}
	p.Title.TextStyle.Font.Size = headPoints
	for _, a := range []*plot.Axis{&p.X, &p.Y} {
		a.Padding = 0
		a.LineStyle = draw.LineStyle{Color: inkGrey, Width: 0.5}
		a.Tick.LineStyle = a.LineStyle
		a.Tick.Length = 3
		a.Tick.Marker = n.ticker(5)
	}
	return p
}

// ticker marks an axis with at most n round steps and our decimal mark.
func (n numbers) ticker(steps int) plot.Ticker {
	return plot.TickerFunc(func(lo, hi float64) []plot.Tick {
		at := ticks(lo, hi, steps)
		words, power := n.tickText(at)
		out := make([]plot.Tick, len(at))
		for i, v := range at {
			out[i] = plot.Tick{Value: v, Label: words[i]}
			if power != 0 && v != 0 {
				out[i].Label = words[i] + "·10" + superscript(power)
			}
		}
		return out
	})
}

func textStyle(size float64, c color.Color) text.Style {
	return text.Style{Color: c, Font: font.Font{Typeface: "Liberation", Variant: "Sans", Size: vg.Points(size)},
		XAlign: draw.XLeft, YAlign: draw.YTop, Handler: plot.DefaultTextHandler}
}

// drawGrid draws plots in rows of cols, their data areas aligned.
func drawGrid(c draw.Canvas, cols int, plots []*plot.Plot) {
	rows := (len(plots) + cols - 1) / cols
	if rows == 0 {
		return
	}
	all := make([][]*plot.Plot, rows)
	for r := range all {
		all[r] = make([]*plot.Plot, cols)
		copy(all[r], plots[r*cols:min(len(plots), (r+1)*cols)])
	}
	t := draw.Tiles{Rows: rows, Cols: cols, PadX: 9, PadY: 9, PadTop: 5, PadBottom: 4, PadLeft: 3, PadRight: 9}
	cs := plot.Align(all, t, c)
	for r := range all {
		for k, p := range all[r] {
			if p != nil {
				p.Draw(cs[r][k])
			}
		}
	}
}
