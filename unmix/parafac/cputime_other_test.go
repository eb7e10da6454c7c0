//go:build !unix

package parafac

import "testing"

func reportCPU(*testing.B) func() { return func() {} }
