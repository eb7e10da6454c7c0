package merit

import (
	"cmp"
	"slices"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// Sources is what is known of the errors behind a resolution, beside the noise of
// the cells in Cube.U. Slices are by row of the cube. The zero Sources is lawful:
// what is left then is the noise, or the scatter of the residual.
type Sources struct {
	Causes   [][]eem.Cause // errors that cells share, on the cube's grid
	BlankSet []string      // which mean of blanks was subtracted, empty: none
	Factor   []float64     // dilution, by which that mean's error was multiplied; nil means 1
	Blank    []bool        // the bottle is itself one of its BlankSet

	// BlankU is the standard uncertainty of the cells of a mean of blanks, J × K.
	BlankU map[string][]float32

	// References say how the components came from standards; nil when they did not.
	References *References
	// Loadings say how well resolved components are known; nil when they were given.
	Loadings *Loadings

	// Stock is the relative standard uncertainty of the standards' amounts, which a
	// component's levels share; StockMissing says that it acts and nobody stated it.
	Stock        float64
	StockMissing bool

	// Scatter, by component, is how far single standards are off their line beyond
	// their budget (Scatters); nil where that was not asked.
	Scatter []Scatter

	// Limits are the laboratory's own, by component; they replace the computed ones.
	// What is NaN among them stays computed.
	Limits map[string]Limits

	Seed uint64 // of the Monte Carlo draws
}

// References tie components to the standards they were made of.
type References struct {
	Weights *unmix.Weights
	Row     []int // of the cube, one a standard in the order of Weights
	// Given, by standard, holds the amounts of the components in the bottle, 0 where
	// it has none; nil where nobody asks how standards scatter.
	Given [][]float64
}

// Loadings give, for every sample l that a model was fitted to, how far the
// loadings move (first order) when it is left out: F × J and F × K, in units of
// their maximum of 1. Their products summed over l are the covariance of the
// loadings (infinitesimal jackknife).
type Loadings struct {
	Samples int
	Move    func(l int) (ex, em [][]float64)
	// BentEx and BentEm, F × J and F × K in the same unit, are by how far the bounds at
	// zero hold the loadings: a bias. nil: there is none, or it is not known.
	BentEx, BentEm [][]float64
}

// Term is one row of an uncertainty budget: what one cause contributes to the
// standard uncertainty of every component of a bottle.
type Term struct {
	Cause  string
	Scope  string    // who shares the error: cell, bottle, standard, batch, survey
	U      []float64 // F; nil: the cause acts and its size is not given
	DF     float64   // degrees of freedom, 0 for known
	Source string
}

// Sum is how sure the sum of a pair of components is.
type Sum struct {
	Alike
	Value, U, Lower, Upper            float64
	Critical, Detection, Quantifiable float64
}

// Spread is how sure the contributions of one bottle are, F values each, in the
// components' units; NaN where the bottle was not usable.
type Spread struct {
	U, DF                             []float64 // combined standard uncertainty, effective degrees of freedom
	Lower, Upper                      []float64 // of the 95 % interval, 0 or more
	Critical, Detection, Quantifiable []float64
	Computed                          []Limits         // what the budget gives where the laboratory's own limits took its place; nil elsewhere
	Cov                               []float64        // F × F covariance of the contributions above zero
	Terms                             []Term           // largest first for the first component; not given ones last
	Sums                              []Sum            // of the pairs that cannot be told apart
	Yard                              *unmix.Yardstick // what the residual is held against; nil: the noise model
	Hot                               Hot              // where the residual stands out most
	Tops                              []Top            // the largest residual of every scan that stands out of the noise
	Runs                              float64          // Z of the runs of signs along emission: below 0, neighbours are alike
	NoiseRMS                          float64          // what noise alone would leave, intensity
	ChiSquare                         float64          // Σ(residual²/variance) over the degrees of freedom: 1 is noise alone
	Misfit                            float64          // variance of the residual beyond noise; 0 where noise explains it
	Alike                             [2]float64       // correlation of what is beyond noise with its neighbours, by excitation and emission
}

// Largest returns the terms in falling order of what they contribute to component f,
// those not given last.
func (s *Spread) Largest(f int) []Term {
	out := slices.Clone(s.Terms)
	slices.SortStableFunc(out, func(x, y Term) int {
		switch {
		case x.U == nil && y.U == nil:
			return 0
		case y.U == nil:
			return -1
		case x.U == nil:
			return 1
		}
		return cmp.Compare(y.U[f], x.U[f])
	})
	return out
}
