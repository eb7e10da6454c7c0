package eem

import (
	"fmt"
	"slices"
)

// Cube is a survey: I samples on one grid, sample × ex × em.
type Cube struct {
	Grid
	Unit Unit
	IDs  []string  // I
	X    []float64 // I × J × K row-major, NaN missing
	Why  []Reason  // I × J × K: why missing; a number with a Reason was filled, not measured
	// U is the standard uncertainty, Unit, of each cell from causes that act on
	// that cell alone; nil while nobody knows it.
	U []float32
}

// NewCube stacks EEMs, all of one unit, on grid g (regridded where they differ).
// ids[i] names es[i]. It panics when the lengths or the units differ.
func NewCube(g Grid, ids []string, es []*EEM) *Cube {
	if len(ids) != len(es) {
		panic(fmt.Sprintf("eem: %d ids for %d EEMs", len(ids), len(es)))
	}
	n := g.Cells()
	c := &Cube{Grid: g, IDs: slices.Clone(ids), X: make([]float64, len(es)*n), Why: make([]Reason, len(es)*n)}
	for i, e := range es {
		if i == 0 {
			c.Unit = e.Unit
		} else if e.Unit != c.Unit {
			panic(fmt.Sprintf("eem: %s is in %s, the cube in %s", ids[i], e.Unit, c.Unit))
		}
		if !e.Grid.Equal(g) {
			e = e.Regrid(g)
		}
		copy(c.X[i*n:], e.F)
		copy(c.Why[i*n:], e.Why)
	}
	return c
}

// Len returns the number of samples.
func (c *Cube) Len() int { return len(c.IDs) }

// Sample returns the cells of sample i, J × K; they are part of c.
func (c *Cube) Sample(i int) []float64 {
	n := c.Cells()
	return c.X[i*n : (i+1)*n : (i+1)*n]
}

// SampleWhy returns the reasons of sample i, J × K; they are part of c.
func (c *Cube) SampleWhy(i int) []Reason {
	n := c.Cells()
	return c.Why[i*n : (i+1)*n : (i+1)*n]
}

// SampleU returns the standard uncertainties of sample i, J × K; they are part of
// c. It is nil while nobody knows them.
func (c *Cube) SampleU(i int) []float32 {
	if c.U == nil {
		return nil
	}
	n := c.Cells()
	return c.U[i*n : (i+1)*n : (i+1)*n]
}

// Select returns the cube of the samples idx, in that order.
func (c *Cube) Select(idx []int) *Cube {
	n := c.Cells()
	out := &Cube{Grid: c.Grid, Unit: c.Unit, IDs: make([]string, len(idx)),
		X: make([]float64, len(idx)*n), Why: make([]Reason, len(idx)*n)}
	if c.U != nil {
		out.U = make([]float32, len(idx)*n)
	}
	for o, i := range idx {
		out.IDs[o] = c.IDs[i]
		copy(out.X[o*n:], c.Sample(i))
		copy(out.Why[o*n:], c.SampleWhy(i))
		if c.U != nil {
			copy(out.U[o*n:], c.U[i*n:(i+1)*n])
		}
	}
	return out
}
