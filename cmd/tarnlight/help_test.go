package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// Every verb's help has examples, and every example runs.
func TestExamplesRun(t *testing.T) {
	testkit.Heavy(t)
	base := t.TempDir()
	t.Chdir(base)
	survey := func(name string) {
		t.Helper()
		y := newTiny()
		for file, text := range y.files {
			put(t, name, file, text)
		}
		put(t, name, "runsheet.csv", strings.Join(y.sheet, "\n")+"\n")
		put(t, name, "survey.toml", y.settings)
	}
	results := func(name string) {
		t.Helper()
		survey(name)
		runNoPictures(t, name)
	}
	prepare := map[string]func(){
		"run": func() { survey("mysurvey") }, "quantify": func() { survey("mysurvey") }, "check": func() { survey("mysurvey") },
		"resolve": func() {
			survey("mysurvey")
			put(t, "mysurvey", "survey.toml", newTiny().settings+"[resolve]\ncomponents = 1\n")
		},
		"begin": func() {
			survey("mysurvey")
			put(t, "mysurvey", "survey.toml", newTiny().settings+"[sheet]\nname = \"{id}\"\n")
			if err := os.Remove("mysurvey/runsheet.csv"); err != nil {
				t.Fatal(err)
			}
		},
		"report": func() { results("mysurvey") }, "verify": func() {
			results("mysurvey")
			runNoPictures(t, "mysurvey", "--out", "results")
		},
		"apply":   func() { results("lastyear"); survey("tonight"); survey("nights") },
		"compare": func() { results("lastyear"); results("thisyear"); results("mysurvey"); results("mysurvey") },
		"explain": func() {
			if err := synth.Demo(1).Write("tarnlight-demo"); err != nil {
				t.Fatal(err)
			}
			runNoPictures(t, "tarnlight-demo")
		},
		"factors": func() {
			for _, name := range []string{"certificate.csv", "scan.csv", "counter.csv", "blue.csv", "bluescan.csv"} {
				curve(t, name, 400, 520, 5, 0.02, bell(450, 40))
			}
			curve(t, "red.csv", 480, 600, 5, 0.02, bell(540, 40))
			curve(t, "redscan.csv", 480, 600, 5, 0.02, bell(540, 40))
		},
		"limits": func() {
			if err := lowStudy(3, 1).Write("mystudy"); err != nil {
				t.Fatal(err)
			}
			runNoPictures(t, "mystudy")
		},
		"plan": func() {
			writePlanned(t, "mysurvey")
			runNoPictures(t, "mysurvey")
		},
		"settings": func() {}, "tests": func() {}, "completion": func() {}, "demo": func() {},
	}
	for _, c := range newRoot(streams{}).Commands() {
		t.Run(c.Name(), func(t *testing.T) {
			if c.Name() == "demo" {
				t.Skip("runs in TestDemo")
			}
			if c.Example == "" || c.Long == "" && c.Short == "" {
				t.Fatal("no example")
			}
			for _, line := range strings.Split(c.Example, "\n") {
				args := strings.Fields(line)
				if args[0] != "tarnlight" || args[1] != c.Name() {
					t.Errorf("example %q does not call the verb", line)
				}
				entries, err := filepath.Glob("*")
				if err != nil {
					t.Fatal(err)
				}
				for _, e := range entries {
					if err := os.RemoveAll(e); err != nil {
						t.Fatal(err)
					}
				}
				ready, ok := prepare[c.Name()]
				if !ok {
					t.Fatalf("the test does not know what %q needs", c.Name())
				}
				ready()
				call(args[1:]...).want(t, exitDone, exitDoubt)
			}
		})
	}
}
