package parafac

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
)

// problem is the cube as the solver sees it: the P cells that hold data, sorted
// by excitation then emission, and the samples as rows of length P, scaled, zero
// where missing. NaN never gets past here.
type problem struct {
	grid    eem.Grid
	i, j, k int // samples in the fit, excitations, emissions
	p       int

	sample []int // cube index of each row
	total  int   // samples of the cube

	cj, ck []int32 // excitation and emission of each cell
	byEx   []int   // J+1: cells of excitation j are byEx[j]:byEx[j+1]
	byEm   []int   // K+1: into emCells
	emCell []int32 // cells sorted by emission

	w     []float64   // P: square root of the weight of each cell, mean square 1
	x     [][]float64 // I × P: weighted, scaled data
	scale []float64   // I: x = w · data / scale
	gaps  [][]int32   // I: cells of P that this row lacks
	x2    float64     // ‖x‖²

	notes []eem.Note
}

// rareShare is the share of samples below which a cell is left out of the fit:
// one cell that only one sample has would make all others samples with gaps.
const rareShare = 0.05

func newProblem(c *eem.Cube, components int, s *Settings) (*problem, error) {
	if components < 1 || components > maxF {
		return nil, fmt.Errorf("a model of %d components cannot be fitted; ask for 1 to %d", components, maxF)
	}
	if c.Len() == 0 {
		return nil, errors.New("the survey has no sample to fit")
	}
	if err := s.checkHold(c.Grid, components); err != nil {
		return nil, err
	}
	p := &problem{grid: c.Grid, j: c.Ex.Len(), k: c.Em.Len(), total: c.Len()}
	p.chooseSamples(c, components)
	p.i = len(p.sample)
	if p.i < 2 || p.i < components {
		return nil, fmt.Errorf("%d samples with data are too few for %d components; PARAFAC needs 2 samples and as many as components: add samples, ask for fewer components, or quantify against references", p.i, components)
	}
	if err := p.chooseCells(c); err != nil {
		return nil, err
	}
	p.weigh(c, s)
	if err := p.fill(c, s); err != nil {
		return nil, err
	}
	return p, nil
}

func usable(v float64, why eem.Reason) bool {
	return why == eem.Measured && !math.IsNaN(v) && !math.IsInf(v, 0)
}

// chooseSamples leaves out samples that cannot even carry their own scores.
func (p *problem) chooseSamples(c *eem.Cube, components int) {
	for i := range c.Len() {
		n, why := 0, c.SampleWhy(i)
		for q, v := range c.Sample(i) {
			if usable(v, why[q]) {
				n++
			}
		}
		if n > components {
			p.sample = append(p.sample, i)
			continue
		}
		p.note("few-cells", eem.Reject, float64(n), float64(components+1), fmt.Sprintf(
			"%s has %d measured cells, too few for %d components; it took no part in the fit and has no scores: look at its scans, or exclude it", c.IDs[i], n, components))
	}
}

func (p *problem) chooseCells(c *eem.Cube) error {
	n := c.Cells()
	count := make([]int, n)
	for _, i := range p.sample {
		why := c.SampleWhy(i)
		for q, v := range c.Sample(i) {
			if usable(v, why[q]) {
				count[q]++
			}
		}
	}
	least := max(1, int(math.Ceil(rareShare*float64(p.i))))
	if p.i < 40 {
		least = 1
	}
	p.byEx, p.byEm = make([]int, p.j+1), make([]int, p.k+1)
	rare := 0
	for j := range p.j {
		p.byEx[j] = len(p.cj)
		for k := range p.k {
			switch m := count[j*p.k+k]; {
			case m >= least:
				p.cj, p.ck = append(p.cj, int32(j)), append(p.ck, int32(k))
				p.byEm[k+1]++
			case m > 0:
				rare++
			}
		}
	}
	p.p = len(p.cj)
	p.byEx[p.j] = p.p
	if p.p == 0 {
		return errors.New("no cell of the grid was measured in enough samples; look at the masks and at the samples' grids")
	}
	p.sortByEmission()
	if rare > 0 {
		p.note("", eem.Information, 0, 0, fmt.Sprintf("%d cells measured in fewer than %d samples took no part in the fit", rare, least))
	}
	p.noteEmpty()
	return nil
}

func (p *problem) sortByEmission() {
	for k := range p.k {
		p.byEm[k+1] += p.byEm[k]
	}
	p.emCell = make([]int32, p.p)
	next := append([]int(nil), p.byEm[:p.k]...)
	for q, k := range p.ck {
		p.emCell[next[k]] = int32(q)
		next[k]++
	}
}

// noteEmpty says which wavelengths have no data at all.
func (p *problem) noteEmpty() {
	say := func(mode string, a eem.Axis, at []int) {
		n, first := 0, 0.0
		for q := range a.Len() {
			if at[q] == at[q+1] {
				if n == 0 {
					first = a.At(q)
				}
				n++
			}
		}
		if n > 0 {
			p.note("", eem.Information, 0, 0, fmt.Sprintf("%d %s wavelengths (the first at %g nm) hold no data in any sample; the loadings there are undetermined: narrow the grid or the scatter bands", n, mode, first))
		}
	}
	say("excitation", p.grid.Ex, p.byEx)
	say("emission", p.grid.Em, p.byEm)
}

// weigh sets w and the rows' scale to the separable form of the uncertainties:
// log u_ip ≈ row_i + cell_p, from row and column means of log u.
func (p *problem) weigh(c *eem.Cube, s *Settings) {
	p.w, p.scale = make([]float64, p.p), make([]float64, p.i)
	for q := range p.w {
		p.w[q] = 1
	}
	for i := range p.scale {
		p.scale[i] = 1
	}
	if !s.Weights || c.U == nil {
		return
	}
	n := c.Cells()
	sum, num := make([]float64, p.p), make([]float64, p.p)
	for r, i := range p.sample {
		var rowSum, rowNum float64
		for q := range p.w {
			at := i*n + int(p.cj[q])*p.k + int(p.ck[q])
			u := float64(c.U[at])
			if !usable(c.X[at], c.Why[at]) || !(u > 0) || math.IsInf(u, 0) {
				continue
			}
			l := math.Log(u)
			sum[q], num[q], rowSum, rowNum = sum[q]+l, num[q]+1, rowSum+l, rowNum+1
		}
		if rowNum > 0 {
			p.scale[r] = math.Exp(rowSum / rowNum)
		}
	}
	p.cellWeights(sum, num)
}

func (p *problem) cellWeights(sum, num []float64) {
	var all, cells float64
	for q := range sum {
		if num[q] > 0 {
			all, cells = all+sum[q]/num[q], cells+1
		}
	}
	if cells == 0 {
		return
	}
	var ss float64
	for q := range p.w {
		if num[q] > 0 {
			p.w[q] = math.Exp(-(sum[q]/num[q] - all/cells))
		}
		ss += p.w[q] * p.w[q]
	}
	for q := range p.w {
		p.w[q] /= math.Sqrt(ss / float64(p.p))
	}
}

// fill copies the data, scales the rows and lists the gaps.
func (p *problem) fill(c *eem.Cube, s *Settings) error {
	all := make([]float64, p.i*p.p)
	p.gaps = make([][]int32, p.i)
	lo, hi := math.Inf(1), math.Inf(-1)
	for r, i := range p.sample {
		row, why := c.Sample(i), c.SampleWhy(i)
		x := all[r*p.p : (r+1)*p.p] // not cut off: neighbours are read as one (joinedRows)
		p.x = append(p.x, x)
		for q := range x {
			at := int(p.cj[q])*p.k + int(p.ck[q])
			if !usable(row[at], why[at]) {
				p.gaps[r] = append(p.gaps[r], int32(q))
				continue
			}
			lo, hi = min(lo, row[at]), max(hi, row[at])
			x[q] = p.w[q] * row[at] / p.scale[r]
		}
	}
	if lo == hi {
		return fmt.Errorf("every measured cell of the survey holds %g; there is nothing to resolve: look at the lamp, the shutter and the corrections", lo)
	}
	p.normalise(c, s)
	return nil
}

func (p *problem) normalise(c *eem.Cube, s *Settings) {
	for r, i := range p.sample {
		x := p.x[r]
		n := norm(x)
		if n == 0 {
			p.note("no-light", eem.Reject, 0, 0, fmt.Sprintf("%s holds nothing but zeros; its scores are 0 and mean nothing", c.IDs[i]))
		}
		if !s.RawSamples && !s.Weights && n > 0 {
			p.scale[r] *= n
			for q := range x {
				x[q] /= n
			}
		}
		p.x2 += sumSquares(x)
	}
}

// subset is the problem of some of the samples, sharing their rows. A cell that
// none of them has weighs nothing there.
func (p *problem) subset(rows []int) *problem {
	s := *p
	s.i, s.sample, s.x, s.gaps, s.scale = len(rows), nil, nil, nil, nil
	s.x2, s.notes = 0, nil
	lack := make([]int, p.p)
	for _, i := range rows {
		for _, q := range p.gaps[i] {
			lack[q]++
		}
	}
	s.w = slices.Clone(p.w)
	for q, n := range lack {
		if n == len(rows) {
			s.w[q] = 0
		}
	}
	for _, i := range rows {
		var gaps []int32
		for _, q := range p.gaps[i] {
			if lack[q] < len(rows) {
				gaps = append(gaps, q)
			}
		}
		s.sample, s.x, s.gaps, s.scale = append(s.sample, p.sample[i]), append(s.x, p.x[i]), append(s.gaps, gaps), append(s.scale, p.scale[i])
		s.x2 += sumSquares(p.x[i])
	}
	return &s
}

func (p *problem) note(test string, sev eem.Severity, value, limit float64, msg string) {
	p.notes = append(p.notes, eem.Note{Step: "parafac", Test: test, Severity: sev, Value: value, Limit: limit, Measure: limit != 0, Msg: msg})
}
