package prepare

import (
	"fmt"
	"path/filepath"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scanfile"
)

// lampWindow, nm, is how far on both sides of its tabulated wavelength a line of a
// lamp is looked for; the nearest two, 296.728 and 302.150, are 5.4 nm apart.
const lampWindow = 4

// checkLamps holds the scan of a line lamp, which a setup may name, against the
// tabulated lines, and tells the batches of that setup. Data are never shifted.
func (s *Survey) checkLamps() error {
	told := map[string]*eem.Note{} // by file
	for _, bt := range s.Batches {
		set := bt.Bottles[0].Setting.Correct
		if set.LampScan == "" {
			continue
		}
		n, ok := told[set.LampScan]
		if !ok {
			var err error
			if n, err = s.checkLamp(set.LampScan, set.Lamp); err != nil {
				return fmt.Errorf("settings, correct.lamp_scan: %w", err)
			}
			told[set.LampScan] = n
		}
		if n.Test != "" {
			s.Flags = append(s.Flags, eem.FlagFrom(s.judge(*n), "", bt.Name))
		}
	}
	return nil
}

// checkLamp reads the scan and makes the note; one without a test code found
// nothing wrong.
func (s *Survey) checkLamp(name, lamp string) (*eem.Note, error) {
	path := filepath.FromSlash(name)
	if !filepath.IsAbs(path) {
		path = filepath.Join(s.Dir, path)
	}
	data, in, err := s.load(path)
	if err != nil {
		return nil, err
	}
	scan, _, err := scanfile.ReadCurveBytes(in.Path, data, nil)
	if err != nil {
		return nil, err
	}
	c := correct.Curve{Axis: scan.Axis, Y: scan.Y, Source: in.Path}
	s.Inputs = append(s.Inputs, in)
	lines := correct.MercuryLines
	if lamp == "mercury-argon" {
		lines = append(lines[:len(lines):len(lines)], correct.ArgonLines...)
	}
	_, n, err := correct.CheckLamp(correct.FindLines(c, lines, lampWindow), s.Limit("lamp-lines"))
	if err != nil {
		return nil, fmt.Errorf("%s: %w; is it the scan of a %s lamp?", in.Path, err, lamp)
	}
	n.File = in.Path
	return &n, nil
}
