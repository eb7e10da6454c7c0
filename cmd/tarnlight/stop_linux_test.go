package main

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"tarnlight/eem/testkit"
	"tarnlight/unmix/outdir"
)

// until waits for a file.
func until(t *testing.T, path string) {
	t.Helper()
	for range 20000 {
		if _, err := os.Lstat(path); err == nil {
			return
		}
		time.Sleep(500 * time.Microsecond)
	}
	t.Fatalf("%s did not come", path)
}

// Ctrl-C and the signal that a scheduler sends stop a run soon: exit 1, it
// says so, older results are as they were, nothing is left behind.
func TestInterrupted(t *testing.T) {
	testkit.Heavy(t)
	dir := demoFolder(t, nil)
	put(t, dir, "survey.toml", read(t, dir, "survey.toml")+"\n[resolve]\ncomponents = [2, 7]\nstarts = 40\n")
	call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	before := tree(t, filepath.Join(dir, "out"))
	for _, sig := range []os.Signal{os.Interrupt, syscall.SIGTERM} {
		for _, after := range []time.Duration{0, 300 * time.Millisecond, 1500 * time.Millisecond} {
			p := command(t, "run", dir, "--json")
			if err := p.Start(); err != nil {
				t.Fatal(err)
			}
			until(t, filepath.Join(dir, "out.work", "new"))
			time.Sleep(after)
			start := time.Now()
			if err := p.Process.Signal(sig); err != nil {
				t.Fatal(err)
			}
			r := p.result(t).want(t, exitFailed)
			if d := time.Since(start); d > 20*time.Second { // a fraction of a second on an idle machine
				t.Errorf("%v after %v: %v until the end", sig, after, d)
			}
			if !strings.Contains(r.err, interrupted) || !strings.Contains(r.out, interrupted) {
				t.Errorf("%v: %s%s", sig, r.out, r.err)
			}
			sameTree(t, fmt.Sprint(sig), before, tree(t, filepath.Join(dir, "out")))
			if _, err := os.Stat(filepath.Join(dir, "out.work")); err == nil {
				t.Errorf("%v: out.work was left", sig)
			}
		}
	}
	call("verify", filepath.Join(dir, "out")).want(t, exitDone)
}

// kill -9 at random moments of runs over older results, half of them after the new
// ones are staged whole: verify says old-complete or new-complete, with the inputs of
// the old ones changed or those of the new ones equal, and the next run goes on.
// TARNLIGHT_KILLS says how often.
func TestKilledRuns(t *testing.T) {
	testkit.Heavy(t)
	kills := 10
	if n, err := strconv.Atoi(os.Getenv("TARNLIGHT_KILLS")); err == nil {
		kills = n
	}
	y := newTiny()
	dir := y.write(t)
	out := filepath.Join(dir, "out")
	raw := []string{gridText(1.5, 0.5), gridText(1.7, 0.3)}
	var whole []map[string]string // results of either raw file
	var took time.Duration
	for _, text := range raw {
		put(t, dir, "scans/W1.csv", text)
		start := time.Now()
		command(t, "run", dir, "--pictures=false").result(t).want(t, exitDone, exitDoubt)
		took = time.Since(start)
		whole = append(whole, tree(t, out))
	}
	if whole[0]["/contributions.csv"] == whole[1]["/contributions.csv"] {
		t.Fatal("both raw files give the same results")
	}
	rnd := rand.New(rand.NewPCG(uint64(time.Now().UnixNano()), 1))
	is := 1 // which results lie there
	count := map[string]int{}
	for i := range kills {
		next := 1 - is
		put(t, dir, "scans/W1.csv", raw[next])
		p := command(t, "run", dir, "--pictures=false")
		if err := p.Start(); err != nil {
			t.Fatal(err)
		}
		ended := make(chan error, 1)
		go func() { ended <- p.Wait() }()
		if i%2 == 0 {
			time.Sleep(time.Duration(rnd.Int64N(int64(took))))
		} else {
			staged := filepath.Join(dir, "out.work", "new", "provenance.json")
			for len(ended) == 0 { // the run may be over before we see it
				if _, err := os.Lstat(staged); err == nil {
					break
				}
				time.Sleep(50 * time.Microsecond)
			}
			time.Sleep(time.Duration(rnd.Int64N(int64(25 * time.Millisecond))))
		}
		_ = p.Process.Kill() // fails where the run is over
		<-ended
		killed := p.ProcessState.ExitCode() == -1
		r := call("verify", out).want(t, exitDone, exitDoubt)
		report, err := outdir.Verify(out)
		if err != nil || !report.Whole() || len(report.Extra) > 0 {
			t.Fatalf("kill %d: %v %v\n%s", i, report.Lines(), err, r.out)
		}
		now := tree(t, report.Dir)
		which := next
		if now["/provenance.json"] == whole[is]["/provenance.json"] {
			which = is
		}
		sameTree(t, fmt.Sprintf("kill %d", i), whole[which], now)
		if (r.code == exitDone) != (which == next) {
			t.Errorf("kill %d: exit %d of verify over results %d with input %d\n%s", i, r.code, which, next, r.out)
		}
		count[map[bool]string{true: "new", false: "old"}[which == next]]++
		if report.Dir != out {
			count["in the gap"]++
		}
		if report.Interrupted != "" {
			count["told as interrupted"]++
		}
		if !killed {
			count["over before"]++
		}
		if is = which; t.Failed() {
			return
		}
	}
	put(t, dir, "scans/W1.csv", raw[0])
	command(t, "run", dir, "--pictures=false").result(t).want(t, exitDone, exitDoubt)
	call("verify", out).want(t, exitDone)
	sameTree(t, "at the end", whole[0], tree(t, out))
	if list, err := os.ReadDir(dir); err != nil || len(list) != 6 { // runsheet, survey, scans, out, out.previous, out.cache
		t.Errorf("left behind: %v %v", list, err)
	}
	t.Logf("%d kills of a run of %v: %v", kills, took.Round(time.Millisecond), count)
}

// Two runs in one folder: the second names the first and touches nothing; the way
// out is to end it, however that is done.
func TestTwoRunsAtOnce(t *testing.T) {
	dir := newTiny().write(t)
	runNoPictures(t, dir)
	before := tree(t, dir)
	stage, err := outdir.Begin(filepath.Join(dir, "out"))
	if err != nil {
		t.Fatal(err)
	}
	for _, verb := range []string{"run", "report"} {
		r := call(verb, map[string]string{"run": dir, "report": filepath.Join(dir, "out")}[verb]).want(t, exitFailed)
		for _, w := range []string{fmt.Sprintf("process %d is writing results here", os.Getpid()), "wait until it is done, or end it", "nothing was touched"} {
			if !strings.Contains(r.err, w) {
				t.Errorf("%s: no %q in %s", verb, w, r.err)
			}
		}
	}
	if r := call("verify", filepath.Join(dir, "out")).want(t, exitDone); !strings.Contains(r.out, "a run is writing new results") {
		t.Errorf("verify: %s", r.out)
	}
	if err := stage.Abort(); err != nil {
		t.Fatal(err)
	}
	sameTree(t, "two at once", before, tree(t, dir))
	p := command(t, "run", dir)
	if err := p.Start(); err != nil {
		t.Fatal(err)
	}
	until(t, filepath.Join(dir, "out.work", "lock"))
	if err := p.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	p.result(t)
	runNoPictures(t, dir) // a lock whose owner is dead counts for nothing
}
