package synth

import (
	"bytes"
	"cmp"
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

func TestDemoBottles(t *testing.T) {
	s := Demo(1)
	count := map[string]int{}
	ids := map[string]bool{}
	duplicates := 0
	for _, b := range s.Bottles {
		count[b.Kind]++
		ids[b.ID] = true
		if b.ReplicateOf != "" {
			duplicates++
		}
	}
	want := map[string]int{"sample": 36, "blank": 6, "field-blank": 3, "standard": 20, "control": 3, "spike": 1}
	for kind, n := range want {
		if count[kind] != n {
			t.Errorf("%d of kind %s, want %d", count[kind], kind, n)
		}
	}
	if len(ids) != len(s.Bottles) || len(s.Bottles) != 69 || duplicates != 3 {
		t.Errorf("%d bottles, %d ids, %d duplicates", len(s.Bottles), len(ids), duplicates)
	}
	for _, f := range s.Faults() {
		if _, ok := eem.FindTest(f.Test); !ok || !ids[f.ID] {
			t.Errorf("fault %+v names no bottle or no test", f)
		}
	}
}

// The raw numbers must show what the faults say, for any seed.
func TestDemoHoldsItsFaults(t *testing.T) {
	for seed := range uint64(10) {
		s := Demo(seed)
		for i, b := range s.Bottles {
			e, a := s.Raw(i)
			clipped := maxOf(e.F) >= s.Instrument.Saturation
			if want := b.ID == "W207"; clipped != want {
				t.Errorf("seed %d, %s: clipped %v, largest count %g", seed, b.ID, clipped, maxOf(e.F))
			}
			if want := b.ID == "W204" || b.Kind == "blank"; (a == nil) != want {
				t.Errorf("seed %d, %s: absorbance missing %v", seed, b.ID, a == nil)
			}
			if dark := maxOf(e.F) < s.Instrument.Offset+10*s.Instrument.Read; dark != (b.ID == "W306") {
				t.Errorf("seed %d, %s: dark %v", seed, b.ID, dark)
			}
			if a != nil {
				brown := a.PerCM(260)+a.PerCM(300) > 1.5 // limit of the inner-filter correction, Kothawala et al. 2013
				if brown != (b.ID == "W101") {
					t.Errorf("seed %d, %s: A260 + A300 = %.3f", seed, b.ID, a.PerCM(260)+a.PerCM(300))
				}
			}
			for _, l := range levels {
				above := b.Liquid.Amount(l.of) > l.amount[3]
				if b.ID == "W207" && l.of == brightener && !above {
					t.Errorf("seed %d: W207 is not above the standards", seed)
				}
			}
		}
	}
}

// A plain chain of corrections and an unconstrained least squares, written here
// alone, must find the truth again: median error under 3 % for every component.
func TestDemoRecoversTruth(t *testing.T) {
	for _, seed := range []uint64{0, 1, 2, 31} {
		s := Demo(seed)
		found := solve(t, s)
		for id, v := range found {
			if strings.HasPrefix(id, "FB") {
				continue // nothing in it to be explained
			}
			if spill := v["explained"] < 0.9; spill != (id == "W310") {
				t.Errorf("seed %d, %s: references explain %.1f %% of the signal", seed, id, 100*v["explained"])
			}
		}
		errs := map[string][]float64{}
		for _, r := range s.Truth() {
			if v, ok := found[r.ID]; ok && r.Value > 0 {
				errs[r.Component] = append(errs[r.Component], math.Abs(v[r.Component]/r.Value-1))
			}
		}
		for _, f := range s.Components {
			e := errs[f.Name]
			slices.Sort(e)
			median, p90 := stat.Quantile(0.5, stat.Empirical, e, nil), stat.Quantile(0.9, stat.Empirical, e, nil)
			t.Logf("seed %d %-14s n %d: median %.2f %%, 90 %% of bottles under %.2f %%, worst %.1f %%", seed, f.Name, len(e), 100*median, 100*p90, 100*e[len(e)-1])
			if median > 0.03 {
				t.Errorf("seed %d %s: median error %.1f %%, want < 3 %%", seed, f.Name, 100*median)
			}
		}
	}
}

// solve returns contributions by id and component, in the bottle, and under
// "explained" the share of the sum of squares.
func solve(t *testing.T, s *Survey) map[string]map[string]float64 {
	t.Helper()
	day := func(b Bottle) int { return b.Measured.Day() }
	blanks, scale := map[int][]float64{}, map[int]float64{}
	cells := make([][]float64, len(s.Bottles))
	for i, b := range s.Bottles {
		cells[i] = corrected(s, i)
		if b.Kind == "blank" {
			if blanks[day(b)] == nil {
				blanks[day(b)] = make([]float64, len(cells[i]))
			}
			for c, v := range cells[i] {
				blanks[day(b)][c] += v / 2
			}
		}
	}
	in := s.Instrument
	for d, b := range blanks {
		j, _ := in.Ex.Find(350)
		for k := range in.Em.Len() {
			if nm := in.Em.At(k); nm >= 371 && nm <= 428 {
				scale[d] += 2 * b[in.Index(j, k)]
			}
		}
	}
	for i, b := range s.Bottles {
		for c := range cells[i] {
			cells[i][c] = (cells[i][c] - blanks[day(b)][c]) / scale[day(b)] * max(b.Dilution, 1)
		}
	}
	refs := slopes(s, cells)
	out := map[string]map[string]float64{}
	for i, b := range s.Bottles {
		if b.Kind == "blank" || b.Kind == "standard" || b.Closed {
			continue
		}
		out[b.ID] = leastSquares(t, s, cells[i], refs)
	}
	return out
}

// corrected undoes offset, lamp, detector and inner filter (centre form); NaN at
// the limit and 12 nm around the Rayleigh lines.
func corrected(s *Survey, i int) []float64 {
	e, a := s.Raw(i)
	in := s.Instrument
	fEx, fEm := in.ExcitationFactors(in.Ex), in.EmissionFactors(in.Em)
	for j := range in.Ex.Len() {
		for k := range in.Em.Len() {
			ex, em, c := in.Ex.At(j), in.Em.At(k), in.Index(j, k)
			if e.F[c] >= in.Saturation || em <= ex+12 || math.Abs(em-2*ex) <= 12 {
				e.F[c] = math.NaN()
				continue
			}
			e.F[c] = (e.F[c] - in.Offset) * fEx[j] * fEm[k]
			if a != nil {
				e.F[c] *= math.Pow(10, (a.PerCM(ex)+a.PerCM(em))/2)
			}
		}
	}
	return e.F
}

func slopes(s *Survey, cells [][]float64) [][]float64 {
	refs := make([][]float64, len(s.Components))
	for f, of := range s.Components {
		refs[f] = make([]float64, s.Instrument.Cells())
		cc := 0.0
		for i, b := range s.Bottles {
			if b.Kind == "standard" && b.Liquid.Amount(of) > 0 {
				c := b.Known[0].Amount
				cc += c * c
				for n, v := range cells[i] {
					refs[f][n] += c * v
				}
			}
		}
		for n := range refs[f] {
			refs[f][n] /= cc
		}
	}
	return refs
}

func leastSquares(t *testing.T, s *Survey, x []float64, refs [][]float64) map[string]float64 {
	t.Helper()
	var a, b []float64
	for c, v := range x {
		if math.IsNaN(v) || math.IsNaN(refs[0][c]) {
			continue
		}
		b = append(b, v)
		for f := range refs {
			a = append(a, refs[f][c])
		}
	}
	var sol mat.VecDense
	if err := sol.SolveVec(mat.NewDense(len(b), len(refs), a), mat.NewVecDense(len(b), b)); err != nil {
		t.Fatal(err)
	}
	out := map[string]float64{"explained": 1}
	for f, of := range s.Components {
		out[of.Name] = sol.AtVec(f)
	}
	var r mat.VecDense
	r.MulVec(mat.NewDense(len(b), len(refs), a), &sol)
	r.SubVec(mat.NewVecDense(len(b), b), &r)
	out["explained"] -= mat.Dot(&r, &r) / mat.Dot(mat.NewVecDense(len(b), b), mat.NewVecDense(len(b), b))
	return out
}

func TestDemoWritesSameBytes(t *testing.T) {
	a, b := t.TempDir(), filepath.Join(t.TempDir(), "new")
	for _, dir := range []string{a, b} {
		if err := Demo(1).Write(dir); err != nil {
			t.Fatal(err)
		}
	}
	n := 0
	for f := range Demo(1).Files() {
		n++
		for _, dir := range []string{a, b} {
			have, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(f.Path)))
			if err != nil || !bytes.Equal(have, f.Data) {
				t.Fatalf("%s: %v", f.Path, err)
			}
		}
	}
	if err := Demo(1).Write(a); err != nil {
		t.Errorf("writing the same again: %v", err)
	}
	// 5 + 46 stacks of 43 (36 samples, spike, 6 blanks, 3 field blanks) + 23 grids + 62 absorbances
	if want := 5 + 46*43 + 23 + 62; n != want {
		t.Errorf("%d files, want %d", n, want)
	}
}

func TestWriteOverwritesNothing(t *testing.T) {
	s := Demo(1)
	s.Bottles = s.Bottles[:3]
	full := t.TempDir()
	if err := os.WriteFile(filepath.Join(full, "thesis.txt"), []byte("mine"), 0o644); err != nil {
		t.Fatal(err)
	}
	if err := s.Write(full); err == nil || !strings.Contains(err.Error(), full) {
		t.Errorf("a folder with other files: %v", err)
	}
	if entries, _ := os.ReadDir(full); len(entries) != 1 {
		t.Errorf("%d entries after a refusal", len(entries))
	}
	ours := filepath.Join(t.TempDir(), "a", "b")
	if err := s.Write(ours); err != nil {
		t.Fatal(err)
	}
	sheet := filepath.Join(ours, "runsheet.csv")
	if err := os.WriteFile(sheet, []byte("edited"), 0o644); err != nil {
		t.Fatal(err)
	}
	if err := s.Write(ours); err == nil || !strings.Contains(err.Error(), sheet) {
		t.Errorf("an edited sheet: %v", err)
	}
	if have, _ := os.ReadFile(sheet); string(have) != "edited" {
		t.Error("an edited sheet was overwritten")
	}
}

// Every form of a bottle must hold the very numbers of Raw.
func TestFormsHoldRawNumbers(t *testing.T) {
	s := Demo(4)
	for _, l := range []Layout{{}, {Form: Matrix, Delimiter: ";", DecimalComma: true, CRLF: true}, {Form: Long, Delimiter: ","}} {
		s.Bottles[1].Layout = l
		e, _ := s.Raw(1)
		if got := readBack(t, l, s.Bottles[1].ID, e); !slices.Equal(got, e.F) {
			t.Errorf("%+v: numbers differ from Raw", l)
		}
	}
}

func readBack(t *testing.T, l Layout, id string, e *eem.EEM) []float64 {
	t.Helper()
	out := make([]float64, e.Cells())
	for j, f := range l.files(id, e) {
		text := string(f.Data)
		if l.CRLF != strings.Contains(text, "\r\n") {
			t.Errorf("%s: line ends", f.Path)
		}
		lines := strings.Split(strings.TrimSpace(strings.ReplaceAll(text, "\r\n", "\n")), "\n")
		for n, line := range lines {
			c := strings.Split(line, cmp.Or(l.Delimiter, "\t"))
			switch {
			case l.Form == Stack && n >= 2:
				out[e.Index(j, n-2)] = parse(t, c[1])
			case l.Form == Matrix && n >= 1:
				for j := range e.Ex.Len() {
					out[e.Index(j, n-1)] = parse(t, c[1+j])
				}
			case l.Form == Long && n >= 1:
				out[n-1] = parse(t, c[2])
			}
		}
	}
	return out
}

func parse(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(strings.Replace(s, ",", ".", 1), 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func TestSheet(t *testing.T) {
	s := Demo(1)
	rows, err := csv.NewReader(bytes.NewReader(s.sheet())).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	want := []string{"id", "kind", "scans", "absorbance", "sampled", "measured", "site", "dilution", "replicate_of", "spike_of",
		"doc_mg_per_l", "temperature_c", "conc:tryptophan [µg/L]", "conc:peat extract [mg/L]", "conc:algal extract [mg/L]",
		"conc:brightener [µg/L]", "conc:pyrene [µg/L]", "remark"}
	if !slices.Equal(rows[0], want) || len(rows) != 70 {
		t.Errorf("%d rows, header %q", len(rows), rows[0])
	}
}

// What a bottle reads depends on itself alone.
func TestBottlesAreIndependent(t *testing.T) {
	s := Demo(2)
	before, _ := s.Raw(40)
	id := s.Bottles[40].ID
	s.Bottles = slices.Delete(s.Bottles, 3, 9)
	i := slices.IndexFunc(s.Bottles, func(b Bottle) bool { return b.ID == id })
	if after, _ := s.Raw(i); !slices.Equal(before.F, after.F) {
		t.Error("leaving bottles out changed another one's counts")
	}
}

func BenchmarkDemoWrite(b *testing.B) {
	for b.Loop() {
		if err := Demo(1).Write(filepath.Join(b.TempDir(), "demo")); err != nil {
			b.Fatal(err)
		}
	}
}
