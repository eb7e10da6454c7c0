// Package plan says which few emission scans would do, before anything is
// measured: it predicts how sure the contributions of a bottle will be from any
// choice of excitations, and searches the choice that makes them surest.
//
// The prediction is that of the fit that is done afterwards (unmix.Quantify): plain
// least squares over all cells, every cell weighing the same. With K the components
// on the cells that are scanned and V the noise variances of those cells
//
//	Cov(x) = (KᵀK)⁻¹ KᵀVK (KᵀK)⁻¹
//
// KᵀK and KᵀVK are sums over excitations, so that a choice of scans costs the sum
// of a few small matrices, whatever the number of cells. Because no cell is weighed
// by its noise a dim, noisy scan can do harm: more scans are not always better, and
// the whole grid is not always the best.
//
// What is predicted is what the bottle's own noise and that of the subtracted blanks
// do, and what real bottles depart from the model, where that is known (Noise.Misfit).
// Errors that all cells share (intensity scale, stock solutions, baseline of the
// absorbance) are nearly the same for any choice and are not in it; that a contribution
// is never negative is not in it either, so that the figures hold for amounts well
// above their detection limit.
package plan
