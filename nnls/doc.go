// Package nnls solves linear least squares with non-negative variables,
//
//	min ‖W^½(a·x − b)‖   subject to x ≥ 0,
//
// and hands every answer over with a certificate: a scale-free number that says
// by how much the answer violates the conditions of optimality. The problem is
// convex, so an answer whose violation is zero is a global optimum, however it
// was found.
//
// [SolveTo] solves one problem. [Batch] factors a matrix once and solves for
// many right-hand sides, each of which may lack rows of its own. [Covariance]
// says how far an answer may be off.
//
// The method is the active set of Lawson and Hanson (Solving Least Squares
// Problems, 1974, chapter 23) on a QR factorisation that is updated as variables
// come and go. The normal equations are never formed: with a condition number
// of 10⁷ they would lose every digit.
package nnls
