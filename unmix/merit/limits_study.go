package merit

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// Repeats is what repeated measurements of one amount show over several batches:
// the one-way analysis of variance with batches drawn at random (ISO 5725-2; from
// memory). What the values cannot tell is NaN.
type Repeats struct {
	N, Batches int
	Mean       float64
	SD         float64 // of all values, N − 1 degrees of freedom
	Within     float64 // SD within a batch, N − Batches degrees of freedom
	Between    float64 // SD of what a batch has for itself
	Total      float64 // SD of one measurement on a day of its own: √(Within² + Between²)
	DF         float64 // of Total, by Welch–Satterthwaite
}

// RepeatsOf analyses values, one slice a batch.
func RepeatsOf(batches [][]float64) Repeats {
	batches = slices.DeleteFunc(slices.Clone(batches), func(v []float64) bool { return len(v) == 0 })
	nan := math.NaN()
	r := Repeats{Batches: len(batches), Mean: nan, SD: nan, Within: nan, Between: nan, Total: nan, DF: nan}
	sum, squares := 0.0, 0.0
	for _, b := range batches {
		r.N += len(b)
		squares += float64(len(b) * len(b))
		for _, v := range b {
			sum += v
		}
	}
	if r.N < 2 {
		return r
	}
	n, k := float64(r.N), float64(r.Batches)
	r.Mean = sum / n
	var within, between float64
	for _, b := range batches {
		m := stat.Mean(b, nil)
		between += float64(len(b)) * (m - r.Mean) * (m - r.Mean)
		for _, v := range b {
			within += (v - m) * (v - m)
		}
	}
	r.SD = math.Sqrt((within + between) / (n - 1))
	r.Total, r.DF = r.SD, n-1
	if n > k {
		within /= n - k
		r.Within = math.Sqrt(within)
	}
	if n == k || k < 2 {
		return r
	}
	between /= k - 1
	size := (n - squares/n) / (k - 1) // of a batch, as the analysis counts it
	r.Between = math.Sqrt(math.Max(0, (between-within)/size))
	if r.Between > 0 {
		v := []float64{between / size, (1 - 1/size) * within}
		r.Total, r.DF = math.Sqrt(v[0]+v[1]), Satterthwaite(v, []float64{k - 1, n - k})
	}
	return r
}

// The published forms of a detection limit.
const (
	FormCurrie = "Currie"
	FormISO    = "ISO 11843-2"
	FormMDL    = "MDL"
)

// What a study needs. Seven replicates at two to ten times the limit, over several
// days, are what 40 CFR 136, appendix B, asks for (from memory).
const (
	fewestRepeats = 7
	highestRatio  = 10
	fewestBatches = 3
)

// Basis is one published form of the limits of a component, with what it rests on.
type Basis struct {
	Form, On string
	Given    float64 // amount given to the replicates, NaN unknown
	Repeats
	Limits
	Refused string // why no limits may be set by it, in words
	Remark  string // what makes it less than it should be, in words
	Values  [][]float64
	Source  string
}

const (
	sourceCurrie = "Currie 1968, Anal. Chem. 40, 586 (from memory), Student's t in place of the normal distribution"
	sourceISO    = "ISO 11843-2 (formulas from memory)"
	sourceMDL    = "40 CFR 136, appendix B (from memory): t(0.99)·s"
)

// FromReplicates gives the limits that replicates of one low amount show, values by
// batch as they were reported: after Currie from the scatter of a measurement on a
// day of its own, and the method detection limit t(0.99)·s of all of them.
func FromReplicates(on string, given float64, batches [][]float64) []Basis {
	r := RepeatsOf(batches)
	mdl := MDL(r.SD, r.N)
	currie := Basis{Form: FormCurrie, Limits: Limits{TQuantile(0.95, r.DF) * r.Total, Delta(r.DF, 0.05, 0.05) * r.Total, kQuantify * r.Total}, Source: sourceCurrie}
	cfr := Basis{Form: FormMDL, Limits: Limits{mdl, mdl, kQuantify * r.SD}, Source: sourceMDL}
	refused := tooFew(r.N, "replicates")
	none := 0
	for _, b := range batches {
		for _, v := range b {
			if v <= 0 {
				none++
			}
		}
	}
	switch {
	case refused != "":
	case none > 0:
		refused = fmt.Sprintf("in %d of %d replicates none of it was found, so that their scatter is cut off at zero; take a higher level", none, r.N)
	case r.Mean > highestRatio*mdl:
		refused = fmt.Sprintf("their level, %s, is %s times the limit that they give, and scatter grows with the amount; take a level of 2 to %d times the limit", digits(r.Mean, 3), digits(r.Mean/mdl, 2), highestRatio)
	}
	out := []Basis{currie, cfr}
	for i := range out {
		out[i].On, out[i].Given, out[i].Repeats, out[i].Values, out[i].Refused, out[i].Remark = on, given, r, batches, refused, tooFewBatches(r)
		if r.N < 2 {
			out[i].Limits = Limits{math.NaN(), math.NaN(), math.NaN()}
		}
	}
	return out
}

// FromBlanks gives the limits that blanks show, values by batch as least squares
// sees them (Signed). inMean is 0 for blanks that are handled like a sample: their
// mean is what a bottle without the component shows, and counts where it is above
// zero. Otherwise they are themselves the mean of so many that was subtracted: only
// their scatter within a batch says something, that of one measurement less that
// mean.
func FromBlanks(on string, batches [][]float64, inMean int) []Basis {
	r := RepeatsOf(batches)
	s, nu, base := r.Total, r.DF, math.Max(0, r.Mean)
	mdl := base + TQuantile(0.99, float64(r.N-1))*r.SD
	if inMean > 0 {
		s, nu, base = r.Within*math.Sqrt(1+1/float64(inMean)), float64(r.N-r.Batches), 0
		mdl = TQuantile(0.99, nu) * s
		r.Mean, r.Between, r.Total, r.DF = 0, math.NaN(), s, nu
	}
	currie := Basis{Form: FormCurrie, Limits: Limits{base + TQuantile(0.95, nu)*s, base + Delta(nu, 0.05, 0.05)*s, base + kQuantify*s}, Source: sourceCurrie}
	cfr := Basis{Form: FormMDL, Limits: Limits{mdl, mdl, base + kQuantify*s}, Source: sourceMDL + " above the mean of the blanks"}
	out := []Basis{currie, cfr}
	for i := range out {
		out[i].On, out[i].Given, out[i].Repeats, out[i].Values, out[i].Refused, out[i].Remark = on, 0, r, batches, tooFew(r.N, "blanks"), tooFewBatches(r)
		if !(s > 0) {
			out[i].Limits = Limits{math.NaN(), math.NaN(), math.NaN()}
			if out[i].Refused == "" {
				out[i].Refused = "no two blanks of one batch; their scatter is not known"
			}
		}
	}
	return out
}

// FromStandards gives the limits of a straight line through standards: amounts x
// given and y found of them.
func FromStandards(x, y []float64, batches int) Basis {
	l := ISO11843(x, y, 1)
	b := Basis{Form: FormISO, On: "standards", Given: math.NaN(), Limits: Limits{l.Critical, l.Detectable, math.NaN()}, Source: sourceISO,
		Repeats: Repeats{N: len(x), Batches: batches, Mean: math.NaN(), SD: l.SD, Within: math.NaN(), Between: math.NaN(), Total: l.SD, DF: l.DF},
		Values:  [][]float64{y}}
	if len(x) > 0 {
		b.Mean = stat.Mean(x, nil)
	}
	levels := slices.Sorted(slices.Values(x))
	switch n := len(slices.Compact(levels)); {
	case n < 3:
		b.Refused = eem.Count(n, "level") + " of standards; a line needs at least 3"
	case l.Critical != l.Critical:
		b.Refused = "what is found does not grow with what was given"
	case slices.Max(x) > highestRatio*l.Detectable:
		b.Refused = fmt.Sprintf("the standards reach %s times the limit that they give, and scatter grows with the amount; use a line of standards up to %d times the limit", digits(slices.Max(x)/l.Detectable, 2), highestRatio)
	}
	return b
}

func tooFew(n int, what string) string {
	if n >= fewestRepeats {
		return ""
	}
	return fmt.Sprintf("%d %s; at least %d are needed (40 CFR 136, appendix B)", n, what, fewestRepeats)
}

func tooFewBatches(r Repeats) string {
	if r.Batches >= fewestBatches {
		return ""
	}
	return fmt.Sprintf("from %d batches: what differs from day to day is not in it; measure on %d days at least", r.Batches, fewestBatches)
}

// Choose returns the basis of a form that sets the limits: the one with the largest
// detection limit of those not refused. It says false where all are.
func Choose(bases []Basis, form string) (Basis, bool) {
	var out Basis
	ok := false
	for _, b := range bases {
		if b.Form == form && b.Refused == "" && b.Detection > 0 && (!ok || b.Detection > out.Detection) {
			out, ok = b, true
		}
	}
	return out, ok
}

// Signed returns for rows of the cube what least squares makes of them without
// keeping amounts above zero, F values each: the scatter of bottles that hold nothing
// is then not cut off. NaN where the cells do not allow it.
func Signed(c *eem.Cube, s *unmix.Set, rows []int) [][]float64 {
	n := s.Len()
	a, cells := s.Matrix()
	out := make([][]float64, len(rows))
	for k, i := range rows {
		gram, kb := make([]float64, n*n), make([]float64, n)
		x, why := c.Sample(i), c.SampleWhy(i)
		for l, cell := range cells {
			if why[cell] == eem.Measured && !math.IsNaN(x[cell]) {
				row := a[l*n : (l+1)*n]
				addOuter(gram, row, 1)
				axpy(x[cell], row, kb)
			}
		}
		inv := inverse(gram, n, all(n))
		if inv == nil {
			out[k] = nans(n)
			continue
		}
		out[k] = make([]float64, n)
		for f := range n {
			for h, v := range kb {
				out[k][f] += inv[f*n+h] * v
			}
		}
	}
	return out
}
