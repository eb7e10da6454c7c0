package prepare_test

import (
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/synth"
)

// Each fault of a blank of one day is flagged on the blank and reaches every
// bottle of that day once, and none of the other day.
func TestFaultyBlanks(t *testing.T) {
	brightener := synth.Substance("brightener")
	off := *forty(t).Instrument
	off.Off = [2]float64{0, 2.5}
	for _, c := range []struct {
		test  string
		blank func(s *synth.Survey, b *synth.Bottle)
	}{
		{"blank-level", func(_ *synth.Survey, b *synth.Bottle) {
			b.Liquid = b.Liquid.With(synth.Dose{Of: brightener, Amount: 0.3})
		}},
		{"blank-drift", func(_ *synth.Survey, b *synth.Bottle) { b.Power *= 0.88 }},
		{"wavelength", func(_ *synth.Survey, b *synth.Bottle) {
			b.Spoil = func(e *eem.EEM, rnd *rand.Rand) { copy(e.F, off.Scan(synth.Liquid{}, rnd).F) }
		}},
		{"raman-law", func(_ *synth.Survey, b *synth.Bottle) {
			b.Spoil = func(e *eem.EEM, _ *rand.Rand) {
				for i := range e.Row(4) { // ex 290, a fault of the lamp's reference
					e.Row(4)[i] = 60 + 1.4*(e.Row(4)[i]-60)
				}
			}
		}},
	} {
		t.Run(c.test, func(t *testing.T) {
			s := forty(t)
			c.blank(s, find(s, "PW1-1"))
			dir := t.TempDir()
			if err := s.Write(dir); err != nil {
				t.Fatal(err)
			}
			sv := prepared(t, dir, 0)
			got := map[string]int{}
			for _, f := range sv.Flags {
				if f.Test == c.test {
					got[f.ID]++
				}
			}
			for _, b := range sv.Bottles {
				want := 0
				switch {
				case b.Row.Kind == "blank" && b.Row.Measured.Day() == "2031-05-06":
					// Of two blanks that drift apart nobody knows which is wrong, and
					// wavelengths show on two lines.
					if n := got["PW1-1"] + got["PW1-2"]; n < 1 || (c.test != "blank-drift" && got["PW1-2"] > 0) {
						t.Errorf("the blanks are flagged %d and %d times", got["PW1-1"], got["PW1-2"])
					}
					continue
				case b.Row.Kind == "blank":
				case b.Row.Measured.Day() == "2031-05-06":
					want = 1
				}
				if got[b.Row.ID] != want {
					t.Errorf("%s: flagged %d times, want %d", b.Row.ID, got[b.Row.ID], want)
				}
			}
		})
	}
}

// The spectra through the brightest spot of a contaminated blank, less those of its
// neighbour, are the contaminant's; the flag names the place and what it is like.
func TestContaminationSpectrum(t *testing.T) {
	s := forty(t)
	of := synth.Substance("brightener")
	b := find(s, "PW1-1")
	b.Liquid = b.Liquid.With(synth.Dose{Of: of, Amount: 2})
	dir := t.TempDir()
	if err := s.Write(dir); err != nil {
		t.Fatal(err)
	}
	sv := prepared(t, dir, 0)
	g := find2(t, sv, "PW1-1").Glow
	if g == nil || math.Abs(g.ExNM-350) > 10 || math.Abs(g.EmNM-432) > 12 { // where the brightener is brightest
		t.Fatalf("brightest spot %+v", g)
	}
	for _, c := range []struct {
		what   string
		points []prepare.GlowPoint
		of     synth.Band
	}{{"excitation", g.Excitation, of.Absorbs}, {"emission", g.Emission, of.Emits}} {
		var ab, aa, bb float64
		n := 0
		for _, p := range c.points {
			if v := p.Percent - p.Others; !math.IsNaN(v) {
				w := c.of.At(p.NM)
				ab, aa, bb, n = ab+v*w, aa+v*v, bb+w*w, n+1
			}
		}
		if cos := ab / math.Sqrt(aa*bb); n < 10 || cos < 0.99 {
			t.Errorf("%s: congruence %.4f over %d points with the contaminant's", c.what, cos, n)
		}
	}
	for _, f := range sv.Flags {
		if f.ID == "PW1-1" && f.Test == "blank-level" && !strings.Contains(f.Msg, "like peak C, humic-like; its spectra stand in blanks.csv") {
			t.Error(f.Msg)
		}
	}
}

// A batch of which most bottles failed is rejected, and so is one of two that has
// neither blank nor scale; the other batch is not.
func TestBatchesRejected(t *testing.T) {
	for test, change := range map[string]func(*synth.Survey){
		"batch-rejected": func(s *synth.Survey) {
			for i := range s.Bottles {
				if b := &s.Bottles[i]; b.Measured.Day() == 6 {
					b.Closed = b.Kind == "sample"
				}
			}
		},
		"batch-scale": func(s *synth.Survey) {
			s.Bottles = slices.DeleteFunc(s.Bottles, func(b synth.Bottle) bool { return b.Kind == "blank" && b.Measured.Day() == 6 })
		},
	} {
		for _, limit := range []string{"", "[quality]\nlimit = {batch-rejected = 1}\n"} {
			s := forty(t)
			s.Settings = limit
			change(s)
			dir := t.TempDir()
			if err := s.Write(dir); err != nil {
				t.Fatal(err)
			}
			var got []string
			for _, f := range prepared(t, dir, 0).Flags {
				if f.Severity == eem.Reject && f.ID == "" {
					got = append(got, f.Batch+" "+f.Test)
				}
			}
			want := []string{"2031-05-06 " + test}
			if limit != "" && test == "batch-rejected" {
				want = nil
			}
			if !slices.Equal(got, want) {
				t.Errorf("%s, %q: rejected are %v, want %v", test, limit, got, want)
			}
		}
	}
}

// A blank of another day's water is contaminated for the bottles: more of their
// cells lie below zero than noise explains.
func TestNegativeAfterBlank(t *testing.T) {
	s := forty(t)
	for _, id := range []string{"PW1-1", "PW1-2"} {
		b := find(s, id)
		b.Liquid = b.Liquid.With(synth.Dose{Of: synth.Substance("dyestuff"), Amount: 20})
	}
	dir := t.TempDir()
	if err := s.Write(dir); err != nil {
		t.Fatal(err)
	}
	n := 0
	for _, f := range prepared(t, dir, 0).Flags {
		if f.Test == "negative" {
			n++
		}
		if f.Test == "negative" && f.Batch != "2031-05-06" {
			t.Errorf("%s is flagged: %s", f.ID, f.Msg)
		}
	}
	if n < 15 {
		t.Errorf("%d bottles of the day are flagged, want nearly all 20", n)
	}
}

// variant writes the survey of forty with settings and an edited sheet, and reads
// it.
func variant(t *testing.T, settings string, sheet func(string) string, change func(*synth.Survey)) *prepare.Survey {
	t.Helper()
	s := forty(t)
	s.Bottles = slices.DeleteFunc(s.Bottles, func(b synth.Bottle) bool { return strings.HasPrefix(b.ID, "S0") && b.ID > "S006" })
	correct, here := strings.CutPrefix(settings, "[correct]\n")
	if !here {
		s.Settings, correct = settings, ""
	}
	if change != nil {
		change(s)
	}
	dir := t.TempDir()
	if err := s.Write(dir); err != nil {
		t.Fatal(err)
	}
	name := filepath.Join(dir, "survey.toml")
	write(t, name, strings.Replace(readText(t, name), "[correct]\n", "[correct]\n"+correct, 1))
	if sheet != nil {
		name := filepath.Join(dir, "runsheet.csv")
		write(t, name, sheet(readText(t, name)))
	}
	return prepared(t, dir, 0)
}

// Each step can be switched off by name; what is left out stands in the notes.
func TestStepsOff(t *testing.T) {
	plain := variant(t, "", nil, nil)
	at := func(sv *prepare.Survey) float64 { return find2(t, sv, "S002").EEM.Interp(350, 450) }
	for _, step := range []string{"offset", "spectral", "inner-filter", "blank", "intensity", "scatter"} {
		sv := variant(t, "[correct]\noff = [\""+step+"\"]\n", nil, nil)
		b := find2(t, sv, "S002")
		if at(sv) == at(plain) && step != "scatter" {
			t.Errorf("without %s the same number comes out: %g", step, at(sv))
		}
		if step == "intensity" && sv.Unit != eem.Counts {
			t.Errorf("the unit is %s without a scale", sv.Unit)
		}
		if step == "scatter" && (b.EEM.Why[b.EEM.Index(5, 10)] != eem.Measured || slices.Contains(b.EEM.Why, eem.Rayleigh1)) {
			t.Error("cells are masked though scatter is off")
		}
		if !slices.ContainsFunc(b.EEM.Notes, func(n eem.Note) bool { return n.Msg == step+" switched off" }) {
			t.Errorf("no note tells that %s was switched off", step)
		}
	}
	spiky := func(s *synth.Survey) {
		find(s, "S002").Spoil = func(e *eem.EEM, _ *rand.Rand) { e.F[e.Index(14, 75)] += 3e4 }
	}
	for text, want := range map[string]eem.Reason{"": eem.Spike, "[correct]\noff = [\"spikes\"]\n": eem.Measured} {
		b := find2(t, variant(t, text, nil, spiky), "S002")
		if got := b.EEM.Why[b.EEM.Index(14, 75)]; got != want {
			t.Errorf("%q: the spike's cell is %v, want %v", text, got, want)
		}
	}
}

// Fluorescence lost by warming comes back: 1 %/°C at 30 °C is F/0.9 at 20 °C
// (Watras et al. 2011, from memory). A bottle without temperature is told.
func TestTemperature(t *testing.T) {
	warm := func(s *synth.Survey) { find(s, "S002").TemperatureC = 30; find(s, "S003").TemperatureC = 20 }
	plain := variant(t, "", nil, warm)
	sv := variant(t, "[correct]\ntemperature = {reference_c = 20, percent_per_c = 1}\n", nil, warm)
	for id, want := range map[string]float64{"S002": 1 / 0.9, "S003": 1, "S004": 1} {
		r := find2(t, sv, id).EEM.Interp(350, 450) / find2(t, plain, id).EEM.Interp(350, 450)
		if math.Abs(r-want) > 1e-12 {
			t.Errorf("%s: %g times, want %g", id, r, want)
		}
		if told := said(sv)[id+" no-temperature"] > 0; told != (id == "S004") {
			t.Errorf("%s: no-temperature %v", id, told)
		}
	}
}

// A bottle whose batch has no blank takes the latest of its setup, but none that
// is older than the limit.
func TestLatestBlank(t *testing.T) {
	drop := func(s *synth.Survey) {
		s.Bottles = slices.DeleteFunc(s.Bottles, func(b synth.Bottle) bool { return strings.HasPrefix(b.ID, "PW2") })
	}
	for text, want := range map[string]int{
		"[correct]\nblank = \"latest\"\n":                           2,
		"[correct]\nblank = \"latest\"\nblank_max_age_days = 0.5\n": 0,
		"[correct]\nblank = \"latest\"\nblank_max_age_days = 0\n":   2,
		"[correct]\nblank = \"batch-mean\"\n":                       0,
	} {
		sv := variant(t, text, nil, drop)
		b := find2(t, sv, "S002") // of the second day
		if len(b.Blanks()) != want || (said(sv)["S002 no-blank"] > 0) != (want == 0) {
			t.Errorf("%q: %d blanks, flagged %v", text, len(b.Blanks()), flagsOf(sv, "S002"))
		}
	}
}

// A batch that borrows blanks says so. Where the lamp has fallen by 10 % since, its
// bottles' own light tells: a doubt on the batch, and in the uncertainty of the scale.
func TestBorrowedBlank(t *testing.T) {
	for _, power := range []float64{1, 0.9} {
		sv := variant(t, "[correct]\nblank = \"latest\"\n", nil, func(s *synth.Survey) {
			day := find(s, "S002").Measured.YearDay()
			last := find(s, "PW1-1").Power
			for i := range s.Bottles {
				if b := &s.Bottles[i]; b.Measured.YearDay() == day {
					b.Power = last * power
				}
			}
			s.Bottles = slices.DeleteFunc(s.Bottles, func(b synth.Bottle) bool { return strings.HasPrefix(b.ID, "PW2") })
		})
		b := find2(t, sv, "S002")
		bt := sv.Find(b.Batch)
		told := map[string]eem.Flag{}
		for _, f := range sv.Flags {
			if f.ID == "" && f.Batch == b.Batch {
				told[f.Test] = f
			}
		}
		if f := told["blank-borrowed"]; !strings.Contains(f.Msg, "PW1-1, PW1-2 of batch") || !(f.Value > 0.5 && f.Value < 1.5) {
			t.Errorf("power %g: %+v", power, f)
		}
		f, doubt := told["blank-drift"]
		if doubt != (power < 1) || doubt && (f.Severity != eem.Doubt || math.Abs(f.Value+10) > 2) {
			t.Errorf("power %g: %+v", power, f)
		}
		if u := bt.ScaleU(); math.Abs(u-(1-power)) > 0.02 {
			t.Errorf("power %g: the scale is known to %g", power, u)
		}
		if !slices.ContainsFunc(b.Causes, func(c eem.Cause) bool { return c.Key == b.Batch && math.Abs(c.U-(1-power)) < 0.02 }) {
			t.Errorf("power %g: causes %+v", power, b.Causes)
		}
		if !slices.ContainsFunc(b.EEM.Notes, func(n eem.Note) bool {
			return slices.ContainsFunc(n.Params, func(p eem.Param) bool {
				return p.Name == "Raman area" && strings.Contains(p.Source, "PW1-1, PW1-2 of batch")
			})
		}) {
			t.Error("the steps do not name the blanks")
		}
	}
}

// A batch without Raman area among others in Raman units rejects its bottles; it
// never divides by the area it lacks.
func TestNoRamanArea(t *testing.T) {
	settings := "[intensity]\nunit = \"raman\"\n[setup.done]\nscans.applied = [\"blank\", \"intensity\"]\n"
	sv := variant(t, settings, func(text string) string {
		// One batch, whose first bottle came scaled and whose second did not.
		lines := strings.Split(strings.TrimSpace(text), "\n")
		head := strings.Split(lines[0], ",")
		setup, batch := slices.Index(head, "setup"), slices.Index(head, "batch")
		if setup < 0 {
			lines[0] += ",setup"
		}
		if batch < 0 {
			lines[0] += ",batch"
		}
		out := lines[:1]
		for _, l := range lines[1:] {
			cells := strings.Split(l, ",")
			if cells[1] == "blank" {
				continue
			}
			set := map[bool]string{true: "done"}[len(out) == 1]
			if setup >= 0 {
				cells[setup] = set
			} else {
				cells = append(cells, set)
			}
			if batch >= 0 {
				cells[batch] = "one"
			} else {
				cells = append(cells, "one")
			}
			out = append(out, strings.Join(cells, ","))
		}
		return strings.Join(out, "\n") + "\n"
	}, nil)
	got := said(sv)
	if n := len(slices.Collect(maps.Keys(got))); n == 0 || got["S002 raman-range"] != 1 {
		t.Errorf("S002 has no scale and is not rejected: %v", flagsOf(sv, "S002"))
	}
}

// Quinine units come with the line's uncertainty, shared by the batch.
func TestQuinineUnits(t *testing.T) {
	sv := variant(t, "[intensity]\nunit = \"quinine\"\n", func(text string) string {
		return strings.Replace(text, "conc:brightener", "conc:quinine sulfate", 1)
	}, func(s *synth.Survey) {
		b := synth.Substance("brightener")
		s.Components = append(s.Components, b)
		for i, day := range []string{"PW1-1", "PW1-2", "PW2-1", "PW2-2"} {
			like := find(s, day)
			for n, amount := range []float64{2, 4} {
				dose := []synth.Dose{{Of: b, Amount: amount}}
				s.Bottles = append(s.Bottles, synth.Bottle{ID: "Q" + day[2:] + string(rune('a'+n)), Kind: "standard", Measured: like.Measured,
					Power: like.Power * (1 + 0.01*float64(i%2)), Liquid: synth.Liquid{Doses: dose}, Known: dose, Layout: like.Layout})
			}
		}
	})
	if sv.Unit != eem.Quinine {
		t.Fatalf("unit %s", sv.Unit)
	}
	for _, bt := range sv.Batches {
		if q := bt.Quinine; q.N < 4 || !(q.U > 0) || q.U > 0.05*q.Slope || math.Abs(bt.ScaleU()-q.U/q.Slope) > 1e-15 {
			t.Errorf("batch %s: %+v, scale %g", bt.Name, q, bt.ScaleU())
		}
	}
	b := find2(t, sv, "Q1-1a")
	if v := b.EEM.Interp(350, 450); math.Abs(v-2) > 0.05 {
		t.Errorf("2 µg/L reads %g at ex 350 / em 450", v)
	}
	if !slices.ContainsFunc(b.Causes, func(c eem.Cause) bool { return c.Scope == eem.OfBatch && c.Key == b.Batch && c.U > 0 }) {
		t.Errorf("the scale's uncertainty is no cause: %+v", b.Causes)
	}
}

// Results do not depend on the number of workers.
func TestWorkers(t *testing.T) {
	dir := t.TempDir()
	s := forty(t)
	s.Settings = "[scatter]\nrayleigh.first = \"auto\"\nraman.first = \"auto\"\n"
	if err := s.Write(dir); err != nil {
		t.Fatal(err)
	}
	a, b := prepared(t, dir, 1), prepared(t, dir, 7)
	for i := range a.Bottles {
		for c, v := range a.Bottles[i].EEM.F {
			if w := b.Bottles[i].EEM.F[c]; math.Float64bits(v) != math.Float64bits(w) {
				t.Fatalf("%s, cell %d: %g and %g", a.Bottles[i].Row.ID, c, v, w)
			}
		}
	}
	if set := a.Settings.Scatter; set.Rayleigh.First.Auto || set.Raman.First.ToCM == 0 || set != b.Settings.Scatter {
		t.Errorf("bands found: %+v and %+v", set, b.Settings.Scatter)
	}
}

// From which excitation on the water is thin enough is stated for every bottle; it
// is a finding only where the inner filter is not corrected.
func TestLinearRange(t *testing.T) {
	brown := func(s *synth.Survey) {
		b := find(s, "S002")
		b.Liquid = synth.Liquid{Color: synth.Tail{At254: 0.1, Slope: 0.015}} // ln(10)·A = 0.05 at 254 + ln(4.6)/0.015 = 355.8 nm
	}
	for off, want := range map[string]int{"": 0, "[correct]\noff = [\"inner-filter\"]\n": 1} {
		sv := variant(t, off, nil, brown)
		b := find2(t, sv, "S002")
		if b.LinearFrom != 360 {
			t.Errorf("linear from %g nm, want 360", b.LinearFrom)
		}
		if got := said(sv)["S002 linear-range"]; got != want {
			t.Errorf("%q: flagged %d times, want %d", off, got, want)
		}
	}
}

// Brown water without absorbance that was scanned at two dilutions is corrected by
// them (METHODS 1.5) as its absorbance, left out here, corrects it: within 3 % a
// scan, of up to 40 % that the inner filter took.
func TestControlledDilution(t *testing.T) {
	two := func(absorbance bool) func(*synth.Survey) {
		return func(s *synth.Survey) {
			a, b := find(s, "S002"), find(s, "S004") // of one day
			a.Liquid.Color = synth.Tail{At254: 0.5, Slope: 0.015}
			b.Liquid, b.Dilution, b.ReplicateOf = a.Liquid, 2, a.ID
			a.NoAbsorbance, b.NoAbsorbance = !absorbance, !absorbance
		}
	}
	with, without := variant(t, "", nil, two(true)), variant(t, "", nil, two(false))
	for _, id := range []string{"S002", "S004"} {
		a, b := find2(t, with, id).EEM, find2(t, without, id).EEM
		worst := 0.0
		for x := range a.Ex.Len() { // sums over a scan: single cells are noisy, √5 times as noisy as one scan
			var sa, sb float64
			for k, v := range a.Row(x) {
				if i := a.Index(x, k); a.Why[i] == eem.Measured && b.Why[i] == eem.Measured {
					sa, sb = sa+v, sb+b.F[i]
				}
			}
			worst = max(worst, math.Abs(sb/sa-1))
		}
		t.Logf("%s: a scan is off by %.2f %% at most", id, 100*worst)
		if !(worst < 0.03) {
			t.Errorf("%s: off by %.1f %%", id, 100*worst)
		}
		for _, test := range []string{"no-absorbance", "dilution-differs"} {
			if said(without)[id+" "+test] > 0 || said(with)[id+" "+test] > 0 {
				t.Errorf("%s is flagged: %s", id, test)
			}
		}
	}
}

// The scan of a mercury lamp whose lines lie 1.6 nm too high is flagged for each
// batch; one that is right to 0.3 nm is not, and a scan without lines is an error.
func TestLamp(t *testing.T) {
	scan := func(off float64) string {
		var b strings.Builder
		b.WriteString("wavelength_nm,counts\n")
		for nm := 240.0; nm <= 600; nm += 0.5 {
			v := 20.0
			for i, line := range []float64{253.652, 296.728, 302.150, 334.148, 404.656, 435.833, 546.074} {
				z := (nm - line - off) / 0.9
				v += 1000 * float64(i+2) * math.Exp(-z*z/2)
			}
			fmt.Fprintf(&b, "%g,%.1f\n", nm, v)
		}
		return b.String()
	}
	for off, want := range map[float64]int{0.3: 0, 1.6: 2} {
		s := forty(t)
		s.Bottles = slices.DeleteFunc(s.Bottles, func(b synth.Bottle) bool { return strings.HasPrefix(b.ID, "S0") && b.ID > "S004" })
		dir := t.TempDir()
		if err := s.Write(dir); err != nil {
			t.Fatal(err)
		}
		name := filepath.Join(dir, "survey.toml")
		write(t, name, strings.Replace(readText(t, name), "[correct]\n", "[correct]\nlamp_scan = \"correction/lamp.csv\"\n", 1))
		text := scan(off)
		if want > 0 { // as an instrument exports it
			text = "Fluorometer F-1\r\nSlit\t2.5 nm\r\n\r\nWavelength (nm)\tCounts\r\n" +
				strings.NewReplacer("wavelength_nm,counts\n", "", ",", "\t", "\n", "\r\n").Replace(text) + "End of scan\r\n"
		}
		write(t, filepath.Join(dir, "correction", "lamp.csv"), text)
		if got := said(prepared(t, dir, 0))[" lamp-lines"]; got != want {
			t.Errorf("lines off by %g nm: %d batches flagged, want %d: %v", off, got, want, flagsOf(prepared(t, dir, 0), ""))
		}
	}
}
