package report

import (
	"bytes"
	"image"
	"image/color"
	"image/png"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"tarnlight/eem"
)

// cielab is an independent measure of colour: CIE 1976 L*a*b* for the sRGB white
// (IEC 61966-2-1).
func cielab(c color.NRGBA) [3]float64 {
	lin := func(u uint8) float64 {
		v := float64(u) / 255
		if v <= 0.04045 {
			return v / 12.92
		}
		return math.Pow((v+0.055)/1.055, 2.4)
	}
	return labOf(lin(c.R), lin(c.G), lin(c.B))
}

func labOf(r, g, b float64) [3]float64 {
	x := (0.4124*r + 0.3576*g + 0.1805*b) / 0.9505
	y := 0.2126*r + 0.7152*g + 0.0722*b
	z := (0.0193*r + 0.1192*g + 0.9505*b) / 1.089
	f := func(t float64) float64 {
		if t > 216.0/24389 {
			return math.Cbrt(t)
		}
		return (24389.0/27*t + 16) / 116
	}
	return [3]float64{116*f(y) - 16, 500 * (f(x) - f(y)), 200 * (f(y) - f(z))}
}

func deltaE(a, b [3]float64) float64 {
	return math.Sqrt((a[0]-b[0])*(a[0]-b[0]) + (a[1]-b[1])*(a[1]-b[1]) + (a[2]-b[2])*(a[2]-b[2]))
}

// Intensities: lightness falls all the way, in steps that CIELAB finds even too.
func TestSequentialIsEven(t *testing.T) {
	c := sequential(seqLen)
	var steps []float64
	for i := range c {
		if i > 0 && cielab(c[i])[0] >= cielab(c[i-1])[0]+0.01 {
			t.Errorf("colour %d is lighter than the one before", i)
		}
		if i >= 8 {
			steps = append(steps, deltaE(cielab(c[i]), cielab(c[i-8])))
		}
	}
	mean, sd := 0.0, 0.0
	for _, s := range steps {
		mean += s / float64(len(steps))
	}
	for _, s := range steps {
		sd += (s - mean) * (s - mean) / float64(len(steps))
	}
	if cv := math.Sqrt(sd) / mean; cv > 0.30 { // published perceptually uniform maps lie at 0.20–0.28 by this measure
		t.Errorf("steps vary by %.2f", cv)
	}
}

// Residuals: near-white in the middle, equally dark at equal distances.
func TestDivergingIsBalanced(t *testing.T) {
	c := diverging(divLen)
	if l := cielab(c[divLen/2])[0]; l < 95 {
		t.Errorf("zero has lightness %.1f", l)
	}
	for i := range divLen / 2 {
		if d := cielab(c[i])[0] - cielab(c[divLen-1-i])[0]; math.Abs(d) > 6 {
			t.Errorf("level %d: lightness differs by %.1f", i, d)
		}
	}
}

// Lines stay apart for colour-blind eyes: Machado, Oliveira & Fernandes 2009,
// IEEE Trans. Vis. Comput. Graph. 15, 1291, full severity (matrices from memory;
// their rows sum to 1).
func TestSeriesForColourBlindEyes(t *testing.T) {
	for name, m := range map[string][3][3]float64{
		"normal":       {{1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
		"protanopia":   {{0.152286, 1.052583, -0.204868}, {0.114503, 0.786281, 0.099216}, {-0.003882, -0.048116, 1.051998}},
		"deuteranopia": {{0.367322, 0.860646, -0.227968}, {0.280085, 0.672501, 0.047413}, {-0.011820, 0.042940, 0.968881}},
	} {
		see := func(c color.NRGBA) [3]float64 {
			lin := func(u uint8) float64 { return math.Pow(float64(u)/255, 2.2) }
			in := [3]float64{lin(c.R), lin(c.G), lin(c.B)}
			var out [3]float64
			for i := range out {
				for k := range in {
					out[i] += m[i][k] * in[k]
				}
				out[i] = min(max(out[i], 0), 1)
			}
			return labOf(out[0], out[1], out[2])
		}
		for i := range seriesColours {
			for k := range i {
				if d := deltaE(see(seriesColours[i]), see(seriesColours[k])); d < 12 {
					t.Errorf("%s: colours %d and %d differ by %.1f only", name, k, i, d)
				}
			}
		}
	}
}

// A map in SVG stands where it stands in PNG: the darkest spot lies at the same
// place when an independent program draws the file.
func TestSVGAgreesWithPNG(t *testing.T) {
	rsvg := outside(t, "rsvg-convert")
	g := eem.Grid{Ex: axis(t, 240, 300, 5), Em: axis(t, 300, 600, 2)}
	v := make([]float64, g.Cells())
	for i := range v {
		ex, em := g.Ex.At(i/g.Em.Len()), g.Em.At(i%g.Em.Len())
		v[i] = math.Exp(-math.Pow((ex-285)/4, 2) - math.Pow((em-540)/10, 2))
	}
	f := &figure{name: "m", height: 60 * vg.Millimeter, numbers: &Table{Columns: []string{"a"}}, draw: func(c draw.Canvas) {
		p := numbers{}.newPlot("", "Emission wavelength (nm)", "Excitation wavelength (nm)")
		p.Add(&heat{g, v, scale{1, false}})
		p.Draw(c)
	}}
	dir := t.TempDir()
	must(t, f.write(dir))
	must(t, exec.Command(rsvg, "-d", "200", "-p", "200", "-o", filepath.Join(dir, "s.png"), filepath.Join(dir, "m.svg")).Run())
	ax, ay := darkest(t, filepath.Join(dir, "m.png"))
	bx, by := darkest(t, filepath.Join(dir, "s.png"))
	if math.Hypot(ax-bx, ay-by) > 0.012 {
		t.Errorf("darkest at %.3f, %.3f of the PNG and %.3f, %.3f of the SVG", ax, ay, bx, by)
	}
}

// darkest is the centre of the darkest blue pixels, as shares of width and height.
func darkest(t *testing.T, path string) (x, y float64) {
	b, err := os.ReadFile(path)
	must(t, err)
	img, err := png.Decode(bytes.NewReader(b))
	must(t, err)
	top := sequential(seqLen)[seqLen-4]
	n := 0.0
	for py := range img.Bounds().Dy() {
		for px := range img.Bounds().Dx() {
			c := color.NRGBAModel.Convert(img.At(px, py)).(color.NRGBA)
			if deltaE(cielab(c), cielab(top)) < 8 {
				x, y, n = x+float64(px), y+float64(py), n+1
			}
		}
	}
	if n == 0 {
		t.Fatalf("%s shows no peak", path)
	}
	return x / n / float64(img.Bounds().Dx()), y / n / float64(img.Bounds().Dy())
}

// Contours run where they must: a cone of known slope has circles.
func TestContourOfACone(t *testing.T) {
	g := eem.Grid{Ex: axis(t, 200, 300, 2), Em: axis(t, 400, 500, 2)}
	v := make([]float64, g.Cells())
	for i := range v {
		v[i] = math.Hypot(g.Ex.At(i/g.Em.Len())-250, g.Em.At(i%g.Em.Len())-450)
	}
	lines := contourLines(g, v, 30)
	if len(lines) != 1 {
		t.Fatalf("%d lines, want one circle", len(lines))
	}
	for _, p := range lines[0] {
		if r := math.Hypot(p.ex-250, p.em-450); math.Abs(r-30) > 0.05 { // linear between cells of 2 nm
			t.Errorf("point %v lies at radius %g", p, r)
		}
	}
	if l := lines[0]; l[0] != l[len(l)-1] {
		t.Error("the circle is not closed")
	}
	// A missing quarter opens it, and no line runs along the gap.
	for i := range v {
		if g.Ex.At(i/g.Em.Len()) > 250 && g.Em.At(i%g.Em.Len()) > 450 {
			v[i] = math.NaN()
		}
	}
	for _, l := range contourLines(g, v, 30) {
		for _, p := range l {
			if r := math.Hypot(p.ex-250, p.em-450); math.Abs(r-30) > 0.05 {
				t.Errorf("with a gap: point %v lies at radius %g", p, r)
			}
		}
	}
}

// Cells are drawn as large as they are on an uneven axis, and missing ones grey.
func TestMappingOfUnevenAxes(t *testing.T) {
	ex, err := eem.NewAxis([]float64{250, 260, 300})
	must(t, err)
	em, err := eem.NewAxis([]float64{300, 310, 350, 360})
	must(t, err)
	m := newMapping(image.Rect(0, 0, 700, 750), eem.Grid{Ex: ex, Em: em})
	count := map[int]int{}
	for _, k := range m.em {
		count[k]++
	}
	// edges at 295, 305, 330, 355, 365: 10, 25, 25, 10 of 70 nm on 700 pixels
	for k, want := range []int{100, 250, 250, 100} {
		if math.Abs(float64(count[k]-want)) > 1 {
			t.Errorf("emission %g nm is %d pixels wide, want %d", em.At(k), count[k], want)
		}
	}
	if m.ex[0] != 2 || m.ex[len(m.ex)-1] != 0 {
		t.Error("excitation does not run upwards")
	}
	c := newCanvas(700, 750)
	m.drawTo(c, []float64{math.NaN(), 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 1}, scale{1, false})
	if p := c.Pix[749*c.Stride]; p != missing && p != hatch {
		t.Errorf("a missing cell has colour %d", p)
	}
	if p := c.Pix[699]; p != seqFirst+seqLen-1 {
		t.Errorf("the largest value has colour %d", p)
	}
}

func TestNumbersForPeople(t *testing.T) {
	n, k := numbers{}, numbers{comma: true}
	for _, c := range []struct{ got, want string }{
		{n.sig(0.0123456, 3), "0.0123"}, {n.sig(-1234.5, 2), "−1200"}, {k.sig(3.14159, 3), "3,14"}, {n.sig(9.996, 3), "10.0"},
		{n.sig(1e-7, 2), "1.0 · 10⁻⁷"}, {n.sig(math.NaN(), 2), "–"}, {n.sig(math.Inf(1), 2), "∞"}, {n.sig(0, 3), "0"},
		{n.fixed(-0.001, 2), "0.00"}, {n.fixed(1234.5, -2), "1200"}, {n.short(0.02, 5), "0.02"}, {n.short(512.30, 5), "512.3"}, {n.short(100, 5), "100"},
		{n.nm(452.50), "452.5"}, {n.nm(300), "300"},
	} {
		if c.got != c.want {
			t.Errorf("%q, want %q", c.got, c.want)
		}
	}
	for text, want := range map[string]string{"0.371": "0,371", "9.1e-5": "9,1 · 10⁻⁵", "< 9.1e-5": "< 9,1 · 10⁻⁵", "see a + base": "see a + base", "70": "70"} {
		if got := k.stated(text); got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}
