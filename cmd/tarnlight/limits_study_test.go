package main

import (
	"fmt"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/synth"
)

// lowStudy is a survey with a study of limits in it: over four days nine controls of
// low amounts, the others replicates of the first, and eight field blanks.
func lowStudy(seed uint64, times float64) *synth.Survey {
	d := erring(seed, false)
	d.Days, d.Samples, d.Components = 4, 4, 3
	s := d.Survey()
	amounts := map[string]float64{"tryptophan": 0.3, "peat extract": 0.008, "algal extract": 0.008}
	var doses []synth.Dose
	for _, f := range s.Components {
		doses = append(doses, synth.Dose{Of: f, Amount: times * amounts[f.Name]})
	}
	day := map[int]synth.Bottle{} // one of each, for its time and lamp
	for _, b := range s.Bottles {
		day[b.Measured.YearDay()] = b
	}
	first := s.Bottles[0].Measured.YearDay()
	for i := range 9 {
		like := day[first+i%4]
		b := synth.Bottle{ID: fmt.Sprintf("LOW%d", i+1), Kind: "control", Liquid: synth.Liquid{}.With(doses...), Known: doses, Measured: like.Measured, Power: like.Power}
		if i > 0 {
			b.ReplicateOf = "LOW1"
		}
		s.Bottles = append(s.Bottles, b)
		if i < 8 {
			s.Bottles = append(s.Bottles, synth.Bottle{ID: fmt.Sprintf("MB%d", i+1), Kind: "field-blank", Measured: like.Measured, Power: like.Power})
		}
	}
	for i := range s.Bottles {
		s.Bottles[i].Layout.Form = synth.Matrix
	}
	s.Settings = erringSettings
	return s
}

// A study gives a limits file; from its results the same file comes; and a survey
// that names the file reports exactly those limits.
func TestLimitsStudy(t *testing.T) {
	dir, base := t.TempDir(), t.TempDir()
	if err := lowStudy(3, 1).Write(dir); err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(base, "limits.csv")
	r := call("limits", dir, "-o", file).want(t, exitDoubt)
	if !strings.Contains(r.err, "tryptophan: in the samples the budgets give a critical value 8.") {
		t.Errorf("limits of pure water are taken for those of the samples: %s", r.err)
	}
	for _, want := range []string{"replicates of LOW1", "field blanks", "refused, standards (tryptophan): the standards reach", "*"} {
		if !strings.Contains(r.out, want) {
			t.Errorf("no %q in\n%s", want, r.out)
		}
	}
	if r := call("limits", dir, "-o", file).want(t, exitFailed); !strings.Contains(r.err, "is there already") {
		t.Errorf("written over: %s", r.err)
	}
	call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	again := filepath.Join(base, "again.csv")
	call("limits", filepath.Join(dir, "out"), "-o", again).want(t, exitDoubt)
	if read(t, file) != read(t, again) {
		t.Error("the results give another file than the survey")
	}
	mdl := call("limits", filepath.Join(dir, "out"), "--form", "mdl").want(t, exitDoubt)
	if mdl.out == r.out {
		t.Error("--form mdl marks the same rows")
	}

	put(t, dir, "limits.csv", read(t, file))
	put(t, dir, "survey.toml", erringSettings+"[quantify]\nlimits = \"limits.csv\"\n")
	call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	own, c := table(t, file), table(t, dir, "out", "contributions.csv")
	for _, row := range own.Rows {
		for _, column := range []string{"detection_limit", "critical_value", "quantification_limit"} {
			if got := cell(t, c, column, "id", "S001", "component", row[0]); got != row[own.Col(column)] {
				t.Errorf("%s of %s: %s, the file says %s", column, row[0], got, row[own.Col(column)])
			}
		}
	}
	l := table(t, dir, "out", "limits.csv")
	if got := cell(t, l, "detection_limit", "component", "tryptophan", "form", "laboratory"); got != own.Rows[0][own.Col("detection_limit")] {
		t.Errorf("limits.csv tells another limit of the laboratory: %s", got)
	}
	if got := cell(t, table(t, dir, "out", "flags.csv"), "severity", "test", "limits-low", "component", "tryptophan"); got != "note" {
		t.Errorf("limits-low: %s", got)
	}
}

// Replicates far above the limit, and a folder without any, set none and say why.
func TestLimitsRefused(t *testing.T) {
	dir := t.TempDir()
	s := lowStudy(4, 300)
	var few []synth.Bottle
	for _, b := range s.Bottles { // few field blanks: the replicates alone could set limits
		if b.Kind != "field-blank" || b.ID == "MB1" {
			few = append(few, b)
		}
	}
	s.Bottles = few
	if err := s.Write(dir); err != nil {
		t.Fatal(err)
	}
	r := call("limits", dir, "--form", "mdl")
	if !strings.Contains(r.out, "times the limit that they give, and scatter grows with the amount; take a level of 2 to 10 times") {
		t.Errorf("%s", r.out)
	}
	y := newTiny()
	none := call("limits", y.write(t), "-o", filepath.Join(t.TempDir(), "l.csv")).want(t, exitFailed)
	if !strings.Contains(none.err, "the study sets no limit by Currie") || !strings.Contains(none.out, "1 blanks; at least 7") {
		t.Errorf("%s%s", none.out, none.err)
	}
	if r := call("limits", dir, "--form", "best").want(t, exitMisuse); !strings.Contains(r.err, "currie, iso or mdl") {
		t.Errorf("%s", r.err)
	}
}

// Controls of one amount are replicates of one another without naming the first; of
// another amount they are not, and a limit that rests on blanks alone is said to.
func TestLimitsControlsAlike(t *testing.T) {
	named, alike, apart := lowStudy(3, 1), lowStudy(3, 1), lowStudy(3, 1)
	for _, s := range []*synth.Survey{alike, apart} {
		for i := range s.Bottles {
			s.Bottles[i].ReplicateOf = ""
		}
	}
	for i := range apart.Bottles {
		b := &apart.Bottles[i]
		b.Known = slices.Clone(b.Known)
		for d := range b.Known {
			if b.Kind == "control" {
				b.Known[d].Amount *= 1 + float64(i)/1e4
			}
		}
	}
	var files []string
	for i, s := range []*synth.Survey{named, alike, apart} {
		dir := t.TempDir()
		if err := s.Write(dir); err != nil {
			t.Fatal(err)
		}
		file := filepath.Join(t.TempDir(), "limits.csv")
		r := call("limits", dir, "-o", file).want(t, exitDoubt)
		if got := strings.Contains(r.out, "controls alike with LOW1"); got != (i == 1) {
			t.Errorf("study %d: controls alike %v\n%s", i, got, r.out)
		}
		told := ""
		for _, line := range strings.Split(r.err, "\n") {
			if strings.Contains(line, "set by blanks alone") {
				told += line
			}
		}
		if got := strings.Contains(told, "tryptophan"); got != (i == 2) {
			t.Errorf("study %d: tryptophan by blanks alone %v: %s", i, got, r.err)
		}
		files = append(files, strings.ReplaceAll(read(t, file), "controls alike with", "replicates of"))
	}
	if files[0] != files[1] {
		t.Errorf("named: %s\nalike: %s", files[0], files[1])
	}
}
