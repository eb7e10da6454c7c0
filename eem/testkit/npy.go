package testkit

import (
	"encoding/binary"
	"os"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

var npyShape = regexp.MustCompile(`'shape': \(([0-9, ]+)\)`)

// Npy reads a little-endian array of float64 or float32 as NumPy writes it (format
// version 1.0); the last index runs fastest in x.
func Npy(t testing.TB, path string) (x []float64, shape []int) {
	t.Helper()
	b, err := os.ReadFile(path)
	Must(t, err)
	if !strings.HasPrefix(string(b), "\x93NUMPY\x01\x00") {
		t.Fatalf("%s: not an npy file of version 1.0", path)
	}
	end := 10 + int(binary.LittleEndian.Uint16(b[8:]))
	head := string(b[10:end])
	m := npyShape.FindStringSubmatch(head)
	if m == nil {
		t.Fatalf("%s: header %q", path, head)
	}
	n := 1
	for s := range strings.SplitSeq(m[1], ",") {
		if s = strings.TrimSpace(s); s != "" {
			v, err := strconv.Atoi(s)
			Must(t, err)
			shape, n = append(shape, v), n*v
		}
	}
	x = make([]float64, n)
	switch {
	case strings.Contains(head, "'<f8'"):
		_, err = binary.Decode(b[end:], binary.LittleEndian, x)
	case strings.Contains(head, "'<f4'"):
		single := make([]float32, n)
		_, err = binary.Decode(b[end:], binary.LittleEndian, single)
		for i, v := range single {
			x[i] = float64(v)
		}
	default:
		t.Fatalf("%s: header %q", path, head)
	}
	Must(t, err)
	if strings.Contains(head, "'fortran_order': True") {
		x = lastFastest(x, shape)
	}
	return x, shape
}

// lastFastest turns an array whose first index runs fastest.
func lastFastest(x []float64, shape []int) []float64 {
	out := make([]float64, len(x))
	at := make([]int, len(shape))
	for from, v := range x {
		to, rest := 0, from
		for d, n := range shape {
			at[d], rest = rest%n, rest/n
		}
		for d, n := range shape {
			to = to*n + at[d]
		}
		out[to] = v
	}
	return out
}
