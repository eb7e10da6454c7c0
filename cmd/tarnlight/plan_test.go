package main

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
	"tarnlight/unmix"
	"tarnlight/unmix/plan"
	"tarnlight/unmix/report"
)

// planned is a small survey to plan with: three blanks, standards, a few samples, a
// point every step nm of emission.
func planned(step float64) *synth.Survey {
	in := synth.NewInstrument()
	ex, err := eem.Steps(240, 450, 10)
	if err != nil {
		panic(err)
	}
	em, err := eem.Steps(280, 600, step)
	if err != nil {
		panic(err)
	}
	in.Grid = eem.Grid{Ex: ex, Em: em}
	s := synth.Design{Samples: 6, Days: 1, Blanks: 3, Levels: 4, Brown: 0.1, Instrument: in, Seed: 5}.Survey()
	for i := range s.Bottles {
		s.Bottles[i].Layout.Form = synth.Matrix
	}
	return s
}

func writePlanned(t testing.TB, dir string) {
	t.Helper()
	if err := planned(4).Write(dir); err != nil {
		t.Fatal(err)
	}
}

// planJSON calls plan and reads its answer.
func planJSON(t *testing.T, codes []int, args ...string) planResult {
	t.Helper()
	res := call(append(append([]string{"plan"}, args...), "--json")...).want(t, codes...)
	var r planResult
	if err := json.Unmarshal([]byte(res.out), &r); err != nil {
		t.Fatal(err, res.out)
	}
	return r
}

func TestPlanTellsEverything(t *testing.T) {
	dir := t.TempDir()
	writePlanned(t, dir)
	csv, figures := filepath.Join(t.TempDir(), "plan.csv"), filepath.Join(t.TempDir(), "figures")
	res := call("plan", dir, "--scans", "4", "-o", csv, "--figures", figures).want(t, exitDone)
	t.Log("\n" + res.out + res.err)
	for _, want := range []string{"Standard uncertainty", "Detection limit", "Variance inflation", "minutes", "every choice", "all scans", "the fewest within 25 %"} {
		if !strings.Contains(res.out, want) {
			t.Errorf("stdout lacks %q", want)
		}
	}
	if !strings.Contains(res.err, "Raman units come from the blanks' scan at ex 350 nm") {
		t.Errorf("stderr does not tell of Raman units: %s", res.err)
	}
	tab := table(t, csv)
	if len(tab.Rows) != 5*5 {
		t.Errorf("%d rows, want 5 components × (4 plans + all scans)", len(tab.Rows))
	}
	r := planJSON(t, []int{exitDone}, dir, "--scans", "4")
	for i, p := range r.Plans {
		if p.Scans != i+1 || len(p.Excitations) != i+1 || math.Abs(p.Minutes-float64(i+1)*(320/600.+5/60.)) > 1e-9 {
			t.Errorf("%+v", p)
		}
		for _, c := range p.Components {
			text := cell(t, tab, "standard_uncertainty", "scans", fmt.Sprint(p.Scans), "component", c.Name)
			if c.U == nil || number(t, text) != *c.U || *c.Percent != 100**c.U/c.Level || *c.VIF < 1 {
				t.Errorf("%s: %s and %+v", c.Name, text, c)
			}
		}
	}
	for _, name := range []string{"plan-tradeoff", "plan-lines"} {
		for _, ext := range []string{".svg", ".png", ".csv"} {
			if info, err := os.Stat(filepath.Join(figures, name+ext)); err != nil || info.Size() < 500 {
				t.Errorf("%s%s: %v", name, ext, err)
			}
		}
	}
	lines := table(t, figures, "plan-lines.csv")
	drawn := map[string]bool{}
	for i := range lines.Rows {
		if lines.Bool(i, lines.Col("planned")) {
			drawn[lines.Text(i, lines.Col("excitation_nm"))] = true
		}
	}
	if len(drawn) == 0 || len(drawn) > 4 {
		t.Errorf("lines drawn at %v", drawn)
	}
}

func TestPlanLimits(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	writePlanned(t, dir)
	r := planJSON(t, []int{exitDone}, dir, "--scans", "4")
	at3 := *r.Plans[2].Components[0].Detection
	reach := fmt.Sprintf("tryptophan=%g", at3*1.001)
	res := call("plan", dir, "--scans", "4", "--limit", reach).want(t, exitDone)
	smallest := slices.IndexFunc(r.Plans, func(p planRow) bool { return *p.Components[0].Detection <= at3*1.001 }) + 1
	if want := fmt.Sprintf("the smallest plan that meets the detection limits: %s at ex %s nm", eem.Count(smallest, "scan"), numbersText(r.Plans[smallest-1].Excitations)); !strings.Contains(res.out, want) {
		t.Errorf("%s\nlacks %q", res.out, want)
	}
	res = call("plan", dir, "--scans", "2", "--limit", "tryptophan=1e-6").want(t, exitDoubt)
	if !strings.Contains(res.out, "no plan of up to 2 scans meets the detection limits: tryptophan") || !strings.Contains(res.out, "nor do all 22 scans") {
		t.Error(res.out)
	}
	for _, c := range []struct{ args, want string }{
		{"--limit tryptofan=1", "there is no component"},
		{"--limit tryptophan", "NAME=AMOUNT"},
		{"--with 351", "the nearest is 350 nm"},
		{"--emission 300", "FROM:TO[:STEP]"},
		{"--emission 700:800", "the references know emissions of"},
		{"--apart gold", "there is no component"},
		{"--unknown x", "EMISSION:WIDTH"},
		{"--scans 0", "write 1 or more"},
		{"--read 1 --like " + dir, "keep one of them"},
		{"--speed 0", "a speed or a dwell"},
		{"--draw 9 --scans 2 --figures " + t.TempDir(), "there are plans of 1 to 2"},
	} {
		if res := call(append([]string{"plan", dir}, strings.Fields(c.args)...)...).want(t, exitMisuse); !strings.Contains(res.err, c.want) {
			t.Errorf("%s: %s", c.args, res.err)
		}
	}
}

// Wishes reach the numbers: an unknown interferent and a component kept apart, a
// forced line, a narrower window, a stated noise.
func TestPlanWishes(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	writePlanned(t, dir)
	cost := func(r planResult) float64 { return *r.Plans[len(r.Plans)-1].Percent }
	plain := planJSON(t, []int{exitDone}, dir, "--scans", "3")
	for _, c := range []struct {
		args string
		more bool
	}{{"--unknown 430:80", true}, {"--with 350 --with 450", true}, {"--absorbance " + filepath.Join(dir, "absorbance", "S001.csv") + " --times 20", true},
		{"--emission 300:500:8", true}, {"--apart pyrene", false}, {"--blanks 0", false}, {"--narrow 20", true}} {
		r := planJSON(t, []int{exitDone}, append([]string{dir, "--scans", "3"}, strings.Fields(c.args)...)...)
		t.Logf("%s: %.6f %%, without %.6f %%", c.args, cost(r), cost(plain))
		if (cost(r) > cost(plain)) != c.more {
			t.Errorf("%s: %.4f %%, without %.4f %%", c.args, cost(r), cost(plain))
		}
	}
	one := planJSON(t, []int{exitDone}, dir, "--scans", "3", "--read", "1e-3", "--shot", "1e-5")
	two := planJSON(t, []int{exitDone}, dir, "--scans", "3", "--read", "2e-3", "--shot", "4e-5")
	if math.Abs(cost(two)/cost(one)-2) > 1e-9 {
		t.Errorf("twice the noise: %g and %g %%", cost(two), cost(one))
	}
}

// From the files of a run: the model with the noise of the survey gives what the
// survey gives; without any noise it is assumed, and told.
func TestPlanFromFiles(t *testing.T) {
	dir := t.TempDir()
	writePlanned(t, dir)
	runNoPictures(t, dir)
	model, spectra := filepath.Join(dir, "out", "model.json"), filepath.Join(dir, "out", "components.csv")
	levels := []string{}
	own := planJSON(t, []int{exitDone}, dir, "--scans", "3")
	for _, c := range own.Plans[0].Components {
		levels = append(levels, "--level", fmt.Sprintf("%s=%g", c.Name, c.Level))
	}
	like := planJSON(t, []int{exitDone}, append([]string{model, "--like", dir, "--scans", "3"}, levels...)...)
	for i := range own.Plans {
		if a, b := *own.Plans[i].Percent, *like.Plans[i].Percent; math.Abs(a/b-1) > 1e-6 {
			t.Errorf("%d scans: the survey gives %g %%, its model %g %%", i+1, a, b)
		}
	}
	res := call("plan", spectra, "--scans", "2").want(t, exitDoubt)
	if !strings.Contains(res.err, "the noise is not known and was assumed") || !strings.Contains(res.err, "--level NAME=AMOUNT") {
		t.Error(res.err)
	}
}

// Two components with one emission spectrum, told apart only at 340 nm.
func TestPlanInseparable(t *testing.T) {
	var b strings.Builder
	b.WriteString("component,mode,wavelength_nm,loading\n")
	for name, ex := range map[string][]float64{"a": {1, 1, 1, .2}, "b": {1, 1, 1, .9}} {
		for j, v := range ex {
			fmt.Fprintf(&b, "%s,excitation,%d,%g\n", name, 310+10*j, v)
		}
		for k, v := range []float64{.1, .3, .6, .9, 1, .8, .5, .3, .1} {
			fmt.Fprintf(&b, "%s,emission,%d,%g\n", name, 420+10*k, v)
		}
	}
	dir := folder(t, map[string]string{"twins.csv": b.String()})
	res := call("plan", filepath.Join(dir, "twins.csv"), "--read", "0.01", "--with", "310", "--scans", "2").want(t, exitDone)
	t.Log("\n" + res.out)
	if !strings.Contains(res.out, "stay inseparable") || !strings.Contains(res.out, "a scan at ex 340 nm beside these would part them") {
		t.Error(res.out)
	}
	res = call("plan", filepath.Join(dir, "twins.csv"), "--read", "0.01", "--excitation", "300:330").want(t, exitDoubt)
	if !strings.Contains(res.out, "no scan of this grid parts them") || !strings.Contains(res.out, "no plan of up to 3 scans tells all components apart") {
		t.Error(res.out)
	}
}

// One substance: excitation maximum, scatter and linear range. The band and the limit
// are computed: water's Raman line of ex 280 lies at 309.5 nm; ln(10)·0.03 = 0.069.
func TestPlanAlone(t *testing.T) {
	dir := t.TempDir()
	for file, height := range map[string]float64{"thick.csv": 0.03, "thin.csv": 0.003} {
		var b strings.Builder
		b.WriteString("wavelength_nm,absorbance\n")
		for nm := 240.0; nm <= 400; nm += 2 {
			fmt.Fprintf(&b, "%g,%.6f\n", nm, height*math.Exp(-math.Pow((nm-280)/12, 2)))
		}
		put(t, dir, file, b.String())
	}
	res := call("plan", filepath.Join(dir, "thick.csv"), "--emission", "300:420").want(t, exitDoubt)
	t.Log("\n" + res.out)
	for _, want := range []string{"280", "Raman first order", "above the linear range of 0.05", "scatter takes"} {
		if !strings.Contains(res.out, want) {
			t.Errorf("lacks %q", want)
		}
	}
	if res := call("plan", filepath.Join(dir, "thin.csv"), "--emission", "330:420").want(t, exitDone); strings.Contains(res.out, "linear range") {
		t.Error(res.out)
	}
	if res := call("plan", filepath.Join(dir, "thick.csv"), "--emission", "330:420", "--times", "0.1").want(t, exitDone); strings.Contains(res.out, "linear range") {
		t.Error(res.out)
	}
	if res := call("plan", filepath.Join(dir, "thick.csv")).want(t, exitMisuse); !strings.Contains(res.err, "--emission FROM:TO") {
		t.Error(res.err)
	}
	if res := call("plan", filepath.Join(dir, "nothing.csv")).want(t, exitFailed); !strings.Contains(res.err, "no such file or folder") {
		t.Error(res.err)
	}
}

// keepLines leaves a grid file (excitations across) the excitations named.
func keepLines(t testing.TB, path string, keep []float64) {
	t.Helper()
	var out []string
	var cols []int
	text, sep := read(t, path), "\t"
	if !strings.Contains(text, sep) {
		sep = ","
	}
	for n, line := range strings.Split(strings.TrimRight(text, "\n"), "\n") {
		cells := strings.Split(strings.TrimRight(line, "\r"), sep)
		if n == 0 {
			cols = []int{0}
			for c, head := range cells[1:] {
				if slices.Contains(keep, number(t, head)) {
					cols = append(cols, c+1)
				}
			}
		}
		var row []string
		for _, c := range cols {
			row = append(row, cells[c])
		}
		out = append(out, strings.Join(row, sep))
	}
	put(t, filepath.Dir(path), filepath.Base(path), strings.Join(out, "\n")+"\n")
}

// A survey measured at the planned excitations alone runs like any other, and reports
// the noise that was predicted. Its noise model rests on the few cells of its own
// blanks and is itself known to some 10 %, so that 15 % are allowed; bottles are those
// of the plan, and the blanks have one scan more, that at 350 nm, for Raman units.
func TestPlannedSurveyReportsWhatWasPredicted(t *testing.T) {
	s := planned(2)
	level := map[string]float64{"tryptophan": 60, "peat extract": 3, "algal extract": 2.5, "brightener": 3, "pyrene": 1}
	var levels []string
	for i := range s.Bottles {
		if b := &s.Bottles[i]; b.Kind == "sample" {
			b.Liquid = synth.Liquid{Color: synth.Tail{At254: 0.1, Slope: 0.0155}, Turbidity: 1e-4}
			for _, c := range s.Components {
				b.Liquid = b.Liquid.With(synth.Dose{Of: c, Amount: level[c.Name]})
			}
		}
	}
	for name, v := range level {
		levels = append(levels, "--level", fmt.Sprintf("%s=%g", name, v))
	}
	dir := t.TempDir()
	if err := s.Write(dir); err != nil {
		t.Fatal(err)
	}
	r := planJSON(t, []int{exitDone}, append([]string{dir, "--scans", "5"}, levels...)...)
	p := r.Plans[4]
	for _, b := range s.Bottles {
		lines := p.Excitations
		if b.Kind == "blank" {
			lines = append(slices.Clone(lines), 350)
		}
		keepLines(t, filepath.Join(dir, "scans", b.ID+".csv"), lines)
	}
	call("run", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	c, budget := table(t, dir, "out", "contributions.csv"), table(t, dir, "out", "budget.csv")
	t.Logf("5 scans at %v nm", p.Excitations)
	for _, comp := range p.Components {
		var reported, error2, n float64
		for _, b := range s.Bottles {
			if b.Kind != "sample" {
				continue
			}
			if unit := cell(t, c, "unit", "id", b.ID, "component", comp.Name); unit != comp.Unit {
				t.Fatalf("unit %q", unit)
			}
			noise := causeOf(budget, b.ID, comp.Name, "noise")
			blank := causeOf(budget, b.ID, comp.Name, "blank")
			reported += math.Hypot(noise, blank)
			error2 += math.Pow(number(t, cell(t, c, "value", "id", b.ID, "component", comp.Name))-level[comp.Name], 2)
			n++
		}
		reported /= n
		t.Logf("%-13s predicted %.4g, reported of noise and blank %.4g (%+.1f %%), rms error from everything %.4g %s", comp.Name, *comp.U, reported, 100*(reported / *comp.U - 1), math.Sqrt(error2/n), comp.Unit)
		if math.Abs(reported / *comp.U - 1) > 0.15 {
			t.Errorf("%s: predicted %g, reported %g", comp.Name, *comp.U, reported)
		}
	}
}

// causeOf is one cause of a bottle's budget; 0 where it is not there.
func causeOf(budget *report.Table, id, component, cause string) float64 {
	for i := range budget.Rows {
		if budget.Text(i, budget.Col("id")) == id && budget.Text(i, budget.Col("component")) == component && budget.Text(i, budget.Col("cause")) == cause {
			return budget.Float(i, budget.Col("standard_uncertainty"))
		}
	}
	return 0
}

// What the plans hide is said: a plan of fewer scans than components + 1 is not
// recommended where the samples depart from the model, and detection limits are set
// against those of the full grid.
func TestPlanTellsWhatFewScansHide(t *testing.T) {
	row := func(scans int, cost, detection float64) planRow {
		return planRow{Scans: scans, Percent: &cost, prediction: plan.Prediction{Cost: cost},
			Components: []planComponent{{Name: "a", Wanted: true, Detection: &detection}, {Name: "b", Wanted: true, Detection: &detection}}}
	}
	r := planResult{in: &planInput{}, Full: row(20, 2, 0.1), Plans: []planRow{row(1, 1, 0.6), row(2, 1, 0.5), row(3, 1, 0.4)}}
	verdict := func(departs bool, plans int) string {
		some := r
		some.in, some.Plans = &planInput{departs: departs}, r.Plans[:plans]
		some.judge(nil)
		return some.Verdict
	}
	for _, c := range []struct {
		departs     bool
		plans       int
		begin, says string
		warned      bool
	}{
		{false, 3, "1 scan ", "up to 6.00 times those of the full grid (a)", false},
		{true, 3, "3 scans ", "up to 4.00 times those of the full grid (a)", false},
		{true, 2, "1 scan ", "fewer than 3 scans (components + 1)", true},
	} {
		v := verdict(c.departs, c.plans)
		if !strings.HasPrefix(v, c.begin) || !strings.Contains(v, c.says) || strings.Contains(v, "not recommended") != c.warned {
			t.Errorf("%+v: %s", c, v)
		}
	}
	r.tellFewer()
	if len(r.Notes) != 1 || !strings.HasPrefix(r.Notes[0], "1 scan has a smaller predicted uncertainty than all 20") || !strings.Contains(r.Notes[0], "report less of it") {
		t.Errorf("%q", r.Notes)
	}
}

// Raman units are spoken of only where they can be meant, and a scan is planned in
// only where the grid has it.
func TestPlanTellsOfRamanUnits(t *testing.T) {
	for _, c := range []struct {
		unit eem.Unit
		last float64
		want string
	}{
		{"RU", 400, "Raman units come from the blanks' scan at ex 350 nm: scan the blanks there too, or plan it in with --with 350"},
		{"RU", 300, "Raman units come from the blanks' scan at ex 350 nm, a scan outside this grid: scan the blanks there too"},
		{"", 300, "the unit of the references is not known; Raman units come from the blanks' scan at ex 350 nm, a scan outside this grid: scan the blanks there too"},
		{"counts", 400, ""},
	} {
		ex, err := eem.Steps(250, c.last, 10)
		if err != nil {
			t.Fatal(err)
		}
		set := &unmix.Set{Unit: c.unit, Grid: eem.Grid{Ex: ex}}
		r := planResult{taken: -1, Full: planRow{Excitations: ex.Values()}, in: &planInput{problem: plan.Problem{Set: set}, setting: survey.Default()}}
		r.tellRaman()
		if got := strings.Join(r.Notes, "\n"); got != c.want {
			t.Errorf("%s to %g nm: %q", c.unit, c.last, got)
		}
	}
}

func TestDigits3(t *testing.T) {
	for v, want := range map[float64]string{0.16: "0.160", 0.316: "0.316", 2: "2.00", 9.996: "10.0", 123.4: "123", 1234: "1.23e+03", 0: "0.00"} {
		if got := digits3(&v); got != want {
			t.Errorf("%g: %s, want %s", v, got, want)
		}
	}
}
