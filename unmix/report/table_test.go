package report

import (
	"bytes"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"tarnlight/eem"
)

func TestTableCells(t *testing.T) {
	x := &Table{Name: "x.csv", Columns: []string{"a", "b", "c", "d", "e", "f", "g"}}
	x.Append("say \"hi\", you", 0.1, math.NaN(), 42, true, nil, eem.Doubt)
	x.Append("two\nlines", 1e-9, math.Copysign(0, -1), -1, false, "", eem.Reject)
	var b bytes.Buffer
	must(t, x.Write(&b))
	const want = "a,b,c,d,e,f,g\n\"say \"\"hi\"\", you\",0.1,,42,true,,doubt\n\"two\nlines\",1e-09,0,-1,false,,reject\n"
	if b.String() != want {
		t.Errorf("wrote\n%s\nwant\n%s", b.String(), want)
	}
	dir := t.TempDir()
	must(t, x.WriteFile(dir))
	y, err := ReadTable(filepath.Join(dir, "x.csv"))
	must(t, err)
	if !reflect.DeepEqual(x, y) {
		t.Errorf("came back as %+v", y)
	}
	if y.Float(0, y.Col("b")) != 0.1 || !math.IsNaN(y.Float(0, y.Col("c"))) || !y.Bool(0, 4) || y.Text(0, -1) != "" || !math.IsNaN(y.Float(0, 0)) {
		t.Error("a cell was read wrongly")
	}
}

func TestReadTableNamesTheLine(t *testing.T) {
	path := filepath.Join(t.TempDir(), "flags.csv")
	for content, want := range map[string]string{"": "flags.csv:1", "a,b\n1,2\n3\n": "line 3", "a,b\n1,\"2\n": "line"} {
		must(t, os.WriteFile(path, []byte(content), 0o600))
		_, err := ReadTable(path)
		if err == nil || !strings.Contains(err.Error(), want) || !strings.Contains(err.Error(), "flags.csv") {
			t.Errorf("%q: error %v does not name %q", content, err, want)
		}
	}
}

// The columns that have been released, in their order (the contract of results);
// new ones come behind them.
func TestSchemaOrder(t *testing.T) {
	for name, want := range map[string]string{
		"contributions.csv": "id,component,method,value,unit,standard_uncertainty,lower95,upper95,detection_limit,qualifier,critical_value,quantification_limit,detected,reported,reasons,model",
		"flags.csv":         "id,batch,component,method,test,severity,value,limit,message,file,line",
		"components.csv":    "component,mode,wavelength_nm,loading,standard_uncertainty,determined,method,components,chosen",
	} {
		if got := strings.Join(New(name).Columns, ","); !strings.HasPrefix(got+",", want+",") {
			t.Errorf("%s: %s", name, got)
		}
	}
	for _, f := range Schema {
		seen := map[string]bool{}
		for _, c := range f.Columns {
			if seen[c.Name] || c.What == "" || f.What == "" {
				t.Errorf("%s: column %q twice or without a word", f.Name, c.Name)
			}
			seen[c.Name] = true
		}
	}
}

func TestSamplesKeepTheSheetsColumns(t *testing.T) {
	x := NewSamples([]string{"id", "kind", "notes", "peak_t", "peak_t_found"})
	if got := x.Columns[:5]; !reflect.DeepEqual(got, []string{"id", "kind", "notes", "peak_t", "peak_t_found"}) {
		t.Errorf("the sheet's columns became %v", got)
	}
	for name, want := range map[string]string{"notes": "notes_found", "peak_t": "peak_t_found_found", "doubts": "doubts"} {
		if got := x.Columns[x.Own(name)]; got != want {
			t.Errorf("own column %s is %s, want %s", name, got, want)
		}
	}
	if x.Own("nothing") != -1 || x.Col("notes") != 2 {
		t.Error("columns are found wrongly")
	}
}
