package report

import (
	"errors"
	"fmt"
	"math"
	"os"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/netcdf"
)

// StoreName is the file name of the store in a results folder.
const StoreName = "survey.nc"

// StoreSettings describes survey.nc before its first sample.
type StoreSettings struct {
	Grid    eem.Grid
	Unit    eem.Unit
	IDs     []string // every sample, in the order of Append
	Methods []string // methods that leave a residual: "references", "parafac", "model"
	Title   string
}

// StoreWriter writes survey.nc sample by sample; it holds one sample.
type StoreWriter struct {
	s    StoreSettings
	f    *os.File
	w    *netcdf.Writer
	next int
	id   []byte
	why  []int8
	u    []float32
	x    []float64
	res  [][]float32
}

// CreateStore makes the file at path. It panics on an empty grid and on a method
// named twice.
func CreateStore(path string, s StoreSettings) (*StoreWriter, error) {
	f, err := os.Create(path)
	if err != nil {
		return nil, err
	}
	w, err := netcdf.NewWriter(f, storeHeader(s))
	if err != nil {
		return nil, errors.Join(err, f.Close())
	}
	n := s.Grid.Cells()
	c := &StoreWriter{s: s, f: f, w: w, id: make([]byte, idBytes(s.IDs)), why: make([]int8, n),
		u: make([]float32, n), x: make([]float64, n), res: make([][]float32, len(s.Methods))}
	for m := range c.res {
		c.res[m] = make([]float32, n)
	}
	err = errors.Join(w.Put("excitation", s.Grid.Ex.Values()), w.Put("emission", s.Grid.Em.Values()))
	if err != nil {
		return nil, errors.Join(err, f.Close())
	}
	return c, nil
}

func idBytes(ids []string) int {
	n := 1
	for _, id := range ids {
		n = max(n, len(id))
	}
	return n
}

// residualVar names the variable of a method's residual.
func residualVar(method string) string { return "residual_" + method }

func storeHeader(s StoreSettings) netcdf.Header {
	flags, words := make([]int8, eem.NumReasons), make([]string, eem.NumReasons)
	for r := range eem.NumReasons {
		flags[r], words[r] = int8(r), strings.ReplaceAll(r.String(), " ", "_")
	}
	unit := string(s.Unit)
	cube, nan := []int{0, 1, 2}, math.NaN()
	nan32 := []float32{float32(nan)}
	h := netcdf.Header{
		Dims: []netcdf.Dim{{Name: "sample"}, {Name: "excitation", Len: s.Grid.Ex.Len()},
			{Name: "emission", Len: s.Grid.Em.Len()}, {Name: "id_length", Len: idBytes(s.IDs)}},
		Attrs: []netcdf.Attr{
			{Name: "Conventions", Value: "CF-1.8"},
			{Name: "title", Value: s.Title},
			{Name: "intensity_unit", Value: unit},
			{Name: "methods", Value: strings.Join(s.Methods, " ")},
			{Name: "comment", Value: "Excitation-emission matrices. RU: Raman units, intensity over the area of water's Raman line, 1/nm. " +
				"QSU: quinine sulfate units, 1 = 1 ug/L quinine sulfate dihydrate. " +
				"A number whose why_missing is not 0 was filled, not measured. Model = corrected - residual."},
		},
		Vars: []netcdf.Var{
			wavelengthVar("excitation", 1),
			wavelengthVar("emission", 2),
			{Name: "sample_id", Type: netcdf.Char, Dims: []int{0, 3}, Attrs: []netcdf.Attr{
				{Name: "long_name", Value: "id of the bottle, UTF-8"}, {Name: "cf_role", Value: "timeseries_id"}}},
			{Name: "corrected", Type: netcdf.Double, Dims: cube, Attrs: []netcdf.Attr{
				{Name: "long_name", Value: "corrected fluorescence"}, {Name: "units", Value: unit},
				{Name: "_FillValue", Value: []float64{nan}}, {Name: "coordinates", Value: "sample_id"},
				{Name: "ancillary_variables", Value: "uncertainty why_missing"}}},
			{Name: "uncertainty", Type: netcdf.Float, Dims: cube, Attrs: []netcdf.Attr{
				{Name: "long_name", Value: "standard uncertainty of corrected from causes that act on one cell alone"},
				{Name: "units", Value: unit}, {Name: "_FillValue", Value: nan32}, {Name: "coordinates", Value: "sample_id"}}},
			{Name: "why_missing", Type: netcdf.Byte, Dims: cube, Attrs: []netcdf.Attr{
				{Name: "long_name", Value: "why the cell is missing, or was filled"},
				{Name: "flag_values", Value: flags}, {Name: "flag_meanings", Value: strings.Join(words, " ")},
				{Name: "coordinates", Value: "sample_id"}}},
		},
	}
	for _, m := range s.Methods {
		h.Vars = append(h.Vars, netcdf.Var{Name: residualVar(m), Type: netcdf.Float, Dims: cube, Attrs: []netcdf.Attr{
			{Name: "long_name", Value: "corrected less the sum of the components, method " + m},
			{Name: "units", Value: unit}, {Name: "_FillValue", Value: nan32}, {Name: "coordinates", Value: "sample_id"}}})
	}
	return h
}

func wavelengthVar(name string, dim int) netcdf.Var {
	return netcdf.Var{Name: name, Type: netcdf.Double, Dims: []int{dim}, Attrs: []netcdf.Attr{
		{Name: "long_name", Value: name + " wavelength"}, {Name: "units", Value: "nm"}}}
}

// Append writes the next sample. Arrays are J × K, row-major, ex × em; a nil one
// is written as missing (why: not measured), so that a bottle that could not be
// read has its place. It panics when id is not the next of the settings' IDs, on
// a method that was not announced, or on arrays of another length.
func (w *StoreWriter) Append(id string, corrected []float64, u []float32, residual map[string][]float64, why []eem.Reason) error {
	if w.next >= len(w.s.IDs) || w.s.IDs[w.next] != id {
		panic(fmt.Sprintf("report: sample %q is not number %d of the store", id, w.next+1))
	}
	w.next++
	clear(w.id)
	copy(w.id, id)
	fill(w.x, corrected)
	fill(w.u, u)
	for i := range w.why {
		w.why[i] = int8(eem.NotMeasured)
	}
	if why != nil {
		w.sameLen(len(why))
		for i, r := range why {
			w.why[i] = int8(r)
		}
	}
	found := 0
	rec := []any{w.id, w.x, w.u, w.why}
	for m, name := range w.s.Methods {
		if _, ok := residual[name]; ok {
			found++
		}
		fill(w.res[m], residual[name])
		rec = append(rec, w.res[m])
	}
	if found != len(residual) {
		panic(fmt.Sprintf("report: sample %q has the residual of a method that the store was not made for", id))
	}
	return w.w.Append(rec...)
}

func (w *StoreWriter) sameLen(n int) {
	if n != len(w.x) {
		panic(fmt.Sprintf("report: %d cells for a grid of %d", n, len(w.x)))
	}
}

// fill copies src to dst, or NaN where src is nil.
func fill[D, S float32 | float64](dst []D, src []S) {
	if src != nil && len(src) != len(dst) {
		panic(fmt.Sprintf("report: %d cells for a grid of %d", len(src), len(dst)))
	}
	for i := range dst {
		if src == nil {
			dst[i] = D(math.NaN())
		} else {
			dst[i] = D(src[i])
		}
	}
}

// Close completes the file. It panics when fewer samples were written than
// announced, unless an Append failed.
func (w *StoreWriter) Close() error {
	if w.next != len(w.s.IDs) {
		w.f.Close()
		panic(fmt.Sprintf("report: %d of %d samples were written", w.next, len(w.s.IDs)))
	}
	return errors.Join(w.w.Close(), w.f.Close())
}

// Abort closes the file as it is, for a run that failed.
func (w *StoreWriter) Abort() error { return w.f.Close() }
