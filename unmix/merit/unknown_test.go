package merit_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// twoUnknowns makes 24 bottles of two known bands; rows 3, 9 and 15 hold a third at
// amounts 2, 3 and 4, and rows 5 and 11 a fourth at 1 and 2, that nobody knows. The
// amounts overlap in no bottle.
func twoUnknowns(sd float64) (c *eem.Cube, set *unmix.Set, hidden [2][]float64) {
	ex, _ := eem.Steps(250, 400, 10)
	em, _ := eem.Steps(410, 600, 5)
	g := eem.Grid{Ex: ex, Em: em}
	set = &unmix.Set{Grid: g, Unit: eem.Raman, Method: "references", Origin: "test"}
	bands := [][2]float64{{270, 430}, {350, 470}, {310, 520}, {390, 560}}
	profile := func(a eem.Axis, nm, width float64) []float64 {
		v := make([]float64, a.Len())
		for i := range v {
			z := (a.At(i) - nm) / width
			v[i] = math.Exp(-z * z / 2)
		}
		return v
	}
	var comps []unmix.Component
	for f, b := range bands {
		comps = append(comps, unmix.Component{Name: string(rune('a' + f)), AmountUnit: "mg/L", Scale: 1, Ex: profile(ex, b[0], 20), Em: profile(em, b[1], 25)})
	}
	set.Components = comps[:2]
	const rows = 24
	hidden = [2][]float64{make([]float64, rows), make([]float64, rows)}
	hidden[0][3], hidden[0][9], hidden[0][15] = 2, 3, 4
	hidden[1][5], hidden[1][11] = 1, 2
	rnd := rand.New(rand.NewPCG(8, 9))
	c = &eem.Cube{Grid: g, Unit: eem.Raman}
	for i := range rows {
		amounts := []float64{1 + rnd.Float64(), 2 * rnd.Float64(), hidden[0][i], hidden[1][i]}
		c.IDs = append(c.IDs, fmt.Sprint(i))
		for j := range ex.Len() {
			for k := range em.Len() {
				v := sd * rnd.NormFloat64()
				for f, a := range amounts {
					v += a * comps[f].At(g, j, k)
				}
				c.X, c.Why, c.U = append(c.X, v), append(c.Why, eem.Measured), append(c.U, float32(sd))
			}
		}
	}
	return c, set, hidden
}

// Two components that the model lacks come back with their spectra, the bottles that
// hold them and how much, the stronger first; the other answer has them in the model,
// and the flag gives both.
func TestTwoUnknowns(t *testing.T) {
	const sd = 0.02
	c, set, hidden := twoUnknowns(sd)
	r, sp := spreads(t, c, set, nil)
	sp[15].U = []float64{1e-3, 1e-3} // as if the budget had not seen the misfit
	var rows []int
	var bottles []merit.Bottle
	for i := range c.IDs {
		rows, bottles = append(rows, i), append(bottles, merit.Bottle{ID: c.IDs[i], Row: i})
	}
	us, err := merit.FindUnknowns(c, r, rows, nil, sp)
	if err != nil || len(us) != 2 {
		t.Fatalf("%d unknowns, %v", len(us), err)
	}
	last := us[1].Resolution
	for n, u := range us {
		want := [][2]float64{{310, 520}, {390, 560}}[n]
		if math.Abs(u.ExNM-want[0]) > 10 || math.Abs(u.EmNM-want[1]) > 5 {
			t.Errorf("unknown %d at %g/%g, want %v", n, u.ExNM, u.EmNM, want)
		}
		var holds []int
		for i, a := range hidden[n] {
			if a > 0 {
				holds = append(holds, i)
			}
			if got := last.Value[i*4+2+n]; math.Abs(got-a) > 0.03*a+4*sd {
				t.Errorf("unknown %d in row %d: %g, holds %g", n, i, got, a)
			}
		}
		if !slices.Equal(u.Shown, holds) {
			t.Errorf("unknown %d shown by %v, held by %v", n, u.Shown, holds)
		}
		for k := range u.Component.Em {
			z := (c.Em.At(k) - want[1]) / 25
			if d := u.Component.Em[k] - math.Exp(-z*z/2); math.Abs(d) > 0.06 {
				t.Errorf("unknown %d: emission at %g nm off by %g", n, c.Em.At(k), d)
			}
		}
	}
	j := merit.Judge(r, sp, bottles, c.Sample, func(string) float64 { return 4 }, func(f eem.Flag) eem.Flag { return f }, "test")
	j.AddUnknowns(us, r, bottles, func(f eem.Flag) eem.Flag { return f }, "test")
	if len(j.Beyond) != 2*len(bottles) || j.Beyond[0].Method != merit.MethodUnknown {
		t.Errorf("%d contributions of unknowns", len(j.Beyond))
	}
	for n, b := range j.Beyond { // found where the search says so
		u, row := us[n%2], bottles[n/2].Row
		if b.Detected != slices.Contains(u.Shown, row) {
			t.Errorf("%s: %g %s of %s, critical value %g, detected %v, shown by %v", b.ID, b.Value, b.Unit, b.Component, b.Critical, b.Detected, u.Shown)
		}
	}
	flags := 0
	for _, f := range j.Flags {
		if f.Test == "unknown" {
			flags++
			if f.ID != "15" && !strings.Contains(f.Msg, "with it in the model") {
				t.Errorf("bottle %s does not say what the unknown changes: %s", f.ID, f.Msg)
			}
			if f.ID == "15" && (f.Severity != eem.Doubt || !strings.Contains(f.Msg, " instead of ")) {
				t.Errorf("bottle 15 does not give both answers: %s", f.Msg)
			}
		}
	}
	if flags != 5 {
		t.Errorf("%d flags, five bottles hold an unknown", flags)
	}
	for f, want := range []float64{r.Value[15*2], r.Value[15*2+1]} { // the first answer stays
		if got := j.Contributions[15*2+f].Value; got != want {
			t.Errorf("contribution %d of bottle 15 was changed: %g, was %g", f, got, want)
		}
	}
}
