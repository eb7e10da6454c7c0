package main

import (
	"bytes"
	"strings"
	"testing"
	"time"
)

// On a terminal the bar shows rate and time left and gets out of the way of talk;
// where the talk is piped there is none.
func TestProgress(t *testing.T) {
	var out bytes.Buffer
	b := &bar{w: &out, on: true}
	b.step(0, 100, "reading")
	b.start = b.start.Add(-10 * time.Second)
	b.last = time.Time{}
	b.step(50, 100, "reading")
	for _, want := range []string{"reading", "50 of 100", "5/s", "10s left"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("%q lacks %q", out.String(), want)
		}
	}
	if _, err := b.Write([]byte("talk\n")); err != nil || !strings.HasSuffix(out.String(), "\r\x1b[Ktalk\n") {
		t.Errorf("talk behind the bar: %q, %v", out.String(), err)
	}
	var piped bytes.Buffer
	newBar(&piped).step(50, 100, "reading")
	if piped.Len() > 0 {
		t.Errorf("piped: %q", piped.String())
	}
}
