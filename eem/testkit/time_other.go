//go:build !unix

package testkit

import (
	"testing"
	"time"
)

var began = time.Now()

// ProcessorTime is the time by the clock since the process began: this system tells no
// other.
func ProcessorTime(testing.TB) time.Duration { return time.Since(began) }
