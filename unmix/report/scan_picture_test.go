package report

import (
	"context"
	"image/png"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

// A survey of single emission scans is drawn as spectra, in the pictures and in the
// page, and its numbers can be read as they can from maps.
func TestOneExcitation(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	f := newFixture(t, 9, "references")
	f.grid.Ex = axis(t, 350, 350, 5)
	f.write(t, dir)
	must(t, Render(context.Background(), dir, testSettings(), nil))
	if m, _ := filepath.Glob(filepath.Join(dir, "figures", "component-maps*")); len(m) > 0 {
		t.Errorf("a map of one row was drawn: %v", m)
	}
	r, err := os.Open(filepath.Join(dir, "maps", safeName("TL-0001")+".png"))
	must(t, err)
	defer r.Close()
	img, err := png.Decode(r)
	must(t, err)
	coloured := map[[3]uint32]bool{}
	for y := range img.Bounds().Dy() {
		for x := range img.Bounds().Dx() {
			red, green, blue, _ := img.At(x, y).RGBA()
			coloured[[3]uint32{red >> 8, green >> 8, blue >> 8}] = true
		}
	}
	for n, what := range map[int]string{0: "measured", 1: "model", 3: "residual"} {
		if c := series(n); !coloured[[3]uint32{uint32(c.R), uint32(c.G), uint32(c.B)}] {
			t.Errorf("the picture has no line of the colour of %s", what)
		}
	}

	s, err := OpenStore(filepath.Join(dir, StoreName))
	must(t, err)
	defer s.Close()
	x, err := s.Sample(0)
	must(t, err)
	b := newBrowser(t, 1200, 900)
	b.open(t, filepath.Join(dir, "report.html"))
	eval[bool](t, b, `document.querySelector(".open").click(); true`)
	b.wait(t, `document.getElementById("readout").textContent.includes("measured")`)
	if label := eval[string](t, b, `document.querySelector(".maps canvas").getAttribute("aria-label")`); !strings.HasPrefix(label, "measured spectrum of TL-0001") {
		t.Errorf("the spectrum is called %q", label)
	}
	em, err := strconv.ParseFloat(eval[string](t, b, `document.getElementById("readout").dataset.em`), 64)
	must(t, err)
	got, err := strconv.ParseFloat(eval[string](t, b, `document.getElementById("readout").dataset.measured`), 64)
	must(t, err)
	k, _ := s.Grid.Em.Find(em)
	lo, hi := bounds(x.Corrected)
	if d := math.Abs(got - x.Corrected[k]); !(d <= (hi-lo)/32767) {
		t.Errorf("em %g: read %g, survey.nc has %g", em, got, x.Corrected[k])
	}
	if len(b.wrong) > 0 {
		t.Errorf("the page complained: %v", b.wrong)
	}
}

// The largest loading that is determined is no peak where a larger one is open.
func TestPeakUndetermined(t *testing.T) {
	nan := math.NaN()
	r := &results{}
	seen := line{nm: []float64{300, 310, 320}, v: []float64{0.2, 1, 0.4}, open: []float64{0.2, 1, 0.4}}
	c := &component{"C1", line{nm: []float64{240, 245, 250}, v: []float64{nan, 0.95, 0.6}, open: []float64{1, 0.95, 0.6}}, seen}
	if got := r.peakText(c); got != "C1  (ex peak undetermined, em 310 nm)" {
		t.Error(got)
	}
	c.ex = seen
	c.ex.nm = []float64{280, 290, 300}
	if got := r.peakText(c); got != "C1  (ex 290, em 310 nm)" {
		t.Error(got)
	}
	c.ex.nm = []float64{290, 315, 330} // nothing fluoresces at ex 315 / em 310 nm
	if got := r.peakText(c); got != "C1  (seen peak ex 315, em 320 nm)" {
		t.Error(got)
	}
	if oneScan(eem.Grid{Ex: axis(t, 240, 250, 5), Em: axis(t, 300, 310, 5)}) {
		t.Error("two excitations are one scan")
	}
}
