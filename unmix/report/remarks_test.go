package report

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"

	"tarnlight/eem"
)

// A doubt on all bottles is told once, in the Summary; a bottle's remarks point to
// it and keep what is its own, though messages hold the "; " that parts them.
func TestDoubtOnAllIsToldOnce(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 9, "parafac").write(t, dir)
	const all = "no number of components passes; two are shown all the same; look at the splits"
	flags, err := ReadTable(filepath.Join(dir, "flags.csv"))
	must(t, err)
	put(flags, "", "", "", "parafac", "no-model-passes", "doubt", nil, nil, all)
	must(t, flags.WriteFile(dir))
	c, err := ReadTable(filepath.Join(dir, "contributions.csv"))
	must(t, err)
	for i := range c.Rows {
		if q := c.Col("qualifier"); c.Rows[i][q] == "" {
			c.Rows[i][q], c.Rows[i][c.Col("reasons")] = "J", all+"; above the highest standard"
		}
	}
	must(t, c.WriteFile(dir))
	set := testSettings()
	set.Pictures = false
	must(t, Render(context.Background(), dir, set, nil))
	f, err := excelize.OpenFile(filepath.Join(dir, "report.xlsx"))
	must(t, err)
	defer f.Close()
	summary, err := f.GetRows("Summary")
	must(t, err)
	told := 0
	for _, row := range summary {
		told += strings.Count(strings.Join(row, "|"), all)
	}
	if told != 1 {
		t.Errorf("the Summary tells it %d times", told)
	}
	rows, err := f.GetRows("Results")
	must(t, err)
	for _, row := range rows[4:5] {
		if last := row[len(row)-1]; last != "above the highest standard; see Summary, doubt on all bottles" {
			t.Errorf("remarks %q", last)
		}
	}
	page, err := os.ReadFile(filepath.Join(dir, "report.html"))
	must(t, err)
	if n := strings.Count(string(page), all); n > 2 { // overview, and the table of models' reasons
		t.Errorf("the page tells it %d times", n)
	}
}

// Of a standard's doubt that the bottle shares, the standard stays and no stump.
func TestLeftover(t *testing.T) {
	for reasons, want := range map[string]string{
		"":                                   "",
		"; standard S1: ; standard S2: ; ":   alsoOn + "S1, S2",
		"; standard S1:; standard S1:; far":  "far|" + alsoOn + "S1",
		"standard S1: saturated; negative":   "standard S1: saturated|negative",
		"above the highest standard; dilute": "above the highest standard|dilute",
	} {
		if got := strings.Join(Leftover(reasons), "|"); got != want {
			t.Errorf("%q: %q, want %q", reasons, got, want)
		}
	}
}

// Row heights follow the widths of the letters: a line that fits takes one line.
func TestLineHeight(t *testing.T) {
	l := cellLetters()
	for text, want := range map[string]float64{"one line": 15, "two\nlines": 27, strings.Repeat("word ", 40): 3 + 12*6, strings.Repeat("m", 100): 3 + 12*6} {
		if got := lineHeight(text, 200, l); got < want-12 || got > want+12 {
			t.Errorf("%.20q: %g, want about %g", text, got, want)
		}
	}
	if narrow, wide := lineHeight("iiiiiiiiiiiiiiiiiiii iiiiiiiii", 120, l), lineHeight("MMMMMMMMMMMMMMMMMMMM MMMMMMMMM", 120, l); narrow != 15 || wide <= 27 {
		t.Errorf("narrow letters %g, wide ones %g", narrow, wide)
	}
}

// A client reads what was found; the figures behind it and the remedy stand where the
// laboratory looks: in the workings, and on the page behind "in detail".
func TestClientReadsShortWords(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 9, "parafac").write(t, dir)
	flags, err := ReadTable(filepath.Join(dir, "flags.csv"))
	must(t, err)
	const found, behind = "something in this bottle is not in the model, which explains 58.7 % of the signal", "its variance is 8690 times that of the noise model"
	put(flags, "TL-0001", "", "", "parafac", "unexplained", "doubt", 0.587, 0.9, found+"; look at its map"+eem.InDetail+behind)
	put(flags, "TL-0001", "", "", "parafac", "unknown", "doubt", 9.0, 5.0, "something unknown; with it in the model the bottle holds 2 instead of 3")
	must(t, flags.WriteFile(dir))
	set := testSettings()
	set.Pictures = false
	must(t, Render(context.Background(), dir, set, nil))
	sheet := func(book, name string, column int) string {
		f, err := excelize.OpenFile(filepath.Join(dir, book))
		must(t, err)
		defer f.Close()
		rows, err := f.GetRows(name)
		must(t, err)
		text := ""
		for _, row := range rows {
			if len(row) > column {
				text += row[column] + "\n"
			}
		}
		return text
	}
	results, err := excelize.OpenFile(filepath.Join(dir, "report.xlsx"))
	must(t, err)
	defer results.Close()
	rows, err := results.GetRows("Results")
	must(t, err)
	if got := rows[4][len(rows[3])-1]; got != found+"; something unknown; with it in the model the bottle holds 2 instead of 3" {
		t.Errorf("remarks %q", got)
	}
	if text := sheet("report.xlsx", "Flags", 4); strings.Contains(text, behind) || !strings.Contains(text, found+"; look at its map\n") {
		t.Errorf("Flags: %s", text)
	}
	if text := sheet("workings.xlsx", "Findings", 8) + sheet("workings.xlsx", "Findings", 7); !strings.Contains(text, behind) {
		t.Errorf("the workings do not hold the figures: %s", text)
	}
	page, err := os.ReadFile(filepath.Join(dir, "report.html"))
	must(t, err)
	if want := `["doubt","` + found + `; look at its map","` + behind + `"]`; !strings.Contains(string(page), want) {
		t.Errorf("the page does not hold %s", want)
	}
}

// The reason of a batch's verdict keeps how many more there are.
func TestWithoutRemedy(t *testing.T) {
	for reason, want := range map[string]string{"": "", "1 of 22 bottles rejected": "1 of 22 bottles rejected",
		"Raman area is off; look for the cause (and 2 more)": "Raman area is off (and 2 more)", "off; look": "off"} {
		if got := withoutRemedy(reason); got != want {
			t.Errorf("%q: %q, want %q", reason, got, want)
		}
	}
}
