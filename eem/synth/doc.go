// Package synth makes measurements whose truth is known.
//
// Trilinear makes cubes that follow the trilinear model exactly, for tests and
// benchmarks of solvers. An Instrument scans Liquids as a small right-angle
// fluorometer does and gives the counts it would report, with everything that
// stands between them and the concentrations: lamp and detector, absorption
// along the light's way, scatter, noise, saturation. Demo is a whole invented
// survey, written as the raw files of such an instrument.
//
// Everything is a pure function of its seed.
package synth
