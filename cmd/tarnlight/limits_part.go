package main

import (
	"fmt"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem/scanfile"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// readLimits reads the laboratory's own limits ([quantify] limits), a table with the
// columns component and detection_limit and, where it has them, critical_value,
// quantification_limit and unit. Without a critical value it is half the detection
// limit, as with equal errors of both kinds and a constant standard deviation
// (Currie 1968).
func (j *job) readLimits(set *unmix.Set) error {
	name := j.set.Quantify.Limits
	if name == "" {
		return nil
	}
	path := filepath.FromSlash(name)
	if !filepath.IsAbs(path) {
		path = filepath.Join(j.dir, path)
	}
	t, err := scanfile.ReadTable(path)
	if err != nil {
		return fmt.Errorf("settings, quantify.limits: %w", err)
	}
	j.limits, err = parseLimits(name, t, set)
	return err
}

func parseLimits(name string, t *scanfile.Table, set *unmix.Set) (map[string]merit.Limits, error) {
	col := map[string]int{}
	for i, h := range t.Header {
		col[strings.ToLower(strings.TrimSpace(h))] = i + 1
	}
	if col["component"] == 0 || col["detection_limit"] == 0 {
		return nil, fmt.Errorf("%s:%d: a limits file has the columns component and detection_limit, and if wanted critical_value, quantification_limit and unit", name, t.HeadLine)
	}
	out := map[string]merit.Limits{}
	for _, row := range t.Rows {
		text := func(c string) string {
			if i := col[c]; i > 0 && i <= len(row.Cells) {
				return strings.TrimSpace(row.Cells[i-1])
			}
			return ""
		}
		var bad error
		number := func(c string) float64 {
			s := text(c)
			if s == "" {
				return nan
			}
			v, err := strconv.ParseFloat(strings.Replace(s, ",", ".", 1), 64)
			if err != nil || !(v > 0) || v > 1e300 {
				bad = fmt.Errorf("%s:%d: %s %q; write a number above 0", name, row.Line, c, s)
			}
			return v
		}
		comp := text("component")
		f := slices.Index(set.Names(), comp)
		if f < 0 {
			continue // a laboratory's file may hold more than this survey asks for
		}
		unit := set.Components[f].AmountUnit
		if unit == "" {
			unit = string(set.Unit)
		}
		if u := text("unit"); u != "" && u != unit {
			return nil, fmt.Errorf("%s:%d: limits of %s in %s, but the survey gives it in %s; convert them", name, row.Line, comp, u, unit)
		}
		if _, twice := out[comp]; twice {
			return nil, fmt.Errorf("%s:%d: %s stands twice; keep one row", name, row.Line, comp)
		}
		l := merit.Limits{Critical: number("critical_value"), Detection: number("detection_limit"), Quantification: number("quantification_limit")}
		switch {
		case bad != nil:
			return nil, bad
		case l.Detection != l.Detection:
			return nil, fmt.Errorf("%s:%d: detection_limit of %s is empty", name, row.Line, comp)
		case l.Critical != l.Critical:
			l.Critical = l.Detection / 2
		case l.Critical > l.Detection:
			return nil, fmt.Errorf("%s:%d: the critical value of %s (%g) is above its detection limit (%g)", name, row.Line, comp, l.Critical, l.Detection)
		}
		out[comp] = l
	}
	return out, nil
}
