package report

import (
	"fmt"
	"slices"
	"strings"
)

// cautions stand on everything that is handed over.
var cautions = []string{
	"Screening results. Direct fluorescence must not decide compliance of drinking water or of a discharge: for that use an accredited, approved method (for example under ISO/IEC 17025), and where it differs, follow its result.",
	"Names such as tryptophan-like or humic-like say where light appears, not which substance sends it. Confirm an identity by a second, separating technique such as chromatography.",
	"Components of a fitted model are statistical unless they were matched to standards; their contributions (Fmax) are fluorescence in the unit shown, not concentrations.",
	"A known-reference result rests on the list of references being complete: a fluorophore that is not on it is shared among the others. Look at the residual maps and the condition number.",
	"Turbidity, pH, metals such as copper and iron, oxygen and temperature change how strongly a substance fluoresces; spiked samples or standard additions reveal it.",
	"Not detected means below what this measurement can tell from nothing. It does not mean absent.",
}

// qualifiers explains the letters in the column Q.
var qualifiers = [][2]string{
	{"(none)", "Found; the value can be used within its uncertainty."},
	{"U", "Not detected: the value is not above the critical value. The detection limit is shown after \"<\"."},
	{"J", "Unreliable, or above the highest standard. The reason stands under Remarks."},
	{"R", "Not usable. The reason stands under Remarks."},
}

// stepWords says what a step does in a sentence that can go into a report.
type stepWords struct {
	what, formula, source string
}

// stepText describes the steps by their names in steps.csv; the general part of
// a method description, whose particulars are the parameters.
var stepText = map[string]stepWords{
	"read":       {"The instrument's text files were read; nothing was changed in them.", "", ""},
	"saturation": {"Readings at or above the limit of the detector were left out.", "F missing where F ≥ limit", ""},
	"detector":   {"Faults of single readings were looked for: scans with dropped readings, and spikes that stand out alone; such readings were left out.", "", ""},
	"noise": {"The noise of the readings was estimated from replicate blanks; it weighs the cells and enters every uncertainty.",
		"variance of a reading = (read noise)² + factor · reading", ""},
	"temperature": {"Intensities were brought to one temperature with the coefficient given.", "F = F / (1 + ρ · (T − T_ref))", "Watras et al. 2011, Limnol. Oceanogr. Methods 9, 296 (from memory)"},
	"offset":      {"The dark reading of the detector was subtracted.", "F = F_read − offset", ""},
	"spectral factors": {"Excitation and emission were corrected for the wavelength-dependent response of the instrument; cells outside the certified range were left out, never extrapolated.",
		"F = F · C_ex(λ_ex) · C_em(λ_em)", "ASTM E3029-15"},
	"inner filter": {"Light that the sample absorbed itself (inner-filter effect) was restored from the sample's own absorbance; cells above the limit were left out.",
		"right angle, beam in the centre of a 1 cm cell: F = F · 10^((A_ex + A_em)/2), A for 1 cm", "Parker & Rees 1962, Analyst 87, 83; Kothawala et al. 2013, Limnol. Oceanogr. Methods 11, 616"},
	"blank": {"The fluorescence and Raman scatter of pure water, measured in the same batch, was subtracted cell by cell.", "F = F − mean of the blanks", ""},
	"intensity scale": {"Intensities were brought to a common scale. Raman units divide by the area of water's Raman line at excitation 350 nm; quinine sulfate units divide by the intensity of 1 µg/L quinine sulfate dihydrate.",
		"Raman units: F = F / ∫ F_blank(350 nm, λ_em) dλ_em", "Lawaetz & Stedmon 2009, Appl. Spectrosc. 63, 936"},
	"dilution": {"The result was brought back to the undiluted sample.", "F = F · final volume / sample volume", ""},
	"scatter": {"Bands of Rayleigh and Raman scatter of both orders, and emission below the excitation where nothing can fluoresce, were left out.",
		"Rayleigh: λ_em = n · λ_ex; Raman: λ_em = n / (1/λ_ex − Δν), n = 1, 2", "Bahram et al. 2006, J. Chemom. 20, 99"},
}

// methodText describes how contributions were found.
var methodText = map[string]stepWords{
	"references": {"Each sample was described as a sum of the spectra of known references, none of them negative (non-negative least squares).",
		"min ‖F − Σ c_f · R_f‖², c_f ≥ 0", "Lawson & Hanson 1974, Solving Least Squares Problems, ch. 23"},
	"parafac": {"The samples of the survey were resolved together into components that share their excitation and emission spectra (parallel factor analysis, all factors non-negative).",
		"F_ijk = Σ_f a_if · b_jf · c_kf + e_ijk, all ≥ 0; Fmax = a_if with the maxima of b and c set to 1", "Bro 1997, Chemom. Intell. Lab. Syst. 38, 149"},
	"model": {"Each sample was described as a sum of the components of a model that had been fitted before and was not changed, none of them negative.",
		"min ‖F − Σ a_f · b_f c_fᵀ‖², a_f ≥ 0", "Lawson & Hanson 1974, Solving Least Squares Problems, ch. 23"},
}

// limitsText and uncertaintyText end the methods.
var (
	uncertaintyText = stepWords{"Uncertainties of noise, blank, scale, inner filter and references or loadings were combined; the expanded uncertainty is k times the combined standard uncertainty and makes an interval of about 95 %: k = 2, more where that rests on few degrees of freedom.",
		"u² = Σ (∂x/∂q)² u(q)² + 2 Σ covariances; ± = k u, k ≥ 2", "JCGM 100:2008 (GUM), annex G.4"}
	limitsText = stepWords{"A component counts as found where its value is above the critical value, which nothing at all exceeds with a probability of 5 %; the detection limit is what is found with a probability of 95 %.",
		"critical value 1.645 s₀, detection limit 3.29 s₀ (normal errors, known s₀)", "Currie 1968, Anal. Chem. 40, 586; ISO 11843"}
)

// step is one step of the work as the report tells it.
type methodStep struct {
	name, setup string
	words       stepWords
	done        []string // what was done in this survey
	params      []string
}

// sentences say what a step does, and what it did in this survey.
func (m *methodStep) sentences() string {
	if len(m.done) == 0 {
		return m.words.what
	}
	return strings.TrimSpace(m.words.what + " Here: " + strings.Join(m.done, "; ") + ".")
}

// methodSteps gathers steps.csv by step and setup, and adds how contributions,
// uncertainties and limits were found.
func (r *results) methodSteps() []*methodStep {
	t := r.table["steps.csv"]
	setup, name, par, value, unit, source, note := t.Col("setup"), t.Col("step"), t.Col("parameter"), t.Col("value"), t.Col("unit"), t.Col("source"), t.Col("note")
	var out []*methodStep
	for i := range t.Rows {
		n, s := t.Text(i, name), t.Text(i, setup)
		k := slices.IndexFunc(out, func(m *methodStep) bool { return m.name == n && m.setup == s })
		if k < 0 {
			k = len(out)
			out = append(out, &methodStep{name: n, setup: s, words: stepText[n]})
		}
		m := out[k]
		if v := t.Text(i, note); v != "" && !slices.Contains(m.done, v) {
			m.done = append(m.done, v)
		}
		if p := t.Text(i, par); p != "" {
			text := fmt.Sprintf("%s = %s", p, strings.TrimSpace(r.num.rounded(t.Text(i, value))+" "+t.Text(i, unit)))
			if v := baseName(t.Text(i, source)); v != "" {
				text += " (" + v + ")"
			}
			m.params = append(m.params, text)
		}
	}
	for _, m := range out {
		if m.name == "noise" {
			m.words.what = noiseText(strings.Join(m.params, "; "))
		}
	}
	for _, m := range r.methods() {
		out = append(out, &methodStep{name: methodName(m), words: methodText[m]})
	}
	return append(out, &methodStep{name: "uncertainty", words: uncertaintyText}, &methodStep{name: "detection", words: limitsText})
}

// noiseText is the text of step noise, after where its parameters come from.
func noiseText(params string) string {
	own := strings.Contains(params, "own scans")
	switch {
	case own && strings.Contains(params, "blanks"):
		return strings.Replace(stepText["noise"].what, "replicate blanks", "replicate blanks, where there were too few from the roughness of each bottle's own scans", 1)
	case own:
		return strings.Replace(stepText["noise"].what, "replicate blanks", "the roughness of each bottle's own scans, because there were too few blanks", 1)
	}
	return stepText["noise"].what
}

// baseName keeps only the last part of a path: what is handed over shows no
// folder of the laboratory.
func baseName(s string) string {
	if strings.ContainsAny(s, `/\`) && !strings.Contains(s, " ") {
		s = s[strings.LastIndexAny(s, `/\`)+1:]
	}
	return s
}
