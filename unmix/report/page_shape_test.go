package report

import (
	"context"
	"path/filepath"
	"testing"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/chromedp"
)

// On a telephone nothing sticks out of the page but what scrolls by itself, every
// control has a name for a screen reader, and on paper no table is cut.
func TestPageShape(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 24, "references", "parafac").write(t, dir)
	set := testSettings()
	set.Pictures = false
	must(t, Render(context.Background(), dir, set, nil))
	b := newBrowser(t, 400, 900)
	b.open(t, filepath.Join(dir, "report.html"))
	eval[bool](t, b, `document.querySelectorAll(".open")[3].click(); true`)
	b.wait(t, `document.getElementById("readout").textContent.includes("measured")`)
	if w := eval[int](t, b, `document.documentElement.scrollWidth`); w > 400 {
		t.Errorf("the page is %d px wide on a screen of 400", w)
	}
	if bare := eval[string](t, b, `[...document.querySelectorAll("input, select, button, canvas, [role=region]")].filter(e => !(e.getAttribute("aria-label") || (e.labels && e.labels.length) || e.textContent.trim())).map(e => e.outerHTML.slice(0, 80)).join("\n")`); bare != "" {
		t.Errorf("controls without a name:\n%s", bare)
	}
	if bare := eval[string](t, b, `[...document.images].filter(e => !e.alt).map(e => e.src.slice(0, 60)).join("\n")`); bare != "" {
		t.Errorf("pictures without words:\n%s", bare)
	}
	// A4 landscape less margins of 12 mm is 1032 px wide.
	must(t, chromedp.Do(b.ctx, chromedp.EmulateViewport(1032, 900), chromedp.Func(func(ctx context.Context, _ *chromedp.Target) error {
		_, err := chromedp.Call(ctx, emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{Media: "print"})
		return err
	})))
	if cut := eval[string](t, b, `[...document.querySelectorAll("table, img, canvas")].filter(e => e.getBoundingClientRect().right > innerWidth + 1).map(e => e.outerHTML.slice(0, 80) + " " + e.getBoundingClientRect().right).join("\n")`); cut != "" {
		t.Errorf("cut on paper:\n%s", cut)
	}
	if shown := eval[int](t, b, `[...document.querySelectorAll(".tools, nav, .filter")].filter(e => e.getBoundingClientRect().height > 0).length`); shown != 0 {
		t.Errorf("%d controls are printed", shown)
	}
}

// On a small screen the results stand where the page opens, without scrolling down or
// sideways, and a bottle's numbers before its maps.
func TestSmallScreen(t *testing.T) {
	b := newBrowser(t, 600, 900)
	dir := rendered(t, 12, func(s *RenderSettings) { s.Pictures = false }, "parafac")
	b.open(t, filepath.Join(dir, "report.html"))
	b.wait(t, `document.getElementById("count").textContent.endsWith("shown")`)
	first := eval[[]float64](t, b, `(() => { const r = document.querySelector("#table tbody td[data-v]:not(.k)").getBoundingClientRect(); return [r.right, r.bottom]; })()`)
	if first[0] > 600 || first[1] > 900 {
		t.Errorf("the first result ends at %g, %g px", first[0], first[1])
	}
	eval[bool](t, b, `document.querySelector(".open").click(); true`)
	b.wait(t, `document.getElementById("readout").textContent.includes("measured")`)
	if !eval[bool](t, b, `document.getElementById("parts").getBoundingClientRect().bottom <= document.querySelector(".maps").getBoundingClientRect().top`) {
		t.Error("the maps stand before the numbers")
	}
	if w := eval[int](t, b, `document.documentElement.scrollWidth`); w > 600 {
		t.Errorf("the page is %d px wide", w)
	}
}
