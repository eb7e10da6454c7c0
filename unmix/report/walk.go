package report

import (
	"context"
	"fmt"
	"math"
	"path/filepath"
	"sync"

	"tarnlight/eem"
)

// pass is what one walk through the store gathers.
type pass struct {
	left   map[string]*leftover // by method
	scales [][]float64          // by bottle: scale ends of the measured map and of each residual
	packed []string             // by bottle: its maps for the page
	thumbs [][]byte             // by bottle: small PNG, nil without a map
	note   string               // how finely the page's maps are cut
}

// shown is what one bottle leaves for the collector.
type shown struct {
	residual map[string][]float32
	scales   []float64
	packed   string
	thumb    []byte
}

// common is one scale for all bottles: what 95 % of their own scales lie below.
func (p *pass) common() []float64 {
	var out []float64
	for l := 0; ; l++ {
		var all []float64
		for _, s := range p.scales {
			if l < len(s) {
				all = append(all, s[l])
			}
		}
		if all == nil {
			return out
		}
		out = append(out, topOf(all, 0.95))
	}
}

// walk reads every bottle once: draws its map, packs it for the page and gathers
// what the survey's figures need.
func (r *results) walk(ctx context.Context, tell func(done int, what string)) (*pass, error) {
	p := &pass{left: map[string]*leftover{}}
	if r.store == nil {
		return p, nil
	}
	methods := r.store.Methods
	for _, m := range methods {
		p.left[m] = newLeftover(r.store.Grid.Cells())
	}
	levels, err := r.chooseLevels(p)
	if err != nil {
		return nil, err
	}
	w := &walker{r: r, methods: methods, tri: newTriptych(r.store.Grid, r.store.Unit, methods, r.modelTitles(methods), r.num)}
	w.packers.New = func() any { return newPacker(levels, methods) }
	size := 0
	return p, ordered(ctx, r.s.Workers, len(r.bottles), w.visit, func(i int, s *shown) error {
		for _, m := range methods {
			if s.residual != nil && r.bottles[i].worst < eem.Reject {
				p.left[m].add(s.residual[m])
			}
		}
		if size += len(s.packed); size > pageLimit {
			s.packed = "" // only a survey too large for the coarsest steps comes here
		}
		p.scales, p.packed, p.thumbs = append(p.scales, s.scales), append(p.packed, s.packed), append(p.thumbs, s.thumb)
		tell(i+1, "maps")
		return nil
	})
}

// walker does what is done to every bottle; several goroutines share it.
type walker struct {
	r       *results
	methods []string
	tri     *triptych
	packers sync.Pool
}

// visit reads bottle i, draws it and packs it.
func (w *walker) visit(i int) (*shown, error) {
	r, b := w.r, w.r.bottles[i]
	if b.at < 0 {
		return &shown{}, nil
	}
	s, err := r.store.Sample(b.at)
	if err != nil || largest(s.Corrected) < 0 {
		return &shown{}, err // nothing was measured
	}
	var ps []panels
	for _, m := range w.methods {
		ps = append(ps, newPanels(s, m))
	}
	if ps == nil {
		ps = []panels{newPanels(s, "")}
	}
	out := &shown{residual: s.Residual, scales: []float64{ps[0].scale}, thumb: thumb(r.store.Grid, ps[0])}
	for _, q := range ps {
		out.scales = append(out.scales, q.residualScale)
	}
	k := w.packers.Get().(*packer)
	out.packed = k.pack(s)
	w.packers.Put(k)
	if r.s.Pictures {
		err = r.drawMap(w.tri, b, ps)
	}
	return out, err
}

// pageLimit bounds the maps in the page, bytes: a browser opens 40 MB in a second
// or two.
const pageLimit = 36 << 20

// chooseLevels takes the finest steps with which the maps of all bottles stay
// within the page's limit, judged by 24 bottles spread over the survey.
func (r *results) chooseLevels(p *pass) (int, error) {
	var some []*StoreSample
	with := 0
	for _, b := range r.bottles {
		if b.at >= 0 {
			with++
		}
	}
	seen := 0
	for _, b := range r.bottles {
		if b.at < 0 {
			continue
		}
		if seen%max(1, with/24) == 0 {
			s, err := r.store.Sample(b.at)
			if err != nil {
				return 0, err
			}
			some = append(some, s)
		}
		seen++
	}
	levels := levelsChoice[0]
	for _, levels = range levelsChoice {
		size, k := 0, newPacker(levels, r.store.Methods)
		for _, s := range some {
			size += len(k.pack(s))
		}
		if len(some) == 0 || size/len(some)*with < pageLimit*9/10 {
			break
		}
	}
	p.note = fmt.Sprintf("Maps in this page are cut into %d steps between their lowest and highest value, so that a value read here is within half a step, %s %% of that range, of the one in survey.nc. Tables are not cut.",
		levels, r.num.sig(50/float64(levels), 2))
	return levels, nil
}

// modelTitles says for each method which model it is.
func (r *results) modelTitles(methods []string) []string {
	var out []string
	for _, m := range methods {
		n := 0
		for _, s := range r.series {
			if s.method == m {
				n++
			}
		}
		out = append(out, fmt.Sprintf("%s, %s", methodName(m), eem.Count(n, "component")))
	}
	return out
}

// pictureText is what stands above a bottle's picture.
func (r *results) pictureText(b *bottle) triptychText {
	t := r.table["samples.csv"]
	f := func(name string) float64 { return t.Float(b.row, t.Own(name)) }
	text := triptychText{id: b.id, what: "no fit"}
	if e := f("explained_percent"); !math.IsNaN(e) {
		text.what = r.num.fitText(e, f("residual_rms"), f("noise_rms"), r.unit)
	}
	return text
}

// drawMap writes one bottle's picture to maps/.
func (r *results) drawMap(tri *triptych, b *bottle, ps []panels) error {
	if oneScan(r.store.Grid) {
		return r.drawScan(b, tri.methods, ps)
	}
	c := tri.draw(r.pictureText(b), ps)
	return writeFile(filepath.Join(r.dir, "maps", r.mapFile(b.id)), c.encode)
}
