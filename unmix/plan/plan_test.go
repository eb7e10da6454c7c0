package plan_test

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/plan"
)

// dense computes the uncertainties of scans at lines from the matrices of all cells at
// once, with a column of its own for every unknown band at every excitation: what the
// sums over excitations must give.
func dense(p plan.Problem, lines []int) []float64 {
	a, cells := p.Set.Matrix()
	n, nk := p.Set.Len(), p.Set.Grid.Em.Len()
	var rows, v []float64
	extra := len(p.Unknown) * len(lines)
	m := 0
	for l, i := range cells {
		place := slices.Index(lines, i/nk)
		if place < 0 {
			continue
		}
		row := append(slices.Clone(a[l*n:(l+1)*n]), make([]float64, extra)...)
		signal := p.Noise.Water[i]
		for f, x := range p.Level {
			signal += x * row[f]
		}
		for u, band := range p.Unknown {
			sd := 1e7 * band.WidthNM / band.AtNM / band.AtNM / 2.3548200450309493
			z := (1e7/p.Set.Grid.Em.At(i%nk) - 1e7/band.AtNM) / sd
			row[n+place*len(p.Unknown)+u] = math.Exp(-z * z / 2)
		}
		k := p.Factor[i]
		rows = append(rows, row...)
		v = append(v, k*k*p.Noise.Read2[i]+k*p.Noise.Shot[i]*signal+(p.Noise.Read2[i]+p.Noise.Shot[i]*p.Noise.Water[i])/float64(p.Noise.Blanks))
		m++
	}
	var qr mat.QR
	qr.Factorize(mat.NewDense(m, n+extra, rows))
	eye := mat.NewDense(m, m, nil)
	for i := range m {
		eye.Set(i, i, 1)
	}
	var inv mat.Dense
	if err := qr.SolveTo(&inv, false, eye); err != nil {
		panic(err)
	}
	out := make([]float64, n)
	for f := range out {
		for i := range m {
			out[f] += inv.At(f, i) * inv.At(f, i) * v[i]
		}
		out[f] = math.Sqrt(out[f])
	}
	return out
}

func TestPredictionAgainstWholeMatrices(t *testing.T) {
	p := newWorld().problem()
	lines := []int{6, 11, 19, 33}
	for _, unknown := range [][]plan.Emission{nil, {{AtNM: 430, WidthNM: 90}}, {{AtNM: 430, WidthNM: 90}, {AtNM: 520, WidthNM: 60}}} {
		p.Unknown = unknown
		got, want := design(t, p).Predict(lines).U, dense(p, lines)
		t.Logf("%d unknown bands: %.4g", len(unknown), got)
		for f := range want {
			if math.Abs(got[f]/want[f]-1) > 1e-8 { // condition of K below 1e3
				t.Errorf("%d unknown, component %d: %g, whole matrices %g", len(unknown), f, got[f], want[f])
			}
		}
	}
}

// What unmix/merit reports as noise of a bottle measured at those scans is what was
// predicted. Cube.U is kept as float32, 6e-8.
func TestPredictionIsWhatMeritReports(t *testing.T) {
	w := newWorld()
	p := w.problem()
	p.Noise.Blanks = 0
	d := design(t, p)
	lines := []int{6, 11, 19, 33}
	e := eem.New(w.in.Grid, eem.Raman)
	e.Var = make([]float64, len(e.F))
	for i := range e.F {
		signal := 0.0
		for f, c := range p.Set.Components {
			signal += w.level[f] * c.Surface[i]
		}
		if signal == signal {
			e.F[i], e.Why[i] = signal, eem.Measured
			e.Var[i] = w.factor[i]*w.factor[i]*p.Noise.Read2[i] + w.factor[i]*p.Noise.Shot[i]*(signal+p.Noise.Water[i])
		}
	}
	few := at(e, lines)
	c := eem.NewCube(few.Grid, []string{"W"}, []*eem.EEM{few})
	c.U = make([]float32, len(few.F))
	for i, v := range few.Var {
		c.U[i] = float32(math.Sqrt(v))
	}
	r, err := unmix.Quantify(c, p.Set)
	if err != nil {
		t.Fatal(err)
	}
	s := merit.Spreads(c, r, nil)[0]
	pr := d.Predict(lines)
	o := merit.Overlaps(unfold(r.Set))
	for f, name := range w.names {
		t.Logf("%-13s predicted %.6g, reported %.6g; VIF %.4f and %.4f", name, pr.U[f], s.U[f], pr.VIF[f], o[f].VIF)
		if math.Abs(s.U[f]/pr.U[f]-1) > 1e-6 || math.Abs(o[f].VIF/pr.VIF[f]-1) > 1e-9 {
			t.Errorf("%s: predicted %g (VIF %g), reported %g (%g)", name, pr.U[f], pr.VIF[f], s.U[f], o[f].VIF)
		}
	}
}

func unfold(s *unmix.Set) mat.Matrix {
	a, cells := s.Matrix()
	return mat.NewDense(len(cells), s.Len(), a)
}

// The detection limit is that of a bottle without the component: 3.29 times the
// uncertainty predicted at next to none of it.
func TestDetectionLimitHasNoLightOfItsOwn(t *testing.T) {
	p := newWorld().problem()
	lines := []int{6, 11, 19, 33}
	all := design(t, p).Predict(lines)
	for f := range p.Level {
		q := p
		q.Level = slices.Clone(p.Level)
		q.Level[f] *= 1e-9
		if want := 3.2897072539 * design(t, q).Predict(lines).U[f]; math.Abs(all.Detection[f]/want-1) > 1e-6 {
			t.Errorf("component %d: %g, want %g", f, all.Detection[f], want)
		}
	}
}

// Departures from the model add τ·m·(KᵀK)⁻¹, with τ from the distances of the scans,
// and nothing to detection limits.
func TestMisfit(t *testing.T) {
	p := newWorld().problem()
	lines := []int{6, 10, 19} // 270, 290, 335 nm
	plain := design(t, p).Predict(lines)
	const m = 1e-6
	p.Noise.Misfit, p.Noise.AlikeNM = make([]float64, p.Set.Grid.Cells()), [2]float64{20, 8}
	for i := range p.Noise.Misfit {
		p.Noise.Misfit[i] = m
	}
	got := design(t, p).Predict(lines)
	ex, em := (math.Exp(-20/20.)+math.Exp(-45/20.))/2, math.Exp(-2/8.)
	tau := (1 + ex) / (1 - ex) * (1 + em) / (1 - em)
	a, cells := p.Set.Matrix()
	for f := range p.Level {
		norm := 0.0
		for l, i := range cells {
			if slices.Contains(lines, i/p.Set.Grid.Em.Len()) {
				norm += a[l*len(p.Level)+f] * a[l*len(p.Level)+f]
			}
		}
		want := math.Sqrt(plain.U[f]*plain.U[f] + tau*m*plain.VIF[f]/norm)
		if math.Abs(got.U[f]/want-1) > 1e-9 || got.Detection[f] != plain.Detection[f] {
			t.Errorf("component %d: u %g, want %g; detection limit %g and %g", f, got.U[f], want, got.Detection[f], plain.Detection[f])
		}
	}
	// Scans close together depart alike: the plan spreads them.
	apart := func(p plan.Problem) float64 {
		c, err := design(t, p).Plans(t.Context(), 5, &plan.Settings{Most: -1})
		if err != nil {
			t.Fatal(err)
		}
		least := math.Inf(1)
		for i, nm := range nm(p.Set.Grid, c[4].Lines) {
			if i > 0 {
				least = min(least, nm-p.Set.Grid.Ex.At(c[4].Lines[i-1]))
			}
		}
		return least
	}
	for i := range p.Noise.Misfit {
		p.Noise.Misfit[i] = 1e-3
	}
	p.Noise.AlikeNM[0] = 60
	with := apart(p)
	p.Noise.Misfit = nil
	without := apart(p)
	t.Logf("closest two of 5 scans: %g nm, with departures alike over 60 nm %g nm", without, with)
	if with <= without {
		t.Errorf("closest two of 5 scans: %g nm, with departures alike over 60 nm %g nm", without, with)
	}
}

// A component in another unit changes nothing but its own numbers.
func TestUnitsDoNotMatter(t *testing.T) {
	p := newWorld().problem()
	want, err := design(t, p).Plans(t.Context(), 4, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, by := range []float64{1e-9, 1e9} {
		q := newWorld().problem()
		q.Level = slices.Clone(p.Level)
		q.Level[1] *= by
		for i := range q.Set.Components[1].Surface {
			q.Set.Components[1].Surface[i] /= by
		}
		got, err := design(t, q).Plans(t.Context(), 4, nil)
		if err != nil {
			t.Fatal(err)
		}
		for i := range want {
			if !slices.Equal(got[i].Lines, want[i].Lines) || math.Abs(got[i].U[1]/want[i].U[1]/by-1) > 1e-9 {
				t.Errorf("%v, %g; want %v, %g", got[i].Lines, got[i].U[1], want[i].Lines, want[i].U[1]*by)
			}
		}
	}
}

// Any number of goroutines finds the same.
func TestSameOnAnyWorkers(t *testing.T) {
	d := design(t, newWorld().problem())
	one, err := d.Plans(t.Context(), 6, &plan.Settings{Workers: 1, Most: 20_000})
	if err != nil {
		t.Fatal(err)
	}
	five, err := d.Plans(t.Context(), 6, &plan.Settings{Workers: 5, Most: 20_000})
	if err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(one) != fmt.Sprint(five) {
		t.Errorf("one goroutine %v\nfive %v", one, five)
	}
}

// Scans that must be part of a plan are; a component kept apart does not count, but
// costs; an unknown interferent costs more.
func TestWishes(t *testing.T) {
	p := newWorld().problem()
	d := design(t, p)
	free, err := d.Plans(t.Context(), 3, nil)
	if err != nil {
		t.Fatal(err)
	}
	forced, err := d.Plans(t.Context(), 3, &plan.Settings{Must: []int{22}})
	if err != nil {
		t.Fatal(err)
	}
	for i, c := range forced {
		if !slices.Contains(c.Lines, 22) || c.Cost < free[i].Cost {
			t.Errorf("%d scans, 350 nm among them: %v, cost %g; free %g", i+1, c.Lines, c.Cost, free[i].Cost)
		}
	}
	q := p
	q.Want = []bool{true, false, false, false, false, false}
	one, err := design(t, q).Plans(t.Context(), 3, nil)
	if err != nil {
		t.Fatal(err)
	}
	if got, all := one[2].U[0], free[2].U[0]; got >= all {
		t.Errorf("asked for alone tryptophan has u = %g, among all %g", got, all)
	}
	alone := *p.Set
	alone.Components = alone.Components[:1]
	single := design(t, plan.Problem{Set: &alone, Level: p.Level[:1], Noise: p.Noise, Factor: p.Factor}).Predict(one[2].Lines)
	if single.U[0] >= one[2].U[0] {
		t.Errorf("with others kept apart u = %g, without them %g", one[2].U[0], single.U[0])
	}
	q = p
	q.Unknown = []plan.Emission{{AtNM: 430, WidthNM: 80}}
	if with := design(t, q).Predict(free[2].Lines); with.Cost <= free[2].Cost {
		t.Errorf("an unknown interferent costs nothing: %g, without it %g", with.Cost, free[2].Cost)
	}
	q = p
	q.WorstCase = true
	even, err := design(t, q).Plans(t.Context(), 3, nil)
	if err != nil {
		t.Fatal(err)
	}
	if even[2].Cost >= relative(free[2].U, p.Level) || even[2].Cost != relative(even[2].U, p.Level) {
		t.Errorf("worst case %g, of the usual plan %g", even[2].Cost, relative(free[2].U, p.Level))
	}
}

func relative(u, level []float64) (worst float64) {
	for f := range u {
		worst = max(worst, u[f]/level[f])
	}
	return worst
}

// twins is a set of two components with one emission spectrum; excitations tell them
// apart only from the third line on. A third component glows only at the last line.
func twins(t *testing.T) plan.Problem {
	t.Helper()
	g := eem.Grid{}
	var err error
	if g.Ex, err = eem.Steps(300, 340, 10); err != nil {
		t.Fatal(err)
	}
	if g.Em, err = eem.Steps(400, 480, 10); err != nil {
		t.Fatal(err)
	}
	em := []float64{.1, .3, .6, .9, 1, .8, .5, .3, .1}
	other := []float64{1, .8, .6, .4, .2, .1, 0, 0, 0}
	s := &unmix.Set{Grid: g, Origin: "twins"}
	for _, c := range []struct {
		name   string
		ex, em []float64
	}{{"a", []float64{1, 1, .8, .5, .2}, em}, {"b", []float64{1, 1, .3, .8, .9}, em}, {"c", []float64{0, 0, 0, 0, 1}, other}} {
		s.Components = append(s.Components, unmix.Component{Name: c.name, Ex: c.ex, Em: c.em, Scale: 1})
	}
	return plan.Problem{Set: s, Level: []float64{1, 1, 1}, Noise: plan.Even(g.Cells(), 0.01, 1e-5, 0)}
}

func TestTooFewScans(t *testing.T) {
	d := design(t, twins(t))
	p := d.Predict([]int{0, 1})
	if !math.IsInf(p.Cost, 1) || p.U[0] == p.U[0] {
		t.Errorf("two scans that see no difference cost %g, u %v", p.Cost, p.U)
	}
	m := d.Mixed([]int{0, 1})
	t.Logf("%+v", m)
	if len(m) != 2 || !slices.Equal(m[0].Components, []int{2}) || m[0].Line != 4 || !slices.Equal(m[1].Components, []int{0, 1}) {
		t.Fatalf("%+v", m)
	}
	// 340 nm, where a is weak and b strong, parts them most.
	if m[1].Line != 4 || !m[1].Parted || m[1].After < -0.95 || m[1].Correlation > -0.9999 {
		t.Errorf("%+v", m[1])
	}
	if m := d.Mixed([]int{0, 2, 4}); m != nil {
		t.Errorf("three good scans leave %+v", m)
	}
	c, err := d.Plans(t.Context(), 3, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !math.IsInf(c[0].Cost, 1) || math.IsInf(c[1].Cost, 1) {
		t.Errorf("one scan cannot do, two can: %v", c)
	}
}

// One component that is a mixture of two others makes three that nothing tells apart.
func TestMixtureOfOthers(t *testing.T) {
	p := twins(t)
	for j := range 5 {
		p.Set.Components[2].Ex[j] = p.Set.Components[0].Ex[j] + p.Set.Components[1].Ex[j]
	}
	p.Set.Components[2].Em = p.Set.Components[0].Em
	m := design(t, p).Mixed([]int{0, 1, 2, 3, 4})
	t.Logf("%+v", m)
	if len(m) != 1 || !slices.Equal(m[0].Components, []int{0, 1, 2}) || m[0].Line != -1 {
		t.Errorf("%+v", m)
	}
}

// A narrower window saves time and costs no more than allowed.
func TestNarrow(t *testing.T) {
	d := design(t, newWorld().problem())
	c, err := d.Plans(t.Context(), 4, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, v := range []struct {
		time plan.Timing
		loss float64 // every second point alone costs 41 %
	}{{plan.Timing{NMPerMinute: 600, SettleSeconds: 3}, 0.1}, {plan.Timing{SettleSeconds: 3, DwellSeconds: 0.1}, 0.6}} {
		time, lines := v.time, c[3].Lines
		w, p := d.Narrow(lines, v.loss, time)
		before, after := time.Minutes(d, plan.Window{}, 4), time.Minutes(d, w, 4)
		t.Logf("%+v: %+v, %.2f of %.2f min, cost %.4f of %.4f %%", time, w, after, before, 100*p.Cost, 100*c[3].Cost)
		if after >= 0.9*before || p.Cost > (1+v.loss)*c[3].Cost || time.DwellSeconds > 0 && w.Stride < 2 {
			t.Errorf("%+v: %+v, %g of %g min, cost %g of %g", time, w, after, before, p.Cost, c[3].Cost)
		}
		q := newWorld().problem()
		q.Window = w
		if again := design(t, q).Predict(lines).Cost; math.Abs(again/p.Cost-1) > 1e-12 {
			t.Errorf("the window alone costs %g, was told %g", again, p.Cost)
		}
	}
	if got := (plan.Timing{NMPerMinute: 600, SettleSeconds: 3}).Minutes(d, plan.Window{}, 5); math.Abs(got-5*(320/600.+0.05)) > 1e-12 {
		t.Errorf("5 scans of 320 nm at 600 nm/min and 3 s take %g min", got)
	}
}

func TestBadProblems(t *testing.T) {
	p := twins(t)
	p.Level = []float64{1, 0, 1}
	if _, err := plan.New(p); err == nil || !strings.Contains(err.Error(), "typical level") {
		t.Error(err)
	}
	p = twins(t)
	p.Want = make([]bool, 3)
	if _, err := plan.New(p); err == nil {
		t.Error("a plan for nothing")
	}
	p = twins(t)
	p.Window = plan.Window{From: 3, To: 3, Stride: 1}
	if _, err := plan.New(p); err == nil {
		t.Error("a plan without cells")
	}
	defer func() {
		if recover() == nil {
			t.Error("levels of the wrong length do not panic")
		}
	}()
	p = twins(t)
	p.Level = p.Level[:2]
	_, _ = plan.New(p)
}

// BenchmarkPlans: 1 to 4 scans of 43, exhaustive (136,654 choices) against greedy with
// exchange.
func BenchmarkPlans(b *testing.B) {
	d := design(b, newWorld().problem())
	for _, v := range []struct {
		name string
		most int
	}{{"exhaustive", 0}, {"exchange", -1}} {
		b.Run(v.name, func(b *testing.B) {
			for b.Loop() {
				if _, err := d.Plans(b.Context(), 4, &plan.Settings{Most: v.most}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
