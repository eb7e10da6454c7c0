package parafac

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// tell fills in what the result says about errors: standard errors, what is
// determined, leverage and influence.
func (n *newton) tell(r *Result) {
	bent := n.bent()
	in := n.influence()
	f := in.f
	sb, sc := in.loadingSE()
	peakB, peakC := make([]int, f), make([]int, f)
	for x := range f {
		b, _ := in.loading(in.b, in.j, x)
		c, _ := in.loading(in.c, in.k, x)
		peakB[x], peakC[x] = floats.MaxIdx(b), floats.MaxIdx(c)
	}
	for to, x := range r.order {
		se, ok := in.modeSE(sb, in.b, in.dampB, in.j, x, peakB[x], r.Held[to] != "")
		r.ExSE, r.ExDetermined = append(r.ExSE, se), append(r.ExDetermined, ok)
		se, ok = in.modeSE(sc, in.c, in.dampC, in.k, x, peakC[x], r.Held[to] != "")
		r.EmSE, r.EmDetermined = append(r.EmSE, se), append(r.EmDetermined, ok)
		r.exRes = append(r.exRes, undamped(in.dampB, in.j, f, x))
		r.emRes = append(r.emRes, undamped(in.dampC, in.k, f, x))
	}
	in.keep(r, peakB, peakC)
	in.keepBent(r, bent, peakB, peakC)
	score := in.scoreSE(peakB, peakC)
	for row, i := range in.sample {
		for to, x := range r.order {
			r.ScoreSE[i*f+to] = score[row*f+x]
		}
	}
	in.tellSamples(r, sb, sc)
}

func undamped(damped []bool, rows, f, x int) []bool {
	out := make([]bool, rows)
	for r := range out {
		out[r] = !damped[r*f+x]
	}
	return out
}

// modeSE scales the standard errors of component x to a maximum of 1 and says
// which of its loadings are determined.
func (in *influence) modeSE(se, load []float64, damped []bool, rows, x, peak int, held bool) ([]float64, []bool) {
	out, ok := make([]float64, rows), make([]bool, rows)
	top := math.Abs(load[peak*in.f+x])
	for r := range rows {
		e := r*in.f + x
		if top > 0 {
			out[r] = se[e] / top
		}
		ok[r] = held || top > 0 && out[r] < mostSE && !damped[e]
	}
	return out, ok
}

func (in *influence) tellSamples(r *Result, sb, sc []float64) {
	r.Leverage, r.Influence = make([]float64, in.total), make([]float64, in.total)
	m := len(in.theta)
	for row, h := range in.leverage() {
		r.Leverage[in.sample[row]] = h
	}
	for row, i := range in.sample {
		for x, e := range in.theta {
			var se float64
			if e < in.nb {
				se = sb[e]
			} else {
				se = sc[e-in.nb]
			}
			if se > 0 {
				r.Influence[i] = math.Max(r.Influence[i], math.Abs(in.d[row*m+x])/se)
			}
		}
	}
}
