package synth

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"time"
)

// streamDemo draws what the bottles of the demo hold.
const streamDemo = 100

// Demo returns an invented survey of 69 bottles: an invented catchment sampled on
// three days, 36 samples of which three are duplicates, a spike, and each day two
// blanks, a field blank, a control and a share of the standards of five
// components at four levels. Seven bottles have something wrong with them.
func Demo(seed uint64) *Survey {
	d := &demo{
		rnd: rand.New(rand.NewPCG(seed, streamDemo)),
		s: &Survey{
			Title: "Brackle catchment, spring 2031 (invented)", Seed: seed,
			Instrument: NewInstrument(),
			Photometer: NewPhotometer(),
			Components: []*Fluorophore{tryptophan, peat, algal, brightener, pyrene},
			Settings:   demoReport,
		},
	}
	for day := 1; day <= 3; day++ {
		d.measure(day)
	}
	d.s.Planted = planted()
	return d.s
}

// demoReport is what stands at the head of the demo's workbook.
const demoReport = `[report]
client = "Brackle Rivers Board (invented)"
order = "BRB-31/07"
number = "R-2031-018"
method = "EEM fluorescence, house method F-12"
remarks = "Bottles were kept dark and cold and scanned on the day after sampling."
`

// demo builds the survey in the order of measurement.
type demo struct {
	s     *Survey
	rnd   *rand.Rand
	clock time.Time
	power float64
}

// put adds a bottle. The lamp loses 0.01 % a bottle and no two bottles stand in
// the beam alike, 0.2 %.
func (d *demo) put(b Bottle) {
	b.Measured = d.clock
	d.clock = d.clock.Add(12 * time.Minute)
	d.power *= 0.9999
	b.Power = d.power * (1 + 0.002*d.rnd.NormFloat64())
	d.s.Bottles = append(d.s.Bottles, b)
}

// measure is one day. The lamp ages: without an intensity scale the days would
// differ by a fifth.
func (d *demo) measure(day int) {
	d.clock = time.Date(2031, time.May, 5+day, 8, 0, 0, 0, time.UTC)
	d.power = []float64{1, 0.90, 0.82}[day-1]
	n := strconv.Itoa(day)
	d.put(Bottle{ID: "PW" + n + "A", Kind: "blank", NoAbsorbance: true})
	d.standards(day)
	d.put(Bottle{ID: "CT" + n, Kind: "control", Liquid: Liquid{Doses: control()}, Known: control(), Layout: spreadsheet()})
	d.samples(day)
	d.put(Bottle{ID: "FB" + n, Kind: "field-blank", Site: "Drovel Ford", Sampled: d.sampled(day, 7)})
	d.put(Bottle{ID: "PW" + n + "B", Kind: "blank", NoAbsorbance: true})
}

// spreadsheet is how the standards were exported: one file a bottle, as a
// spreadsheet of a country with decimal comma writes it.
func spreadsheet() Layout {
	return Layout{Form: Matrix, Delimiter: ";", DecimalComma: true, CRLF: true}
}

// standards measures the levels so that every component has some on every day.
func (d *demo) standards(day int) {
	for c, l := range levels {
		for i, amount := range l.amount {
			if (i+c)%3 != day-1 {
				continue
			}
			dose := []Dose{{l.of, amount}}
			d.put(Bottle{ID: fmt.Sprintf("%s-%d", l.code, i+1), Kind: "standard",
				Liquid: Liquid{Doses: dose}, Known: dose, Layout: spreadsheet()})
		}
	}
}

func control() []Dose {
	return []Dose{{tryptophan, 100}, {peat, 4}, {algal, 4}, {brightener, 4}, {pyrene, 1.5}}
}

func (d *demo) sampled(day, site int) time.Time {
	return time.Date(2031, time.May, 4+day, 9, 20+25*site, 0, 0, time.UTC)
}

// samples measures the sites downstream, each day's duplicate right after its
// bottle.
func (d *demo) samples(day int) {
	for site, p := range places {
		b := d.sample(day, site, p)
		d.put(b)
		switch b.ID {
		case "W108", "W203", "W302":
			r := b
			r.ID, r.ReplicateOf, r.Remark = b.ID+"R", b.ID, ""
			d.put(r)
		case "W205":
			r := b
			r.ID, r.Kind, r.SpikeOf = b.ID+"S", "spike", b.ID
			r.Known = []Dose{{tryptophan, 80}, {pyrene, 1}}
			r.Liquid = b.Liquid.With(r.Known...)
			d.put(r)
		}
	}
}

// sample draws what a bottle holds and plants its fault.
func (d *demo) sample(day, site int, p place) Bottle {
	b := Bottle{ID: fmt.Sprintf("W%d%02d", day, site+1), Kind: "sample", Site: p.name,
		Sampled: d.sampled(day, site), TemperatureC: 20}
	b.Liquid = Liquid{Turbidity: 1e-4 * (1 + 2*d.rnd.Float64())}.With(
		d.dose(tryptophan, p.tryptophan), d.dose(peat, p.peat), d.dose(algal, p.algal),
		d.dose(brightener, p.brightener), d.dose(pyrene, p.pyrene))
	switch b.ID {
	case "W101":
		b.Liquid, b.Remark = b.Liquid.With(Dose{peat, 28}), "very brown"
	case "W201":
		b.Liquid = b.Liquid.With(Dose{peat, 16})
		b.Dilution, b.Remark = 5, "brown, diluted 1 + 4"
	case "W204":
		b.NoAbsorbance = true
	case "W207":
		b.Liquid = b.Liquid.With(Dose{brightener, 150})
	case "W306":
		b.Closed = true
	case "W310":
		b.Liquid = b.Liquid.With(Dose{dyestuff, 30})
	}
	b.DOC = digits(0.8+0.55*b.Liquid.Amount(peat)+0.5*b.Liquid.Amount(algal), 2)
	return b
}

// dose scatters a usual amount by some 20 %.
func (d *demo) dose(f *Fluorophore, usual float64) Dose {
	return Dose{f, digits(usual*math.Exp(0.2*d.rnd.NormFloat64()), 3)}
}

// digits rounds to significant digits.
func digits(v float64, n int) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', n, 64), 64)
	if err != nil {
		panic(err)
	}
	return r
}

func planted() []Fault {
	return []Fault{
		{"W101", "absorbance-limit", "so brown that it should have been diluted"},
		{"W201", "diluted", "brown, and diluted 1 + 4"},
		{"W204", "no-absorbance", "nobody measured its absorbance"},
		{"W207", "saturated", "waste water so bright that the detector clipped"},
		{"W207", "above-standards", "brightener above the highest standard"},
		{"W306", "no-light", "measured with the shutter closed"},
		{"W310", "unexplained", "a spill of a dyestuff that the references do not know"},
	}
}
