package prepare

import (
	"path/filepath"

	"tarnlight/eem/survey"
)

// Root is the folder that scans and absorbance cells of a survey are relative to.
func Root(dir string, set *survey.Settings) string {
	return (&Survey{Dir: dir, Settings: set}).root()
}

// Expand lists the files below root that a scans cell names: a file, a folder (the
// files in it, hidden ones left out) or a pattern of either, sorted.
func Expand(root, cell string) ([]string, error) { return expand(root, cell) }

// Claimed gives the rows that name a file, by its path; several rows of one file
// are its samples.
type Claimed map[string][]*survey.Row

// Claims gives the rows of every file that a sheet names, below root, also of rows
// that are excluded. A cell that names nothing claims nothing.
func Claims(root string, sheet *survey.Sheet) Claimed {
	out := Claimed{}
	for i := range sheet.Rows {
		row := &sheet.Rows[i]
		if row.Absorbance != "" {
			p := filepath.Join(root, filepath.FromSlash(row.Absorbance))
			out[p] = append(out[p], row)
		}
		if row.Scans == "" {
			continue
		}
		files, err := expand(root, row.Scans)
		if err != nil {
			continue
		}
		for _, f := range files {
			out[f] = append(out[f], row)
		}
	}
	return out
}
