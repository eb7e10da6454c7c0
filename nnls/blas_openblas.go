//go:build openblas

package nnls

// #cgo pkg-config: openblas
import "C"

import (
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/netlib/blas/netlib"
)

func init() { blas64.Use(netlib.Implementation{}) }
