//go:build openblas

package nnls

import (
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/netlib/blas/netlib"
)

func TestOpenBLASInUse(t *testing.T) {
	if _, ok := blas64.Implementation().(netlib.Implementation); !ok {
		t.Errorf("built with -tags openblas, but BLAS is %T", blas64.Implementation())
	}
}
