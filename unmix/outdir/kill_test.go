package outdir

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"
)

// The test binary runs itself as a process to be killed. Called with victim, a
// folder, a number and a step it commits generations from that number on, and
// kills itself at that step of the first; -1 leaves the killing to others, and
// -2 makes it hold the lock and wait for that.
func TestMain(m *testing.M) {
	if len(os.Args) == 5 && os.Args[1] == "victim" {
		from, err1 := strconv.Atoi(os.Args[3])
		step, err2 := strconv.Atoi(os.Args[4])
		if err := errors.Join(err1, err2, victim(os.Args[2], from, step)); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

func victim(dir string, from, step int) error {
	for g := from; ; g++ {
		s, err := Begin(dir)
		if err != nil {
			return err
		}
		fmt.Println("begun", g)
		if step == -2 {
			time.Sleep(time.Hour)
		}
		i := -1
		s.step = func(name string) error {
			if i++; i == step {
				fmt.Println("killed at", name)
				die()
			}
			return nil
		}
		if err := generation(s, g); err != nil {
			return err
		}
		if step >= 0 {
			return nil // there are fewer steps
		}
	}
}

// die ends the process like kill -9.
func die() {
	p, err := os.FindProcess(os.Getpid())
	if err == nil {
		err = p.Kill()
	}
	if err != nil {
		panic(err)
	}
	select {}
}

func child(t *testing.T, dir string, from, step int) *exec.Cmd {
	t.Helper()
	exe, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(exe, "victim", dir, strconv.Itoa(from), strconv.Itoa(step))
	cmd.Stderr = os.Stderr
	return cmd
}

// afterwards checks what a killed run left: the results of one generation, or a
// swap under way that Verify names; that the next run puts it in order; and that
// the generation before is still there. Without any results it returns 0.
func afterwards(t *testing.T, dir string) (generation int) {
	t.Helper()
	want := []string{}
	r, err := Verify(dir)
	if err == nil {
		if !r.Whole() || r.Running {
			t.Fatal(r.Lines())
		}
		if r.Dir != dir && !strings.Contains(r.Interrupted, dir+".previous") {
			t.Fatalf("results lie in %s: %q", r.Dir, r.Interrupted)
		}
		generation = generationOf(t, dir)
		want = append(want, "out")
	} else if !errors.Is(err, fs.ErrNotExist) {
		t.Fatal(err)
	}
	if err := begin(t, dir).Abort(); err != nil {
		t.Fatal(err)
	}
	if generation > 0 {
		if got := generationOf(t, dir); got != generation {
			t.Fatalf("generation %d became %d", generation, got)
		}
	}
	if generation > 1 {
		want = append(want, "out.previous")
		if got := generationOf(t, dir+".previous"); got != generation-1 {
			t.Fatalf("generation %d has former results %d", generation, got)
		}
	}
	if got := entries(t, filepath.Dir(dir)); !slices.Equal(got, want) {
		t.Fatalf("%q, want %q", got, want)
	}
	return generation
}

// A run kills itself at every step of Commit, over none, one and two older
// results.
func TestKilledAtEachStep(t *testing.T) {
	for prior, want := range []string{"[0 0 1]", "[1 1 1 gap 1 2]", "[2 2 2 2 gap 2 3]"} {
		left := []string{} // generation after a kill at each step
		for step := 0; ; step++ {
			dir := filepath.Join(t.TempDir(), "out")
			for g := 1; g <= prior; g++ {
				commit(t, dir, g)
			}
			if out, err := child(t, dir, prior+1, step).Output(); err == nil {
				break // it lived: there are no more steps
			} else if !strings.Contains(string(out), "killed at") {
				t.Fatalf("step %d: %v", step, err)
			}
			is := ""
			if r, err := Verify(dir); err == nil && r.Dir != dir {
				is = "gap "
			}
			left = append(left, is+strconv.Itoa(afterwards(t, dir)))
		}
		if got := fmt.Sprint(left); got != want {
			t.Errorf("%d older: %s, want %s", prior, got, want)
		}
	}
}

// kill -9 at random moments of runs that do nothing but replace results.
func TestKilledAtRandom(t *testing.T) {
	rounds := 100
	if testing.Short() {
		rounds = 10
	}
	dir := filepath.Join(t.TempDir(), "out")
	commit(t, dir, 1)
	rnd := rand.New(rand.NewPCG(1, 2)) // the scheduler makes it random all the same
	last, advanced := 1, 0
	for range rounds {
		cmd := child(t, dir, last+1, -1)
		stdout, err := cmd.StdoutPipe()
		if err != nil {
			t.Fatal(err)
		}
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		r := bufio.NewReader(stdout)
		if _, err := r.ReadString('\n'); err != nil {
			t.Fatal("the run did not begin: ", err)
		}
		time.Sleep(time.Duration(rnd.Int64N(int64(20 * time.Millisecond))))
		if err := cmd.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		if _, err := io.Copy(io.Discard, r); err != nil {
			t.Fatal(err)
		}
		if err := cmd.Wait(); err == nil {
			t.Fatal("the run ended by itself")
		}
		g := afterwards(t, dir)
		if g < last {
			t.Fatalf("generation %d after %d", g, last)
		}
		if g > last {
			advanced++
		}
		last = g
	}
	t.Logf("%d runs killed, %d of them after a first Commit; %d generations", rounds, advanced, last)
}

// A lock whose owner was killed counts for nothing; one whose owner lives names
// it.
func TestLockOfAnotherProcess(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	commit(t, dir, 1)
	cmd := child(t, dir, 2, -2)
	stdout, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	if _, err := bufio.NewReader(stdout).ReadString('\n'); err != nil {
		t.Fatal(err)
	}
	if _, err := Begin(dir); !errors.Is(err, ErrLocked) || !strings.Contains(err.Error(), fmt.Sprintf("process %d ", cmd.Process.Pid)) {
		t.Errorf("error %v", err)
	}
	if r, err := Verify(dir); err != nil || !r.Whole() || r.Pid != cmd.Process.Pid || r.Interrupted != "" {
		t.Errorf("%v %v", r.Lines(), err)
	}
	if err := cmd.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	if err := cmd.Wait(); err == nil {
		t.Error("the run ended by itself")
	}
	if r, err := Verify(dir); err != nil || !r.Whole() || r.Running || !strings.Contains(r.Interrupted, "out.work") {
		t.Errorf("%v %v", r.Lines(), err)
	}
	if got := afterwards(t, dir); got != 1 {
		t.Errorf("generation %d", got)
	}
}
