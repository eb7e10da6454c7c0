package parafac

// ridgeA, ridgeB and ridgeC set lam, the ridge on the columns of one mode. The
// penalty is at first the energy of every component,
//
//	ε Σ_f ‖a_f‖²‖b_f‖²‖c_f‖²
//
// and after damp only that of the loadings the data do not determine, b° and c°:
//
//	ε Σ_f ‖a_f‖² (‖b°_f‖²‖c_f‖² + ‖b_f‖²‖c°_f‖²)
//
// Both are free of scale, and every update has its exact share of them.
func (s *als) ridgeA() {
	for f := range s.f {
		b, c := columnSquare(s.b, s.j, s.f, f), columnSquare(s.c, s.k, s.f, f)
		s.lam[f] = s.eps * b * c
		if s.dampB != nil {
			s.lam[f] = s.eps * (dampedSquare(s.b, s.dampB, s.f, f)*c + b*dampedSquare(s.c, s.dampC, s.f, f))
		}
	}
}

func (s *als) ridgeB() { s.ridgeLoading(s.c, s.dampC, s.k) }
func (s *als) ridgeC() { s.ridgeLoading(s.b, s.dampB, s.j) }

// ridgeLoading sets lam and lamDamped from the other loading mode.
func (s *als) ridgeLoading(other []float64, damped []bool, n int) {
	for f := range s.f {
		e := s.eps * columnSquare(s.a, s.i, s.f, f)
		s.lam[f], s.lamDamped[f] = e*columnSquare(other, n, s.f, f), 0
		if damped != nil {
			s.lam[f], s.lamDamped[f] = e*dampedSquare(other, damped, s.f, f), s.lam[f]
		}
	}
}

// rowRidge writes the ridge of one row of loadings, whose entries start at.
func (s *als) rowRidge(dst []float64, damped []bool, at int) {
	copy(dst, s.lam)
	for f := range dst {
		if damped != nil && damped[at+f] {
			dst[f] += s.lamDamped[f]
		}
	}
}

func dampedSquare(x []float64, damped []bool, f, col int) float64 {
	var v float64
	for i := col; i < len(x); i += f {
		if damped[i] {
			v += x[i] * x[i]
		}
	}
	return v
}

func columnSquare(x []float64, n, f, col int) float64 {
	var v float64
	for i := range n {
		v += x[i*f+col] * x[i*f+col]
	}
	return v
}
