package prepare

import (
	"math"
	"slices"

	"tarnlight/eem/correct"
	"tarnlight/eem/scatter"
)

// Steps lists what is done to a bottle, in order.
var Steps = []string{"read", correct.StepSaturation, correct.StepDetector, correct.StepOffset, correct.StepNoise, correct.StepSpectral, correct.StepInner,
	correct.StepBlank, correct.StepTemperature, correct.StepScale, correct.StepDilution, scatter.Step}

// stepNames maps the words of [scans] applied and [correct] off to the steps.
var stepNames = map[string]string{stepOffset: correct.StepOffset, stepSpectral: correct.StepSpectral, stepInner: correct.StepInner,
	stepBlank: correct.StepBlank, stepIntensity: correct.StepScale, stepDilution: correct.StepDilution, stepScatter: scatter.Step,
	stepSaturation: correct.StepSaturation, stepDropped: correct.StepDetector, stepSpikes: correct.StepDetector,
	stepTemperature: correct.StepTemperature}

// StepOrder returns the place of a step, from 1; 0 when there is no such step.
func StepOrder(step string) int { return slices.Index(Steps, step) + 1 }

// RamanPeak returns where the batch's blanks show water's Raman line at the
// scale's excitation, nm, and its height over the noise, both the mean over the
// blanks; NaN where no blank shows it.
func (bt *Batch) RamanPeak() (nm, snr float64) { return bt.peakNM, bt.peakSNR }

// wantedPeak is where that line should be, nm.
func (bt *Batch) wantedPeak() float64 {
	return scatter.Raman1.Em(bt.Bottles[0].Setting.Intensity.ExcitationNM)
}

// findPeak looks for the Raman line in the blanks before they are subtracted.
func (bt *Batch) findPeak() {
	bt.peakNM, bt.peakSNR = nan, nan
	var nm, snr, n float64
	for _, b := range bt.Blanks {
		for _, p := range scatter.Ridge(b.raw, scatter.Raman1, 25) {
			if math.Abs(p.ExNM-b.Setting.Intensity.ExcitationNM) < 1e-4 {
				nm, snr, n = nm+p.Em, snr+p.Snr, n+1
			}
		}
	}
	if n > 0 {
		bt.peakNM, bt.peakSNR = nm/n, snr/n
	}
}
