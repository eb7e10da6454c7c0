package main

import (
	"bytes"
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
		if kind == "done" {
			statusFollows(t, schema.OneOf[i].Properties["status"], line)
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

// statusFollows holds the outcome, and each reason in it, against its part of the
// schema: every key is described and required, in the order in which they were
// released.
func statusFollows(t *testing.T, schema json.RawMessage, line string) {
	t.Helper()
	type object struct {
		Properties map[string]json.RawMessage
		Required   []string
	}
	var want, group object
	var list struct{ Items object }
	var got struct{ Status json.RawMessage }
	var keys struct {
		Groups []json.RawMessage `json:"reason_groups"`
	}
	for _, u := range []struct {
		from json.RawMessage
		to   any
	}{{schema, &want}, {[]byte(line), &got}} {
		if err := json.Unmarshal(u.from, u.to); err != nil {
			t.Fatal(err)
		}
	}
	if err := json.Unmarshal(want.Properties["reason_groups"], &list); err != nil {
		t.Fatal(err)
	}
	group = list.Items
	if err := json.Unmarshal(got.Status, &keys); err != nil || len(keys.Groups) == 0 {
		t.Fatalf("no reasons in %s: %v", got.Status, err)
	}
	for _, c := range []struct {
		want object
		got  json.RawMessage
	}{{want, got.Status}, {group, keys.Groups[0]}} {
		order := keysOf(t, c.got)
		if !slices.Equal(order, c.want.Required) || len(c.want.Properties) != len(order) {
			t.Errorf("keys %v, the schema has %v and requires %v", order, c.want.Properties, c.want.Required)
		}
	}
}

// keysOf lists the keys of an object as they come.
func keysOf(t *testing.T, object json.RawMessage) []string {
	t.Helper()
	d := json.NewDecoder(bytes.NewReader(object))
	var keys []string
	for depth, name := 0, false; ; {
		tok, err := d.Token()
		if err != nil {
			return keys
		}
		switch v := tok.(type) {
		case json.Delim:
			if v == '{' || v == '[' {
				depth++
			} else {
				depth--
			}
			name = depth == 1
		case string:
			if name && depth == 1 {
				keys = append(keys, v)
			}
			name = depth == 1 && !name
		default:
			name = depth == 1
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
