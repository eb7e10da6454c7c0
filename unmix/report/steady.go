package report

import (
	"archive/zip"
	"bytes"
	"errors"
	"io"
	"regexp"
	"slices"
	"strings"
)

var contentTypes = regexp.MustCompile(`<(?:Default|Override) [^>]*?(?:/>|></(?:Default|Override)>)`)

// steady rewrites the parts of a workbook in the order of their names, with the
// list of content types sorted: the library's order differs from run to run once
// pictures are embedded.
func steady(raw []byte) ([]byte, error) {
	in, err := zip.NewReader(bytes.NewReader(raw), int64(len(raw)))
	if err != nil {
		return nil, err
	}
	slices.SortFunc(in.File, func(a, b *zip.File) int { return strings.Compare(a.Name, b.Name) })
	var buf bytes.Buffer
	out := zip.NewWriter(&buf)
	for _, f := range in.File {
		r, err := f.Open()
		if err != nil {
			return nil, err
		}
		part, err := io.ReadAll(r)
		if err = errors.Join(err, r.Close()); err != nil {
			return nil, err
		}
		if f.Name == "[Content_Types].xml" {
			part = sortElements(part)
		}
		w, err := out.CreateHeader(&zip.FileHeader{Name: f.Name, Method: zip.Deflate})
		if err == nil {
			_, err = w.Write(part)
		}
		if err != nil {
			return nil, err
		}
	}
	err = out.Close() // writes the directory: only then is buf whole
	return buf.Bytes(), err
}

func sortElements(part []byte) []byte {
	all := contentTypes.FindAll(part, -1)
	if len(all) == 0 {
		return part
	}
	start := contentTypes.FindIndex(part)[0]
	tail := bytes.LastIndex(part, []byte("</Types>"))
	sorted := slices.Clone(all)
	slices.SortFunc(sorted, bytes.Compare)
	return slices.Concat(part[:start], bytes.Join(sorted, nil), part[tail:])
}
