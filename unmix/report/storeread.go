package report

import (
	"errors"
	"fmt"
	"os"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/netcdf"
)

// Store is an open survey.nc. Samples are read when asked for; it may be used by
// several goroutines at once.
type Store struct {
	Grid    eem.Grid
	Unit    eem.Unit
	IDs     []string
	Methods []string
	f       *os.File
	nc      *netcdf.File
}

// StoreSample is one sample of a store, arrays J × K, ex × em.
type StoreSample struct {
	ID        string
	Corrected []float64
	U         []float32            // standard uncertainty
	Residual  map[string][]float32 // by method
	Why       []eem.Reason
}

// OpenStore opens a survey.nc. Close it after use.
func OpenStore(path string) (*Store, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	s := &Store{f: f}
	if err := s.open(); err != nil {
		return nil, errors.Join(fmt.Errorf("%s: %w; it was not written by this program or was damaged: run again", path, err), f.Close())
	}
	return s, nil
}

func (s *Store) open() error {
	info, err := s.f.Stat()
	if err != nil {
		return err
	}
	if s.nc, err = netcdf.Read(s.f, info.Size()); err != nil {
		return err
	}
	if s.Grid.Ex, err = s.axis("excitation"); err != nil {
		return err
	}
	if s.Grid.Em, err = s.axis("emission"); err != nil {
		return err
	}
	if err := s.shapes(); err != nil {
		return err
	}
	unit, _ := s.nc.Attr("intensity_unit").(string)
	methods, _ := s.nc.Attr("methods").(string)
	s.Unit, s.Methods = eem.Unit(unit), strings.Fields(methods)
	return s.ids()
}

// shapes checks that every sample has its own id and cells of the grid, before
// any memory is taken for them.
func (s *Store) shapes() error {
	for _, name := range []string{"sample_id", "corrected", "uncertainty", "why_missing"} {
		i := s.nc.Var(name)
		if i < 0 {
			return fmt.Errorf("no variable %q", name)
		}
		n, isRecord := s.nc.Cells(i)
		if !isRecord || (name != "sample_id" && n != s.Grid.Cells()) {
			return fmt.Errorf("variable %q is not sample × excitation × emission", name)
		}
	}
	return nil
}

func (s *Store) axis(name string) (eem.Axis, error) {
	i := s.nc.Var(name)
	if i < 0 {
		return eem.Axis{}, fmt.Errorf("no variable %q", name)
	}
	n, _ := s.nc.Cells(i)
	nm := make([]float64, n)
	if err := s.nc.ReadTo(nm, name, 0); err != nil {
		return eem.Axis{}, err
	}
	return eem.NewAxis(nm)
}

func (s *Store) ids() error {
	n, _ := s.nc.Cells(s.nc.Var("sample_id"))
	buf := make([]byte, n)
	s.IDs = make([]string, s.nc.Records)
	for r := range s.IDs {
		if err := s.nc.ReadTo(buf, "sample_id", r); err != nil {
			return err
		}
		s.IDs[r] = strings.TrimRight(string(buf), "\x00")
	}
	return nil
}

// Sample reads sample i. It panics when there is no such sample.
func (s *Store) Sample(i int) (*StoreSample, error) {
	n := s.Grid.Cells()
	out := &StoreSample{ID: s.IDs[i], Corrected: make([]float64, n), U: make([]float32, n),
		Residual: map[string][]float32{}, Why: make([]eem.Reason, n)}
	why := make([]int8, n)
	err := errors.Join(s.nc.ReadTo(out.Corrected, "corrected", i), s.nc.ReadTo(out.U, "uncertainty", i),
		s.nc.ReadTo(why, "why_missing", i))
	for k, r := range why {
		out.Why[k] = eem.Reason(r)
	}
	for _, m := range s.Methods {
		r := make([]float32, n)
		err = errors.Join(err, s.nc.ReadTo(r, residualVar(m), i))
		out.Residual[m] = r
	}
	if err != nil {
		return nil, fmt.Errorf("%s, sample %q: %w", s.f.Name(), s.IDs[i], err)
	}
	return out, nil
}

// Close closes the file.
func (s *Store) Close() error { return s.f.Close() }
