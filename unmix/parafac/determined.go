package parafac

const (
	// resolved is the least resolution [(H+Λ)⁻¹H]_ff of a loading that the data
	// determine: at ε = 3e-5 about 0.3 % of the component's energy is seen there.
	resolved = 0.99
	// mostSE is the largest standard error of a loading that can be drawn, as a
	// share of the component's maximum.
	mostSE = 0.05
)

// resolution returns, for every entry of b and of c, how far the data and not
// the ridge decide it (NUMERICS 2c). The scores must be up to date.
func (s *als) resolution() (rb, rc []float64) {
	s.modelRows()
	s.project()
	s.ridgeB()
	hs, _ := s.normal(s.modeB())
	rb = s.resolutionOf(hs, s.j)
	s.ridgeC()
	hs, _ = s.normal(s.modeC())
	return rb, s.resolutionOf(hs, s.k)
}

func (s *als) resolutionOf(hs []float64, rows int) []float64 {
	f := s.f
	out := make([]float64, rows*f)
	col := make([]float64, f)
	for r := range rows {
		h := hs[r*f*f : (r+1)*f*f]
		l := append([]float64(nil), h...)
		for x := range f {
			l[x*f+x] += s.lam[x]
		}
		if !cholesky(l, f, 1e-14) {
			continue
		}
		for x := range f {
			for y := range f {
				col[y] = h[y*f+x]
			}
			solveCholesky(l, col, f)
			out[r*f+x] = col[x]
		}
	}
	return out
}

// damp takes the ridge away from all loadings but those that the data do not
// determine. To fix those at their damped values instead was tried: the rest of
// the column then has a scale against them, along which Gauss–Newton creeps.
func (s *als) damp() {
	rb, rc := s.resolution()
	s.dampB, s.dampC = below(rb), below(rc)
}

func below(res []float64) []bool {
	out := make([]bool, len(res))
	for i, v := range res {
		out[i] = v < resolved
	}
	return out
}
