package report

import (
	"context"
	"os"
	"path/filepath"
	"testing"
	"time"

	"tarnlight/eem/testkit"

	"github.com/chromedp/cdproto/cdp"
	"github.com/chromedp/cdproto/performance"
	"github.com/chromedp/chromedp"
)

// opening is what it costs to open a page until its table can be used: by the clock,
// and in processor time of the page's own thread, which a busy machine does not
// stretch.
func opening(t *testing.T, path string) (clock, thread time.Duration) {
	t.Helper()
	b := newBrowser(t, 1300, 900)
	must(t, chromedp.Do(b.ctx, chromedp.Navigate("about:blank"))) // the browser itself is up
	must(t, chromedp.Do(b.ctx, chromedp.Func(func(ctx context.Context, _ *chromedp.Target) error {
		_, err := chromedp.Call(ctx, performance.Enable, performance.EnableParams{TimeDomain: performance.EnableTimeDomainThreadTicks})
		return err
	})))
	start := time.Now()
	b.open(t, path)
	b.wait(t, `document.readyState === "complete" && document.getElementById("count").textContent.endsWith("shown")`)
	clock = time.Since(start)
	must(t, chromedp.Do(b.ctx, chromedp.Func(func(ctx context.Context, _ *chromedp.Target) error {
		r, err := chromedp.Call(ctx, performance.GetMetrics, cdp.Empty{})
		for _, m := range r.Metrics {
			if os.Getenv("LOOK_PAGE") != "" {
				t.Logf("%s %.3f", m.Name, m.Value)
			}
			if m.Name == "TaskDuration" {
				thread = time.Duration(m.Value * float64(time.Second))
			}
		}
		return err
	})))
	return clock, thread
}

// A page opens fast: 1,500 bottles within 2 s and 40 MB, 150 within half of both (a
// browser takes its time for the smallest page, and few maps are cut finer than
// many). LOOK_PAGE measures the page of a folder instead.
func TestPageOpensFast(t *testing.T) {
	testkit.Heavy(t)
	dir, most, size := os.Getenv("LOOK_PAGE"), 2*time.Second, int64(40e6)
	if dir == "" {
		const n = 150
		dir, most, size = t.TempDir(), most/2, size/2
		newFixture(t, n, "parafac").write(t, dir)
		set := testSettings()
		set.Pictures = false
		must(t, Render(context.Background(), dir, set, nil))
	}
	path := filepath.Join(dir, "report.html")
	info, err := os.Stat(path)
	must(t, err)
	clock, thread := opening(t, path)
	t.Logf("%.1f MB open after %v by the clock, %v of the page's thread", float64(info.Size())/1e6, clock.Round(time.Millisecond), thread.Round(time.Millisecond))
	if info.Size() > size {
		t.Errorf("%d bytes, %d are allowed", info.Size(), size)
	}
	if thread <= 0 || thread > most {
		t.Errorf("opening takes %v, %v are allowed", thread, most)
	}
}
