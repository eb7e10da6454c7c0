package plan

import "math"

// mostAlike is the largest correlation of neighbours that is believed, as in merit.
const mostAlike = 0.95

// setAlike tabulates how alike departures from the model are.
func (d *Design) setAlike() {
	g, nj := d.p.Set.Grid, d.p.Set.Grid.Ex.Len()
	if d.p.Noise.Misfit == nil {
		return
	}
	d.alike = make([]float64, nj*nj)
	for j := range nj {
		for i := range nj {
			d.alike[j*nj+i] = alikeAt(math.Abs(g.Ex.At(j)-g.Ex.At(i)), d.p.Noise.AlikeNM[0])
		}
	}
	from, to, stride := d.Ends(d.p.Window)
	if n := to - from - 1; n > 0 {
		d.alikeEm = alikeAt((g.Em.At(to-1)-g.Em.At(from))/float64(n)*float64(stride), d.p.Noise.AlikeNM[1])
	}
}

func alikeAt(distance, length float64) float64 {
	if !(length > 0) {
		return 0
	}
	return math.Min(mostAlike, math.Exp(-distance/length))
}

// together is how many cells count as one for scans at lines and one more (−1: none):
// (1+ρ)/(1−ρ) along both axes, as of a first-order autoregression, ρ being that of
// neighbouring scans in the middle.
func (d *Design) together(lines []int, more int, cells float64) float64 {
	if d.alike == nil {
		return 1
	}
	nj := d.p.Set.Grid.Ex.Len()
	sum, pairs := 0.0, 0.0
	for _, j := range lines {
		if next := above(lines, more, j); next >= 0 {
			sum, pairs = sum+d.alike[j*nj+next], pairs+1
		}
	}
	if more >= 0 {
		if next := above(lines, -1, more); next >= 0 {
			sum, pairs = sum+d.alike[more*nj+next], pairs+1
		}
	}
	tau := (1 + d.alikeEm) / (1 - d.alikeEm)
	if pairs > 0 {
		tau *= (1 + sum/pairs) / (1 - sum/pairs)
	}
	return math.Min(tau, cells/float64(d.n+1))
}

// above is the nearest line above j among lines and more, −1 where there is none.
func above(lines []int, more, j int) int {
	next := -1
	for _, i := range lines {
		if i > j && (next < 0 || i < next) {
			next = i
		}
	}
	if more > j && (next < 0 || more < next) {
		next = more
	}
	return next
}
