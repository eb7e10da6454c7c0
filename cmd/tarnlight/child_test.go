package main

import (
	"bytes"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// asCommand makes the test binary the program itself, for tests that send it
// signals, kill it, or measure its memory.
const asCommand = "TARNLIGHT_TEST_AS_COMMAND"

func TestMain(m *testing.M) {
	if os.Getenv(asCommand) != "" {
		main()
	}
	os.Exit(m.Run())
}

// process is the program in a process of its own.
type process struct {
	*exec.Cmd
	out, err bytes.Buffer
}

func command(t testing.TB, args ...string) *process {
	t.Helper()
	exe, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	p := &process{Cmd: exec.Command(exe, args...)}
	p.Env = append(os.Environ(), asCommand+"=1")
	p.Stdout, p.Stderr = &p.out, &p.err
	return p
}

// result waits for the end of a process that was started, or starts it first.
func (p *process) result(t testing.TB) result {
	t.Helper()
	if p.Process == nil {
		if err := p.Start(); err != nil {
			t.Fatal(err)
		}
	}
	err := p.Wait()
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		t.Fatal(err)
	}
	return result{p.ProcessState.ExitCode(), p.out.String(), p.err.String()}
}

// tree is everything below a folder with its content.
func tree(t *testing.T, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	err := filepath.WalkDir(dir, func(p string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		b, err := os.ReadFile(p)
		out[strings.TrimPrefix(p, dir)] = string(b)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func sameTree(t *testing.T, what string, before, after map[string]string) {
	t.Helper()
	for name := range after {
		if _, ok := before[name]; !ok {
			t.Errorf("%s: %s is new", what, name)
		}
	}
	for name, text := range before {
		if now, ok := after[name]; !ok {
			t.Errorf("%s: %s is gone", what, name)
		} else if now != text {
			t.Errorf("%s: %s was changed", what, name)
		}
	}
}
