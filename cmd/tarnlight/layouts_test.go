package main

import (
	"fmt"
	"strings"
	"testing"
)

// tinyText writes one bottle of tiny in another form of file, with the numbers of
// gridText.
func tinyText(form string, a, b float64) string {
	var s strings.Builder
	comma := func(v float64) string { return strings.Replace(fmt.Sprintf("%.4f", v), ".", ",", 1) }
	switch form {
	case "pairs": // side by side, excitation in the header
		for _, ex := range tinyEx {
			fmt.Fprintf(&s, "Ex %g nm;;", ex)
		}
		s.WriteString("\n")
		for k, em := range tinyEm {
			for j := range tinyEx {
				fmt.Fprintf(&s, "%g;%s;", em, comma(tinyCell(a, b, j, k)))
			}
			s.WriteString("\n")
		}
	case "long": // in 1/cm, descending, as 1,5500E+02
		s.WriteString("ex (1/cm);em (1/cm);intensity\n")
		for j, ex := range tinyEx {
			for k := range tinyEm {
				k = len(tinyEm) - 1 - k
				row := fmt.Sprintf("%.9f;%.9f;%.12E\n", 1e7/ex, 1e7/tinyEm[k], round4(tinyCell(a, b, j, k)))
				s.WriteString(strings.ReplaceAll(row, ".", ","))
			}
		}
	case "jcamp":
		s.WriteString("##TITLE=W\n##JCAMP-DX=5.01\n##DATA TYPE=LINK\n##BLOCKS=3\n")
		for j, ex := range tinyEx {
			fmt.Fprintf(&s, "##TITLE=W\n##$EXCITATION=%g\n##XUNITS=NANOMETERS\n##YUNITS=COUNTS\n##NPOINTS=%d\n##FIRSTX=%g\n##LASTX=%g\n##XFACTOR=1\n##YFACTOR=0.0001\n##XYPOINTS=(XY..XY)\n",
				ex, len(tinyEm), tinyEm[0], tinyEm[len(tinyEm)-1])
			for k, em := range tinyEm {
				fmt.Fprintf(&s, "%g,%.0f\n", em, 1e4*tinyCell(a, b, j, k))
			}
			s.WriteString("##END=\n")
		}
		s.WriteString("##END=\n")
	}
	return s.String()
}

func round4(v float64) float64 {
	var out float64
	if _, err := fmt.Sscan(fmt.Sprintf("%.4f", v), &out); err != nil {
		panic(err)
	}
	return out
}

// dayText is one file of several samples, each a grid below its name.
func dayText(samples map[string][2]float64, order ...string) string {
	var s strings.Builder
	for _, id := range order {
		fmt.Fprintf(&s, "Sample: %s\n%s\n", id, gridText(samples[id][0], samples[id][1]))
	}
	return s.String()
}

// A survey whose bottles lie in every form of file, several of a day in one, has
// the numbers that it has as grids; check says on one screen what each kind of file
// was taken for, once, and what was wrong in a day's file only of the bottle that it
// befell.
func TestEveryLayoutInOneSurvey(t *testing.T) {
	plain := newTiny()
	for _, id := range []string{"W3", "W4", "W5"} {
		plain.add(id, "sample", 1, 0.5, "")
	}
	want := plain.write(t)
	runNoPictures(t, want)

	y := newTiny()
	for _, id := range []string{"W3", "W4", "W5"} {
		y.add(id, "sample", 1, 0.5, "")
	}
	for id, form := range map[string]string{"W3": "pairs", "W4": "long", "W5": "jcamp"} {
		y.files["scans/"+id+".csv"] = tinyText(form, 1, 0.5)
	}
	day := dayText(map[string][2]float64{"W1": {1.5, 0.5}, "W2": {0.4, 1.1}}, "W1", "W2")
	for _, id := range []string{"W1", "W2"} {
		delete(y.files, "scans/"+id+".csv")
	}
	y.files["scans/day.csv"] = day
	for i, row := range y.sheet {
		y.sheet[i] = strings.NewReplacer("scans/W1.csv", "scans/day.csv", "scans/W2.csv", "scans/day.csv").Replace(row)
	}
	dir := y.write(t)
	r := call("check", dir).want(t, exitDone, exitDoubt)
	screen := r.err + r.out
	for _, words := range []string{"taken for a grid", "side by side", "long table", "wavenumbers (1/cm)", "JCAMP-DX"} {
		if strings.Count(r.err, words) != 1 {
			t.Errorf("%q is told %d times:\n%s", words, strings.Count(r.err, words), r.err)
		}
	}
	if n := strings.Count(screen, "\n"); n > 24 {
		t.Errorf("check takes %d lines, more than a screen:\n%s", n, screen)
	}
	runNoPictures(t, dir)
	for _, id := range []string{"W1", "W2", "W3", "W4", "W5"} {
		for _, c := range []string{"a", "b"} {
			got := number(t, cell(t, table(t, dir, "out", "contributions.csv"), "value", "id", id, "component", c, "method", "references"))
			w := number(t, cell(t, table(t, want, "out", "contributions.csv"), "value", "id", id, "component", c, "method", "references"))
			if d := got - w; d > 1e-9 || d < -1e-9 { // 1/cm to nine decimals
				t.Errorf("%s, %s: %v, as a grid %v", id, c, got, w)
			}
		}
	}

	broken := strings.Split(day, "\n")
	for i, l := range broken {
		if strings.HasPrefix(l, "310,") {
			broken[i] = "310,OVER" + l[strings.Index(l[4:], ",")+4:]
			break // of the first sample
		}
	}
	put(t, dir, "scans/day.csv", strings.Join(broken, "\n"))
	runNoPictures(t, dir)
	flags := table(t, dir, "out", "flags.csv")
	for _, row := range flags.Rows {
		if row[flags.Col("test")] == "saturated" && row[flags.Col("id")] != "W1" {
			t.Errorf("told of %s: %v", row[flags.Col("id")], row)
		}
		if row[flags.Col("test")] == "same-content" {
			t.Errorf("one file was taken for two: %v", row)
		}
	}
	cell(t, flags, "message", "id", "W1", "test", "saturated")
}

// A day's file that does not name a row's id is told so, with the names it has.
func TestDayFileWithOtherNames(t *testing.T) {
	y := newTiny()
	y.files["scans/day.csv"] = dayText(map[string][2]float64{"W1": {1.5, 0.5}, "Weir": {0.4, 1.1}}, "W1", "Weir")
	for i, row := range y.sheet {
		y.sheet[i] = strings.NewReplacer("scans/W1.csv", "scans/day.csv", "scans/W2.csv", "scans/day.csv").Replace(row)
	}
	r := call("run", y.write(t), "--pictures=false").want(t, exitFailed)
	for _, w := range []string{"runsheet.csv:7", "scans/day.csv", "W1, Weir", `"W2"`} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in: %s", w, r.err)
		}
	}
	for i, row := range y.sheet {
		if strings.HasPrefix(row, "W1,") {
			y.sheet[i] = strings.Replace(row, "scans/day.csv", "scans/W1.csv", 1)
		}
	}
	dir := y.write(t)
	runNoPictures(t, dir)
	if m := cell(t, table(t, dir, "out", "flags.csv"), "message", "id", "W2", "test", "excitation-repeated"); !strings.Contains(m, "W1, Weir") {
		t.Errorf("message: %s", m)
	}
}
