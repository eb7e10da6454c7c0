package synth

import "fmt"

// The fluorophores of the demo. Places of bands, molar absorption and yields are
// of the order that handbooks give for such substances, widths and lesser bands
// from memory; the extracts and the dyestuff are invented.
var (
	// tryptophan: 5,500 L mol⁻¹ cm⁻¹ at 280 nm, yield 0.13 (Chen 1967), 204.2 g/mol.
	tryptophan = &Fluorophore{Name: "tryptophan", Unit: "µg/L", Yield: 0.13,
		Absorbs: Band{PeakAt(279, 1500, 2.7e-5), PeakAt(220, 2400, 1.6e-4)},
		Emits:   Band{PeakAt(352, 1950, 1)}}

	// peat extract: what bogs give to brown water.
	peat = &Fluorophore{Name: "peat extract", Unit: "mg/L", Yield: 0.03,
		Absorbs: Band{PeakAt(348, 2700, 0.0026), PeakAt(252, 3600, 0.0060)},
		Inert:   Tail{At254: 0.028, Slope: 0.0145},
		Emits:   Band{PeakAt(452, 2300, 1), PeakAt(510, 2300, 0.25)}}

	// algal extract: what ponds give, shorter in wavelength and clearer.
	algal = &Fluorophore{Name: "algal extract", Unit: "mg/L", Yield: 0.03,
		Absorbs: Band{PeakAt(313, 2100, 0.0030), PeakAt(238, 2800, 0.0050)},
		Inert:   Tail{At254: 0.012, Slope: 0.0185},
		Emits:   Band{PeakAt(402, 2200, 1)}}

	// brightener: of the kind that washing leaves in waste water, 60,000 L mol⁻¹ cm⁻¹
	// at 350 nm, 563 g/mol.
	brightener = &Fluorophore{Name: "brightener", Unit: "µg/L", Yield: 0.5,
		Absorbs: Band{PeakAt(349, 1500, 1.07e-4), PeakAt(322, 1300, 3e-5), PeakAt(245, 2600, 3e-5)},
		Emits:   Band{PeakAt(425, 1000, 1), PeakAt(447, 1500, 0.75)}}

	// pyrene: vibronic bands, 50,000 L mol⁻¹ cm⁻¹ at 335 nm, 202.3 g/mol, yield in
	// water that holds air.
	pyrene = &Fluorophore{Name: "pyrene", Unit: "µg/L", Yield: 0.3,
		Absorbs: Band{PeakAt(335, 420, 2.5e-4), PeakAt(320, 480, 1.5e-4), PeakAt(306, 600, 6e-5),
			PeakAt(272, 500, 2.6e-4), PeakAt(262, 550, 1.3e-4), PeakAt(241, 600, 3.8e-4)},
		Emits: Band{PeakAt(373, 320, 1), PeakAt(384, 380, 0.75), PeakAt(393, 420, 0.8), PeakAt(414, 650, 0.25)}}

	// dyestuff: what is spilled, unknown to the run sheet.
	dyestuff = &Fluorophore{Name: "dyestuff", Unit: "µg/L", Yield: 0.4,
		Absorbs: Band{PeakAt(408, 1500, 1.0e-4), PeakAt(270, 2500, 3e-5)},
		Emits:   Band{PeakAt(488, 1300, 1), PeakAt(522, 1500, 0.4)}}
)

// place is a sampling site with what its water holds on an ordinary day, in the
// units of the fluorophores.
type place struct {
	name                                        string
	tryptophan, peat, algal, brightener, pyrene float64
}

// An invented catchment, from the bog down to the pond.
var places = []place{
	{"Brackle Head", 18, 9, 0.8, 0, 0},
	{"Mossel Brook", 25, 7, 1.0, 0, 0},
	{"Ombersike", 40, 5, 1.5, 0.5, 0},
	{"Ombersike Mill", 55, 4.5, 1.8, 1.2, 0},
	{"Quiller Sluice", 60, 4, 2.5, 1.5, 0.3},
	{"Drovel Weir", 65, 4, 3.0, 1.8, 0.3},
	{"Drovel Outfall", 160, 3, 5.0, 7, 0.4},
	{"Drovel Ford", 100, 3.5, 3.5, 4, 0.4},
	{"Tarrel Yard", 90, 3, 3.0, 3, 2.5},
	{"Tarrel Bridge", 85, 3.2, 3.2, 3, 1.2},
	{"Reedmere", 110, 2.5, 7.0, 1.5, 0.6},
}

// levels are the concentrations of the standards.
var levels = []struct {
	of     *Fluorophore
	code   string
	amount [4]float64
}{
	{tryptophan, "TRP", [4]float64{25, 75, 150, 250}},
	{peat, "PEA", [4]float64{2, 5, 8, 12}},
	{algal, "ALG", [4]float64{1, 3, 6, 10}},
	{brightener, "BRI", [4]float64{1, 3, 6, 12}},
	{pyrene, "PYR", [4]float64{0.3, 1, 2, 4}},
}

// Substance returns a fluorophore of the demo by name: tryptophan, peat extract,
// algal extract, brightener, pyrene, and the dyestuff that the demo spills. It
// panics at any other name.
func Substance(name string) *Fluorophore {
	for _, f := range []*Fluorophore{tryptophan, peat, algal, brightener, pyrene, dyestuff} {
		if f.Name == name {
			g := *f
			return &g
		}
	}
	panic(fmt.Sprintf("synth: no substance %q", name))
}
