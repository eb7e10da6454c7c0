// Package unmix says how much of each fluorescing component a bottle holds.
//
// A Component is a spectrum that belongs together: an excitation and an emission
// loading, or, when it was built from standards, a whole surface ex × em.
// References come from standards (FromStandards) or from a file (ReadComponents);
// Quantify resolves every bottle of a cube against them by non-negative least
// squares and returns a Resolution: contributions, what is left over, and a
// certificate for every bottle.
package unmix
