package merit

import (
	"slices"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
)

// references adds what is wrong with the components themselves.
func (b *bottle) references() {
	e, n := b.e, b.e.n
	if b.m.ref != nil {
		b.addTensor("noise of the standards", "standard", 0, "noise model of the blanks", b.m.ref)
	}
	b.scatter()
	if b.m.apart != nil {
		b.addTensor("absorbance noise of the standards", "standard", 0, "roughness of the absorbance spectrum", b.m.apart)
	}
	if b.m.load != nil {
		text := "uncertainty of the given spectra"
		if e.src.Loadings != nil {
			text = "infinitesimal jackknife over the bottles of the model"
		}
		b.addTensor("loadings", "survey", 0, text, b.m.load)
	}
	if b.m.bent != nil {
		b.addBias(CauseBounds, "survey", "loadings less those of a Gauss–Newton step to loadings and scores of either sign", b.m.bent)
	}
	b.frozen()
	if e.src.StockMissing {
		b.silent = append(b.silent, Term{Cause: "standards", Scope: "survey", Source: "not given"})
	}
	if e.src.Stock > 0 {
		var effects [][]float64
		for g := range n {
			effect := make([]float64, n*n)
			for h := range n {
				effect[h*n+g] = b.m.gram[h*n+g] * e.src.Stock
			}
			effects = append(effects, effect)
		}
		b.addLinear("standards", "survey", 0, "settings: uncertainty", effects)
	}
}

var scopes = map[eem.Scope]string{eem.OfSurvey: "survey", eem.OfBatch: "batch", eem.OfStandard: "standard", eem.OfBottle: "bottle"}

// shared adds the causes that cells share. One that acts on bottle and standards
// acts on both together.
func (b *bottle) shared() {
	e, n := b.e, b.e.n
	group := map[string]int{}
	add := func(name, scope string, df float64, text string, effect []float64) {
		if _, ok := group[name]; !ok {
			group[name] = len(b.sources)
			b.add(name, scope, df, text, nil)
		}
		own := &b.sources[group[name]]
		own.effects = append(own.effects, effect)
		own.at = linear(own.effects, n)
	}
	done := map[int]bool{}
	for _, c := range e.causesOf(b.i) {
		if c.U != c.U && b.repeats && c.Name == CauseRepeat {
			continue
		}
		if c.U != c.U {
			b.silent = append(b.silent, Term{Cause: c.Name, Scope: scopes[c.Scope], Source: "not given"})
			continue
		}
		if c.Apart {
			done[e.placeOf(c)] = true
			b.add(c.Name, scopes[c.Scope], c.DF, c.Source, b.byWavelength(&c))
			continue
		}
		effect := b.onBottle(&c)
		if z, ok := e.place[idOf(c)]; ok {
			done[z] = true
			axpy(-1, b.m.q[z], effect)
		}
		add(c.Name, scopes[c.Scope], c.DF, c.Source, effect)
	}
	for z := range e.causes {
		c := &e.causes[z]
		if done[z] || c.apart {
			continue
		}
		effect := make([]float64, n*n)
		axpy(-1, b.m.q[z], effect)
		if c.scope == eem.OfBottle {
			add(c.name+ofStandards, "standard", c.df, c.source, effect)
		} else {
			add(c.name, scopes[c.scope], c.df, c.source, effect)
		}
	}
}

// byWavelength is the source of a cause that every wavelength has for itself.
func (b *bottle) byWavelength(c *eem.Cause) func(dst, x []float64) {
	n := b.e.n
	return func(dst, x []float64) {
		v := make([]float64, n)
		for _, mode := range []struct{ u, sums []float64 }{{c.Ex, b.m.kx}, {c.Em, b.m.km}} {
			for i, u := range mode.u {
				for h := range n {
					v[h] = 0
					for g, y := range x {
						v[h] += mode.sums[(i*n+h)*n+g] * y
					}
				}
				addOuter(dst, v, u*u)
			}
		}
	}
}

// onBottle returns [h][g]: Σ K_h·relative·K_g, the change of K'b with b = Σ x_g K_g.
// Of a contribution that is a height (Fmax) the survey's own errors only move that
// height: the loadings have them too.
func (b *bottle) onBottle(c *eem.Cause) []float64 {
	e, n := b.e, b.e.n
	out := make([]float64, n*n)
	if c.Scope == eem.OfSurvey && e.src.References == nil && e.r.Set.Components[0].AmountUnit == "" {
		for g := range n {
			comp := &e.r.Set.Components[g]
			v := relative(c, int32(floats.MaxIdx(comp.Ex)), int32(floats.MaxIdx(comp.Em)))
			for h := range n {
				out[h*n+g] = v * b.m.gram[h*n+g]
			}
		}
		return out
	}
	if c.Ex == nil && c.Em == nil {
		axpy(c.U, b.m.gram, out)
		return out
	}
	// Σ (U + ex_j + em_k) K_h K_g by what wavelengths sum up to.
	axpy(c.U, b.m.gram, out)
	for _, mode := range []struct{ shape, sums []float64 }{{c.Ex, b.m.kx}, {c.Em, b.m.km}} {
		for i, v := range mode.shape {
			if sum := mode.sums[i*n*n : (i+1)*n*n]; slices.Max(sum) > 0 { // a wavelength that no cell has need not be known
				axpy(v, sum, out)
			}
		}
	}
	return out
}
