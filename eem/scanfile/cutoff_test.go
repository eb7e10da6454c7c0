package scanfile

import (
	"fmt"
	"math/rand/v2"
	"strings"
	"testing"
)

// A file cut off at any byte is an error, or holds the numbers of the whole one and
// no other: never the first digits of a number as a number. Where the format does not
// tell (whole counts, or too few rows) nothing is refused.
func TestCutOff(t *testing.T) {
	rnd := rand.New(rand.NewPCG(3, 1))
	for _, c := range []struct {
		format, delim, dec string
		cols               int
		wide               bool // UTF-16
	}{{"%.3f", "\t", ".", 1, false}, {"%.2f", ";", ",", 4, false}, {"%.4E", ",", ".", 1, false}, {"%.1f", ",", ".", 3, false}, {"%.3f", "\t", ".", 2, true}} {
		var s strings.Builder
		for j := range c.cols + 1 {
			s.WriteString([]string{"em", "240", "250", "260", "270"}[j])
			s.WriteString(map[bool]string{true: "\n", false: c.delim}[j == c.cols])
		}
		if c.cols == 1 {
			s.Reset()
		}
		const lines = 60
		for k := range lines {
			fmt.Fprint(&s, 300+2*k)
			for range c.cols {
				s.WriteString(c.delim + strings.Replace(fmt.Sprintf(c.format, 1000+500*rnd.Float64()), ".", c.dec, 1))
			}
			s.WriteString("\n")
		}
		text := s.String()
		if c.wide {
			text = "\xff\xfe" + strings.Join(strings.Split(text, ""), "\x00") + "\x00"
		}
		whole, err := ReadBytes("W_ex240.txt", []byte(text), nil)
		if err != nil {
			t.Fatal(err)
		}
		from := len(text) - 3*len(text)/lines/2
		refused := 0
		for end := from; end < len(text); end++ { // the last line and a half
			f, err := ReadBytes("W_ex240.txt", []byte(text[:end]), nil)
			if err != nil {
				refused++
				if !strings.HasPrefix(err.Error(), "W_ex240.txt:") {
					t.Errorf("%s cut at %q: %v", c.format, text[max(0, end-20):end], err)
				}
				continue
			}
			for i, scan := range f.Scans {
				for k, v := range scan.F {
					if v == v && v != whole.Scans[i].F[k] {
						t.Errorf("%s cut at %q: read as %g", c.format, text[max(0, end-20):end], v)
					}
				}
			}
		}
		if refused == 0 {
			t.Errorf("%s: nothing was refused", c.format)
		}
	}
	cut := func(text string) string { return text[:len(text)-1] }
	for what, text := range map[string]string{
		"whole counts, cut": cut(counts(60, "%.0f")), "few rows, cut": cut(counts(20, "%.2f")),
		"zeros left out": counts(60, "%g"), "nothing cut": counts(60, "%.2f"),
	} {
		if _, err := ReadBytes("W_ex240.txt", []byte(text), nil); err != nil {
			t.Errorf("%s: %v", what, err)
		}
	}
}

// counts is a scan without the last line end.
func counts(n int, format string) string {
	var s strings.Builder
	for k := range n {
		fmt.Fprintf(&s, "\n%d\t"+format, 300+2*k, 1000+12.5*float64(k)+0.25*float64(k%3))
	}
	return s.String()[1:]
}
