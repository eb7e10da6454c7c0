package prepare

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"tarnlight/eem/survey"
)

// A file that vanishes between the listing and its turn rejects its bottle, with the
// file's name, and no other; a scan, one of a stack, and an absorbance.
func TestVanishedFiles(t *testing.T) {
	dir := t.TempDir()
	put := func(name, text string) {
		p := filepath.Join(dir, filepath.FromSlash(name))
		if err := os.MkdirAll(filepath.Dir(p), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(p, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	sheet := "id,kind,scans,absorbance\n"
	for i, id := range []string{"A", "B", "C", "D", "E"} {
		for _, ex := range []int{250, 260} {
			put(fmt.Sprintf("scans/%s/%s_ex%d.txt", id, id, ex), fmt.Sprintf("300\t%d\n310\t%d\n320\t12\n", 20+i, 30+2*i+ex))
		}
		put("abs/"+id+".csv", "wavelength_nm,absorbance\n240,0.1\n300,0.05\n400,0.01\n")
		sheet += fmt.Sprintf("%s,sample,scans/%s,abs/%s.csv\n", id, id, id)
	}
	put("runsheet.csv", sheet)
	s, err := survey.ReadSheet(dir, nil)
	if err != nil {
		t.Fatal(err)
	}
	gone := map[string]string{"B": "scans/B/B_ex260.txt", "C": "abs/C.csv", "D": "scans/D"}
	sv, err := Read(context.Background(), dir, s, survey.Default(), Options{Workers: 1, Progress: func(done, _ int, what string) {
		if what == "reading" && done == 1 {
			for _, name := range gone {
				if err := os.RemoveAll(filepath.Join(dir, filepath.FromSlash(name))); err != nil {
					t.Error(err)
				}
			}
		}
	}})
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range sv.Bottles {
		name, lost := gone[b.Row.ID]
		if b.Rejected != lost {
			t.Errorf("%s: rejected %v", b.Row.ID, b.Rejected)
		}
		told := false
		for _, f := range b.Flags {
			told = told || f.Test == "unreadable" && strings.Contains(f.Msg, name) && strings.Contains(f.Msg, "no such file")
		}
		if lost && !told {
			t.Errorf("%s: %+v does not name %s", b.Row.ID, b.Flags, name)
		}
	}
}
