// Command tally reads what go test -json wrote and prints one line,
//
//	N passed, N failed, N skipped
//
// for all files together. With -failures it first prints the output of what
// failed and the time of every package and slow test, and says that the counts
// are of one run only. It fails when a test or package failed, and when no test ran.
package main

import (
	"bufio"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"io"
	"log"
	"os"
	"strings"
)

// An event is one line of test2json, or of the build messages beside it.
type event struct {
	Action, Package, Test, Output string
	ImportPath                    string
	Elapsed                       float64 // seconds
}

// A tally counts tests (subtests too); a package that failed without a failing
// test (it did not build, it ran out of time) counts as one failed test.
type tally struct {
	pass, fail, skip int
	report           io.Writer
	output           map[string][]string // by package and test, until its end
	failedIn         map[string]bool     // packages with a failed test
}

func main() {
	log.SetFlags(0)
	failures := flag.Bool("failures", false, "print the output of what failed")
	flag.Parse()
	var sum tally
	for _, name := range flag.Args() {
		t := tally{report: io.Discard, output: map[string][]string{}, failedIn: map[string]bool{}}
		if *failures {
			t.report = os.Stdout
		}
		if err := t.read(name); err != nil {
			log.Fatal(err)
		}
		sum.pass, sum.fail, sum.skip = sum.pass+t.pass, sum.fail+t.fail, sum.skip+t.skip
	}
	end := ""
	if *failures {
		end = " in this run"
	}
	fmt.Printf("%d passed, %d failed, %d skipped%s\n", sum.pass, sum.fail, sum.skip, end)
	if sum.fail > 0 || sum.pass == 0 {
		os.Exit(1)
	}
}

func (t *tally) read(name string) error {
	f, err := os.Open(name)
	if err != nil {
		return err
	}
	defer f.Close()
	r := bufio.NewReader(f)
	for {
		line, err := r.ReadBytes('\n')
		var e event
		if len(line) > 0 && json.Unmarshal(line, &e) == nil {
			t.add(e)
		}
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
	}
}

func (t *tally) add(e event) {
	key := e.ImportPath + e.Package + " " + e.Test
	const slow = 20 // seconds
	if (e.Action == "pass" || e.Action == "fail") && (e.Test == "" || e.Elapsed > slow) {
		fmt.Fprintf(t.report, "%6.1f s  %s\n", e.Elapsed, key)
	}
	switch e.Action {
	case "output", "build-output":
		t.output[key] = append(t.output[key], e.Output)
	case "pass":
		if e.Test != "" {
			t.pass++
		}
		delete(t.output, key)
	case "skip":
		if e.Test != "" {
			t.skip++
		}
		delete(t.output, key)
	case "build-fail":
		fmt.Fprintf(t.report, "%s", strings.Join(t.output[key], ""))
	case "fail":
		if e.Test != "" || !t.failedIn[e.Package] {
			t.fail++
			fmt.Fprintf(t.report, "--- %s\n%s", key, strings.Join(t.output[key], ""))
		}
		t.failedIn[e.Package] = true
		delete(t.output, key)
	}
}
