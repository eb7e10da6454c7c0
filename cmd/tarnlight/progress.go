package main

import (
	"fmt"
	"io"
	"os"
	"strings"
	"sync"
	"time"

	"golang.org/x/term"
)

// bar draws the progress of long work on a terminal, and nothing elsewhere.
// Lines written through it clear the bar first, so that nothing is swallowed.
type bar struct {
	mu    sync.Mutex
	w     io.Writer
	on    bool
	drawn bool
	what  string
	start time.Time
	last  time.Time
}

func newBar(w io.Writer) *bar {
	f, isFile := w.(*os.File)
	on := isFile && term.IsTerminal(int(f.Fd())) && os.Getenv("TERM") != "dumb" && os.Getenv("CI") == ""
	return &bar{w: w, on: on}
}

// step reports done of total; it may be called from several goroutines.
func (b *bar) step(done, total int, what string) {
	if !b.on || total <= 0 {
		return
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	now := time.Now()
	if what != b.what {
		b.what, b.start, b.last = what, now, time.Time{}
	}
	if done < total && now.Sub(b.last) < 80*time.Millisecond {
		return
	}
	b.last = now
	const width = 24
	full := min(done*width/total, width)
	line := fmt.Sprintf("%-12s %s%s %d of %d", what, strings.Repeat("█", full), strings.Repeat("·", width-full), done, total)
	if spent := now.Sub(b.start); done > 0 && spent > time.Second {
		rate := float64(done) / spent.Seconds()
		line += fmt.Sprintf("  %.3g/s", rate)
		if done < total {
			line += fmt.Sprintf(", %s left", (time.Duration(float64(total-done)/rate) * time.Second).Round(time.Second))
		}
	}
	fmt.Fprintf(b.w, "\r\x1b[K%s", line)
	b.drawn = true
	if done >= total {
		b.clear()
	}
}

func (b *bar) clear() {
	if b.drawn {
		fmt.Fprint(b.w, "\r\x1b[K")
		b.drawn = false
	}
}

// Write passes talk through, with the bar out of the way.
func (b *bar) Write(p []byte) (int, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	b.clear()
	return b.w.Write(p)
}
