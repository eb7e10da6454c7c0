package report

import (
	"crypto/sha256"
	"encoding/hex"
	"io"
	"os"
	"path/filepath"
	"strings"
)

// provenanceSheet says what these results are: the hash of every table, and the
// settings in force. The hashes of the raw files stand in provenance.json, which
// is written after everything else.
func (r *results) provenanceSheet(b *book) {
	s := b.add("Provenance", layout{portrait: true, widths: []float64{30, 90}})
	s.add(20, cell{"Where these results come from", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"provenance.json beside this file lists every raw file with its SHA-256; tarnlight verify checks them.", look{color: midGrey}})
	s.skip(1)
	s.add(0, cell{"Result mark", look{bold: true}}, cell{r.mark, look{}})
	s.skip(1)
	s.add(16, cell{"Results", headLook}, cell{"SHA-256", headLook})
	for _, f := range Schema {
		if sum := fileHash(filepath.Join(r.dir, f.Name)); sum != "" {
			s.add(rowHeight, cell{f.Name, look{}}, cell{sum, look{}})
		}
	}
	if sum := fileHash(filepath.Join(r.dir, StoreName)); sum != "" {
		s.add(rowHeight, cell{StoreName, look{}}, cell{sum, look{}})
	}
	if raw, err := os.ReadFile(filepath.Join(r.dir, "settings-used.toml")); err == nil {
		s.skip(1)
		s.add(16, cell{"Setting", headLook}, cell{"Value in force", headLook})
		table := ""
		for _, line := range strings.Split(string(raw), "\n") {
			line = strings.TrimSpace(line)
			key, value, ok := strings.Cut(line, "=")
			switch {
			case strings.HasPrefix(line, "["):
				table = strings.Trim(line, "[]") + "."
			case ok && !strings.HasPrefix(line, "#"):
				s.add(0, cell{table + strings.TrimSpace(key), look{}}, cell{visible(strings.TrimSpace(value)), wrapLook})
			}
		}
	}
	s.done()
}

// fileHash is the SHA-256 of a file, empty where it cannot be read.
func fileHash(path string) string {
	f, err := os.Open(path)
	if err != nil {
		return ""
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(h, f); err != nil {
		return ""
	}
	return hex.EncodeToString(h.Sum(nil))
}
