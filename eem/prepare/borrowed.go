package prepare

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
	"tarnlight/eem/survey"
)

// loan is what a batch takes from another: its blanks, and how well they fit.
type loan struct {
	blanks []*Bottle // each once, in the order of use
	age    float64   // days between the last blank and the first bottle that uses it, NaN unknown
	ratio  float64   // median of the bottles' own Raman light over the blanks', NaN unknown
	u      float64   // standard uncertainty of ratio
	n      int       // bottles that show it
}

// borrows says whether the bottle rests on a blank of another batch.
func (b *Bottle) borrows() bool {
	return b.Row.Kind != survey.Blank && slices.ContainsFunc(b.blanks, func(c *Bottle) bool { return c.Batch != b.Batch })
}

// fromOf says in words where blanks of a batch come from.
func fromOf(blanks []*Bottle, batch string) string {
	ids := map[string][]string{}
	var order, from []string
	for _, b := range blanks {
		if b.Batch == batch {
			continue
		}
		if ids[b.Batch] == nil {
			order = append(order, b.Batch)
		}
		ids[b.Batch] = append(ids[b.Batch], b.Row.ID)
	}
	for _, other := range order {
		from = append(from, strings.Join(ids[other], ", ")+" of batch "+other)
	}
	return strings.Join(from, "; ")
}

// findLoans looks, in every batch that borrows, for what its bottles' own Raman
// light says of the blanks: nothing else of the batch tells whether the lamp has
// changed since.
func (s *Survey) findLoans() {
	for _, bt := range s.Batches {
		l := &loan{age: nan, ratio: nan, u: nan}
		var ratios, us []float64
		for _, b := range bt.Bottles {
			if b.Excluded || b.Rejected || !b.borrows() {
				continue
			}
			l.add(b)
			if r, u, ok := b.ownLight(); ok {
				ratios, us = append(ratios, r), append(us, u)
			}
		}
		if len(l.blanks) == 0 {
			continue
		}
		if l.n = len(ratios); l.n > 0 {
			l.ratio, l.u = middle(ratios), middle(us)/math.Sqrt(float64(l.n))
		}
		bt.loan = l
		s.tellLoan(bt)
	}
}

// add notes the blanks that bottle b of the batch borrows.
func (l *loan) add(b *Bottle) {
	for _, c := range b.blanks {
		if c.Batch == b.Batch {
			continue
		}
		if !slices.Contains(l.blanks, c) {
			l.blanks = append(l.blanks, c)
		}
		if b.Row.Measured.IsZero() || c.Row.Measured.IsZero() {
			continue
		}
		if days := b.Row.Measured.Sub(c.Row.Measured.Time).Hours() / 24; !(math.Abs(days) >= math.Abs(l.age)) {
			l.age = days
		}
	}
}

// ownLight is the bottle's own Raman line over that of its blanks, after the inner
// filter and before the blank; ok is false where it says nothing of the lamp.
func (b *Bottle) ownLight() (r, u float64, ok bool) {
	if !b.Usable() || !b.rawLight() || b.dimmed() {
		return nan, nan, false
	}
	mean, err := b.blankMean()
	if mean == nil || err != nil { // told where the blank is subtracted
		return nan, nan, false
	}
	return scatter.Seen(b.EEM, mean, scatter.Raman1, ramanWindow)
}

// departure is by how much the bottles' own light is off that of borrowed blanks,
// relative; 0 where nothing is borrowed or nothing is seen.
func (bt *Batch) departure() float64 {
	if bt.loan == nil || math.IsNaN(bt.loan.ratio) {
		return 0
	}
	return math.Abs(bt.loan.ratio - 1)
}

// tellLoan flags the batch: whose blanks it uses, and where its own light departs
// from theirs beyond what the bottles scatter.
func (s *Survey) tellLoan(bt *Batch) {
	l := bt.loan
	flag := func(n eem.Note) {
		n.Measure = !math.IsNaN(n.Value)
		n.File = filepath.ToSlash(filepath.Base(s.Sheet.Path))
		s.Flags = append(s.Flags, eem.FlagFrom(s.judge(n), "", bt.Name))
	}
	from := fromOf(l.blanks, bt.Name)
	age, seen := "of unknown age", "its bottles do not show whether the lamp was the same"
	if !math.IsNaN(l.age) {
		age = fmt.Sprintf("%.1f days old", l.age)
	}
	if l.n > 0 {
		seen = fmt.Sprintf("water's own light (Raman) is %.3g of the blanks' in the middle of %s", l.ratio, eem.Count(l.n, "bottle"))
	}
	flag(eem.Note{Test: "blank-borrowed", Severity: eem.Remark, Value: l.age,
		Msg: fmt.Sprintf("blanks borrowed for subtraction and scale: %s, %s; %s", from, age, seen)})
	limit := s.Limit("blank-drift")
	if off := 100 * (l.ratio - 1); math.Abs(off)-200*l.u > limit {
		flag(eem.Note{Test: "blank-drift", Severity: eem.Doubt, Value: off, Limit: limit,
			Msg: fmt.Sprintf("blanks borrowed from another batch (%s, %s): %s, so that the lamp or the instrument has changed since and intensities may be off by %.0f %%; measure a blank with the batch, or name a nearer one in the blanks column", from, age, seen, math.Abs(off))})
	}
}

// middle is the median of v, which it sorts.
func middle(v []float64) float64 {
	slices.Sort(v)
	n := len(v)
	return (v[(n-1)/2] + v[n/2]) / 2
}
