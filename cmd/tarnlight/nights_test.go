package main

import (
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// Six nights of a job that calls begin --add and apply --since-last: a normal one,
// one without any file, one that ends while a bottle is being written, one without a
// blank, one with a dead lamp, and one with a spill that the model does not know. The
// next normal night is exit 0 again, and no score of a former night has changed.
func TestSixNights(t *testing.T) {
	testkit.Heavy(t)
	model := kept(t, "parafac.json")
	dir := folder(t, map[string]string{"survey.toml": nightSettings(t, "")})
	add := func(code int) result { t.Helper(); return call("begin", dir, "--add", "--csv").want(t, code) }
	apply := func(code int) status {
		t.Helper()
		r := call("apply", model, dir, "--since-last", "--pictures=false").want(t, code)
		var s status
		if err := json.Unmarshal([]byte(read(t, dir, "out", "status.json")), &s); err != nil {
			t.Fatal(err)
		}
		if s.ExitCode != code || !s.SinceLast {
			t.Errorf("status.json says %+v, the exit code was %d", s, code)
		}
		b := s.Bottles
		if b["new_rejected"] != len(s.Rejected) || b["new_usable"]+b["new_rejected"]+b["new_excluded"] != b["new"] {
			t.Errorf("bottles %v, rejected %v", b, s.Rejected)
		}
		for _, w := range []string{fmt.Sprintf("that the last results lack: %d usable, %d rejected, ", b["new_usable"], b["new_rejected"]),
			fmt.Sprintf("the folder in all: %d bottles: %d usable, %d rejected, ", b["all"], b["usable"], b["rejected"])} {
			if b["new"] > 0 && !strings.Contains(r.err, w) {
				t.Errorf("no %q in:\n%s", w, r.err)
			}
		}
		return s
	}
	concerns := func(s status, what string, ids ...string) {
		t.Helper()
		for c, have := range s.Concerns {
			if c != what && len(have) > 0 {
				t.Errorf("%s: %v beside %s", c, have, what)
			}
		}
		if what != "" && !slices.Equal(s.Concerns[what], ids) {
			t.Errorf("%s: %v, want %v; %q", what, s.Concerns[what], ids, s.Reasons)
		}
	}
	scores := func() []string { return rowsOf(t, dir, "contributions.csv", "") }
	var first []string

	normal := map[string]string{"PW1A": "PW1", "PW1B": "PW2", "W103": "W3", "W105": "W5"}
	t.Run("normal", func(t *testing.T) {
		night(t, dir, "20310601", normal, nil)
		old(t, dir)
		add(exitDone)
		concerns(apply(exitDone), "")
		first = scores()
	})
	t.Run("none", func(t *testing.T) {
		if r := add(exitDone); !strings.Contains(r.err, "nothing new") {
			t.Errorf("begin: %s", r.err)
		}
		s := apply(exitDone)
		concerns(s, "")
		if s.Bottles["new"] != 0 {
			t.Errorf("%d bottles are new", s.Bottles["new"])
		}
		if r := call("apply", model, dir, "--since-last", "--pictures=false").want(t, exitDone); !strings.Contains(r.err, "nothing is new") || r.out != "" {
			t.Errorf("nothing is new, yet apply says %s%s", r.out, r.err)
		}
	})
	t.Run("half-written", func(t *testing.T) {
		night(t, dir, "20310603", normal, nil)
		whole := read(t, dir, "scans/20310603_W5/20310603_W5_ex300.txt")
		old(t, dir)
		put(t, dir, "scans/20310603_W5/20310603_W5_ex300.txt", whole[:len(whole)/3])
		if err := os.RemoveAll(filepath.Join(dir, "scans/20310603_W5/20310603_W5_ex305.txt")); err != nil {
			t.Fatal(err)
		}
		if r := add(exitDone); !strings.Contains(r.err, "waits for the next run: W5 (") || strings.Contains(r.out, "W5 2031") {
			t.Errorf("begin: %s%s", r.out, r.err)
		}
		s := apply(exitDone)
		concerns(s, "")
		if s.Bottles["new"] != 3 {
			t.Errorf("%d bottles are new", s.Bottles["new"])
		}
	})
	t.Run("no blank", func(t *testing.T) {
		night(t, dir, "20310603", normal, nil) // the rest has come
		night(t, dir, "20310604", map[string]string{"W106": "W6"}, nil)
		night(t, dir, "20310607", map[string]string{"W106": "W6"}, nil) // the last blank is older than two days
		old(t, dir)
		if r := add(exitDone); !strings.Contains(r.err, "3 rows") {
			t.Errorf("begin: %s", r.err)
		}
		s := apply(exitDoubt)
		concerns(s, concernInstrument, "batch 2031-06-07", "W6 2031-06-07")
		if !slices.Equal(s.Rejected, []string{"W6 2031-06-07"}) {
			t.Errorf("rejected: %v", s.Rejected)
		}
		if q := cell(t, table(t, dir, "out", "contributions.csv"), "qualifier", "id", "W6", "component", "C1"); q == "R" {
			t.Error("the blank of the day before was not taken")
		}
	})
	t.Run("dead lamp", func(t *testing.T) {
		night(t, dir, "20310608", normal, func(b *synth.Bottle) { b.Closed = true })
		old(t, dir)
		add(exitDone)
		s := apply(exitDoubt)
		for _, id := range []string{"PW1 2031-06-08", "W3 2031-06-08", "W5 2031-06-08"} {
			if !slices.Contains(s.Concerns[concernInstrument], id) || !slices.Contains(s.Rejected, id) {
				t.Errorf("%s: %v %v", id, s.Concerns, s.Rejected)
			}
		}
		if len(s.Concerns[concernModel])+len(s.Concerns[concernLimit]) > 0 || s.Tests["no-light"] == 0 {
			t.Errorf("concerns %v, tests %v", s.Concerns, s.Tests)
		}
	})
	t.Run("unknown in the water", func(t *testing.T) {
		night(t, dir, "20310609", map[string]string{"PW1A": "PW1", "PW1B": "PW2", "W103": "W3", "W310": "W10"}, nil)
		old(t, dir)
		add(exitDone)
		s := apply(exitDoubt)
		concerns(s, concernModel, "W10")
		if s.Tests["unlike-residual"] == 0 {
			t.Errorf("tests %v", s.Tests)
		}
		if s.Bottles["rejected"] != 5 || s.Bottles["new_rejected"] != 0 || len(s.Rejected) != 0 { // of two nights before
			t.Errorf("bottles %v, rejected %v", s.Bottles, s.Rejected)
		}
	})
	t.Run("normal again", func(t *testing.T) {
		night(t, dir, "20310610", normal, nil)
		old(t, dir)
		add(exitDone)
		concerns(apply(exitDone), "")
		now := map[string]bool{}
		for _, r := range scores() {
			now[r] = true
		}
		for _, r := range first {
			if !now[r] {
				t.Errorf("a score of the first night changed: %s", r)
			}
		}
		call("apply", model, dir, "--pictures=false").want(t, exitDoubt)
		if s := read(t, dir, "out", "status.json"); !strings.Contains(s, "W10") || strings.Contains(s, `"since_last": true`) {
			t.Errorf("without --since-last the spill is not told again: %s", s)
		}
		if r := call("explain", filepath.Join(dir, "out"), "W3").want(t, exitDone); !strings.Contains(r.out, "scans/20310601_W3") {
			t.Errorf("explain: %s", r.out)
		}
	})
}

// A night without a blank whose lamp has fallen by 10 % since the last blank is a
// doubt on its batch, and every value of it is estimated.
func TestFallenLampWithoutBlank(t *testing.T) {
	testkit.Heavy(t)
	model := kept(t, "parafac.json")
	dir := folder(t, map[string]string{"survey.toml": nightSettings(t, "")})
	night(t, dir, "20310601", map[string]string{"PW1A": "PW1", "PW1B": "PW2", "W103": "W3"}, nil)
	night(t, dir, "20310602", map[string]string{"W105": "W5", "W106": "W6"}, func(b *synth.Bottle) { b.Power *= 0.9 })
	old(t, dir)
	call("begin", dir, "--add", "--csv").want(t, exitDone)
	r := call("apply", model, dir, "--since-last", "--pictures=false").want(t, exitDoubt)
	if !strings.Contains(r.err, "blank-drift") || !strings.Contains(r.err, "PW1, PW2 of batch 2031-06-01") {
		t.Errorf("not told: %s", r.err)
	}
	c := table(t, dir, "out", "contributions.csv")
	for i := range c.Rows {
		q, id := c.Text(i, c.Col("qualifier")), c.Text(i, c.Col("id"))
		if borrowed := id == "W5" || id == "W6"; borrowed != strings.Contains(q, "J") {
			t.Errorf("%s %s: %q", id, c.Text(i, c.Col("component")), q)
		}
	}
	b := table(t, dir, "out", "batches.csv")
	if s := read(t, dir, "out", "steps.csv"); !strings.Contains(s, "blanks of the batch; borrowed blanks: PW1, PW2 of batch 2031-06-01") {
		t.Errorf("the steps do not tell whose blanks serve: %s", s)
	}
	if v := cell(t, b, "verdict", "batch", "2031-06-02", "batch", "2031-06-02"); v != "doubt" {
		t.Errorf("the batch is %s", v)
	}
}

// A contribution above the laboratory's alert is a doubt that concerns a limit, also
// in the bottle that was known before; an alert for no component is refused.
func TestAlert(t *testing.T) {
	y := newTiny()
	y.settings += "[quality]\nalert = {a = 1.2}\n"
	dir := y.write(t)
	r := call("quantify", dir, "--pictures=false").want(t, exitDoubt)
	if !strings.Contains(r.err, "W1: a is 1.5") || !strings.Contains(r.err, "above the alert at 1.2") {
		t.Errorf("not told: %s", r.err)
	}
	flags := table(t, dir, "out", "flags.csv")
	n := 0
	for i := range flags.Rows {
		if flags.Text(i, flags.Col("test")) == "alert" {
			n++
		}
	}
	if n != 1 || !strings.Contains(read(t, dir, "out", "status.json"), "\"limit\": [\n      \"W1\"") {
		t.Errorf("%d alerts; %s", n, read(t, dir, "out", "status.json"))
	}
	put(t, dir, "survey.toml", strings.Replace(y.settings, "{a = 1.2}", "{A = 1.2}", 1))
	if r := call("quantify", dir, "--pictures=false").want(t, exitFailed); !strings.Contains(r.err, `quality.alert names "A"`) || !strings.Contains(r.err, "did you mean a?") {
		t.Errorf("an alert for nothing: %s", r.err)
	}
}
