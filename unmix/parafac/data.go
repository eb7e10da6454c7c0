package parafac

// data is what an iteration touches instead of the samples: rows of length P.
// The first r rows are bases; those after them are the samples in raw, as they
// are. Without compression there is no basis and every sample is raw.
type data struct {
	*problem
	r     int
	bases []*basis
	at    []int // first row of each basis
	raw   []int
	rows  [][]float64 // (r + len(raw)) × P
	x2    float64     // sum of squares of the samples

	w2       []float64 // J × K: squared weights, zero where there is no cell
	complete []int     // samples whose cells are all there: all but raw ones with gaps

	gapCell []int32   // cells that some raw sample lacks
	gapOf   [][]int32 // which rows lack it
}

// whole is the problem without compression.
func (p *problem) whole() *data {
	d := &data{problem: p, rows: p.x, x2: p.x2, raw: make([]int, p.i)}
	for i := range d.raw {
		d.raw[i] = i
	}
	d.finish()
	return d
}

// finish sets what follows from the rest.
func (d *data) finish() {
	d.w2 = make([]float64, d.j*d.k)
	for q, w := range d.w {
		d.w2[int(d.cj[q])*d.k+int(d.ck[q])] = w * w
	}
	for _, b := range d.bases {
		d.complete = append(d.complete, b.samples...)
	}
	for _, i := range d.raw {
		if len(d.gaps[i]) == 0 {
			d.complete = append(d.complete, i)
		}
	}
	d.listGaps()
}

func (d *data) listGaps() {
	at := make(map[int32]int)
	for _, i := range d.raw {
		for _, q := range d.gaps[i] {
			n, ok := at[q]
			if !ok {
				n = len(d.gapCell)
				at[q] = n
				d.gapCell, d.gapOf = append(d.gapCell, q), append(d.gapOf, nil)
			}
			d.gapOf[n] = append(d.gapOf[n], int32(i))
		}
	}
}
