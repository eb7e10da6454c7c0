package report

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"os"
	"path/filepath"
	"testing"
)

func safeName(id string) string {
	sum := sha256.Sum256([]byte(id))
	return hex.EncodeToString(sum[:4])
}

func testSettings() RenderSettings {
	return RenderSettings{Title: "Upper Lindow, May survey", Client: "Lindow Rivers Board", Order: "LRB-31/07", Number: "R-2031-018",
		Method: "EEM fluorescence, house method F-12", Remarks: "Bottles were kept dark and cold.", TestedBy: "A. Fenn", ApprovedBy: "B. Holm",
		Pictures: true, SafeName: safeName}
}

// TestLook leaves a whole report where LOOK_AT says, for the eye.
func TestLook(t *testing.T) {
	dir := os.Getenv("LOOK_AT")
	if dir == "" {
		t.Skip("set LOOK_AT to a folder")
	}
	n := 36
	fmt.Sscan(os.Getenv("LOOK_N"), &n)
	methods := []string{"parafac"}
	if os.Getenv("LOOK_TWO") != "" {
		methods = []string{"references", "parafac"}
	}
	must(t, os.MkdirAll(dir, 0o777))
	newFixture(t, n, methods...).write(t, dir)
	must(t, Render(context.Background(), dir, testSettings(), func(d, n int, what string) {}))
	t.Log(filepath.Glob(dir + "/*"))
}
