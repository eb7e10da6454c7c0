package report

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"sync"

	"tarnlight/eem"
)

// RenderSettings are the words of the [report] settings and what else Render must
// know that the result files do not hold.
type RenderSettings struct {
	Title, Client, Order, Number, Method, Remarks, TestedBy, ApprovedBy string

	Decimal  string            // decimal mark of text and pictures: "," or "." (default)
	Digits   int               // significant digits of an uncertainty where this package rounds; 0 means 2
	Pictures bool              // make maps/ and figures/
	Accepts  map[string]string // test codes whose doubts are accepted, with the reason

	// SafeName maps a bottle's id to the stem of its file in maps/; nil takes the
	// id as it is, which is only safe for ids that are file names.
	SafeName func(id string) string
	Workers  int // goroutines; 0 means the number of processors
}

// Render makes report.xlsx, workings.xlsx, report.html, maps/ and figures/ from
// the tables and survey.nc in dir. progress, which may be nil, is called from one
// goroutine with how much of the work is done. The same files and settings give
// the same bytes, whatever Workers is.
func Render(ctx context.Context, dir string, s RenderSettings, progress func(done, total int, what string)) error {
	if s.SafeName == nil {
		s.SafeName = func(id string) string { return id }
	}
	if s.Digits <= 0 {
		s.Digits = 2
	}
	if s.Workers <= 0 {
		s.Workers = runtime.GOMAXPROCS(0)
	}
	for _, p := range []*string{&s.Title, &s.Client, &s.Order, &s.Number, &s.Method, &s.Remarks, &s.TestedBy, &s.ApprovedBy} {
		*p = visible(*p)
	}
	r, err := loadResults(dir, &s)
	if err != nil {
		return err
	}
	return errors.Join(r.render(ctx, progress), r.close())
}

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

func (r *results) render(ctx context.Context, progress func(done, total int, what string)) error {
	total := len(r.bottles) + 3
	tell := func(done int, what string) {
		if progress != nil {
			progress(done, total, what)
		}
	}
	if r.s.Pictures {
		for _, d := range []string{"maps", "figures"} {
			if err := os.MkdirAll(filepath.Join(r.dir, d), 0o777); err != nil {
				return err
			}
		}
	}
	p, err := r.walk(ctx, tell)
	if err != nil {
		return err
	}
	tell(len(r.bottles), "figures")
	figures := r.figures(p)
	if r.s.Pictures {
		for _, f := range figures {
			if err := errors.Join(f.write(filepath.Join(r.dir, "figures")), ctx.Err()); err != nil {
				return err
			}
		}
	}
	tell(len(r.bottles)+1, "workbook")
	if err := r.writeClient(); err != nil {
		return err
	}
	if err := errors.Join(ctx.Err(), r.writeWorkings(p)); err != nil {
		return err
	}
	tell(len(r.bottles)+2, "page")
	if err := r.writePage(p, figures); err != nil {
		return err
	}
	tell(total, "report")
	return nil
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
	tri := newTriptych(r.store.Grid, r.store.Unit, methods, r.modelTitles(methods), r.num)
	packers := sync.Pool{New: func() any { return newPacker(levels, methods) }}
	work := func(i int) (*shown, error) {
		b := r.bottles[i]
		if b.at < 0 {
			return &shown{}, nil
		}
		s, err := r.store.Sample(b.at)
		if err != nil || largest(s.Corrected) < 0 {
			return &shown{}, err // nothing was measured
		}
		out := &shown{residual: s.Residual}
		var ps []panels
		for _, m := range methods {
			ps = append(ps, newPanels(s, m))
		}
		if ps == nil {
			ps = []panels{newPanels(s, "")}
		}
		out.scales = append(out.scales, ps[0].scale)
		for _, q := range ps {
			out.scales = append(out.scales, q.residualScale)
		}
		out.thumb = thumb(r.store.Grid, ps[0])
		k := packers.Get().(*packer)
		out.packed = k.pack(s)
		packers.Put(k)
		if r.s.Pictures {
			err = r.drawMap(tri, b, s, ps)
		}
		return out, err
	}
	size := 0
	return p, ordered(ctx, r.s.Workers, len(r.bottles), work, func(i int, s *shown) error {
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
		out = append(out, fmt.Sprintf("%s, %s", methodName(m), plural(n, "component", "components")))
	}
	return out
}

func plural(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}

// drawMap writes one bottle's picture to maps/.
func (r *results) drawMap(tri *triptych, b *bottle, s *StoreSample, ps []panels) error {
	t := r.table["samples.csv"]
	f := func(name string) float64 { return t.Float(b.row, t.Own(name)) }
	text := triptychText{id: b.id, what: "no fit"}
	if e := f("explained_percent"); !math.IsNaN(e) {
		text.what = r.num.fitText(e, f("residual_rms"), f("noise_rms"), r.unit)
	}
	c := tri.draw(text, ps)
	return writeFile(filepath.Join(r.dir, "maps", r.mapFile(b.id)), func(w io.Writer) error { return c.encode(w) })
}

// figures makes every figure that the results have numbers for.
func (r *results) figures(p *pass) []*figure {
	var all []*figure
	for _, m := range r.methods() {
		all = append(all, r.figSpectra(m), r.figComponentMaps(m))
	}
	for _, m := range r.methods() {
		all = append(all, r.figContributions(m, r.bySite()), r.figContributions(m, r.byDate()), r.figContributions(m, r.inOrder()))
	}
	for _, m := range r.methods() {
		if r.store != nil {
			all = append(all, r.figUnexplained(m, p.left[m], r.store.Grid))
		}
	}
	all = append(all, r.figModels(), r.figSplits(), r.figCharts())
	out := all[:0]
	for _, f := range all {
		if f != nil {
			out = append(out, f)
		}
	}
	return out
}
