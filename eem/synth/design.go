package synth

import (
	"fmt"
	"math"
	"math/rand/v2"
	"time"
)

// Design is a plain survey drawn at random, for tests over many surveys. Bottles
// hold the demo's substances. Zero fields take the values named; a share or a
// spread that is zero is no such error.
type Design struct {
	Samples    int // zero means 20
	Components int // of the demo's, 1–5; zero means 5
	Days       int // zero means 2
	Blanks     int // a day; zero means 2
	Levels     int // standards of a component, on days in turn; zero means 4

	Absent  float64 // share of contributions that are truly zero
	Unknown int     // the first samples, so many, hold 30 µg/L of the dyestuff besides
	Brown   float64 // A254 of coloured matter that does not fluoresce, its mean over the samples

	Stock float64 // relative standard deviation of a component's stock solution, shared by its levels
	Dose  float64 // relative standard deviation of every single standard's amount beside that
	Stand float64 // relative standard deviation of how a bottle stands in the beam

	Instrument *Instrument // nil means NewInstrument()
	Photometer *Photometer // nil means NewPhotometer()
	Seed       uint64
}

// Survey draws the survey. What the run sheet says of the standards is their
// nominal concentration; the bottles hold what the erring stock and hand gave.
func (d Design) Survey() *Survey {
	d = d.withDefaults()
	rnd := rand.New(rand.NewPCG(d.Seed, streamDemo+1))
	s := &Survey{Title: fmt.Sprintf("Invented survey %d", d.Seed), Seed: d.Seed, Instrument: d.Instrument, Photometer: d.Photometer}
	stock := make([]float64, d.Components)
	for f := range stock {
		s.Components = append(s.Components, levels[f].of)
		stock[f] = 1 + d.Stock*rnd.NormFloat64()
	}
	dosing := rand.New(rand.NewPCG(d.Seed, streamDemo+2)) // of its own, so that the rest of a survey is the same with and without
	days := make([][]Bottle, d.Days)
	for day := range days {
		for n := range d.Blanks {
			days[day] = append(days[day], Bottle{ID: fmt.Sprintf("PW%d-%d", day+1, n+1), Kind: "blank", NoAbsorbance: true})
		}
	}
	for f, l := range levels[:d.Components] {
		for n := range d.Levels {
			amount := l.amount[3] * float64(n+1) / float64(d.Levels)
			day := (n + f) % d.Days
			days[day] = append(days[day], Bottle{ID: fmt.Sprintf("%s-%d", l.code, n+1), Kind: "standard",
				Liquid: Liquid{Doses: []Dose{{l.of, amount * stock[f] * (1 + d.Dose*dosing.NormFloat64())}}}, Known: []Dose{{l.of, amount}}})
		}
	}
	for i := range d.Samples {
		day := i % d.Days
		days[day] = append(days[day], Bottle{ID: fmt.Sprintf("S%03d", i+1), Kind: "sample", Liquid: d.liquid(i, rnd)})
	}
	for day, bottles := range days {
		power := math.Exp(0.1 * rnd.NormFloat64())
		for n, b := range bottles {
			b.Measured = time.Date(2031, time.May, 6+day, 8, 5*n, 0, 0, time.UTC)
			b.Power = power * (1 + d.Stand*rnd.NormFloat64())
			s.Bottles = append(s.Bottles, b)
		}
	}
	return s
}

func (d Design) withDefaults() Design {
	for _, v := range []struct {
		n    *int
		zero int
	}{{&d.Samples, 20}, {&d.Components, len(levels)}, {&d.Days, 2}, {&d.Blanks, 2}, {&d.Levels, 4}} {
		if *v.n == 0 {
			*v.n = v.zero
		}
		if *v.n < 0 {
			panic(fmt.Sprintf("synth: a number below zero in %+v", d))
		}
	}
	if d.Components > len(levels) {
		panic(fmt.Sprintf("synth: %d components, the demo has %d", d.Components, len(levels)))
	}
	if d.Instrument == nil {
		d.Instrument = NewInstrument()
	}
	if d.Photometer == nil {
		d.Photometer = NewPhotometer()
	}
	return d
}

// liquid draws log-normal amounts whose median is a quarter of the highest
// standard.
func (d Design) liquid(i int, rnd *rand.Rand) Liquid {
	l := Liquid{Turbidity: 1e-4 * (1 + 2*rnd.Float64()), Color: Tail{At254: 2 * d.Brown * rnd.Float64(), Slope: 0.0155}}
	for _, v := range levels[:d.Components] {
		amount := v.amount[3] / 4 * math.Exp(0.5*rnd.NormFloat64())
		if rnd.Float64() < d.Absent {
			amount = 0
		}
		l = l.With(Dose{v.of, amount})
	}
	if i < d.Unknown {
		l = l.With(Dose{dyestuff, 30})
	}
	return l
}
