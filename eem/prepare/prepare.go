// Package prepare turns a run sheet into corrected bottles and the survey cube.
//
// One plan fixes the order of everything that is done to a bottle:
//
//	read · axes swapped? · no light? · saturation · detector · offset ·
//	spectral factors · inner filter · blank · temperature · intensity scale ·
//	dilution · scatter
//
// The steps up to the inner filter need the bottle alone; blank and scale need
// the blanks of its batch; the grid needs all samples. One bad bottle never stops
// a survey: it is kept, marked as rejected, and says why.
package prepare

import (
	"context"
	"fmt"
	"runtime"
	"sync"
	"sync/atomic"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/survey"
)

// Options of Read. The zero value works.
type Options struct {
	Workers  int // goroutines; 0 means GOMAXPROCS; no result depends on it
	Progress func(done, total int, what string)
	// Trace is told what each step made of a bottle; it may be called from several
	// goroutines, for one bottle in the order of the steps. e is not to be changed.
	Trace func(b *Bottle, step string, e *eem.EEM)
	// Cache takes over bottles that are as they were; nil reads all of them. With
	// Trace it is left alone: what was taken over passed no step.
	Cache *Cache
	// KeepUnit holds the unit of [intensity], as a model's must be: a batch that
	// cannot be given in it loses its bottles and does not stop the survey.
	KeepUnit bool
	// Known is what is known of the instrument from elsewhere, such as from the
	// survey of a model; it stands in for what a batch's own blanks are too few to
	// tell, so that no bottle depends on other batches.
	Known *Known
	Grid  *eem.Grid // the survey's grid where it is given, that of a model; nil: that of the most samples
}

// Input is one file that a result rests on.
type Input struct {
	Path   string // relative to the survey folder, with slashes
	SHA256 string // hexadecimal
	Size   int64  // bytes
}

// Bottle is one row of the sheet with what became of it.
type Bottle struct {
	Row        *survey.Row
	Setting    *survey.Settings // with the row's setup merged in
	Batch      string
	EEM        *eem.EEM        // corrected, on the bottle's own grid; nil when it could not be read or is excluded
	Absorb     *eem.Absorbance // of the liquid in the bottle, nil when none was given
	Largest    float64         // largest inner-filter factor of a cell, NaN without correction
	LinearFrom float64         // shortest excitation, nm, from which on ln(10)·A of the liquid scanned is within the linear range; NaN unknown or none
	OverShare  float64         // of its cells that are above the absorbance limit, NaN where unknown
	Files      []Input
	Flags      []eem.Flag
	Excluded   bool // takes part in nothing
	Rejected   bool // no number of it is usable

	// Causes are the errors that the bottle's cells share, on the survey's grid,
	// and BlankSet names the mean of blanks that was subtracted (see
	// Survey.BlankU; empty where none was).
	Causes   []eem.Cause
	BlankSet string
	Glow     *Glow // of a blank, nil where it shows no Raman line

	raw       *eem.EEM        // up to the inner filter: what blank and scale start from
	scanned   *eem.Absorbance // of the liquid scanned
	guesses   []Guess
	strange   []string   // samples that its file names, when none is the bottle
	said      []eem.Note // findings as they came, before the quality settings
	scanFiles []Input    // the raw scans among Files
	claims    []string   // files that the scans cell names
	twofold   *Bottle    // the same water at another dilution, which corrects the inner filter; nil without
	told      int        // notes of EEM whose findings are flags already
	area      float64    // Raman area of a blank, before the blank is removed; NaN unknown
	scale     float64    // what the intensities were divided by; NaN when they stay as they are
	blanks    []*Bottle  // what its blank and its scale rest on

	counts *eem.EEM       // a blank's counts without the offset, for the noise model
	noise  *correct.Noise // nil while unknown
	gain   []float32      // intensity, up to the inner filter, for one count
	u      []float32      // noise of the corrected cells; nil while unknown
}

// Usable says whether the bottle has numbers that may be used.
func (b *Bottle) Usable() bool { return !b.Excluded && !b.Rejected && b.EEM != nil }

// Survey is a survey read and corrected.
type Survey struct {
	Dir      string
	Sheet    *survey.Sheet
	Settings *survey.Settings // with the values found for "auto"
	Unit     eem.Unit
	Grid     eem.Grid
	Bottles  []*Bottle // one a row of the sheet, in its order
	Batches  []*Batch  // in the order of their first bottle
	Flags    []eem.Flag
	Inputs   []Input // without repeats, sorted by path
	Guesses  []Guess // how raw files were taken

	// BlankU is the standard uncertainty of each cell of a mean of blanks from
	// noise, J × K in Unit, by the name of the set; it is that of an undiluted bottle.
	BlankU map[string][]float32

	Noise *BareNoise // of pure water on the survey's grid; nil while unknown

	factors      map[string]factorPair  // by setup
	autoBands    map[string]survey.Band // what was found for "auto", by key of [scatter]
	defaultBands []string               // the keys among them that no blank showed
	trace        func(b *Bottle, step string, e *eem.EEM)
	cache        *Cache
	shared       map[string]*sharedFile // raw files that several rows name, by path
	keepUnit     bool
	known        *Known
	noiseOf      map[string]*correct.Noise // from all blanks of a setup
}

// Guess counts the files that were taken in one way.
type Guess struct {
	Text  string
	Files int
	First string
}

// Read reads and corrects every bottle of the sheet. dir is the survey folder.
// It returns an error only where the survey as a whole cannot be worked on; what
// concerns one bottle is in that bottle's Flags.
func Read(ctx context.Context, dir string, sheet *survey.Sheet, set *survey.Settings, o Options) (*Survey, error) {
	if o.Workers <= 0 {
		o.Workers = runtime.GOMAXPROCS(0)
	}
	own := *set
	s := &Survey{Dir: dir, Sheet: sheet, Settings: &own, trace: o.Trace, keepUnit: o.KeepUnit, known: o.Known}
	if o.Trace == nil {
		s.cache = o.Cache
	}
	if err := s.list(); err != nil {
		return nil, err
	}
	for _, b := range s.Bottles {
		if !b.Excluded {
			b.twofold = s.sameWater(b)
		}
	}
	files, err := s.resolve()
	if err != nil {
		return nil, err
	}
	if err := s.readFactors(); err != nil {
		return nil, err
	}
	if err := s.each(ctx, o, "reading", func(i int) { s.Bottles[i].read(s, files[i]) }); err != nil {
		return nil, err
	}
	s.shared = nil
	if s.cache != nil {
		s.cache.sweep()
	}
	s.formBatches()
	if err := s.checkLamps(); err != nil {
		return nil, err
	}
	if err := s.chooseUnit(); err != nil {
		return nil, err
	}
	s.setNoise()
	s.pairDilutions()
	s.findLoans()
	if err := s.each(ctx, o, "correcting", func(i int) { s.Bottles[i].finish(s) }); err != nil {
		return nil, err
	}
	if err := s.chooseGrid(o.Grid); err != nil {
		return nil, err
	}
	s.listCauses()
	s.blankNoise()
	s.Noise = s.bareNoise()
	for _, b := range s.Bottles {
		b.raw, b.scanned, b.counts, b.gain = nil, nil, nil, nil
	}
	s.inherit()
	s.checkBatches()
	s.checkBelow()
	s.sameContent()
	s.compareDilutions()
	s.unusedFiles()
	s.collect()
	return s, nil
}

// list makes a bottle of every row.
func (s *Survey) list() error {
	for i := range s.Sheet.Rows {
		row := &s.Sheet.Rows[i]
		set, err := s.Settings.For(row.Setup)
		if err != nil {
			return fmt.Errorf("%s:%d: %w", s.Sheet.Path, row.Line, err)
		}
		b := &Bottle{Row: row, Setting: set, Batch: batchName(row), Excluded: row.Exclude != "", Largest: nan, LinearFrom: nan, OverShare: nan, area: nan, scale: nan}
		if b.Excluded {
			b.flag(s, eem.Note{Test: "excluded", Severity: eem.Remark, Msg: "excluded: " + row.Exclude})
		} else if row.ExcludeFromFit != "" {
			b.flag(s, eem.Note{Test: "excluded-from-fit", Severity: eem.Remark, Msg: "left out of model, references and charts: " + row.ExcludeFromFit})
		}
		if !b.Excluded {
			b.checkHolding(s)
		}
		s.Bottles = append(s.Bottles, b)
	}
	for _, n := range s.Sheet.Notes {
		if n.Test != "" {
			s.Flags = append(s.Flags, eem.FlagFrom(s.judge(n), "", ""))
		}
	}
	return nil
}

// each runs f on every bottle that is not excluded, on o.Workers goroutines.
func (s *Survey) each(ctx context.Context, o Options, what string, f func(i int)) error {
	var wg sync.WaitGroup
	next := make(chan int)
	var done atomic.Int64
	for range o.Workers {
		wg.Go(func() {
			for i := range next {
				if !s.Bottles[i].Excluded && ctx.Err() == nil {
					f(i)
				}
				if n := done.Add(1); o.Progress != nil {
					o.Progress(int(n), len(s.Bottles), what)
				}
			}
		})
	}
	for i := range s.Bottles {
		next <- i
	}
	close(next)
	wg.Wait()
	return ctx.Err()
}

// Pick returns the bottles that pass.
func (s *Survey) Pick(pass func(*Bottle) bool) []*Bottle {
	var out []*Bottle
	for _, b := range s.Bottles {
		if pass(b) {
			out = append(out, b)
		}
	}
	return out
}

// Cube stacks usable bottles on the survey's grid.
func (s *Survey) Cube(bottles []*Bottle) *eem.Cube {
	ids := make([]string, len(bottles))
	es := make([]*eem.EEM, len(bottles))
	for i, b := range bottles {
		ids[i], es[i] = b.Row.ID, s.onGrid(b.EEM)
	}
	c := eem.NewCube(s.Grid, ids, es)
	c.Unit = s.Unit
	c.U = s.cellNoise(bottles)
	return c
}
