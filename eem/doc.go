// Package eem holds the data types of excitation-emission fluorometry and no
// file formats: wavelength axes and grids, emission scans, the
// excitation-emission matrix (EEM), absorbance spectra, what was noted about
// them on their way, and the survey cube.
//
// Conventions of the whole module:
//
//   - wavelengths are in nm; an EEM is ex × em, row-major: one row is one
//     emission scan. Indices are i sample, j excitation, k emission,
//     f component.
//   - NaN is a missing cell; why it is missing stands beside it (Reason).
//   - inputs are read-only: an operation returns a new value.
package eem
