package parafac

import (
	"fmt"
	"slices"

	"tarnlight/eem"
)

// judge decides which candidates pass and says why.
func (ch *Choice) judge(asked, top int) {
	for _, c := range ch.Candidates {
		c.Passes, c.Reason = c.judge()
		if c.Passes {
			ch.Components = c.Components
		}
	}
	ch.Verdict = ch.words(asked, top)
}

func (c *Candidate) judge() (bool, string) {
	switch x, y := c.leastSeen(); {
	case c.TripleCosine > sharedTriple:
		return false, fmt.Sprintf("components %d and %d are one shared by two (triple cosine %.2f above %.1f)", c.TriplePair[0]+1, c.TriplePair[1]+1, c.TripleCosine, sharedTriple)
	case c.TripleCosine < -0.85:
		return false, fmt.Sprintf("components %d and %d cancel each other (triple cosine %.2f)", c.TriplePair[0]+1, c.TriplePair[1]+1, c.TripleCosine)
	case c.Status != Converged:
		return false, fmt.Sprintf("the fit did not converge in %d iterations, a sign of too many components", c.Iterations)
	case y < mostlySeen:
		return false, fmt.Sprintf("too little of component %d can be seen (%.0f %% of a spectrum); the rest lies under the scatter bands or beyond the scans", x+1, 100*y)
	case c.Halves > 0 && 2*c.HalvesOK <= c.Halves:
		return false, fmt.Sprintf("split halves disagree: all components were found in both halves in %d of %d splits (smallest congruence, median split: %.2f)", c.HalvesOK, c.Halves, c.LeastHalf)
	case c.Halves > 0:
		return true, fmt.Sprintf("all components were found in both halves in %d of %d splits", c.HalvesOK, c.Halves)
	case c.Components > 2 && c.CoreConsistency < soundCore:
		return false, fmt.Sprintf("core consistency %.0f %% is below %d %%, and there are too few samples to split", c.CoreConsistency, soundCore)
	case c.Agree < soundStarts:
		return false, fmt.Sprintf("only %.0f %% of the starts reached this model, and there are too few samples to split", 100*c.Agree)
	default:
		return true, fmt.Sprintf("%.0f %% of the starts agree and core consistency is %.0f %%; there are too few samples to split", 100*c.Agree, c.CoreConsistency)
	}
}

// leastSeen returns the component with the smallest share of loadings in one
// mode that the mask leaves open to the data, over the wavelengths where it has a tenth of its peak.
func (c *Candidate) leastSeen() (int, float64) {
	at, least := 0, 1.0
	for f := range c.Components {
		for _, m := range []struct {
			v  []float64
			ok []bool
		}{{c.Ex[f], c.exRes[f]}, {c.Em[f], c.emRes[f]}} {
			n, seen := 0, 0
			for i, v := range m.v {
				if v > 0.1 {
					n++
					if m.ok[i] {
						seen++
					}
				}
			}
			if share := float64(seen) / float64(max(1, n)); share < least {
				at, least = f, share
			}
		}
	}
	return at, least
}

func (ch *Choice) words(asked, top int) string {
	var w string
	next := 0
	if ch.Components == 0 {
		w = "No number of components passes."
	} else {
		n := slices.IndexFunc(ch.Candidates, func(c *Candidate) bool { return c.Components == ch.Components })
		w = fmt.Sprintf("%s: %s.", eem.Count(ch.Components, "component"), ch.Candidates[n].Reason)
		next = n + 1
	}
	for _, c := range ch.Candidates[next:] {
		w += fmt.Sprintf(" Not %d: %s.", c.Components, c.Reason)
	}
	if ch.Components == top && top == asked {
		w += " It is the largest number tried; try more."
	}
	if top < asked {
		w += fmt.Sprintf(" More than %d cannot be fitted to so few samples.", top)
	}
	return w
}
