package scanfile_test

import (
	"fmt"

	"tarnlight/eem/scanfile"
)

func ExampleReadBytes() {
	text := "Excitation;240 nm\nnm;counts\n300;1,25\n305;1,5\n310;OVER\n"
	f, err := scanfile.ReadBytes("spring.txt", []byte(text), nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	s := f.Scans[0]
	fmt.Println(s.Ex, s.Em, s.F)
	for _, n := range f.Notes {
		fmt.Println(n.Test+":", n.Msg)
	}
	// Output:
	// 240 300–310 nm (3) [1.25 1.5 NaN]
	// read-guess: taken for a stack: one emission scan a file, excitation from the header, semicolon-delimited, decimal comma, UTF-8
	// saturated: 1 cell left out: marked as over range in the file
}

func ExampleReadBytes_refused() {
	_, err := scanfile.ReadBytes("water_03.csv", []byte("em,ex=240\n300,1.5\n301,abc\n302,1.7\n"), nil)
	fmt.Println(err)
	// Output:
	// water_03.csv:3: "abc" is not a number; leave the cell blank where nothing was measured, or set scans.delimiter and scans.decimal
}

func ExamplePattern_Match() {
	p, err := scanfile.CompilePattern("{date}_{kind}_{id}_ex{nm}")
	if err != nil {
		fmt.Println(err)
		return
	}
	got, ok := p.Match("raw/20260503_field-blank_Weir 7_EX240.txt")
	fmt.Println(ok, got["date"], got["kind"], got["id"], got["nm"])
	// Output:
	// true 2026-05-03 field-blank Weir 7 240
}
