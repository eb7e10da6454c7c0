package scanfile

import (
	"bytes"
	"regexp"
	"strconv"
	"strings"
	"unicode"
)

// nmPerInvCM converts between wavelength, nm, and wavenumber, 1/cm: λ = 10⁷/ν̃.
const nmPerInvCM = 1e7

// wavenumberAbove is the value above which a wavelength must be meant in 1/cm: no
// fluorometer reaches 5,000 nm.
const wavenumberAbove = 5000

// Wavelengths, nm, that a header or a file name may mean by an excitation.
const shortestNM, longestNM = 150, 2000

var (
	// exMention finds the word excitation, words and marks that say nothing, and
	// a number: "Excitation wavelength (nm): 240,5", "EX WL=350.0 nm", "_ex240".
	exMention = regexp.MustCompile(`(?i)(?:^|[^\p{L}])(?:λ_?|lambda_?)?` +
		`(?:excitation|excit|exc|ex|anregungswellenl(?:ä|ae)nge|anregungs?|excitaci[oó]n|excita[cç][aã]o|eccitazione)` +
		`(?:[\s\x{a0}_:=@,;()\[\]"'/|.#>-]|wavelength|wellenl(?:ä|ae)nge|lambda|λ|wave|wl|nm|at|fixed|monochromator|mono)*` +
		`([0-9]+(?:\.[0-9]+|,[0-9]{1,2})?)([\s\x{a0}]*(?:nm|1/cm|cm-1|cm\^-1|cm⁻¹))?`)
	// rangeAfter is what makes the number before it the start of a range or list.
	rangeAfter = regexp.MustCompile(`(?i)^[\s\x{a0}]*(?:nm)?[\s\x{a0}]*(?:-|–|to|bis|\.\.|:|,|;|\t)[\s\x{a0}]*([1-9][0-9]{2,3})(?:[^0-9]|$)`)
	// nmAfter finds a number with the unit nm; in a file name it may stand alone.
	nmAfter = regexp.MustCompile(`(?i)(?:^|[^0-9.,])(?:(em|emission)[ _-]*)?([0-9]{3,4}(?:[.,][0-9]+)?)[ _-]?nm\b`)
	// plainNM is a cell that is nothing but a wavelength.
	plainNM = regexp.MustCompile(`(?i)^(?:x|λ=?)?([0-9]+(?:[.,][0-9]+)?)[\s\x{a0}]*(?:\(?(?:nm|1/cm|cm-1|cm\^-1|cm⁻¹)\)?)?$`)
	// wavenumberWord says that an axis is in 1/cm.
	wavenumberWord = regexp.MustCompile(`(?i)1/cm|cm-1|cm\^-1|cm⁻¹|wave ?number|wellenzahl`)
	// sampleLine gives the name of the sample in a header line.
	sampleLine = regexp.MustCompile(`(?i)^[^\p{L}]*(?:sample(?:[ _-]?(?:name|id))?|probe|bottle|muestra|échantillon|name|id)"?[\s\x{a0}]*[:=\t;,][\s\x{a0}]*"?(.*?)[";,\s]*$`)
)

// mentionedEx returns the excitation, nm, that a header line or file name
// mentions by the word. A range or list of wavelengths is none.
func mentionedEx(s string) (float64, bool) {
	for {
		m := exMention.FindStringSubmatchIndex(s)
		if m == nil {
			return 0, false
		}
		end := m[3]
		if end < len(s) && s[end]-'0' <= 9 { // 240,24|5: the comma of a list
			end = m[2] + strings.IndexAny(s[m[2]:end], ".,")
		}
		if end > m[2] && !rangeAfter.MatchString(s[end:]) {
			if v, ok := plausibleNM(s[m[2]:end]); ok {
				return v, true
			}
		}
		s = s[m[1]:]
	}
}

// plausibleNM parses a wavelength, in 1/cm where it can only be that.
func plausibleNM(s string) (float64, bool) {
	v, err := strconv.ParseFloat(strings.Replace(s, ",", ".", 1), 64)
	if v > wavenumberAbove {
		v = nmPerInvCM / v
	}
	return v, err == nil && v >= shortestNM && v <= longestNM
}

// nameEx returns the excitation that a file name gives: by the word, or the only
// number with the unit nm.
func nameEx(name string) (float64, bool) {
	name = lastElements(strings.ReplaceAll(name, `\`, "/"), 1)
	s := strings.ReplaceAll(stem(name), "_", " ")
	if v, ok := mentionedEx(s); ok {
		return v, true
	}
	var found float64
	n := 0
	for _, m := range nmAfter.FindAllStringSubmatch(s, -1) {
		if v, ok := plausibleNM(m[2]); ok && m[1] == "" {
			found = v
			n++
		}
	}
	return found, n == 1
}

// cellEx returns the wavelength that a header cell gives. rest is what else the
// cell says, such as a sample's name.
func cellEx(cell string, p *Pattern) (nm float64, rest string, ok bool) {
	if p != nil {
		if v, ok := p.nm(cell); ok {
			return v, strings.TrimSpace(p.part.ReplaceAllString(cell, "")), true
		}
	}
	if !strings.ContainsAny(cell, "0123456789") {
		return 0, "", false
	}
	if m := plainNM.FindStringSubmatch(strings.TrimSpace(cell)); m != nil {
		v, err := strconv.ParseFloat(strings.Replace(m[1], ",", ".", 1), 64)
		return v, "", err == nil && v >= 100
	}
	if v, ok := mentionedEx(cell); ok {
		rest = exMention.ReplaceAllString(cell, " ")
		return v, strings.Trim(rest, " \t_-.,;:()[]\"'"), true
	}
	return 0, "", false
}

// role is what the words of a column header say the column holds.
type role uint8

const (
	otherRole role = iota
	exRole
	emRole
	cornerRole // both: the corner of a grid
	intensityRole
	absorbanceRole
	sampleRole
	waveRole
	factorRole
	percentRole // transmission, which is no absorbance
)

var roleWords = map[string]role{
	"ex": exRole, "exc": exRole, "excit": exRole, "excitation": exRole, "anregung": exRole, "exwl": exRole,
	"excitación": exRole, "excitação": exRole, "exwavelength": exRole, "lambdaex": exRole, "λex": exRole, "exnm": exRole,
	"em": emRole, "emi": emRole, "emiss": emRole, "emission": emRole, "emwl": emRole, "emisión": emRole,
	"emissão": emRole, "emwavelength": emRole, "lambdaem": emRole, "λem": emRole, "emnm": emRole,
	"intensity": intensityRole, "int": intensityRole, "intensität": intensityRole, "intensité": intensityRole,
	"intensidad": intensityRole, "counts": intensityRole, "count": intensityRole, "cps": intensityRole, "signal": intensityRole,
	"absorbance": absorbanceRole, "abs": absorbanceRole, "extinction": absorbanceRole, "extinktion": absorbanceRole,
	"absorbanz": absorbanceRole, "absorbancia": absorbanceRole, "au": absorbanceRole,
	"sample": sampleRole, "sampleid": sampleRole, "id": sampleRole, "bottle": sampleRole, "probe": sampleRole, "muestra": sampleRole,
	"wavelength": waveRole, "wl": waveRole, "nm": waveRole, "lambda": waveRole, "λ": waveRole, "wellenlänge": waveRole,
	"factor": factorRole, "factors": factorRole, "correction": factorRole,
	"transmittance": percentRole, "transmission": percentRole,
}

// roleOf reads the words of a header cell. emFirst says, for a corner, that
// emission is named before excitation.
func roleOf(cell []byte) (r role, emFirst bool) {
	if len(cell) > 200 {
		return otherRole, false
	}
	var has [percentRole + 1]bool
	for _, w := range strings.FieldsFunc(strings.ToLower(string(cell)), func(c rune) bool { return !unicode.IsLetter(c) }) {
		k := roleWords[w]
		if k == emRole && !has[exRole] && !has[emRole] {
			emFirst = true
		}
		has[k] = true
	}
	has[percentRole] = has[percentRole] || bytes.HasPrefix(bytes.TrimSpace(cell), []byte("%T"))
	switch {
	case has[exRole] && has[emRole]:
		return cornerRole, emFirst
	case has[intensityRole] && !has[waveRole]:
		return intensityRole, false
	case has[exRole]:
		return exRole, false
	case has[emRole]:
		return emRole, false
	}
	for _, k := range []role{percentRole, absorbanceRole, factorRole, intensityRole, sampleRole, waveRole} {
		if has[k] {
			return k, false
		}
	}
	return otherRole, false
}
