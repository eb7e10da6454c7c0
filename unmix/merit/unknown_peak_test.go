package merit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
)

// logNormal is a band of that form in nm, skew where tail is not 0.
func logNormal(nm, width, tail float64) func(x float64) float64 {
	return func(x float64) float64 {
		z := (x - nm) / width
		if 1+tail*z <= 0 {
			return 0
		}
		if tail != 0 {
			z = math.Log(1+tail*z) / tail
		}
		return math.Exp(-z * z / 2)
	}
}

// The maximum of a noisy band is found to a grid step where the highest point is
// many steps off, also of a band with a tail; one with structure keeps the peak that
// is highest, and one without noise its plain maximum.
func TestPeak(t *testing.T) {
	em, err := eem.Steps(280, 600, 2)
	if err != nil {
		t.Fatal(err)
	}
	vibronic := func(x float64) float64 {
		s := 0.0
		for i, h := range []float64{1, 0.75, 0.85, 0.4} {
			s += h * math.Exp(-math.Pow((x-374-10*float64(i))/3, 2)/2)
		}
		return s
	}
	for _, c := range []struct {
		name string
		f    func(x float64) float64
		sd   float64
		max  float64 // nm that the peak may be off
	}{
		{"plain", logNormal(494, 32, 0), 0.05, 2},
		{"tail", logNormal(494, 30, 0.25), 0.05, 2},
		{"narrow", logNormal(350, 12, 0.1), 0.05, 2},
		{"vibronic", vibronic, 0.02, 2},
		{"no noise", logNormal(494, 30, 0.25), 0, 0},
		{"no noise, vibronic", vibronic, 0, 0},
	} {
		v := make([]float64, em.Len())
		for k := range v {
			v[k] = c.f(em.At(k))
		}
		truth := em.At(floats.MaxIdx(v))
		info := slices.Repeat([]float64{1 / math.Max(1e-12, c.sd*c.sd)}, len(v))
		off, plain := 0, 0
		const tries = 200
		for seed := range tries {
			rnd := rand.New(rand.NewPCG(uint64(seed), 3))
			noisy := make([]float64, len(v))
			for k, x := range v {
				noisy[k] = math.Max(0, x+c.sd*rnd.NormFloat64())
			}
			l := loading{v: noisy, info: info}
			if nm, _ := l.peak(em); math.Abs(nm-truth) > c.max {
				off++
			}
			if d := em.At(floats.MaxIdx(noisy)) - truth; math.Abs(d) > c.max {
				plain++
			}
		}
		t.Logf("%s: %d of %d off by more than %g nm, the highest point %d", c.name, off, tries, c.max, plain)
		if off > tries/20 {
			t.Errorf("%s: %d of %d off by more than %g nm", c.name, off, tries, c.max)
		}
	}
}

// The stated standard error is that of the peak, and neither noise that falls along
// the band nor what keeps small what is little known draws the peak to one side.
func TestPeakError(t *testing.T) {
	em, err := eem.Steps(280, 600, 2)
	if err != nil {
		t.Fatal(err)
	}
	const tries, truth = 500, 494
	band := func(nm float64) float64 { return math.Exp(-math.Pow((1e7/nm-1e7/truth)/1300, 2) / 2) }
	var off, over []float64
	for seed := range tries {
		rnd := rand.New(rand.NewPCG(uint64(seed), 7))
		l := loading{ridge: 25}
		for k := range em.Len() {
			sd := 0.05 * math.Exp(-(em.At(k)-truth)/60)
			info := 1 / (sd * sd)
			l.info = append(l.info, info)
			l.v = append(l.v, math.Max(0, band(em.At(k))+sd*rnd.NormFloat64())*info/(info+l.ridge))
		}
		floats.Scale(1/slices.Max(l.v), l.v)
		nm, u := l.peak(em)
		if u != u {
			continue
		}
		off, over = append(off, nm-truth), append(over, (nm-truth)/u)
	}
	mean, rms := floats.Sum(off)/float64(len(off)), floats.Norm(over, 2)/math.Sqrt(float64(len(over)))
	t.Logf("%d of %d with a standard error: off by %.2f nm in the mean, by %.2f standard errors (rms)", len(off), tries, mean, rms)
	// The mean has a standard error of 0.05 nm, rms one of 3 %; the choice of the stretch
	// is noisy itself.
	if len(off) < tries*9/10 || math.Abs(mean) > 0.2 || rms < 0.9 || rms > 1.25 {
		t.Errorf("%d of %d with a standard error: off by %.2f nm in the mean, by %.2f standard errors (rms)", len(off), tries, mean, rms)
	}
}
