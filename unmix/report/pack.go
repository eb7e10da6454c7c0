package report

import (
	"bytes"
	"compress/gzip"
	"encoding/base64"
	"encoding/binary"
	"errors"
	"math"
)

// Maps in the page are quantised, differenced and compressed:
//
//	layers × { float64 lowest value, float64 step }     little-endian
//	layers × { low bytes of all cells, high bytes of all cells }
//	why bytes of all cells: the reason, plus 128 where there is no number
//
// gzipped and in base64. Layer 0 is the measured map, then the residual of each
// method; a cell is lowest + q·step with q = 0 … levels, so that it is off by half
// a step at most. The 16 bits of a cell are the difference of q to the last
// number before it, as 2d for d ≥ 0 and −2d − 1 below (mod 2¹⁶); cells without a
// number repeat it.
const noNumber = 0x80

// levelsChoice are the numbers of steps that a layer's range may be cut into, the
// finest first.
var levelsChoice = []int{32767, 8191, 2047, 511}

// packer turns samples into the strings of the page. It is for one goroutine.
type packer struct {
	levels  int
	methods []string
	raw     []byte
	buf     bytes.Buffer
	gz      *gzip.Writer
}

func newPacker(levels int, methods []string) *packer {
	gz, _ := gzip.NewWriterLevel(nil, 6) // 6 is a valid level
	return &packer{levels: levels, methods: methods, gz: gz}
}

// pack returns the base64 text of a sample's maps.
func (p *packer) pack(s *StoreSample) string {
	n := len(s.Corrected)
	layers := 1 + len(p.methods)
	size := layers*16 + layers*2*n + n
	if cap(p.raw) < size {
		p.raw = make([]byte, size)
	}
	raw := p.raw[:size]
	at := layers * 16
	for l := range layers {
		var cell func(i int) float64
		if l == 0 {
			cell = func(i int) float64 { return s.Corrected[i] }
		} else {
			r := s.Residual[p.methods[l-1]]
			cell = func(i int) float64 { return float64(r[i]) }
		}
		lo, step := quantise(raw[at:at+n], raw[at+n:at+2*n], n, cell, p.levels)
		binary.LittleEndian.PutUint64(raw[l*16:], math.Float64bits(lo))
		binary.LittleEndian.PutUint64(raw[l*16+8:], math.Float64bits(step))
		at += 2 * n
	}
	for i, w := range s.Why {
		raw[at+i] = byte(w)
		if !finite(s.Corrected[i]) {
			raw[at+i] |= noNumber
		}
	}
	p.buf.Reset()
	p.gz.Reset(&p.buf)
	_, err := p.gz.Write(raw)
	if err = errors.Join(err, p.gz.Close()); err != nil {
		panic("report: " + err.Error()) // a bytes.Buffer takes everything
	}
	return base64.StdEncoding.EncodeToString(p.buf.Bytes())
}

// quantise writes the differences of the cells' steps to lo and hi.
func quantise(lo, hi []byte, n int, cell func(i int) float64, levels int) (lowest, step float64) {
	top := math.Inf(-1)
	lowest = math.Inf(1)
	for i := range n {
		if v := cell(i); finite(v) {
			lowest, top = min(lowest, v), max(top, v)
		}
	}
	if top < lowest {
		lowest, top = 0, 0
	}
	step = (top - lowest) / float64(levels)
	last := 0
	for i := range n {
		q := last
		if v := cell(i); finite(v) && step > 0 {
			q = int(math.Round((v - lowest) / step))
		}
		d := q - last
		last = q
		z := uint16(2 * d)
		if d < 0 {
			z = uint16(-2*d - 1)
		}
		lo[i], hi[i] = byte(z), byte(z>>8)
	}
	return lowest, step
}
