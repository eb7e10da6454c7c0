package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// Every line of --json is one of the schema's objects, with its properties and no
// other; the last one is the outcome.
func TestEventsFollowSchema(t *testing.T) {
	b, err := os.ReadFile("events.schema.json")
	if err != nil {
		t.Fatal(err)
	}
	var schema struct {
		OneOf []struct {
			Properties map[string]json.RawMessage
			Required   []string
		}
	}
	if err := json.Unmarshal(b, &schema); err != nil {
		t.Fatal(err)
	}
	kinds := map[string]int{}
	for i, o := range schema.OneOf {
		var c struct{ Const string }
		if err := json.Unmarshal(o.Properties["event"], &c); err != nil || c.Const == "" {
			t.Fatalf("object %d of the schema has no event", i)
		}
		kinds[c.Const] = i
	}
	y := newTiny()
	y.files["scans/W1.csv"] = "nothing\n"
	dir := y.write(t)
	done := call("run", dir, "--pictures=false", "--json").want(t, exitDoubt)
	failed := call("run", filepath.Join(dir, "nowhere"), "--json").want(t, exitFailed)
	seen := map[string]bool{}
	last := ""
	for _, line := range strings.Split(strings.TrimSpace(done.out+failed.out), "\n") {
		var o map[string]any
		if err := json.Unmarshal([]byte(line), &o); err != nil {
			t.Fatalf("%s: %v", line, err)
		}
		kind, _ := o["event"].(string)
		i, known := kinds[kind]
		if !known {
			t.Errorf("event %q is not in the schema", kind)
			continue
		}
		seen[kind] = true
		for name := range o {
			if _, ok := schema.OneOf[i].Properties[name]; !ok {
				t.Errorf("%s: property %q is not in the schema", kind, name)
			}
		}
		for _, name := range schema.OneOf[i].Required {
			if _, ok := o[name]; !ok {
				t.Errorf("%s: property %q is missing", kind, name)
			}
		}
		if kind != "failed" {
			last = kind
		}
	}
	if last != "done" || !slices.Contains(strings.Split(failed.out, "\""), "failed") {
		t.Errorf("last line %q; failed run: %s", last, failed.out)
	}
	for _, k := range []string{"start", "files", "finding", "done", "failed"} {
		if !seen[k] {
			t.Errorf("no %s line", k)
		}
	}
}

// Exclusions saved from the page are merged by id; an id that is not on the sheet
// is an error that names it.
func TestExclusions(t *testing.T) {
	dir := newTiny().write(t)
	put(t, dir, "exclusions.csv", "id,reason,by\nW2,bubble in the cell,the analyst\n")
	call("run", dir, "--pictures=false", "--exclusions", filepath.Join(dir, "exclusions.csv")).want(t, exitDone, exitDoubt)
	if msg := cell(t, table(t, dir, "out", "flags.csv"), "message", "id", "W2", "test", "excluded"); !strings.Contains(msg, "bubble in the cell") {
		t.Errorf("message %q", msg)
	}
	for _, r := range table(t, dir, "out", "contributions.csv").Rows {
		if r[0] == "W2" {
			t.Error("the excluded bottle was reported")
		}
	}
	put(t, dir, "exclusions.csv", "id,reason,by\nW9,typo,\n")
	r := call("run", dir, "--pictures=false", "--exclusions", filepath.Join(dir, "exclusions.csv")).want(t, exitFailed)
	if !strings.Contains(r.err, "exclusions.csv:2") || !strings.Contains(r.err, "W9") {
		t.Errorf("unknown id: %s", r.err)
	}
}
