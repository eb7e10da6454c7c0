package unmix_test

import (
	"bytes"
	"encoding/csv"
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
	"tarnlight/unmix"
)

const smallModel = `{"version":1,"method":"parafac","title":"x","unit":"RU","grid":{"excitation_nm":[250,260],"emission_nm":[300,310,320]},
"components":[{"name":"C1","excitation":[1,0.5],"emission":[0.25,1,null],"scale":1},
{"name":"C2","amount_unit":"mg/L","excitation":[0.5,1],"emission":[1,0.5,0.1],"scale":2,"surface":[1,0.5,0.1,2,1,null],"highest_standard":4,"levels":3}],
"cells":[0,1,3,4],"samples":["S1"],"explained_percent":99.5,"corrections":["offset"],"settings":"",
"likeness":{"bottles":20,"rate":0.01,"floor":[0.001,0.001],"mean":[0,0],"inverse":[[1,0],[0,1]],"t2_limit":9,"residual_limit":0.01},
"authors":[],"citation":"","licence":""}`

// FuzzModel: no model file panics or hangs, and one that is read can be applied to
// a bottle and written again.
func FuzzModel(f *testing.F) {
	f.Add([]byte(smallModel))
	f.Add([]byte(strings.ReplaceAll(smallModel, "\n", "")))
	f.Add([]byte(`{"version":1,"components":[{}]}`))
	f.Add([]byte(`[[[[`))
	f.Fuzz(func(t *testing.T, data []byte) {
		var m *unmix.Model
		var err error
		testkit.Bounded(t, len(data), func() { m, err = unmix.ParseModel("model.json", data) })
		if err != nil {
			if !strings.HasPrefix(err.Error(), "model.json:") {
				t.Fatalf("error without place: %v", err)
			}
			return
		}
		if again, err := unmix.ParseModel("again.json", marshal(t, m)); err != nil || !bytes.Equal(marshal(t, m), marshal(t, again)) {
			t.Fatalf("written again: %v", err)
		}
		apply(t, m)
	})
}

// apply scores a bottle on the model's own grid, as long as that is small.
func apply(t *testing.T, m *unmix.Model) {
	t.Helper()
	if m.Grid.Cells() > 10_000 || len(m.Components) > 20 {
		return
	}
	e := eem.New(m.Grid, m.Unit)
	for i := range e.F {
		e.F[i], e.Why[i] = float64(i%7), eem.Measured
	}
	c := eem.NewCube(m.Grid, []string{"S"}, []*eem.EEM{e})
	c.Unit = m.Unit
	r, err := unmix.Quantify(c, m.Set())
	if err != nil || !r.Fits[0].Usable {
		return
	}
	for _, v := range r.Value {
		if !(v >= 0) || math.IsInf(v, 0) {
			t.Fatalf("contributions %v", r.Value)
		}
	}
	if m.Likeness != nil {
		m.Likeness.Distance(r.Value)
	}
}

// FuzzComponents: no reference file panics, and one that is read has spectra on
// its grid.
func FuzzComponents(f *testing.F) {
	f.Add("component,mode,wavelength_nm,loading,unit\nA,excitation,250,1,mg/L\nA,excitation,260,0.5,\nA,emission,300,1,\nA,emission,310,0.2,\nA,scale,,12,\n")
	f.Add("mode,component,loading,wavelength_nm,chosen\nemission,A,1,300,true\nexcitation,A,1,250,true\nemission,A,1,300,false\n")
	f.Fuzz(func(t *testing.T, text string) {
		r := csv.NewReader(strings.NewReader(text))
		r.FieldsPerRecord, r.LazyQuotes = -1, true
		rows, err := r.ReadAll()
		if err != nil || len(rows) == 0 {
			return
		}
		line := make([]int, len(rows)-1)
		for i := range line {
			line[i] = i + 2
		}
		s, err := unmix.ParseComponents("refs.csv", rows[0], rows[1:], line)
		if err != nil {
			if !strings.HasPrefix(err.Error(), "refs.csv:") {
				t.Fatalf("error without place: %v", err)
			}
			return
		}
		for _, c := range s.Components {
			if len(c.Ex) != s.Grid.Ex.Len() || len(c.Em) != s.Grid.Em.Len() || !(c.Scale > 0) {
				t.Fatalf("%+v on %s", c, s.Grid)
			}
		}
	})
}

// Model files that a person or a disk spoiled are refused with what is wrong, and
// those built to cost much cost little.
func TestModelRefusals(t *testing.T) {
	for _, c := range []struct{ old, now, want string }{
		{`"version":1`, `"version":99`, "version 99"},
		{`"version":1`, `"version":0`, "not a model file"},
		{`[300,310,320]`, `[300,310]`, `component 1, "C1": the spectra do not have the length`},
		{`[300,310,320]`, `[310,300,320]`, "wavelengths must increase"},
		{`"excitation":[1,0.5]`, `"excitation":[1,-0.5]`, "loading -0.5"},
		{`"excitation":[1,0.5]`, `"excitation":[1,1e300]`, "loading 1e+300"},
		{`"excitation":[1,0.5]`, `"excitation":[1,1e999]`, "not a model file"},
		{`"scale":2`, `"scale":-2`, `"C2": a scale`},
		{`"scale":2`, `"scale":1e200`, "scale 1e+200"},
		{`[1,0.5,0.1,2,1,null]`, `[1,0.5,0.1,2]`, `"C2": the spectra`},
		{`[1,0.5,0.1,2,1,null]`, `[1,0.5,0.1,2,1,-1e200]`, "in its surface"},
		{`"cells":[0,`, `"cells":[6,`, "cell 6 lies outside"},
		{`"mean":[0,0]`, `"mean":[0]`, "likeness"},
		{`"inverse":[[1,0],[0,1]]`, `"inverse":[[1,0],[0]]`, "likeness"},
		{`"floor":[0.001,0.001]`, `"floor":[0,0.001]`, "floor of 0"},
		{`"grid":{"excitation_nm":[250,260],"emission_nm":[300,310,320]},`, ``, "no wavelengths"},
		{`"authors":[]`, `"authors":`, "not a model file"},
	} {
		text := strings.Replace(smallModel, c.old, c.now, 1)
		if text == smallModel {
			t.Fatalf("%q is not there", c.old)
		}
		if _, err := unmix.ParseModel("m.json", []byte(text)); err == nil || !strings.HasPrefix(err.Error(), "m.json:") || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.now, err, c.want)
		}
	}
	axis := strings.TrimSuffix(strings.Repeat("0,", 5000), ",")
	for what, text := range map[string]string{
		"components": `{"version":1,"components":[` + strings.TrimSuffix(strings.Repeat("{},", 30_000), ",") + `]}`,
		"nulls":      `{"version":1,"components":[{"excitation":[` + strings.TrimSuffix(strings.Repeat("null,", 20_000), ",") + `]}]}`,
		"rows":       `{"version":1,"likeness":{"inverse":[` + strings.TrimSuffix(strings.Repeat("[],", 30_000), ",") + `]}}`,
		"depth":      strings.Repeat("[", 100_000),
		"grid":       `{"version":1,"grid":{"excitation_nm":[` + axis + `],"emission_nm":[` + axis + `]},"components":[{}]}`,
	} {
		testkit.Bounded(t, len(text), func() {
			if _, err := unmix.ParseModel("m.json", []byte(text)); err == nil {
				t.Errorf("%s: no error", what)
			}
		})
	}
}
