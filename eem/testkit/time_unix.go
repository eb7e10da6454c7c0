//go:build unix

package testkit

import (
	"syscall"
	"testing"
	"time"
)

// ProcessorTime is what the process has used so far, all threads together: on a busy
// machine the clock on the wall says little.
func ProcessorTime(t testing.TB) time.Duration {
	t.Helper()
	var u syscall.Rusage
	Must(t, syscall.Getrusage(syscall.RUSAGE_SELF, &u))
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}
