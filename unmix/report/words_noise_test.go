package report

import (
	"strings"
	"testing"
)

// The methods tell where the noise comes from as the parameters do.
func TestNoiseText(t *testing.T) {
	for _, c := range []struct{ params, want, not string }{
		{"read noise = 2 counts (4 blanks of the batch)", "replicate blanks", "own scans"},
		{"read noise = 0.0004 RU (the bottle's own scans)", "own scans, because", "from replicate blanks"},
		{"read noise = 2 counts (4 blanks of the batch); read noise = 3 counts (the bottle's own scans)", "replicate blanks, where", "because"},
	} {
		if got := noiseText(c.params); !strings.Contains(got, c.want) || strings.Contains(got, c.not) {
			t.Errorf("%s: %q", c.params, got)
		}
	}
}
