package parafac

import (
	"context"
	"errors"
	"fmt"

	"tarnlight/eem"
)

// Splits says how a survey may be cut into halves. The zero value works.
type Splits struct {
	// Group, I: samples with the same text, unless it is empty, are never parted:
	// the replicates of one bottle.
	Group []string
	// By are columns whose values part the samples: setup, site, season.
	By []SplitBy
}

// SplitBy is one run-sheet column; Value has one text a sample.
type SplitBy struct {
	Name  string
	Value []string
}

// Choice is the table from which a number of components is chosen.
type Choice struct {
	Candidates []*Candidate // by number of components
	Splits     []Split
	Components int    // the largest number that passes; 0 when none does
	Verdict    string // why that one, and why not the next
}

// Candidate is one number of components.
type Candidate struct {
	*Result
	Gain      float64 // percentage points explained beyond the candidate before; 0 for the first
	Agree     float64 // share of the starts that reached this model
	Halves    int     // splits made, those by a column left out
	HalvesOK  int     // of these, in how many every component was found in both halves
	LeastHalf float64 // smallest congruence of a component between halves, over these splits' median one
	Passes    bool
	Reason    string // why it does not pass, or what speaks for it
}

// Split is one component of one candidate in one pair of halves. Congruences and
// shifts are between the halves, over the loadings that the whole survey's mask
// leaves open.
type Split struct {
	Components       int
	Name             string // "random 1", "alternating", "site: A, C against B"
	Component        int
	First, Second    int     // samples in each half
	Ex, Em           float64 // congruence
	ExPeak, EmPeak   float64 // nm, second half's peak less the first's
	ExCentre, EmMean float64 // nm, the same for the centroid
	Agrees           bool    // both congruences at least 0.95

	// Spectra are those of the component in the first and in the second half,
	// at a maximum of 1 over the loadings that the model of the whole survey
	// determines. What it does not determine is not determined in its halves
	// either: plot a gap.
	Spectra [2]Spectra
}

// Spectra are the loadings of one component, J and K.
type Spectra struct{ Ex, Em []float64 }

const (
	sameSpectrum = 0.95 // Lorenzo-Seva & ten Berge 2006
	sharedTriple = 0.7  // one component shared by two (METHODS 5.3, from memory)
	soundCore    = 75   // core consistency below which a fit that cannot be split is not believed (from memory)
	soundStarts  = 0.5  // share of starts, likewise (common practice, no source)
	mostlySeen   = 0.5  // share of a component's loadings that the mask must leave open
)

// Choose fits from … to components, splits the survey into halves, and says
// which numbers the data bear. The settings hold for every fit. A candidate that
// cannot be fitted is left out, with the reason in the verdict; an error is
// returned when none can.
func Choose(ctx context.Context, c *eem.Cube, from, to int, s *Settings, sp *Splits) (*Choice, error) {
	if from < 1 || to < from {
		return nil, fmt.Errorf("components from %d to %d: ask for a range such as 2 to 7", from, to)
	}
	set := s.withDefaults()
	if sp == nil {
		sp = &Splits{}
	}
	if err := sp.check(c.Len()); err != nil {
		return nil, err
	}
	if from < len(set.Hold) {
		return nil, fmt.Errorf("%d spectra are held but the range begins at %d components; begin it at %d or more", len(set.Hold), from, len(set.Hold))
	}
	p, top, err := largest(c, from, to, &set)
	if err != nil {
		return nil, err
	}
	groups := p.groups(sp)
	pr, err := p.prepare(ctx, top, quarters(groups, shuffled(len(groups), set.Seed)), &set)
	if err != nil {
		return nil, err
	}
	ch := &Choice{}
	models, err := pr.descend(ctx, c, from, top, &set, ch)
	if err != nil {
		return nil, err
	}
	if err := pr.splitAll(ctx, models, groups, sp, &set, ch); err != nil {
		return nil, err
	}
	ch.judge(to, top)
	return ch, nil
}

// largest makes the problem of the largest number of components, at most to,
// that the samples allow.
func largest(c *eem.Cube, from, to int, set *Settings) (*problem, int, error) {
	var first error
	for f := min(to, maxF, max(from, c.Len())); f >= from; f-- {
		p, err := newProblem(c, f, set)
		if err == nil {
			return p, f, nil
		}
		first = err
	}
	if first == nil {
		first = errors.New("no number of components in this range can be fitted")
	}
	return nil, 0, first
}

// model is a candidate's fit as it goes into the split halves.
type model struct {
	s *als // finished, on the samples
	r *Result
}

// descend fits every number of components from the largest down. Each also
// starts from the models of one more with one component left out, which find
// optima that random starts miss (NUMERICS 2f).
func (pr *prepared) descend(ctx context.Context, c *eem.Cube, from, to int, set *Settings, ch *Choice) ([]*model, error) {
	starts := make([][]*outcome, to-from+1)
	above := &als{} // none: the largest number starts from random alone
	for f := to; f >= from; f-- {
		set.Progress(to-f, to-from+1, eem.Count(f, "component"))
		all, err := runStarts(ctx, pr.all, f, set, above)
		if err != nil {
			return nil, err
		}
		if above, err = pr.continued(ctx, all, set); err != nil {
			return nil, err
		}
		starts[f-from] = all
	}
	models := make([]*model, len(starts))
	err := parallel(ctx, set, len(starts), "finishing", func(n int) error {
		n = len(starts) - 1 - n // the longest first
		r, s, err := conclude(ctx, c, pr.problem, starts[n], goodForNow, set)
		models[n] = &model{s: s, r: r}
		return err
	})
	if err != nil {
		return nil, err
	}
	for n, m := range models {
		cand := &Candidate{Result: m.r, Agree: m.r.agree()}
		if n > 0 {
			cand.Gain = m.r.Explained - models[n-1].r.Explained
		}
		ch.Candidates = append(ch.Candidates, cand)
	}
	return models, nil
}

// continued refills gaps where there are many and returns the best model as the
// next smaller number starts from it, ridge and all.
func (pr *prepared) continued(ctx context.Context, all []*outcome, set *Settings) (*als, error) {
	if pr.filled {
		if _, err := pr.refill(ctx, all, set); err != nil {
			return nil, err
		}
	}
	best := bestOf(all).s
	keep := newALS(pr.all, best.f, set)
	keep.take(best)
	return keep, nil
}

// agree is the share of the starts that reached the best model.
func (r *Result) agree() float64 {
	n := 0
	for _, s := range r.Starts {
		if s.Agrees {
			n++
		}
	}
	return float64(n) / float64(len(r.Starts))
}

func (sp *Splits) check(samples int) error {
	if sp.Group != nil && len(sp.Group) != samples {
		return fmt.Errorf("%d groups given for %d samples", len(sp.Group), samples)
	}
	for _, b := range sp.By {
		if len(b.Value) != samples {
			return fmt.Errorf("column %q has %d values for %d samples", b.Name, len(b.Value), samples)
		}
	}
	return nil
}

// groups lists the rows that belong together, in the order of their first one.
func (p *problem) groups(sp *Splits) [][]int {
	var out [][]int
	at := make(map[string]int)
	for row, i := range p.sample {
		if sp.Group == nil || sp.Group[i] == "" {
			out = append(out, []int{row})
			continue
		}
		n, ok := at[sp.Group[i]]
		if !ok {
			n = len(out)
			at[sp.Group[i]] = n
			out = append(out, nil)
		}
		out[n] = append(out[n], row)
	}
	return out
}
