package report

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"runtime"

	"tarnlight/unmix/merit"
)

// RenderSettings are the words of the [report] settings and what else Render must
// know that the result files do not hold.
type RenderSettings struct {
	Title, Client, Order, Number, Method, Remarks, TestedBy, ApprovedBy string

	Decimal  string            // decimal mark of text and pictures: "," or "." (default)
	Digits   int               // significant digits of an expanded uncertainty; 0 means 2
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
		s.Digits = merit.StatedDigits
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

// figures makes every figure that the results have numbers for.
func (r *results) figures(p *pass) []*figure {
	var all []*figure
	shown := append(r.methods(), "unexplained") // what is left over may have a spectrum of its own
	for _, m := range shown {
		all = append(all, r.figSpectra(m), r.figComponentMaps(m))
	}
	for _, m := range shown {
		all = append(all, r.figContributions(m, r.bySite()), r.figContributions(m, r.byDate()), r.figContributions(m, r.inOrder()))
	}
	for _, m := range r.methods() {
		if r.store != nil {
			all = append(all, r.figUnexplained(m, p.left[m], r.store.Grid))
		}
	}
	all = append(append(all, r.figModels(), r.figSplits(), r.figBlanks()), r.figCharts()...)
	out := all[:0]
	for _, f := range all {
		if f != nil {
			out = append(out, f)
		}
	}
	return out
}
