package main

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"tarnlight/eem/correct"
	"tarnlight/eem/scanfile"
)

type factorsOptions struct {
	axis                        string // emission or excitation
	certificates, scans, blanks []string
	certified, units            string // photons or energy
	reference, floor            float64
	out                         string
}

// newFactorsCmd makes spectral factor files.
func newFactorsCmd(s streams) *cobra.Command {
	var o factorsOptions
	c := &cobra.Command{
		Use:   "factors emission|excitation",
		Short: "Makes a spectral factor file from a certificate and the scan of its material",
		Long: `factors divides what a certificate says by what the instrument shows, at the
certificate's wavelengths, with the uncertainty of both:

  emission    the certified emission of a reference material or lamp, and its scan
  excitation  the signal of the reference detector as --scan, and as --certificate its
              responsivity; without one the detector counts photons (quantum counter)

Several materials, given in pairs, are joined where they overlap. Nothing is
extrapolated: cells outside the table stay uncorrected and are left out. Files are
scans as the instrument exports them (text with any header, JCAMP-DX), or tables or
workbooks of wavelength_nm, value and, if known, its standard_uncertainty. Certificates differ in what they certify, so that --certified must say
it: energy or photons per wavelength interval (of a responsivity: per energy or
per photon).`,
		Example: "  tarnlight factors emission --certified energy --certificate certificate.csv --scan scan.csv -o emission.csv\n" +
			"  tarnlight factors emission --certified energy --certificate blue.csv --scan bluescan.csv --certificate red.csv --scan redscan.csv -o emission.csv\n" +
			"  tarnlight factors excitation --certified photons --scan counter.csv -o excitation.csv",
		Args:      cobra.MatchAll(cobra.ExactArgs(1), cobra.OnlyValidArgs),
		ValidArgs: []string{"emission", "excitation"},
	}
	f := c.Flags()
	f.StringArrayVar(&o.certificates, "certificate", nil, "table of a certificate; may be given again for another section")
	f.StringArrayVar(&o.scans, "scan", nil, "table of the scan that belongs to the certificate, in the same order")
	f.StringArrayVar(&o.blanks, "blank", nil, "scan of the solvent, subtracted from the scan; one for all scans or one each")
	f.StringVar(&o.certified, "certified", "", "what the certificate gives: energy or photons (no default: ask the certificate)")
	f.StringVar(&o.units, "units", "photons", "what the factors bring intensities to: photons or energy")
	f.Float64Var(&o.reference, "reference", 0, "wavelength, nm, at which the factor is 1 (default: the middle of the table)")
	f.Float64Var(&o.floor, "floor", 0.01, "share of a certificate's maximum below which its points are left out")
	f.StringVarP(&o.out, "out", "o", "", "file for the factors (default: standard output)")
	c.RunE = func(_ *cobra.Command, args []string) error {
		o.axis = args[0]
		return runFactors(s, o)
	}
	return c
}

// check says what is wrong with the options.
func (o factorsOptions) check() error {
	pairs := len(o.certificates) == len(o.scans) || o.axis == "excitation" && len(o.certificates) == 0
	word := func(v string) bool { return v == "photons" || v == "energy" }
	switch {
	case len(o.scans) == 0 || !pairs:
		return misuse("%d certificates and %d scans; give one --scan for each --certificate", len(o.certificates), len(o.scans))
	case len(o.blanks) > 1 && len(o.blanks) != len(o.scans):
		return misuse("%d blanks for %d scans; give one --blank for all or one each", len(o.blanks), len(o.scans))
	case !word(o.certified):
		return misuse("--certified %q; say what the certificate gives, energy or photons: a wrong guess is a factor of wavelength", o.certified)
	case !word(o.units):
		return misuse("--units %q; write photons or energy", o.units)
	case !(o.floor >= 0 && o.floor < 1):
		return misuse("--floor %g; write a share of 0 or more and below 1", o.floor)
	}
	return nil
}

func runFactors(s streams, o factorsOptions) error {
	if err := o.check(); err != nil {
		return err
	}
	sections := make([]*correct.Factors, len(o.scans))
	for i := range o.scans {
		var err error
		if sections[i], err = o.section(i); err != nil {
			return err
		}
		fmt.Fprintf(s.err, "%s: %s%s\n", sections[i].Source, sections[i].Axis, largestU(sections[i]))
	}
	f, err := correct.Join(sections...)
	if err != nil {
		return err
	}
	if o.reference == 0 {
		o.reference = f.Axis.At(f.Axis.Len() / 2)
	}
	if f, err = f.ScaledAt(o.reference); err != nil {
		return err
	}
	told := "with standard uncertainties"
	if f.U == nil {
		told = "without uncertainties, because not every section has them; state [uncertainty] spectral_percent"
	}
	fmt.Fprintf(s.err, "factors of %s to %s: %s, 1 at %g nm, %s; cells outside are left out, never extrapolated\n", o.axis, o.units, f.Axis, o.reference, told)
	text := o.table(f)
	if o.out == "" {
		_, err := s.out.Write(text)
		return err
	}
	return writeNew(o.out, text)
}

// section makes the factors of pair i.
func (o factorsOptions) section(i int) (*correct.Factors, error) {
	scan, err := readCurve(o.scans[i])
	if err != nil {
		return nil, err
	}
	if len(o.blanks) > 0 {
		blank, err := readCurve(o.blanks[min(i, len(o.blanks)-1)])
		if err != nil {
			return nil, err
		}
		scan = lessCurve(scan, blank)
	}
	cert := correct.Curve{Axis: scan.Axis, Y: slices.Repeat([]float64{1}, scan.Axis.Len()), Source: "a detector that counts " + o.certified}
	floor := o.floor
	if len(o.certificates) > 0 {
		if cert, err = readCurve(o.certificates[i]); err != nil {
			return nil, err
		}
	}
	ref := cert.Axis.At(cert.Axis.Len() / 2)
	toPhotons := o.certified == "energy" && o.units == "photons"
	toEnergy := o.certified == "photons" && o.units == "energy"
	if o.axis == "excitation" { // a responsivity is signal over light, so that it goes the other way
		toPhotons, toEnergy = toEnergy, toPhotons
	}
	switch {
	case toPhotons:
		cert = cert.Photons(ref)
	case toEnergy:
		cert = cert.Energy(ref)
	}
	f, err := correct.FactorsFrom(cert, scan, max(floor, math.SmallestNonzeroFloat64))
	if err != nil {
		return nil, fmt.Errorf("%s: %w", o.scans[i], err)
	}
	return f, nil
}

// lessCurve subtracts a blank; where it is not measured nothing is known of the
// scan either.
func lessCurve(scan, blank correct.Curve) correct.Curve {
	out := scan
	out.Y = slices.Clone(scan.Y)
	if scan.U != nil || blank.U != nil {
		out.U = make([]float64, len(scan.Y))
	}
	at := func(c correct.Curve, v []float64, nm float64) float64 {
		if v == nil {
			return 0
		}
		return c.Axis.Interp(v, nm)
	}
	for i := range out.Y {
		nm := scan.Axis.At(i)
		out.Y[i] -= blank.Axis.Interp(blank.Y, nm)
		if out.U != nil {
			out.U[i] = math.Hypot(at(scan, scan.U, nm), at(blank, blank.U, nm))
		}
	}
	return out
}

func largestU(f *correct.Factors) string {
	if f.U == nil {
		return ", no uncertainty given"
	}
	top := 0.0
	for i, u := range f.U {
		top = max(top, u/f.Factor[i])
	}
	return fmt.Sprintf(", relative standard uncertainty up to %.2g %%", 100*top)
}

// table writes the factor file, which [correct] …_factors reads.
func (o factorsOptions) table(f *correct.Factors) []byte {
	var b bytes.Buffer
	fmt.Fprintf(&b, "# factors of %s that bring intensities to %s; certified: %s; 1 at %g nm; from %s\n", o.axis, o.units, o.certified, o.reference, sourceNames(f.Source))
	head := []string{"wavelength_nm", "factor"}
	if f.U != nil {
		head = append(head, "standard_uncertainty")
	}
	fmt.Fprintln(&b, strings.Join(head, ","))
	for i := range f.Factor {
		fmt.Fprintf(&b, "%g,%.8g", f.Axis.At(i), f.Factor[i])
		if f.U != nil {
			fmt.Fprintf(&b, ",%.3g", f.U[i])
		}
		b.WriteByte('\n')
	}
	return b.Bytes()
}

// sourceNames keeps the marks of a table out of its head line.
func sourceNames(s string) string {
	return strings.NewReplacer(",", " ", ";", " ", "\t", " ").Replace(s)
}

// writeNew writes a file that must not be there yet: a factor file in use is never
// changed behind a survey's back. What could not be written whole is removed.
func writeNew(path string, data []byte) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if errors.Is(err, os.ErrExist) {
		return fmt.Errorf("%s is there already; name another file or remove it", path)
	}
	if err != nil {
		return err
	}
	_, err = f.Write(data)
	if err = errors.Join(err, f.Sync(), f.Close()); err != nil {
		return errors.Join(err, os.Remove(path))
	}
	return nil
}

// readCurve reads a spectrum: a certificate's table or a scan as the instrument
// exports it.
func readCurve(path string) (correct.Curve, error) {
	c, _, err := scanfile.ReadCurve(path, nil)
	if err != nil {
		return correct.Curve{}, err
	}
	return correct.Curve{Axis: c.Axis, Y: c.Y, U: c.U, Source: filepath.Base(path)}, nil
}
