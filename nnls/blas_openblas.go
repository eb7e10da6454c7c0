//go:build openblas

package nnls

// This one import puts OpenBLAS behind gonum's calls in every package of the
// module that uses nnls; it needs cgo, libopenblas-dev and pkg-config. What this
// package computes by its own kernels stays the same to the last bit, the QR
// factorisations do not.

// #cgo pkg-config: openblas
import "C"

import (
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/netlib/blas/netlib"
)

func init() { blas64.Use(netlib.Implementation{}) }
