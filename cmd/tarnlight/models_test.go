package main

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/synth"
)

// keptModels is the folder of model files that releases wrote.
const keptModels = root + "/testdata/models"

// kept returns a file of the newest release's folder.
func kept(t *testing.T, name string) string {
	t.Helper()
	list, err := filepath.Glob(filepath.Join(keptModels, "*", name))
	if err != nil || len(list) == 0 {
		t.Fatalf("no %s in %s: %v", name, keptModels, err)
	}
	return list[len(list)-1]
}

// scoredSurvey are six bottles of the demo with their blanks, for a model of the
// demo; tiny is the survey for a model of tiny.
func scoredSurvey(t *testing.T) string {
	return demoFolder(t, func(rows []string) []string {
		return slices.DeleteFunc(rows, func(r string) bool {
			id, rest, _ := strings.Cut(r, ",")
			return id != "id" && !strings.HasPrefix(rest, "blank,") && !slices.Contains([]string{"W102", "W105", "W108", "W203", "W305", "FB1"}, id)
		})
	})
}

// The model files of every release load, and score the same bottles as they did
// when they were kept. Later corrections may be better by a little, so 2 % of the
// component's largest score are allowed; a model that is misread is off by much more.
func TestModelsOfReleases(t *testing.T) {
	list, err := filepath.Glob(filepath.Join(keptModels, "*", "*.json"))
	if err != nil || len(list) < 2 {
		t.Fatalf("%d models in %s (%v); DEVELOPERS.md says how one is kept", len(list), keptModels, err)
	}
	for _, model := range list {
		name := filepath.Base(filepath.Dir(model)) + "/" + filepath.Base(model)
		dir := newTiny().write(t)
		if strings.HasSuffix(model, "parafac.json") {
			dir = scoredSurvey(t)
		}
		call("apply", model, dir, "--pictures=false").want(t, exitDone, exitDoubt)
		got := table(t, dir, "out", "contributions.csv")
		want := table(t, strings.TrimSuffix(model, ".json")+".csv")
		top := map[string]float64{}
		for i := range want.Rows {
			c := want.Text(i, want.Col("component"))
			top[c] = max(top[c], want.Float(i, want.Col("value")))
		}
		for i := range want.Rows {
			id, c, v := want.Text(i, want.Col("id")), want.Text(i, want.Col("component")), want.Float(i, want.Col("value"))
			is := number(t, cell(t, got, "value", "id", id, "component", c, "method", "model"))
			if !(math.Abs(is-v) <= 0.02*top[c]) {
				t.Errorf("%s: %s of %s is %g, was %g", name, c, id, is, v)
			}
		}
		if len(want.Rows) < 10 {
			t.Errorf("%s: only %d scores were kept", name, len(want.Rows))
		}
	}
}

// Keeps the models of the release under way, where TARNLIGHT_KEEP_MODELS names a
// folder for them.
func TestKeepModels(t *testing.T) {
	to := os.Getenv("TARNLIGHT_KEEP_MODELS")
	if to == "" {
		t.Skip("keeps the model files of a release; set TARNLIGHT_KEEP_MODELS to the folder")
	}
	dir := filepath.Dir(filepath.Dir(model5(t)))
	keep := func(name, model, on string) {
		put(t, to, name+".json", read(t, model))
		call("apply", model, on, "--pictures=false").want(t, exitDone, exitDoubt)
		c := table(t, on, "out", "contributions.csv")
		text := "id,component,value\n"
		for i := range c.Rows {
			if c.Text(i, c.Col("method")) == "model" {
				text += fmt.Sprintf("%s,%s,%s\n", c.Text(i, c.Col("id")), c.Text(i, c.Col("component")), c.Text(i, c.Col("value")))
			}
		}
		put(t, to, name+".csv", text)
	}
	keep("parafac", filepath.Join(dir, "out", "model.json"), scoredSurvey(t))
	tiny := newTiny().write(t)
	call("quantify", tiny, "--pictures=false").want(t, exitDone, exitDoubt)
	keep("references", filepath.Join(tiny, "out", "model.json"), newTiny().write(t))
}

// nights writes what the instrument of the demo leaves on a night: a bottle of the
// demo under a name of that day, of which the raw files begin with it.
func night(t *testing.T, dir, day string, bottles map[string]string, change func(b *synth.Bottle)) {
	t.Helper()
	sv := synth.Demo(1)
	all := sv.Bottles
	sv.Bottles = nil
	for _, b := range all {
		if as := bottles[b.ID]; as != "" {
			b.ID = day + "_" + as
			if b.Kind == "sample" {
				b.ReplicateOf, b.Layout = "", synth.Layout{}
			}
			if change != nil {
				change(&b)
			}
			sv.Bottles = append(sv.Bottles, b)
		}
	}
	if len(sv.Bottles) != len(bottles) {
		t.Fatalf("the demo lacks one of %v", bottles)
	}
	for f := range sv.Files() {
		if strings.HasPrefix(f.Path, "scans/") || strings.HasPrefix(f.Path, "absorbance/") || strings.HasPrefix(f.Path, "correction/") {
			put(t, dir, f.Path, string(f.Data))
		}
	}
}

// nightSettings are the demo's, with what a nightly job needs.
func nightSettings(t *testing.T, more string) string {
	t.Helper()
	for f := range synth.Demo(1).Files() {
		if f.Path == "survey.toml" {
			return strings.Replace(string(f.Data), "[correct]\n", "[correct]\nblank = \"latest\"\nblank_max_age_days = 2\n", 1) +
				"\n[sheet]\nname = \"{date}_{id}\"\nkinds = {PW = \"blank\"}\n" + more
		}
	}
	t.Fatal("the demo has no settings")
	return ""
}
