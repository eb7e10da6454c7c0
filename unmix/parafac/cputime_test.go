//go:build unix

package parafac

import (
	"syscall"
	"testing"
	"time"
)

// cpu is the user time that the process has used, all threads together: on a
// busy machine the clock on the wall says little.
func cpu() time.Duration {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	return time.Duration(u.Utime.Nano())
}

// reportCPU begins to count and returns the function that reports the user time
// of one operation.
func reportCPU(b *testing.B) func() {
	from := cpu()
	return func() { b.ReportMetric((cpu()-from).Seconds()/float64(b.N), "cpu-s/op") }
}
