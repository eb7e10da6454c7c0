package report

import (
	"image/color"
	"math"
)

// Colours are made in OKLab (Ottosson 2020, "A perceptual color space for image
// processing"): equal steps there look equal. lab holds lightness 0–1 and the
// green-red and blue-yellow axes.
type lab struct{ L, A, B float64 }

// lch is a colour of lightness l, chroma c and hue h (degrees).
func lch(l, c, h float64) lab {
	s, co := math.Sincos(h * math.Pi / 180)
	return lab{l, c * co, c * s}
}

// linear returns the colour in linear sRGB; components lie outside 0–1 where a
// screen cannot show it.
func (c lab) linear() (r, g, b float64) {
	l := c.L + 0.3963377774*c.A + 0.2158037573*c.B
	m := c.L - 0.1055613458*c.A - 0.0638541728*c.B
	s := c.L - 0.0894841775*c.A - 1.2914855480*c.B
	l, m, s = l*l*l, m*m*m, s*s*s
	return 4.0767416621*l - 3.3077115913*m + 0.2309699292*s,
		-1.2684380046*l + 2.6097574011*m - 0.3413193965*s,
		-0.0041960863*l - 0.7034186147*m + 1.7076147010*s
}

// rgb returns the colour as the screen shows it, less saturated where it must be.
func (c lab) rgb() color.NRGBA {
	for range 40 {
		r, g, b := c.linear()
		if min(r, g, b) >= -1e-4 && max(r, g, b) <= 1+1e-4 {
			break
		}
		c.A *= 0.96
		c.B *= 0.96
	}
	r, g, b := c.linear()
	return color.NRGBA{gamma(r), gamma(g), gamma(b), 255}
}

// gamma is the sRGB transfer function (IEC 61966-2-1), rounded to 8 bits.
func gamma(v float64) uint8 {
	v = min(max(v, 0), 1)
	if v <= 0.0031308 {
		v *= 12.92
	} else {
		v = 1.055*math.Pow(v, 1/2.4) - 0.055
	}
	return uint8(math.Round(v * 255))
}

// toLab is the inverse of rgb.
func toLab(c color.NRGBA) lab {
	lin := func(u uint8) float64 {
		v := float64(u) / 255
		if v <= 0.04045 {
			return v / 12.92
		}
		return math.Pow((v+0.055)/1.055, 2.4)
	}
	r, g, b := lin(c.R), lin(c.G), lin(c.B)
	l := math.Cbrt(0.4122214708*r + 0.5363325363*g + 0.0514459929*b)
	m := math.Cbrt(0.2119034982*r + 0.6806995451*g + 0.1073969566*b)
	s := math.Cbrt(0.0883024619*r + 0.2817188376*g + 0.6299787005*b)
	return lab{0.2104542553*l + 0.7936177850*m - 0.0040720468*s,
		1.9779984951*l - 2.4285922050*m + 0.4505937099*s,
		0.0259040371*l + 0.7827717662*m - 0.8086757660*s}
}

func (c lab) dist(d lab) float64 {
	return math.Sqrt((c.L-d.L)*(c.L-d.L) + (c.A-d.A)*(c.A-d.A) + (c.B-d.B)*(c.B-d.B))
}

// even returns n colours along path (parameter 0–1) that are equally far from one
// another.
func even(n int, path func(t float64) lab) []color.NRGBA {
	const fine = 2000
	length := make([]float64, fine+1)
	last := toLab(path(0).rgb())
	for i := 1; i <= fine; i++ {
		c := path(float64(i) / fine)
		length[i] = length[i-1] + c.dist(last)
		last = c
	}
	out, i := make([]color.NRGBA, n), 0
	for k := range out {
		want := length[fine] * float64(k) / float64(n-1)
		for i < fine && length[i] < want {
			i++
		}
		out[k] = path(float64(i) / fine).rgb()
	}
	return out
}

// sequential returns n colours for intensities, from pale (nothing) to dark
// (most): ink goes where the signal is, lightness falls all the way, so that
// the order survives grey print and colour-blind eyes.
func sequential(n int) []color.NRGBA {
	return even(n, func(t float64) lab {
		return lch(0.975-0.745*t, 0.045+0.115*math.Sin(math.Pi*math.Pow(t, 0.8)), 100+205*t)
	})
}

// diverging returns n colours (odd) for residuals: blue below zero, near-white at
// zero, orange to brown above it; equal distances from zero are equally dark.
func diverging(n int) []color.NRGBA {
	half := func(hue, turn float64) []color.NRGBA {
		return even(n/2+1, func(t float64) lab {
			return lch(0.975-0.575*t, 0.17*math.Pow(t, 0.75)*(1-0.22*t), hue+turn*t)
		})
	}
	neg, pos := half(235, 30), half(75, -35)
	out := make([]color.NRGBA, 0, n)
	for i := len(neg) - 1; i > 0; i-- {
		out = append(out, neg[i])
	}
	return append(out, pos...)
}

// Greys of the pictures: missing cells, their hatching, lines and text.
var (
	missingGrey = color.NRGBA{214, 214, 214, 255}
	hatchGrey   = color.NRGBA{184, 184, 184, 255}
	gridGrey    = color.NRGBA{226, 226, 226, 255}
	inkGrey     = color.NRGBA{32, 32, 36, 255}
)

// series returns the colour of line number i: hues far apart for normal and
// colour-blind eyes, of two lightnesses. Lines also differ in dashes.
func series(i int) color.NRGBA {
	return seriesColours[i%len(seriesColours)]
}

var seriesColours = []color.NRGBA{
	lch(0.45, 0.16, 262).rgb(), // blue
	lch(0.68, 0.16, 55).rgb(),  // orange
	lch(0.55, 0.12, 165).rgb(), // green
	lch(0.42, 0.15, 20).rgb(),  // dark red
	lch(0.72, 0.10, 230).rgb(), // sky
	lch(0.35, 0.03, 270).rgb(), // slate
	lch(0.80, 0.15, 98).rgb(),  // yellow
	lch(0.62, 0.18, 340).rgb(), // pink
}
