// Command vulngate reads what govulncheck -format json wrote and fails when code
// that the module calls has a known vulnerability. Findings in the standard
// library are printed but pass: a newer toolchain mends them, not this module.
package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"log"
	"os"
)

// A message is one value of govulncheck's stream; only the parts used here.
type message struct {
	Finding *struct {
		OSV          string `json:"osv"`
		FixedVersion string `json:"fixed_version"`
		Trace        []struct {
			Module   string `json:"module"`
			Version  string `json:"version"`
			Function string `json:"function"`
		} `json:"trace"`
	} `json:"finding"`
}

func main() {
	log.SetFlags(0)
	f, err := os.Open(os.Args[1])
	if err != nil {
		log.Fatal(err)
	}
	defer f.Close()
	bad, values := 0, 0
	seen := map[string]bool{}
	for dec := json.NewDecoder(f); ; values++ {
		var m message
		err := dec.Decode(&m)
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			log.Fatalf("%s: %v", os.Args[1], err)
		}
		// A finding without a function is a module or package that is there but not called.
		if m.Finding == nil || len(m.Finding.Trace) == 0 || m.Finding.Trace[0].Function == "" {
			continue
		}
		at := m.Finding.Trace[0]
		key := m.Finding.OSV + at.Module
		if seen[key] {
			continue
		}
		seen[key] = true
		fmt.Printf("%s: %s %s, mended in %q\n", m.Finding.OSV, at.Module, at.Version, m.Finding.FixedVersion)
		if at.Module != "stdlib" {
			bad++
		}
	}
	if bad > 0 || values == 0 {
		log.Fatalf("%d vulnerabilities outside the standard library, %d values read", bad, values)
	}
}
