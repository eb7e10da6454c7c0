package report

import (
	"bytes"
	"compress/gzip"
	"encoding/base64"
	"encoding/binary"
	"io"
	"math"
	"path/filepath"
	"testing"

	"tarnlight/eem"
)

// unpack is the reading side as pack.go describes it, written apart from it.
func unpack(t testing.TB, text string, layers, n int) (out [][]float64, why []byte) {
	t.Helper()
	b, err := base64.StdEncoding.DecodeString(text)
	must(t, err)
	r, err := gzip.NewReader(bytes.NewReader(b))
	must(t, err)
	raw, err := io.ReadAll(r)
	must(t, err)
	why = raw[len(raw)-n:]
	for l := range layers {
		lo := math.Float64frombits(binary.LittleEndian.Uint64(raw[l*16:]))
		step := math.Float64frombits(binary.LittleEndian.Uint64(raw[l*16+8:]))
		at := layers*16 + l*2*n
		q, v := 0, make([]float64, n)
		for i := range n {
			z := int(raw[at+i]) | int(raw[at+n+i])<<8
			if z&1 == 0 {
				q += z / 2
			} else {
				q -= (z + 1) / 2
			}
			v[i] = lo + float64(q)*step
			if why[i]&noNumber != 0 {
				v[i] = math.NaN()
			}
		}
		out = append(out, v)
	}
	return out, why
}

func TestPackKeepsHalfAStep(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 9, "parafac").write(t, dir)
	s, err := OpenStore(filepath.Join(dir, StoreName))
	must(t, err)
	defer s.Close()
	for _, levels := range levelsChoice {
		p := newPacker(levels, s.Methods)
		for i := range s.IDs {
			x, err := s.Sample(i)
			must(t, err)
			got, why := unpack(t, p.pack(x), 2, len(x.Corrected))
			lo, hi := bounds(x.Corrected)
			for k, v := range x.Corrected {
				if math.IsNaN(v) != math.IsNaN(got[0][k]) || math.Abs(v-got[0][k]) > (hi-lo)/float64(levels)*0.5001 {
					t.Fatalf("%d levels, bottle %d, cell %d: %g became %g", levels, i, k, v, got[0][k])
				}
				if eem.Reason(why[k]&^noNumber) != x.Why[k] {
					t.Fatalf("bottle %d, cell %d: reason %d became %d", i, k, x.Why[k], why[k])
				}
			}
		}
	}
}

// Constant, empty and filled maps have no range or no number to lean on.
func TestPackOddMaps(t *testing.T) {
	nan := math.NaN()
	for _, v := range [][]float64{{nan, nan, nan}, {2, 2, 2}, {1, nan, -1e300}, {math.Inf(1), 0, 1}, {0, 0, 1e-290}} {
		x := &StoreSample{Corrected: v, Why: []eem.Reason{0, eem.Raman1, 0}}
		got, _ := unpack(t, newPacker(32767, nil).pack(x), 1, 3)
		lo, hi := bounds(v)
		for k := range v {
			if finite(v[k]) && math.Abs(got[0][k]-v[k]) > (hi-lo)/32767 {
				t.Errorf("%v became %v", v, got[0])
			}
		}
	}
}
