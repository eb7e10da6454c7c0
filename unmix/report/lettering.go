package report

import (
	"image"
	"strings"
	"sync"
	"unicode"

	"codeberg.org/go-fonts/liberation/liberationsansbold"
	"codeberg.org/go-fonts/liberation/liberationsansregular"
	"golang.org/x/image/font"
	"golang.org/x/image/font/opentype"
	"golang.org/x/image/math/fixed"
)

// lettering is one font at one size, with its glyphs drawn once. It may be used
// by several goroutines.
type lettering struct {
	face   font.Face
	mu     sync.Mutex
	glyphs map[rune]glyph
}

// glyph is the coverage mask of a rune; at is its offset from the dot.
type glyph struct {
	mask    *image.Alpha
	at      image.Point
	advance fixed.Int26_6
}

// newLettering panics when the embedded font cannot be read: it ships with us.
func newLettering(ttf []byte, px float64) *lettering {
	f, err := opentype.Parse(ttf)
	if err != nil {
		panic("report: " + err.Error())
	}
	face, err := opentype.NewFace(f, &opentype.FaceOptions{Size: px, DPI: 72, Hinting: font.HintingFull})
	if err != nil {
		panic("report: " + err.Error())
	}
	return &lettering{face: face, glyphs: map[rune]glyph{}}
}

func regular(px float64) *lettering { return newLettering(liberationsansregular.TTF, px) }
func bold(px float64) *lettering    { return newLettering(liberationsansbold.TTF, px) }

func (l *lettering) glyph(r rune) glyph {
	l.mu.Lock()
	defer l.mu.Unlock()
	g, ok := l.glyphs[r]
	if ok {
		return g
	}
	b, mask, p, advance, ok := l.face.Glyph(fixed.Point26_6{}, r)
	if !ok {
		b, mask, p, advance, _ = l.face.Glyph(fixed.Point26_6{}, '□')
	}
	g = glyph{mask: image.NewAlpha(image.Rect(0, 0, b.Dx(), b.Dy())), at: b.Min, advance: advance}
	for y := range b.Dy() {
		for x := range b.Dx() {
			_, _, _, a := mask.At(p.X+x, p.Y+y).RGBA()
			g.mask.Pix[y*g.mask.Stride+x] = uint8(a >> 8)
		}
	}
	l.glyphs[r] = g
	return g
}

// width is the width of s in pixels.
func (l *lettering) width(s string) int {
	w := fixed.Int26_6(0)
	for _, r := range s {
		w += l.glyph(r).advance
	}
	return w.Ceil()
}

// fit cuts s so that it is at most w pixels wide.
func (l *lettering) fit(s string, w int) string {
	room := fixed.I(w) - l.glyph('…').advance
	used, last := fixed.Int26_6(0), 0
	for i, r := range s {
		used += l.glyph(r).advance
		if used <= room {
			last = i + len(string(r))
		}
		if used > fixed.I(w) {
			return s[:last] + "…"
		}
	}
	return s
}

// drawTo draws s with its baseline starting at (x, y). turned draws it upwards,
// rotated by 90°. set gets every pixel with its coverage 1–255.
func (l *lettering) drawTo(set func(x, y int, cover uint8), s string, x, y int, turned bool) {
	dot := fixed.Int26_6(0)
	for _, r := range s {
		g := l.glyph(r)
		b := g.mask.Rect
		for gy := range b.Dy() {
			for gx := range b.Dx() {
				c := g.mask.Pix[gy*g.mask.Stride+gx]
				if c == 0 {
					continue
				}
				dx, dy := dot.Round()+g.at.X+gx, g.at.Y+gy
				if turned {
					dx, dy = dy, -dx
				}
				set(x+dx, y+dy, c)
			}
		}
		dot += g.advance
	}
}

// plain makes text from a user fit for one line of a picture: what cannot be seen
// (control characters, marks that turn the direction) becomes a space.
func plain(s string) string {
	out := make([]rune, 0, len(s))
	for _, r := range s {
		if !unicode.IsPrint(r) {
			r = ' '
		}
		out = append(out, r)
		if len(out) == 200 {
			break
		}
	}
	return string(out)
}

// visible makes text from a user fit for a cell or the page: marks that turn the
// direction of what follows are left out, so that nobody reads another name than
// the one that stands there; other characters without a shape are shown as �.
func visible(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r >= '\u202a' && r <= '\u202e', r >= '\u2066' && r <= '\u2069', r == '\u200e', r == '\u200f', r == '\u061c', r == '\r':
			return -1
		case r == '\n' || r == '\t' || !unicode.IsControl(r):
			return r
		}
		return unicode.ReplacementChar
	}, s)
}
