package report

import (
	"context"
	"encoding/base64"
	"fmt"
	"math"
	"net/url"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"
)

// browser is a headless Chromium that keeps what the page asked of the network
// and what it complained about.
type browser struct {
	ctx      context.Context
	mu       sync.Mutex
	requests []string
	wrong    []string
}

func newBrowser(t testing.TB, width, height int64) *browser {
	t.Helper()
	path := outside(t, "chromium", "chromium-browser", "google-chrome")
	opts := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.ExecPath(path), chromedp.NoSandbox, chromedp.DisableGPU,
		chromedp.UserDataDir(t.TempDir()), chromedp.Flag("disable-quic", true), chromedp.Flag("disable-component-update", true))
	ctx, stop := context.WithTimeout(context.Background(), 180*time.Second)
	t.Cleanup(stop)
	ctx, stop2 := chromedp.NewExecAllocator(ctx, opts...)
	t.Cleanup(stop2)
	ctx, stop3 := chromedp.NewContext(ctx)
	t.Cleanup(stop3)
	b := &browser{ctx: ctx}
	must(t, chromedp.Do(ctx, chromedp.EmulateViewport(width, height), chromedp.Func(func(ctx context.Context, tab *chromedp.Target) error {
		_, err := chromedp.Call(ctx, network.Enable, network.EnableParams{})
		return err
	})))
	must(t, chromedp.Listen(ctx, func(ev any) {
		b.mu.Lock()
		defer b.mu.Unlock()
		switch e := ev.(type) {
		case *network.EventRequestWillBeSent:
			if !strings.HasPrefix(e.Request.URL, "data:") {
				b.requests = append(b.requests, e.Request.URL)
			}
		case *runtime.EventExceptionThrown:
			b.wrong = append(b.wrong, e.ExceptionDetails.Text)
		case *runtime.EventConsoleAPICalled:
			b.wrong = append(b.wrong, fmt.Sprintf("console %s: %v", e.Type, len(e.Args)))
		}
	}))
	return b
}

func (b *browser) open(t testing.TB, path string) {
	t.Helper()
	abs, err := filepath.Abs(path)
	must(t, err)
	must(t, chromedp.Do(b.ctx, chromedp.Navigate((&url.URL{Scheme: "file", Path: abs}).String())))
}

// eval runs a script in the page.
func eval[T any](t testing.TB, b *browser, js string) T {
	t.Helper()
	v, err := chromedp.Run(b.ctx, chromedp.Evaluate[T](js))
	if err != nil {
		t.Fatalf("%s: %v", js, err)
	}
	return v
}

// wait waits until a script gives true.
func (b *browser) wait(t testing.TB, js string) {
	t.Helper()
	for range 400 {
		if eval[bool](t, b, js) {
			return
		}
		time.Sleep(10 * time.Millisecond)
	}
	t.Fatalf("the page never came to %s", js)
}

// shot leaves a picture of the page for the eye.
func (b *browser) shot(t testing.TB, path string) {
	t.Helper()
	png, err := chromedp.Run(b.ctx, chromedp.CaptureScreenshot())
	must(t, err)
	must(t, os.WriteFile(path, png, 0o600))
}

func shownIDs(t testing.TB, b *browser) []string {
	return strings.Split(eval[string](t, b, `[...document.querySelectorAll("#table tbody tr")].filter(r => !r.hidden).map(r => r.cells[0].textContent.slice(0, 7)).join("|")`), "|")
}

func TestPage(t *testing.T) {
	b := newBrowser(t, 1500, 950)
	dir := t.TempDir()
	f := newFixture(t, 24, "references", "parafac")
	f.write(t, dir)
	set := testSettings()
	set.Pictures = false
	must(t, Render(context.Background(), dir, set, nil))
	b.open(t, filepath.Join(dir, "report.html"))
	b.wait(t, `document.getElementById("count").textContent === "24 of 24 shown"`)

	t.Run("sort", func(t *testing.T) {
		col := eval[int](t, b, `[...document.querySelectorAll("#table thead th")].findIndex(h => h.textContent.startsWith("Explained"))`)
		button := fmt.Sprintf(`document.querySelectorAll("#table thead th")[%d]`, col)
		eval[bool](t, b, button+`.querySelector("button").click(); true`)
		if ids := shownIDs(t, b); ids[0] != "TL-0004" || ids[23] != "TL-0008" { // the spill, and the dark bottle without a number
			t.Errorf("sorted upwards: %v", ids)
		}
		if s := eval[string](t, b, button+`.getAttribute("aria-sort")`); s != "ascending" {
			t.Errorf("aria-sort is %q", s)
		}
		eval[bool](t, b, button+`.querySelector("button").click(); true`)
		if ids := shownIDs(t, b); ids[22] != "TL-0004" || ids[23] != "TL-0008" {
			t.Errorf("sorted downwards: %v", ids)
		}
	})
	t.Run("filter", func(t *testing.T) {
		for js, want := range map[string]string{
			`document.querySelector("[name=verdict][value=good]").click(); true`:                 "TL-0004 TL-0006 TL-0008",
			`document.getElementById("test").value = "saturated"; true`:                          "TL-0006",
			`document.getElementById("search").value = "zeros"; true`:                            "TL-0008",
			`[...document.querySelectorAll(".filter input")].at(-4).value = "< 90"; true`:        "TL-0004",
			`[...document.querySelectorAll(".filter input")].at(-4).value = "99.4..99.48"; true`: "",
			`document.getElementById("kind").value = "field-blank"; true`:                        "TL-0012",
			`document.querySelector(".filter input").value = "<img"; true`:                       "</scrip",
		} {
			eval[bool](t, b, js)
			eval[bool](t, b, `document.getElementById("filters").dispatchEvent(new Event("input")); true`)
			ids := shownIDs(t, b)
			for _, w := range strings.Fields(want) {
				if !strings.Contains(strings.Join(ids, " "), w) {
					t.Errorf("%s: %v, want %s", js, ids, want)
				}
			}
			if want != "" && len(ids) != len(strings.Fields(want)) {
				t.Errorf("%s: %v, want %s", js, ids, want)
			}
			eval[bool](t, b, `document.getElementById("all").click(); true`)
			b.wait(t, `document.getElementById("count").textContent === "24 of 24 shown"`)
		}
	})
	t.Run("views", func(t *testing.T) { testViews(t, b) })
	t.Run("read-out", func(t *testing.T) { testReadout(t, b, dir) })
	t.Run("exclusions", func(t *testing.T) { testExclusions(t, b) })

	b.mu.Lock()
	defer b.mu.Unlock()
	if len(b.requests) != 1 {
		t.Errorf("the page asked for %v; only itself is allowed", b.requests)
	}
	if len(b.wrong) > 0 {
		t.Errorf("the page complained: %v", b.wrong)
	}
}

// testViews chooses another view of the contributions; one is shown at a time.
func testViews(t *testing.T, b *browser) {
	const shown = `[...document.querySelectorAll("#survey .views")[0].querySelectorAll("figure")].map(f => f.hidden ? "-" : "+").join("")`
	if s := eval[string](t, b, shown); s != "+--" {
		t.Errorf("at first the views are %s", s)
	}
	eval[bool](t, b, `document.querySelectorAll("#survey [name=views-0]")[1].click(); true`)
	if s := eval[string](t, b, shown); s != "-+-" {
		t.Errorf("the second view chosen: %s", s)
	}
}

// testReadout opens the spill, points at a cell with the mouse and moves with the
// keys; the numbers shown are those of survey.nc to half a step.
func testReadout(t *testing.T, b *browser, dir string) {
	s, err := OpenStore(filepath.Join(dir, StoreName))
	must(t, err)
	defer s.Close()
	x, err := s.Sample(3)
	must(t, err)
	eval[bool](t, b, `[...document.querySelectorAll(".open")].find(e => e.textContent === "TL-0004").click(); true`)
	b.wait(t, `document.getElementById("readout").textContent.includes("measured")`)
	eval[bool](t, b, `document.querySelector(".maps").scrollIntoView({block: "center"}); true`)
	at := eval[[]float64](t, b, `(() => { const r = document.querySelector(".maps canvas").getBoundingClientRect(); return [r.left + r.width * .45, r.top + r.height * .5]; })()`)
	must(t, chromedp.Do(b.ctx, chromedp.MouseEvent(chromedp.MouseMoved, at[0]-3, at[1]), chromedp.MouseEvent(chromedp.MouseMoved, at[0], at[1])))
	check := func() (ex, em float64) {
		time.Sleep(60 * time.Millisecond)
		get := func(name string) float64 {
			v, err := strconv.ParseFloat(eval[string](t, b, `document.getElementById("readout").dataset.`+name), 64)
			must(t, err)
			return v
		}
		ex, em = get("ex"), get("em")
		j, _ := s.Grid.Ex.Find(ex)
		k, _ := s.Grid.Em.Find(em)
		i := s.Grid.Index(j, k)
		lo, hi := bounds(x.Corrected)
		if d := math.Abs(get("measured") - x.Corrected[i]); d > (hi-lo)/32767 || math.IsNaN(d) {
			t.Errorf("ex %g em %g: read %g, survey.nc has %g", ex, em, get("measured"), x.Corrected[i])
		}
		if d := math.Abs(get("residual") - float64(x.Residual["references"][i])); d > 0.5/32767 {
			t.Errorf("ex %g em %g: residual %g, survey.nc has %g", ex, em, get("residual"), x.Residual["references"][i])
		}
		text := eval[string](t, b, `document.getElementById("readout").textContent`)
		if !strings.Contains(text, fmt.Sprintf("ex %g nm, em %g nm", ex, em)) {
			t.Errorf("read-out %q", text)
		}
		return ex, em
	}
	ex, em := check()
	eval[bool](t, b, `document.querySelector(".maps canvas").focus(); true`)
	must(t, chromedp.Do(b.ctx, chromedp.KeyEvent("\u0302"), chromedp.KeyEvent("\u0304"))) // arrow right, arrow up
	if ex2, em2 := check(); math.Abs(ex2-ex)+math.Abs(em2-em) != 7 {
		t.Errorf("keys moved from ex %g em %g to ex %g em %g", ex, em, ex2, em2)
	}
}

// testExclusions marks a bottle with a reason and catches the file that is saved.
func testExclusions(t *testing.T, b *browser) {
	eval[bool](t, b, `window.caught = []; const old = URL.createObjectURL; URL.createObjectURL = f => { f.text().then(s => caught.push(s)); return "data:,"; }; HTMLAnchorElement.prototype.click = () => {}; true`)
	eval[bool](t, b, `document.getElementById("reason").value = 'bubble, "big"'; document.querySelector("#mark button").click(); true`)
	eval[bool](t, b, `document.getElementById("by").value = "A. Fenn"; document.querySelector("#marks button").click(); true`)
	b.wait(t, `caught.length === 1`)
	if s := eval[string](t, b, `caught[0]`); s != "id,reason,by\nTL-0004,\"bubble, \"\"big\"\"\",A. Fenn\n" {
		t.Errorf("saved %q", s)
	}
}

// TestLookAtPage leaves pictures of the page of an existing folder.
func TestLookAtPage(t *testing.T) {
	dir := os.Getenv("LOOK_PAGE")
	if dir == "" {
		t.Skip("set LOOK_PAGE to a folder of results")
	}
	for _, w := range []int64{1600, 1000, 600} {
		b := newBrowser(t, w, 1000)
		b.open(t, filepath.Join(dir, "report.html"))
		b.wait(t, `document.getElementById("count").textContent.endsWith("shown")`)
		b.shot(t, filepath.Join(dir, fmt.Sprintf("page-%d-top.png", w)))
		eval[bool](t, b, `document.querySelectorAll(".open")[3].click(); true`)
		b.wait(t, `document.getElementById("readout").textContent !== ""`)
		time.Sleep(200 * time.Millisecond)
		eval[bool](t, b, `document.getElementById(innerWidth > 1100 ? "bottles" : "detail").scrollIntoView(); true`)
		b.shot(t, filepath.Join(dir, fmt.Sprintf("page-%d-bottle.png", w)))
		eval[bool](t, b, `document.getElementById("close").click(); document.querySelectorAll("img").forEach(i => i.loading = "eager"); true`)
		b.wait(t, `[...document.images].every(i => i.complete)`)
		for _, part := range []string{"survey", "model", "quality", "methods"} {
			eval[bool](t, b, `document.getElementById("`+part+`")?.scrollIntoView(); true`)
			b.shot(t, filepath.Join(dir, fmt.Sprintf("page-%d-%s.png", w, part)))
		}
		for _, s := range b.wrong {
			t.Error(s)
		}
	}
}

// The policy lets exactly our script and style run.
func TestPolicyNamesTheSources(t *testing.T) {
	if h := sourceHash("alert('Hello, world.');"); h != "sha256-qznLcsROx4GACP2dm0UCKCzCG+HiZ1guq6ZZDob/Tng=" { // worked example of W3C CSP Level 2, 4.2.5 (from memory)
		t.Errorf("hash %s", h)
	}
	if _, err := base64.StdEncoding.DecodeString(strings.TrimPrefix(sourceHash(pageJS), "sha256-")); err != nil {
		t.Error(err)
	}
}
