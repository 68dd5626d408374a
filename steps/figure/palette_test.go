package figure

import (
	"math"
	"testing"
)

// lightness is L* of CIE 1976 for an sRGB colour (IEC 61966-2-1, D65).
func lightness(r, g, b uint8) float64 {
	linear := func(v uint8) float64 {
		x := float64(v) / 255
		if x <= 0.04045 {
			return x / 12.92
		}
		return math.Pow((x+0.055)/1.055, 2.4)
	}
	y := 0.2126*linear(r) + 0.7152*linear(g) + 0.0722*linear(b)
	if y <= 216.0/24389 {
		return y * 24389 / 27
	}
	return 116*math.Cbrt(y) - 16
}

// TestRamp: the scale grows lighter without a step back, so that it reads in grey
// print, and masked cells are lighter than all of it.
func TestRamp(t *testing.T) {
	last := -1.0
	for k := range rampColors {
		c := rampColor(float64(k) / (rampColors - 1))
		l := lightness(c.R, c.G, c.B)
		if l < last-0.3 { // rounding to 8 bits
			t.Errorf("colour %d has lightness %.2f after %.2f", k, l, last)
		}
		last = max(last, l)
	}
	if masked := lightness(noData.R, noData.G, noData.B); masked < last+4 {
		t.Errorf("masked cells have lightness %.1f, the scale ends at %.1f", masked, last)
	}
	if first := rampColor(-1); first != ramp[0] || rampColor(2) != ramp[len(ramp)-1] {
		t.Error("the ends of the scale")
	}
	if len(mapPalette()) != 256 {
		t.Errorf("%d colours", len(mapPalette()))
	}
}
