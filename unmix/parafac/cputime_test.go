package parafac

import (
	"testing"

	"tarnlight/eem/testkit"
)

// reportCPU begins to count and returns the function that reports the processor time
// of one operation.
func reportCPU(b *testing.B) func() {
	from := testkit.ProcessorTime(b)
	return func() { b.ReportMetric((testkit.ProcessorTime(b)-from).Seconds()/float64(b.N), "cpu-s/op") }
}
