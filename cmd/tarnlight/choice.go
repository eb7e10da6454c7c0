package main

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/parafac"
	"tarnlight/unmix/report"
)

// choose fits every number of components asked for and takes the one that the
// settings state, or the largest that passes every test.
func (j *job) choose(ctx context.Context, fit *eem.Cube, c survey.Components, set *parafac.Settings) error {
	want := j.set.Resolve.Choose
	from, to := c.From, c.To
	if want > 0 {
		from, to = min(from, want), max(to, want)
	}
	splits, err := j.splits(fit)
	if err != nil {
		return err
	}
	ch, err := parafac.Choose(ctx, fit, from, to, set, splits)
	if err != nil {
		return err
	}
	j.choice = ch
	n := ch.Components
	stated := want > 0 || from == to
	if want == 0 && stated {
		want = from
	}
	if stated {
		n = want
	}
	passes := ""
	for _, cand := range ch.Candidates {
		j.fits = append(j.fits, cand.Result)
		if cand.Components == n {
			j.fit = cand.Result
			if !cand.Passes {
				passes = cand.Reason
			}
		}
	}
	doubt := func(sev eem.Severity, format string, a ...any) {
		j.flags = append(j.flags, j.sv.Accept(eem.NewFlag(eem.Flag{Method: "parafac", Test: "no-model-passes", Severity: sev, Value: nan, Limit: nan, Msg: fmt.Sprintf(format, a...)})))
	}
	const remedy = "exclude odd bottles (leverage and influence in samples.csv), widen the scatter bands, narrow the grid to where there is signal, or measure more bottles"
	switch because := j.set.Resolve.Because; {
	case j.fit == nil && stated:
		return fmt.Errorf("settings, resolve.components: %s could not be fitted: %s", eem.Count(want, "component"), ch.Verdict)
	case stated && because != "":
		fmt.Fprintf(j.bar, "%s, because: %s\nthe tests say: %s\n", eem.Count(n, "component"), because, ch.Verdict)
		if passes != "" {
			doubt(eem.Remark, "%s, chosen because: %s; they do not pass every test: %s", eem.Count(n, "component"), because, passes)
		}
	case stated && passes != "":
		doubt(eem.Doubt, "the stated %s do not pass every test: %s; %s, or give the reason for the number ([resolve] choose and because)", eem.Count(n, "component"), passes, remedy)
	case n == 0 && !stated:
		j.fit = j.fits[0]
		doubt(eem.Doubt, "%s %s are shown all the same: %s, or choose a number with a reason ([resolve] choose and because)", strings.TrimRight(ch.Verdict, ".; ")+".", eem.Count(j.fit.Components, "component"), remedy)
	default:
		fmt.Fprintf(j.bar, "%s\n", ch.Verdict)
	}
	return nil
}

// splits says which bottles belong together and which columns part them.
func (j *job) splits(fit *eem.Cube) (*parafac.Splits, error) {
	sp := &parafac.Splits{}
	col := -1
	if name := j.set.Resolve.SplitBy; name != "" {
		if col = slices.IndexFunc(j.sheet.Columns, func(c string) bool { return strings.EqualFold(c, name) }); col < 0 {
			return nil, fmt.Errorf("settings, resolve.split_by: the run sheet has no column %q; it has %s", name, strings.Join(j.sheet.Columns, ", "))
		}
		sp.By = []parafac.SplitBy{{Name: name}}
	}
	for _, id := range fit.IDs {
		b := j.bottle(id)
		sp.Group = append(sp.Group, j.origin(b))
		if col >= 0 {
			v := ""
			if col < len(b.Row.Cells) {
				v = b.Row.Cells[col]
			}
			sp.By[0].Value = append(sp.By[0].Value, v)
		}
	}
	return sp, nil
}

// origin names the bottle that b repeats in the end, itself where it repeats none.
func (j *job) origin(b *prepare.Bottle) string {
	for range j.sv.Bottles { // no longer chain than there are bottles
		of := b.Row.ReplicateOf
		if of == "" {
			of = b.Row.SpikeOf
		}
		next := j.bottle(of)
		if next == nil {
			break
		}
		b = next
	}
	return b.Row.ID
}

// modelTable makes models.csv.
func (j *job) modelTable() *report.Table {
	t := report.New("models.csv")
	for i, fit := range j.fits {
		cells, agree := 0, 0
		for _, n := range fit.Cells {
			cells += n
		}
		for _, s := range fit.Starts {
			if s.Agrees {
				agree++
			}
		}
		ex, em, verdict, reason := nan, nan, "", ""
		if j.choice != nil {
			cand := j.choice.Candidates[i]
			ex, em = j.leastHalves(fit.Components)
			if verdict, reason = "fail", cand.Reason; cand.Passes {
				verdict = "pass"
			}
			if fit == j.fit && j.set.Resolve.Choose > 0 {
				reason = "chosen because: " + j.set.Resolve.Because + "; the tests: " + reason
			}
		}
		unseen := j.unseen(fit)
		if unseen != "" {
			reason = strings.TrimPrefix(reason+"; greatest where nothing fluoresces: "+unseen, "; ")
		}
		t.Append(fit.Components, len(fit.IDs), cells, fit.Loss, fit.Explained, fit.CoreConsistency, ex, em, len(fit.Starts), agree, fit.Iterations,
			fit.Status == parafac.Converged, fit.Certificate, fit.Structure, fit.TripleCosine, fit.Revived, unseen == "", verdict, fit == j.fit, reason,
			strconv.FormatUint(j.set.Resolve.Seed, 10))
	}
	return t
}

// leastHalves returns the lowest congruences between halves of one candidate.
func (j *job) leastHalves(components int) (ex, em float64) {
	ex, em = nan, nan
	for _, s := range j.choice.Splits {
		if s.Components != components {
			continue
		}
		if math.IsNaN(ex) || s.Ex < ex {
			ex = s.Ex
		}
		if math.IsNaN(em) || s.Em < em {
			em = s.Em
		}
	}
	return ex, em
}

// nameIn is the name of component f of the candidate with so many components: in
// the model that the results rest on the name that it kept.
func (j *job) nameIn(components, f int) string {
	for _, r := range j.res {
		if r.Set.Method == "parafac" && components == j.fit.Components {
			return r.Set.Components[f].Name
		}
	}
	for _, fit := range j.fits {
		if fit.Components == components && fit.Held[f] != "" {
			return fit.Held[f]
		}
	}
	return fmt.Sprintf("C%d", f+1)
}

// splitTable makes splits.csv.
func (j *job) splitTable() *report.Table {
	t := report.New("splits.csv")
	if j.choice == nil {
		return t
	}
	for _, s := range j.choice.Splits {
		t.Append(s.Components, s.Name, j.nameIn(s.Components, s.Component), s.Ex, s.Em, 0.95, s.Agrees,
			s.ExPeak, s.EmPeak, s.ExCentre, s.EmMean, s.First, s.Second)
	}
	return t
}

// splitSpectra makes split_spectra.csv: loadings stay empty where the model of all
// bottles does not determine them.
func (j *job) splitSpectra() *report.Table {
	t := report.New("split_spectra.csv")
	if j.choice == nil {
		return t
	}
	whole := make(map[int]*parafac.Result)
	for _, c := range j.choice.Candidates {
		whole[c.Components] = c.Result
	}
	for _, s := range j.choice.Splits {
		r := whole[s.Components]
		for n, half := range []string{"first", "second"} {
			for _, m := range []struct {
				mode string
				axis eem.Axis
				v    []float64
				ok   []bool
			}{
				{unmix.ModeEx, r.Grid.Ex, s.Spectra[n].Ex, r.ExDetermined[s.Component]},
				{unmix.ModeEm, r.Grid.Em, s.Spectra[n].Em, r.EmDetermined[s.Component]},
			} {
				for i, v := range m.v {
					if !m.ok[i] {
						v = nan
					}
					t.Append(s.Components, s.Name, half, j.nameIn(s.Components, s.Component), m.mode, m.axis.At(i), v)
				}
			}
		}
	}
	return t
}
