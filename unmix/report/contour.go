package report

import (
	"image/color"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"tarnlight/eem"
)

// contour draws lines of equal value over a map by marching squares. Squares
// with a missing corner are left out; lines are linked in scan order, so that
// the same map gives the same bytes. (The plot library's own contours zigzag
// along missing cells and follow map order.)
type contour struct {
	grid   eem.Grid
	v      []float64
	levels []float64
	style  func(level float64) draw.LineStyle
}

type point struct{ em, ex float64 }

// Plot implements plot.Plotter.
func (o *contour) Plot(c draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&c)
	for _, level := range o.levels {
		for _, line := range contourLines(o.grid, o.v, level) {
			if len(line) < 6 {
				continue // a speck of noise
			}
			pts := make([]vg.Point, len(line))
			for i, q := range line {
				pts[i] = vg.Point{X: tx(q.em), Y: ty(q.ex)}
			}
			c.StrokeLines(o.style(level), c.ClipLinesXY(pts)...)
		}
	}
}

// edge is a side of a square: from cell (j, k) towards larger emission, or up
// towards larger excitation.
type edge struct {
	j, k int
	up   bool
}

// contourLines returns the polylines along which v, linear between cells, equals
// level. Closed lines end where they begin.
func contourLines(g eem.Grid, v []float64, level float64) [][]point {
	links := map[edge][]edge{}
	var order []edge // edges in scan order
	link := func(a, b edge) {
		for _, e := range []edge{a, b} {
			if links[e] == nil {
				order = append(order, e)
			}
		}
		links[a], links[b] = append(links[a], b), append(links[b], a)
	}
	for j := range g.Ex.Len() - 1 {
		for k := range g.Em.Len() - 1 {
			square(g, v, level, j, k, link)
		}
	}
	var out [][]point
	done := map[edge]bool{}
	trace := func(e edge) {
		line := []point{crossing(g, v, level, e)}
		done[e] = true
		for next, ok := step(links[e], done); ok; next, ok = step(links[e], done) {
			e = next
			done[e] = true
			line = append(line, crossing(g, v, level, e))
		}
		out = append(out, line)
	}
	for _, e := range order { // open lines begin at their ends
		if !done[e] && len(links[e]) == 1 {
			trace(e)
		}
	}
	for _, e := range order {
		if !done[e] {
			trace(e)
			n := len(out) - 1
			out[n] = append(out[n], out[n][0])
		}
	}
	return out
}

func step(to []edge, done map[edge]bool) (edge, bool) {
	for _, e := range to {
		if !done[e] {
			return e, true
		}
	}
	return edge{}, false
}

// square links the sides of one square that the level crosses.
func square(g eem.Grid, v []float64, level float64, j, k int, link func(a, b edge)) {
	n := g.Em.Len()
	c := [4]float64{v[j*n+k], v[j*n+k+1], v[(j+1)*n+k+1], v[(j+1)*n+k]} // around the square
	sides := [4]edge{{j, k, false}, {j, k + 1, true}, {j + 1, k, false}, {j, k, true}}
	var crossed []edge
	for i := range 4 {
		a, b := c[i], c[(i+1)%4]
		if a != a {
			return
		}
		if (a >= level) != (b >= level) {
			crossed = append(crossed, sides[i])
		}
	}
	switch len(crossed) {
	case 2:
		link(crossed[0], crossed[1])
	case 4: // a saddle: the middle decides which corners belong together
		if ((c[0]+c[1]+c[2]+c[3])/4 >= level) == (c[0] >= level) {
			link(crossed[0], crossed[1])
			link(crossed[2], crossed[3])
		} else {
			link(crossed[0], crossed[3])
			link(crossed[1], crossed[2])
		}
	}
}

// crossing is where the level lies on a side.
func crossing(g eem.Grid, v []float64, level float64, e edge) point {
	n := g.Em.Len()
	a := v[e.j*n+e.k]
	p := point{em: g.Em.At(e.k), ex: g.Ex.At(e.j)}
	if e.up {
		b := v[(e.j+1)*n+e.k]
		p.ex += (level - a) / (b - a) * (g.Ex.At(e.j+1) - p.ex)
	} else {
		b := v[e.j*n+e.k+1]
		p.em += (level - a) / (b - a) * (g.Em.At(e.k+1) - p.em)
	}
	return p
}

// onMap is a line that can be seen on the intensity map: dark on its pale half,
// light on its dark half.
func onMap(level float64) draw.LineStyle {
	if level < 0.5 {
		return draw.LineStyle{Color: color.NRGBA{40, 40, 50, 170}, Width: 0.5}
	}
	return draw.LineStyle{Color: color.NRGBA{255, 255, 255, 200}, Width: 0.5}
}
