package parafac

import (
	"fmt"
	"math"
	"runtime"

	"tarnlight/eem"
)

// Settings of a fit. The zero value works.
type Settings struct {
	Starts int    // random starts; 0 means 10
	Seed   uint64 // start s draws from PCG(Seed, s)

	// Tol stops the iterations of a start when, twice in a row,
	//
	//	loss_prev − loss ≤ Tol · loss_prev
	//
	// 0 means 1e-8. The best start is then finished by Gauss–Newton steps, which
	// go by the certificate and not by the loss.
	Tol     float64
	MaxIter int // iterations of one start; 0 means 500

	// RawSamples fits the numbers as they are. Otherwise every sample is brought
	// to unit norm for the fit, so that the strongest do not decide the spectra
	// alone; the scores are in the cube's unit either way.
	RawSamples    bool
	Unconstrained bool   // allows negative scores and loadings
	Hold          []Held // known spectra; they become the first components of the fit

	// Weights takes the cells' standard uncertainties, Cube.U, as weights in
	// their separable form sample × cell. It trusts the noise model: a wrong one
	// biases components that live in cells it calls precise.
	Weights bool

	Workers int // goroutines; 0 means GOMAXPROCS. Results do not depend on it

	// Progress, if set, is told what is being done; it may be called from
	// several goroutines, but never at the same time.
	Progress func(done, total int, what string)
}

// Held is a known spectrum: it stays as it is while the others are fitted.
type Held struct {
	Name string
	Ex   []float64 // J, at the cube's excitations, ≥ 0, in any scale
	Em   []float64 // K
}

const (
	energyRidge = 3e-5 // ε of the loss
	innerSweeps = 10   // sweeps over the columns in one update of a mode
	screenIter  = 60   // iterations a start gets before it must be among the best
	polishIter  = 30   // iterations without ridge before the Gauss–Newton steps
	goOn        = 3    // starts that go on after screening
	maxF        = 30   // components
)

func (s *Settings) withDefaults() Settings {
	var d Settings
	if s != nil {
		d = *s
	}
	if d.Starts <= 0 {
		d.Starts = 10
	}
	if !(d.Tol > 0) {
		d.Tol = 1e-8
	}
	if d.MaxIter <= 0 {
		d.MaxIter = 500
	}
	if d.Workers <= 0 {
		d.Workers = runtime.GOMAXPROCS(0)
	}
	if d.Progress == nil {
		d.Progress = func(int, int, string) {}
	}
	return d
}

// checkHold says what is wrong with the held spectra.
func (s *Settings) checkHold(g eem.Grid, components int) error {
	if len(s.Hold) > components {
		return fmt.Errorf("%d spectra are held but the model has %d components; raise the number of components", len(s.Hold), components)
	}
	for _, h := range s.Hold {
		if len(h.Ex) != g.Ex.Len() || len(h.Em) != g.Em.Len() {
			return fmt.Errorf("held spectrum %q has %d × %d points, the cube %d × %d; interpolate it to the survey's grid", h.Name, len(h.Ex), len(h.Em), g.Ex.Len(), g.Em.Len())
		}
		for _, v := range [][]float64{h.Ex, h.Em} {
			if n := norm(v); !(n > 0) || math.IsInf(n, 0) {
				return fmt.Errorf("held spectrum %q is empty or not finite; give its loading at every wavelength of the survey", h.Name)
			}
			for _, x := range v {
				if x < 0 && !s.Unconstrained {
					return fmt.Errorf("held spectrum %q is negative somewhere; set such loadings to 0", h.Name)
				}
			}
		}
	}
	return nil
}

// Status says why a fit ended. The zero value is no success.
type Status uint8

// Outcomes of a fit.
const (
	Unfinished Status = iota // cancelled or never run
	Converged                // no loading further than a tenth of its standard error from the optimum (Certificate ≤ 0.1)
	Swamp                    // the iterations ran out: usually a sign of too many components
)

// String gives the outcome in words.
func (s Status) String() string {
	return [...]string{"unfinished", "converged", "swamp: iterations ran out"}[min(s, Swamp)]
}
