package correct

import (
	"fmt"

	"tarnlight/eem"
)

// StepTemperature names the temperature correction in the notes.
const StepTemperature = "temperature"

// Temperature brings intensities measured at celsius °C to refC:
//
//	F_ref = F / (1 + ρ·(celsius − refC))
//
// with ρ, 1/°C, negative for fluorescence that fades when warmed (Watras et al.
// 2011, Limnol. Oceanogr. Methods 9, 296, from memory). ρ depends on what
// fluoresces: there is no default. It panics when the divisor is not positive.
func Temperature(e *eem.EEM, celsius, refC, rho float64) *eem.EEM {
	d := 1 + rho*(celsius-refC)
	if !(d > 0) {
		panic(fmt.Sprintf("correct: temperature %g °C from %g °C with %g per °C", celsius, refC, rho))
	}
	return Scale(e, 1/d, e.Unit, record(StepTemperature, fmt.Sprintf("brought from %g to %g °C", celsius, refC),
		eem.Param{Name: "temperature", Value: num(celsius), Unit: "°C", Source: "run sheet: temperature_c"},
		eem.Param{Name: "reference temperature", Value: num(refC), Unit: "°C", Source: "settings: correct.temperature"},
		eem.Param{Name: "temperature coefficient", Value: num(rho), Unit: "1/°C", Source: "settings: correct.temperature"}))
}
