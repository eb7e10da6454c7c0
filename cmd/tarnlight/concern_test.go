package main

import (
	"testing"

	"tarnlight/eem"
)

// Every doubt and reject concerns something by a list, and the lists name tests that
// there are, none twice.
func TestConcerns(t *testing.T) {
	of := map[string]string{}
	for c, codes := range concerns {
		for _, code := range codes {
			if _, ok := eem.FindTest(code); !ok {
				t.Errorf("%s lists %q, which is no test", c, code)
			}
			if of[code] != "" {
				t.Errorf("%q concerns %s and %s", code, of[code], c)
			}
			of[code] = c
		}
	}
	for _, x := range eem.Tests {
		if x.Severity >= eem.Doubt && of[x.Code] == "" {
			t.Errorf("%q is on no list of concerns", x.Code)
		}
	}
}
