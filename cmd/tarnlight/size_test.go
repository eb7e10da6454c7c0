//go:build unix

package main

import (
	"context"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
	"tarnlight/eem/testkit"
	"tarnlight/unmix/report"
)

// TestSizes tells what a report of so many bottles costs (TARNLIGHT_SIZES=40,400,1500):
// the processor time of each of its parts as a ratio to that of reading the raw files
// (43 scans of 161 cells a bottle, a file each) in the same run, and the size of what
// is written.
// TARNLIGHT_SIZES_DIR keeps the folders, for a look with LOOK_PAGE in unmix/report.
func TestSizes(t *testing.T) {
	asked := os.Getenv("TARNLIGHT_SIZES")
	if asked == "" {
		t.Skip("takes minutes: set TARNLIGHT_SIZES to numbers of bottles, such as 40,400,1500")
	}
	for _, s := range strings.Split(asked, ",") {
		n, err := strconv.Atoi(strings.TrimSpace(s))
		if err != nil {
			t.Fatal(err)
		}
		dir := filepath.Join(os.Getenv("TARNLIGHT_SIZES_DIR"), fmt.Sprint(n))
		if os.Getenv("TARNLIGHT_SIZES_DIR") == "" {
			dir = t.TempDir()
		}
		t.Run(s, func(t *testing.T) { sizes(t, n, dir) })
	}
}

func sizes(t *testing.T, n int, dir string) {
	d := erring(7, true)
	d.Samples, d.Days = n, 1+n/50
	sv := d.Survey()
	sv.Settings = erringSettings + "\n[report]\npictures = \"none\"\n"
	if err := sv.Write(dir); err != nil {
		t.Fatal(err)
	}
	out := filepath.Join(dir, "out")
	if _, err := os.Stat(out); err != nil {
		call("run", dir).want(t, exitDone, exitDoubt)
	}
	reading := readRaw(t, filepath.Join(dir, "scans"))
	set, err := survey.ReadSettings(filepath.Join(out, "settings-used.toml"))
	if err != nil {
		t.Fatal(err)
	}
	rs := renderSettings(set)
	rs.Pictures = true
	spent := map[string]time.Duration{}
	start, last := time.Now(), testkit.ProcessorTime(t)
	err = report.Render(context.Background(), out, rs, func(_, _ int, what string) {
		now := testkit.ProcessorTime(t)
		spent[what] += now - last // the time up to a report is spent on what it tells
		last = now
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%d bottles, raw files read in %v of processor time; report made in %v by the clock", len(sv.Bottles), reading.Round(time.Millisecond), time.Since(start).Round(time.Millisecond))
	for _, p := range []struct{ tell, what string }{{"maps", "pictures and packing of the maps"}, {"workbook", "figures"}, {"page", "workbooks"}, {"report", "page"}} {
		t.Logf("%-34s %8v  %5.2f × reading", p.what, spent[p.tell].Round(time.Millisecond), spent[p.tell].Seconds()/reading.Seconds())
	}
	for _, name := range []string{"report.xlsx", "workings.xlsx", "report.html", "maps", "survey.nc"} {
		t.Logf("%-34s %8.1f MB", name, float64(bytesOf(t, filepath.Join(out, name)))/1e6)
	}
	if size := bytesOf(t, filepath.Join(out, "report.html")); size > 40e6 {
		t.Errorf("the page has %d bytes", size)
	}
}

// readRaw reads every scan file as the program does and returns the time it took.
func readRaw(t *testing.T, dir string) time.Duration {
	files, err := filepath.Glob(filepath.Join(dir, "*", "*"))
	if err != nil || len(files) == 0 {
		t.Fatalf("no raw files in %s, %v", dir, err)
	}
	start := testkit.ProcessorTime(t)
	next := make(chan string)
	var wg sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		wg.Go(func() {
			for f := range next {
				if _, err := scanfile.Read(f, nil); err != nil {
					t.Error(err)
				}
			}
		})
	}
	for _, f := range files {
		next <- f
	}
	close(next)
	wg.Wait()
	return testkit.ProcessorTime(t) - start
}

// bytesOf is the size of a file or of all files of a folder.
func bytesOf(t *testing.T, path string) int64 {
	t.Helper()
	var n int64
	err := filepath.WalkDir(path, func(_ string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		info, err := d.Info()
		if err == nil {
			n += info.Size()
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return n
}
