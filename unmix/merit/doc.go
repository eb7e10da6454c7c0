// Package merit judges contributions: how sure they are, whether a component is
// there at all, whether components can be told apart, and what a residual map
// says about the model.
package merit
