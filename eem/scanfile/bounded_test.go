package scanfile

import (
	"bytes"
	"fmt"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// Files of 100 kB that are built to cost much: none takes more memory or time
// than bounded allows, whatever the reader.
func TestBounded(t *testing.T) {
	const size = 100_000
	fill := func(unit string) string { return strings.Repeat(unit, size/len(unit)) }
	var ramp bytes.Buffer
	for i := 0; ramp.Len() < size; i++ {
		fmt.Fprintf(&ramp, "%d 1\n", 300+i)
	}
	var everyEx bytes.Buffer
	for i := 0; everyEx.Len() < size; i++ {
		fmt.Fprintf(&everyEx, "%g,300,1\n%g,310,1\n", 300+float64(i)/100, 300+float64(i)/100)
	}
	for what, text := range map[string]string{
		"blank lines": fill("\n"), "lone returns": "1" + fill("\r"), "ones": fill("1 1\n"), "ones in a line": fill("1,"),
		"numbers and text": fill("1 1\nx\n"), "ragged": fill("1 1\n1 1 1\n"), "text": fill("x\n"), "prose": fill("excitation of the lamp, emission of it\n"),
		"quotes": fill("\""), "open quotes": fill("\"a,"), "minus": fill("-"), "digits": fill("1"), "digits and commas": fill("1,234;"), "sharps": fill("##A=\n"),
		"blocks": fill("##TITLE=\n"), "runs": "##TITLE=\n##FIRSTX=1\n##LASTX=2\n##NPOINTS=100000\n##XYDATA=(X++(Y..Y))\n1A" + fill("S9"),
		"ramp": ramp.String(), "headers": fill("ex,em,intensity\n"), "excitations": "ex,em,f\n" + everyEx.String(), "NULs": fill("1\x00"),
		"wide rows": strings.Repeat(strings.Repeat("1,", 9000)+"1\n", 5), "header cells": "em," + fill("240,") + "\n1,2\n",
		"a mention": "excitation " + fill("_"), "mentions": fill("ex "), "invalid": fill("\xff\xfe\xfd"), "names": fill("a,ex,em,f\nb,240,300,1\n"),
		"blanks": "300" + fill(" ") + "1", "separators": fill(";,\t "), "no numbers": fill("a b\n1 c\n"),
	} {
		data := []byte(text)
		for reader, read := range map[string]func(){
			"scans": func() { _, _ = ReadBytes("a_ex240.csv", data, nil) },
			"stack": func() { _, _ = ReadBytes("a_ex240.csv", data, &Settings{Form: Stack}) },
			"long":  func() { _, _ = ReadBytes("a_ex240.csv", data, &Settings{Form: Long, Delimiter: ","}) },
			"jcamp": func() { _, _ = ReadBytes("a_ex240.csv", data, &Settings{Form: JCAMP}) },
			"abs":   func() { _, _, _ = ReadAbsorbanceBytes("a.csv", data, nil) },
		} {
			t.Run(what+"/"+reader, func(t *testing.T) { testkit.Bounded(t, len(data), read) })
		}
		t.Run(what+"/look", func(t *testing.T) { Look("a.csv", data, nil) })
	}
}
