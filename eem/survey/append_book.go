package survey

import (
	"archive/zip"
	"bytes"
	"errors"
	"fmt"
	"io"
	"slices"

	"tarnlight/eem/scanfile"
)

// Rows are added to a workbook in the XML of its first sheet (ECMA-376, part 1,
// 18.3) and not through the library that writes ours: that one reads a whole
// workbook into its own model and writes that, so that what it does not know is
// lost. Here every other part is copied as it is packed, and of the sheet every
// byte stays but those of empty rows in the way, of its stated size and of the
// tables and filters that end with its list.

// appendXLSX writes records behind the last row with content.
func appendXLSX(name string, data []byte, records [][]string) ([]byte, error) {
	at, err := scanfile.FirstSheet(name, data)
	if err != nil {
		return nil, err
	}
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	changed, err := grownParts(z, at, records)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	var b bytes.Buffer
	w := zip.NewWriter(&b)
	for _, f := range z.File {
		if text, ok := changed[f.Name]; ok {
			err = writePart(w, f, text)
		} else {
			err = w.Copy(f)
		}
		if err != nil {
			return nil, fmt.Errorf("%s: %s: %w", name, f.Name, err)
		}
	}
	if err := errors.Join(w.SetComment(z.Comment), w.Close()); err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	return b.Bytes(), nil
}

// grownParts makes the parts that change: the sheet, and what frames its list.
func grownParts(z *zip.Reader, at scanfile.SheetParts, records [][]string) (map[string][]byte, error) {
	text, err := readPart(z, at.Sheet)
	if err != nil {
		return nil, err
	}
	g := &grownSheet{xml: text}
	if err := g.scan(); err != nil {
		return nil, fmt.Errorf("%s: %w", at.Sheet, err)
	}
	sheet, s := g.with(records)
	if sheet, err = s.tags(sheet, "autoFilter"); err != nil {
		return nil, fmt.Errorf("%s: %w", at.Sheet, err)
	}
	out := map[string][]byte{at.Sheet: sheet}
	for _, table := range at.Tables {
		if text, err = readPart(z, table); err == nil {
			out[table], err = s.tags(text, "table", "autoFilter")
		}
		if err != nil {
			return nil, fmt.Errorf("%s: %w", table, err)
		}
	}
	if at.Workbook != "" {
		if text, err = readPart(z, at.Workbook); err != nil {
			return nil, err
		}
		if grown := s.names(text); !bytes.Equal(grown, text) {
			out[at.Workbook] = grown
		}
	}
	return out, nil
}

func readPart(z *zip.Reader, name string) ([]byte, error) {
	i := slices.IndexFunc(z.File, func(f *zip.File) bool { return f.Name == name })
	r, err := z.File[i].Open() // FirstSheet has found it
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	defer r.Close()
	text, err := io.ReadAll(io.LimitReader(r, scanfile.MaxBookBytes+1))
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	return text, nil
}

func writePart(w *zip.Writer, f *zip.File, text []byte) error {
	out, err := w.CreateHeader(&zip.FileHeader{Name: f.Name, Comment: f.Comment, Method: zip.Deflate, Modified: f.Modified})
	if err != nil {
		return err
	}
	_, err = out.Write(text)
	return err
}
