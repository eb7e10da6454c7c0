package prepare

import (
	"fmt"
	"path/filepath"

	"tarnlight/eem/correct"
	"tarnlight/eem/scanfile"
)

// factorPair holds the spectral factors of a setup, nil where none are stated.
type factorPair struct {
	ex, em *correct.Factors
	sums   [2]string // SHA-256 of both files
}

// readFactors reads the spectral factors of every setup in use.
func (s *Survey) readFactors() error {
	s.factors = map[string]factorPair{}
	type known struct {
		f   *correct.Factors
		sum string
	}
	seen := map[string]known{}
	read := func(name string) (*correct.Factors, string, error) {
		if name == "" {
			return nil, "", nil
		}
		if k, ok := seen[name]; ok {
			return k.f, k.sum, nil
		}
		path := filepath.FromSlash(name)
		if !filepath.IsAbs(path) {
			path = filepath.Join(s.Dir, path)
		}
		data, in, err := s.load(path)
		if err != nil {
			return nil, "", err
		}
		t, _, err := scanfile.ReadFactorsBytes(in.Path, data, nil)
		if err != nil {
			return nil, "", err
		}
		f, err := correct.NewFactors(t.Axis.Values(), t.Factor, t.U, in.Path)
		if err != nil {
			return nil, "", fmt.Errorf("%s: %w", in.Path, err)
		}
		s.Inputs = append(s.Inputs, in)
		seen[name] = known{f, in.SHA256}
		return f, in.SHA256, nil
	}
	for _, b := range s.Bottles {
		if _, ok := s.factors[b.Row.Setup]; ok || b.Excluded {
			continue
		}
		var p factorPair
		var err error
		if p.ex, p.sums[0], err = read(b.Setting.Correct.ExcitationFactors); err != nil {
			return fmt.Errorf("settings, correct.excitation_factors: %w", err)
		}
		if p.em, p.sums[1], err = read(b.Setting.Correct.EmissionFactors); err != nil {
			return fmt.Errorf("settings, correct.emission_factors: %w", err)
		}
		s.factors[b.Row.Setup] = p
	}
	return nil
}
