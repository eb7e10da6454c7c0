package merit

import (
	"cmp"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
)

// Line is a scatter line that a bottle may still hold light of.
type Line struct {
	scatter.Band        // what is taken out, or would be
	Name         string // "second-order Rayleigh line"
	Remedy       string // what the analyst does about light left along it
}

// Top is the largest residual of one scan.
type Top struct {
	Ex, Em, Height float64 // nm, nm, intensity
	Width          float64 // nm: how far emission stays above half its height, to the next missing cell
}

// topsOf finds the largest residual of every scan of a map (J × K, NaN missing) that
// stands out: of 4 standard deviations of the noise u and more, where u is nil of a
// tenth of the map's largest.
func topsOf(g eem.Grid, residual []float64, u []float32) []Top {
	var out []Top
	highest := 0.0
	nk := g.Em.Len()
	for j := range g.Ex.Len() {
		at := -1
		for c := j * nk; c < (j+1)*nk; c++ {
			if v := residual[c]; v > 0 && (at < 0 || v > residual[at]) {
				at = c
			}
		}
		if at < 0 || u != nil && !(residual[at] > 4*float64(u[at])) {
			continue
		}
		out = append(out, Top{g.Ex.At(j), g.Em.At(at - j*nk), residual[at], width(g.Em, residual[j*nk:(j+1)*nk], at-j*nk)})
		highest = max(highest, residual[at])
	}
	if u == nil {
		out = slices.DeleteFunc(out, func(t Top) bool { return t.Height < highest/10 })
	}
	return out
}

// width is how far a scan stays above half of its value at k, nm; a missing cell ends
// it, so that light on both sides of what was taken out is not one.
func width(em eem.Axis, scan []float64, k int) float64 {
	lo, hi := k, k
	for lo > 0 && scan[lo-1] >= scan[k]/2 {
		lo--
	}
	for hi < len(scan)-1 && scan[hi+1] >= scan[k]/2 {
		hi++
	}
	return em.At(hi) - em.At(lo)
}

// besideBand, nm, is how far beyond the ends of what is taken out around a line its
// light may be found.
const besideBand = 10

// along are the tops that lie along a line. They do where they stand within
// besideBand nm of its band at three excitations or more, are narrower than that at
// half their height, and move with it: the slope of where they are over where the
// line is (least squares, each weighing by its height) is one half or more. What a
// substance emits is wider, also where a band cuts it, and stays where it is, slope 0.
func (l Line) along(tops []Top) []Top {
	var on []Top
	var w, x, y float64
	for _, t := range tops {
		lo, hi := l.Range(t.Ex)
		if t.Em < lo-besideBand || t.Em > hi+besideBand || t.Width >= besideBand {
			continue
		}
		on = append(on, t)
		w, x, y = w+t.Height, x+t.Height*l.Em(t.Ex), y+t.Height*t.Em
	}
	var xx, xy float64
	for _, t := range on {
		d := l.Em(t.Ex) - x/w
		xx, xy = xx+t.Height*d*d, xy+t.Height*d*(t.Em-y/w)
	}
	if len(on) < 3 || !(xy >= xx/2) {
		return nil
	}
	return on
}

// leftover names the scatter lines that hold most of what stands out of the noise:
// the tops along lines have half of the summed heights of all tops, or more. The
// line with the most comes first. Nil where the residual is something else.
func leftover(tops []Top, lines []Line) []Line {
	type share struct {
		Line
		height float64
	}
	sum := 0.0
	for _, t := range tops {
		sum += t.Height
	}
	found := map[Top]bool{}
	var out []share
	for _, l := range lines {
		s := share{Line: l}
		for _, t := range l.along(tops) {
			if !found[t] { // near two lines it counts once
				s.height += t.Height
			}
			found[t] = true
		}
		if s.height > 0 {
			out = append(out, s)
		}
	}
	slices.SortStableFunc(out, func(a, b share) int { return cmp.Compare(b.height, a.height) })
	on := 0.0
	var named []Line
	for _, s := range out {
		if on += s.height; s.height >= sum/10 {
			named = append(named, s.Line)
		}
	}
	if len(out) == 0 || on < sum/2 {
		return nil
	}
	return named
}

// along tells in words which lines they are.
func along(lines []Line) string {
	names := make([]string, len(lines))
	for i, l := range lines {
		names[i] = l.Name
	}
	return "along the " + strings.Join(names, " and the ")
}

// remedy tells what to do about light left along lines.
func remedy(lines []Line) string {
	var todo []string
	for _, l := range lines {
		if !slices.Contains(todo, l.Remedy) {
			todo = append(todo, l.Remedy)
		}
	}
	return strings.Join(todo, ", ")
}
