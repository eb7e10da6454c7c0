package main

import (
	"bytes"
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"os"
	"path"
	"path/filepath"
	"runtime/debug"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// damages are what happens to files on their way from an instrument: each changes
// the text of one, nil when the file goes. Lines keep their ends.
var damages = []struct {
	name string
	do   func(text []byte, rnd *rand.Rand) []byte
}{
	{"bytes flipped", func(text []byte, rnd *rand.Rand) []byte {
		text = slices.Clone(text)
		for range 1 + rnd.IntN(8) {
			if len(text) > 0 {
				text[rnd.IntN(len(text))] ^= byte(1 << rnd.IntN(8))
			}
		}
		return text
	}},
	{"line cut", func(text []byte, rnd *rand.Rand) []byte {
		return withLine(text, rnd, func(l [][]byte, i int) [][]byte {
			l[i] = append(slices.Clone(l[i][:rnd.IntN(len(l[i])+1)]), '\n')
			return l
		})
	}},
	{"line gone", func(text []byte, rnd *rand.Rand) []byte {
		return withLine(text, rnd, func(l [][]byte, i int) [][]byte { return slices.Delete(l, i, i+1) })
	}},
	{"line doubled", func(text []byte, rnd *rand.Rand) []byte {
		return withLine(text, rnd, func(l [][]byte, i int) [][]byte { return slices.Insert(l, i, l[i]) })
	}},
	{"lines swapped", func(text []byte, rnd *rand.Rand) []byte {
		return withLine(text, rnd, func(l [][]byte, i int) [][]byte {
			k := rnd.IntN(len(l))
			l[i], l[k] = l[k], l[i]
			return l
		})
	}},
	{"end missing", func(text []byte, rnd *rand.Rand) []byte { return text[:rnd.IntN(len(text)+1)] }},
	{"emptied", func([]byte, *rand.Rand) []byte { return []byte{} }},
	{"removed", func([]byte, *rand.Rand) []byte { return nil }},
}

func withLine(text []byte, rnd *rand.Rand, change func([][]byte, int) [][]byte) []byte {
	lines := bytes.SplitAfter(text, []byte("\n"))
	return bytes.Join(change(lines, rnd.IntN(len(lines))), nil)
}

// hurt is a survey that was damaged: its folder, and the damaged files with what
// they hold now (nil: gone) and what was done to them.
type hurt struct {
	dir  string
	now  map[string][]byte
	what map[string]string
}

func (h hurt) String() string {
	var s []string
	for _, name := range slices.Sorted(maps.Keys(h.what)) {
		s = append(s, name+": "+h.what[name])
	}
	return strings.Join(s, ", ")
}

// damage damages one to three files of the survey in dir. Sheet, settings and
// factors, on which all hangs, are hit in one of four.
func damage(t *testing.T, dir string, clean []synth.File, seed uint64) hurt {
	t.Helper()
	rnd := rand.New(rand.NewPCG(seed, 8))
	h := hurt{dir: dir, now: map[string][]byte{}, what: map[string]string{}}
	few := slices.IndexFunc(clean, func(f synth.File) bool { return strings.HasPrefix(f.Path, "scans/") })
	for range 1 + rnd.IntN(3) {
		i := rnd.IntN(len(clean))
		if rnd.IntN(4) == 0 {
			i = rnd.IntN(few)
		}
		d, f := damages[rnd.IntN(len(damages))], clean[i]
		if now := d.do(f.Data, rnd); f.Path != "truth.csv" && (now == nil || !bytes.Equal(now, f.Data)) {
			h.now[f.Path], h.what[f.Path] = now, d.name
		}
	}
	h.write(t, h.now)
	return h
}

// mend undoes the damage.
func (h hurt) mend(t *testing.T, clean []synth.File) {
	t.Helper()
	was := map[string][]byte{}
	for _, f := range clean {
		if _, ok := h.now[f.Path]; ok {
			was[f.Path] = f.Data
		}
	}
	h.write(t, was)
}

func (h hurt) write(t *testing.T, files map[string][]byte) {
	t.Helper()
	for name, data := range files {
		if data != nil {
			put(t, h.dir, name, string(data))
		} else if err := os.Remove(filepath.Join(h.dir, filepath.FromSlash(name))); err != nil {
			t.Fatal(err)
		}
	}
}

// owner is the bottle that a file belongs to, empty for those that all use.
func owner(file string) string {
	parts := strings.Split(file, "/")
	if parts[0] != "scans" && parts[0] != "absorbance" {
		return ""
	}
	return strings.TrimSuffix(parts[1], path.Ext(parts[1]))
}

// rowsByID maps each id to its rows of a results table. What the model misses is
// looked for in all bottles together, and hangs on all of them.
func rowsByID(t *testing.T, dir, name string) map[string]string {
	tab := table(t, dir, "out", name)
	out := map[string]string{}
	for _, r := range tab.Rows {
		if !slices.Contains(r, "unexplained") {
			out[r[tab.Col("id")]] += strings.Join(r, "|") + "\n"
		}
	}
	return out
}

// Surveys damaged at random: none panics, each ends in 0, 1 or 3, what is wrong is
// said with the name of a file or bottle that was damaged, and bottles that nothing
// happened to, nor to what they rest on, have the numbers of the clean survey.
// TARNLIGHT_DAMAGED is how many, 30 without it, or which, as 123-456.
func TestDamagedSurveys(t *testing.T) {
	testkit.Heavy(t)
	first, last := 1, 30
	if v := os.Getenv("TARNLIGHT_DAMAGED"); v != "" {
		from, to, found := strings.Cut(v, "-")
		if !found {
			from, to = "1", v
		}
		first, last = int(number(t, from)), int(number(t, to))
	}
	sv := smallDemo(t)
	sv.Settings = "[quality]\naccept = { above-standards = \"known\", absorbance-limit = \"known\" }\n"
	clean := slices.Collect(sv.Files())
	whole := t.TempDir()
	if err := sv.Write(whole); err != nil {
		t.Fatal(err)
	}
	call("run", whole, "--pictures=false").want(t, exitDone)
	want := rowsByID(t, whole, "contributions.csv")
	told := rowsByID(t, whole, "flags.csv")
	codes := map[int]int{}
	for seed := first; seed <= last; seed++ {
		h := damage(t, whole, clean, uint64(seed))
		r := callSafely(h.dir)
		codes[r.code]++
		if fault := judge(t, sv, h, r, want, told); fault != "" {
			t.Errorf("seed %d, %s: exit %d, %s", seed, h, r.code, fault)
		}
		h.mend(t, clean)
	}
	t.Logf("%d surveys: %d ended in 0, %d in 1, %d in 3", last-first+1, codes[exitDone], codes[exitFailed], codes[exitDoubt])
}

// callSafely turns a panic into an exit code that nobody wants.
func callSafely(dir string) (r result) {
	defer func() {
		if p := recover(); p != nil {
			r = result{code: -1, err: fmt.Sprintf("panic: %v\n%s", p, debug.Stack())}
		}
	}()
	return call("run", dir, "--pictures=false", "--fresh")
}

// judge says what is wrong with how a damaged survey ended, nothing when it is as
// it should be.
func judge(t *testing.T, sv *synth.Survey, h hurt, r result, want, told map[string]string) string {
	if r.code != exitDone && r.code != exitFailed && r.code != exitDoubt {
		return "which is none of 0, 1 and 3: " + r.err
	}
	text := r.err
	if r.code != exitFailed {
		for id, rows := range rowsByID(t, h.dir, "flags.csv") {
			if rows != told[id] {
				text += id + "\n" + rows
			}
		}
	}
	named := false
	all := len(h.what) == 0
	touched := map[string]bool{}
	for file := range h.what {
		id := owner(file)
		named = named || strings.Contains(text, path.Base(file)) || id != "" && strings.Contains(text, id)
		touched[id] = true
		i := slices.IndexFunc(sv.Bottles, func(b synth.Bottle) bool { return b.ID == id })
		all = all || i < 0 || sv.Bottles[i].Kind == "blank" || sv.Bottles[i].Kind == "standard"
		named = named || i >= 0 && sv.Bottles[i].Kind == "blank" && strings.Contains(text, "the blank")
	}
	if _, set := h.what["survey.toml"]; set && r.code != exitDone {
		return "" // what is left of settings may be lawful, and wrong
	}
	if r.code != exitDone && !named {
		return "and no damaged file is named:\n" + text
	}
	if r.code == exitFailed || all {
		return ""
	}
	got := rowsByID(t, h.dir, "contributions.csv")
	for id, rows := range want {
		switch {
		case !touched[id] && got[id] != rows && !related(sv, id, touched):
			return fmt.Sprintf("and the undamaged %s changed:\n%s%s", id, rows, got[id])
		case touched[id] && !h.digits(id) && !strings.Contains(text, id) && !agrees(t, got[id], rows):
			return fmt.Sprintf("and the damaged %s changed without a word:\n%s%s", id, rows, got[id])
		}
	}
	return ""
}

// related says whether a bottle repeats a damaged one, or is repeated by it: both are
// then in doubt.
func related(sv *synth.Survey, id string, touched map[string]bool) bool {
	return slices.ContainsFunc(sv.Bottles, func(b synth.Bottle) bool {
		of := b.ReplicateOf + b.SpikeOf
		return of != "" && (b.ID == id && touched[of] || of == id && touched[b.ID])
	})
}

// digits says whether damage may have made a number of a bottle into another one,
// which nobody can see.
func (h hurt) digits(id string) bool {
	for file, what := range h.what {
		if owner(file) == id && (what == "bytes flipped" || what == "line cut" || what == "end missing") {
			return true
		}
	}
	return false
}

// agrees says whether the values of two sets of rows agree to three standard
// uncertainties.
func agrees(t *testing.T, got, want string) bool {
	g, w := strings.Split(got, "\n"), strings.Split(want, "\n")
	for i := range min(len(g), len(w)) {
		a, b := strings.Split(g[i], "|"), strings.Split(w[i], "|")
		if len(a) > 5 && len(b) > 5 && a[3] != "" && b[3] != "" && math.Abs(number(t, a[3])-number(t, b[3])) > 3*number(t, b[5]) {
			return false
		}
	}
	return len(g) == len(w)
}
