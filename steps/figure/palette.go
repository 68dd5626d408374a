package figure

import (
	imagecolor "image/color"
	"math"
)

// The colours of all figures. Indigo, teal and amber differ in lightness, and
// along the blue-yellow axis, so that they stay apart in grey print and for
// readers who do not tell red from green.
var (
	ink    = imagecolor.NRGBA{0x1c, 0x21, 0x2e, 0xff} // axes and text
	quiet  = imagecolor.NRGBA{0x5d, 0x64, 0x73, 0xff} // notes and zero lines
	indigo = imagecolor.NRGBA{0x34, 0x2f, 0x8f, 0xff}
	teal   = imagecolor.NRGBA{0x12, 0x86, 0x88, 0xff}
	amber  = imagecolor.NRGBA{0xd4, 0x8a, 0x0c, 0xff}
	noData = imagecolor.NRGBA{0xd8, 0xdb, 0xe0, 0xff} // masked cells of a map; lighter and greyer than the ramp
	blank  = imagecolor.NRGBA{0xff, 0xff, 0xff, 0x00} // cells of a map outside all channels
)

// ramp holds the anchors of the colour scale of maps, equally spaced, of
// increasing lightness.
var ramp = [...]imagecolor.NRGBA{
	{0x1b, 0x15, 0x4d, 0xff},
	{0x39, 0x33, 0x92, 0xff},
	{0x2b, 0x66, 0xa1, 0xff},
	{0x1f, 0x93, 0x95, 0xff},
	{0x7d, 0xb8, 0x73, 0xff},
	{0xf3, 0xc2, 0x4f, 0xff},
}

// Entries of the palette of a map image.
const (
	blankIndex  = 0
	maskedIndex = 1
	firstColor  = 2
	rampColors  = 254
)

// mapPalette returns the palette of a map image: blank, masked, then the ramp.
func mapPalette() imagecolor.Palette {
	p := make(imagecolor.Palette, firstColor+rampColors)
	p[blankIndex], p[maskedIndex] = blank, noData
	for k := range rampColors {
		p[firstColor+k] = rampColor(float64(k) / (rampColors - 1))
	}
	return p
}

// rampColor returns the colour at x, cut to between 0 and 1.
func rampColor(x float64) imagecolor.NRGBA {
	x = min(max(x, 0), 1) * float64(len(ramp)-1)
	k := min(int(x), len(ramp)-2)
	a, b, f := ramp[k], ramp[k+1], x-float64(k)
	mix := func(a, b uint8) uint8 { return uint8(math.Round(float64(a) + f*(float64(b)-float64(a)))) }
	return imagecolor.NRGBA{mix(a.R, b.R), mix(a.G, b.G), mix(a.B, b.B), 0xff}
}

// faint returns c with an opacity between 0 and 1.
func faint(c imagecolor.NRGBA, opacity float64) imagecolor.NRGBA {
	c.A = uint8(math.Round(255 * opacity))
	return c
}
