package report

import (
	"bytes"
	"errors"
	"fmt"
	"image"
	"image/png"
	"slices"
	"strings"

	"github.com/xuri/excelize/v2"

	"tarnlight/eem"
)

// worstMaps is how many residual maps workings.xlsx holds as coloured cells: 100
// of them make a file too slow to open.
const worstMaps = 25

// mapRow is the height of a row of coloured cells, points.
const mapRow = 6.0

// worst lists the bottles with a map by how far their residual rms stands above
// the noise (or by the rms alone where noise is unknown), worst first.
func (r *results) worst() []*bottle {
	t := r.table["samples.csv"]
	rank := func(b *bottle) float64 {
		v := t.Float(b.row, t.Own("residual_rms"))
		if n := t.Float(b.row, t.Own("noise_rms")); n > 0 {
			v /= n
		}
		return zero(v)
	}
	var out []*bottle
	for _, b := range r.bottles {
		if b.at >= 0 && b.reportable() && b.worst < eem.Reject {
			out = append(out, b)
		}
	}
	slices.SortStableFunc(out, func(a, b *bottle) int {
		switch x, y := rank(a), rank(b); {
		case x > y:
			return -1
		case x < y:
			return 1
		}
		return 0
	})
	return out
}

// cellMap is a residual map as cells of a sheet, its upper left one in column B.
type cellMap struct {
	b   *bottle
	v   []float64 // J × K; nil without a fit
	top float64   // where the colours end
	row int       // of the sheet: its title; the cells begin below
}

// cellMaps reads the residual maps of the worst bottles.
func (r *results) cellMaps(worst []*bottle, method string) ([]cellMap, error) {
	var out []cellMap
	for i, x := range worst[:min(len(worst), worstMaps)] {
		s, err := r.store.Sample(x.at)
		if err != nil {
			return nil, err
		}
		p := newPanels(s, method)
		out = append(out, cellMap{x, p.residual, p.residualScale, 4 + i*(r.store.Grid.Ex.Len()+3)})
	}
	return out, nil
}

// residualSheet shows the worst residual maps as coloured cells, emission across
// and excitation up, and then the hottest spots of all.
func (r *results) residualSheet(b *book) error {
	if r.store == nil || len(r.store.Methods) == 0 {
		return nil
	}
	method, g, worst := r.store.Methods[0], r.store.Grid, r.worst()
	maps, err := r.cellMaps(worst, method)
	if err != nil {
		return err
	}
	every := 1 + (g.Em.Len()-1)/200 // at most 200 columns
	cols := (g.Em.Len() + every - 1) / every
	l := layout{widths: append([]float64{10}, slices.Repeat([]float64{0.9}, cols)...), zoom: 70, broken: true}
	each := 2*rowHeight + 10 + mapRow*float64(g.Ex.Len()) // a map with its two rows of text and an empty one
	perPage := max(1, int((l.printRows()-2*rowHeight-20)/each))
	s := b.add("Residual maps", l, func(f *excelize.File, sheet string) error {
		for i, m := range maps {
			if err := m.colour(f, sheet, cols, g.Ex.Len()); err != nil {
				return err
			}
			if i > 0 && i%perPage == 0 {
				if err := f.InsertPageBreak(sheet, fmt.Sprintf("A%d", m.row)); err != nil {
					return err
				}
			}
		}
		return nil
	})
	s.add(20, cell{"Residual maps: measured − model (" + methodName(method) + ")", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{fmt.Sprintf("The %d worst by residual rms over noise. Emission across, excitation up; blue below zero, brown above; grey where missing.", len(maps)), look{color: midGrey}})
	for _, m := range maps {
		s.skip(m.row - s.row)
		s.add(rowHeight, cell{cut(visible(m.b.id), 100) + "   colours end at ±" + r.num.sig(m.top, 2) + " " + r.unit, look{bold: true}})
		m.write(s, g, every)
		s.add(10, cell{}, cell{fmt.Sprintf("emission %s to %s nm", r.num.nm(g.Em.First()), r.num.nm(g.Em.Last())), look{size: 7, color: midGrey}})
	}
	s.done()
	r.hotSheet(b, worst)
	return nil
}

// colour gives the cells of the map their scale of colours.
func (m *cellMap) colour(f *excelize.File, sheet string, cols, rows int) error {
	from, err1 := excelize.CoordinatesToCellName(2, m.row+1)
	to, err2 := excelize.CoordinatesToCellName(1+cols, m.row+rows)
	return errors.Join(err1, err2, f.SetConditionalFormat(sheet, from+":"+to, []excelize.ConditionalFormatOptions{{
		Type: "3_color_scale", Criteria: "=", MinType: "num", MidType: "num", MaxType: "num",
		MinValue: Number(-m.top), MidValue: "0", MaxValue: Number(m.top),
		MinColor: hexOf(0), MidColor: hexOf(divLen / 2), MaxColor: hexOf(divLen - 1)}}))
}

// write writes the rows of the map, the longest excitation first; the format ;;;
// hides the digits.
func (m *cellMap) write(s *sheet, g eem.Grid, every int) {
	number, gap := look{format: ";;;", size: 6}, look{fill: "D6D6D6", size: 6}
	for j := g.Ex.Len() - 1; j >= 0; j-- {
		row := []cell{{g.Ex.At(j), look{size: 6, color: midGrey, format: "0.##"}}}
		for k := 0; k < g.Em.Len(); k += every {
			if i := g.Index(j, k); m.v != nil && finite(m.v[i]) {
				row = append(row, cell{m.v[i], number})
			} else {
				row = append(row, cell{nil, gap})
			}
		}
		s.add(mapRow, row...)
	}
}

func hexOf(level int) string {
	c := diverging(divLen)[level]
	return fmt.Sprintf("#%02X%02X%02X", c.R, c.G, c.B)
}

// hotSheet lists the hottest spot of every bottle, worst bottle first.
func (r *results) hotSheet(b *book, worst []*bottle) {
	t := r.table["samples.csv"]
	s := b.add("Hottest spots", layout{portrait: true, widths: []float64{r.idWidth(), 12, 12, 14, 14, 14, 12, 12}, freeze: "B4", repeat: "$3:$3"})
	s.add(20, cell{"Largest residual of every bottle", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"In " + r.unit + "; the bottle with the largest residual rms over noise first.", look{color: midGrey}})
	var heads []cell
	for i, h := range []string{"Bottle", "Excitation, nm", "Emission, nm", "Largest residual", "Residual rms", "Noise rms", "Explained, %", "Structure z"} {
		heads = append(heads, cell{h, []look{headLook, headRight}[min(i, 1)]})
	}
	s.add(28, heads...)
	for _, x := range worst {
		row := []cell{{visible(x.id), look{bold: true, hair: true}}}
		for _, name := range []string{"hottest_ex_nm", "hottest_em_nm", "hottest_value", "residual_rms", "noise_rms", "explained_percent", "structure"} {
			v := t.Float(x.row, t.Own(name))
			l := look{format: sigFormat(v, 4), hair: true}
			if strings.HasSuffix(name, "_nm") {
				l.format = "0.##"
			}
			row = append(row, cell{v, l})
		}
		s.add(rowHeight, row...)
	}
	s.table("Hottest_spots", 3, len(heads))
	s.done()
}

// Pixels of a small picture: two maps with 6 between them.
const (
	thumbWide = 2*110 + 6
	thumbHigh = 90
)

// thumb is a small picture of a bottle: measured beside residual.
func thumb(g eem.Grid, p panels) []byte {
	const w, h = (thumbWide - 6) / 2, thumbHigh
	if oneScan(g) {
		return scanThumb(p, w, h)
	}
	c := newCanvas(2*w+6, h)
	newMapping(image.Rect(0, 0, w, h), g).drawTo(c, p.measured, scale{p.scale, false})
	if p.residual != nil {
		newMapping(image.Rect(w+6, 0, 2*w+6, h), g).drawTo(c, p.residual, scale{p.residualScale, true})
	}
	var b bytes.Buffer
	e := png.Encoder{CompressionLevel: png.BestSpeed}
	if err := e.Encode(&b, c.Paletted); err != nil {
		panic("report: " + err.Error()) // a bytes.Buffer takes everything
	}
	return b.Bytes()
}

// strip joins the small pictures of a row of the sheet, each as wide as its column: a
// picture a bottle takes the library, and the program that opens the sheet, too long.
func strip(thumbs [][]byte, wide int) []byte {
	c := newCanvas(wide*(len(thumbs)-1)+thumbWide, thumbHigh) // no wider: print would put its end on another page
	for n, t := range thumbs {
		img, err := png.Decode(bytes.NewReader(t))
		p, ok := img.(*image.Paletted)
		if err != nil || !ok {
			panic("report: a small picture of our own cannot be read")
		}
		for y := range p.Rect.Dy() {
			copy(c.Pix[y*c.Stride+n*wide:], p.Pix[y*p.Stride:y*p.Stride+p.Rect.Dx()])
		}
	}
	var b bytes.Buffer
	if err := png.Encode(&b, c.Paletted); err != nil {
		panic("report: " + err.Error()) // a bytes.Buffer takes everything
	}
	return b.Bytes()
}

// thumbnailSheet shows every bottle small.
func (r *results) thumbnailSheet(b *book, p *pass) {
	const cols, rowsEach, perPage = 4, 6, 11
	var with []int
	for i, t := range p.thumbs {
		if t != nil {
			with = append(with, i)
		}
	}
	if len(with) == 0 {
		return
	}
	s := b.add("Thumbnails", layout{portrait: true, broken: true, widths: slices.Repeat([]float64{34}, cols)}, func(f *excelize.File, sheet string) error {
		for n := 0; n < len(with); n += cols {
			four := with[n:min(n+cols, len(with))]
			at := fmt.Sprintf("A%d", 5+n/cols*rowsEach)
			var thumbs [][]byte
			names := ""
			for _, i := range four {
				thumbs = append(thumbs, p.thumbs[i])
				names += " " + cut(plain(r.bottles[i].id), 60)
			}
			err := f.AddPictureFromBytes(sheet, at, &excelize.Picture{Extension: ".png", File: strip(thumbs, columnPixels(34)),
				Format: &excelize.GraphicOptions{AltText: "measured and residual maps of" + names, OffsetX: 2, OffsetY: 1, Positioning: "oneCell"}})
			if row := n / cols; row > 0 && row%perPage == 0 {
				err = errors.Join(err, f.InsertPageBreak(sheet, fmt.Sprintf("A%d", 4+row*rowsEach)))
			}
			if err != nil {
				return err
			}
		}
		return nil
	})
	s.add(20, cell{"Every bottle: measured, and what the model leaves", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"Each on its own scale; the pictures in maps/ state the scales.", look{color: midGrey}})
	for n := 0; n < len(with); n += cols {
		s.skip(4 + n/cols*rowsEach - s.row)
		var row []cell
		for _, i := range with[n:min(n+cols, len(with))] {
			word, l := severityLook(r.bottles[i].worst)
			l.bold, l.fill = true, ""
			row = append(row, cell{cut(plain(r.bottles[i].id), 24) + " – " + word, l})
		}
		s.add(rowHeight, row...)
	}
	s.done()
}
