package figure

import (
	"strings"
	"testing"

	"rimlight/steps/diagnose"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// gapped makes a scene in which one channel has no result at all: what stands in
// its place knows the channel, and no more.
func gapped() (s scene, at int) {
	s, at = newScene(200, 30), 9
	c := s.cube.Channels[at]
	s.points[at] = spectrum.Point{Channel: c, Depth: nan, DepthErr: nan, RadiusRatio: nan, RadiusRatioErr: nan, Chi2: nan, Scatter: nan, Flag: "out of memory"}
	return s, at
}

// TestFiguresWithGap holds that all figures of channels leave a gap out, and
// those of the spectrum say that it is there.
func TestFiguresWithGap(t *testing.T) {
	s, at := gapped()
	whole := newScene(200, 30)
	fits := s.channels()
	fits[at] = diagnose.Summary{Channel: fits[at].Channel, Mid: nan, Level: nan, Cadence: nan,
		Flux:    lightcurve.Averages{Begin: nan, End: nan},
		Scatter: diagnose.Scatter{RMS: nan, Ratio: nan}, Beta: diagnose.Beta{Value: nan, Err: nan, From: nan, To: nan}}
	draw := func(name string, f Figure, err error) Figure {
		t.Helper()
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		if strings.Contains(f.SVG+f.Caption+f.Alt, "NaN") {
			t.Errorf("%s shows NaN", name)
		}
		return f
	}
	f, err := Detrended(fits)
	draw("detrended map", f, err)
	if want := "Fluxes of 200 integrations in 30 channels"; !strings.Contains(f.Caption, want) {
		t.Errorf("caption %q, expected %q", f.Caption, want)
	}
	level := f.Data.Columns[3].Number
	if len(level) != 30 || level[at] == level[at] {
		t.Errorf("the map has the levels %v", level)
	}
	f, err = ChannelGrid(fits, s.points)
	draw("grid", f, err)
	f, err = BinnedScatter(s.white(), fits)
	draw("scatter", f, err)
	f, err = LimbDarkening(s.points)
	draw("limb darkening", f, err)
	rows := func(points []spectrum.Point) int {
		f, err := LimbDarkening(points)
		if err != nil {
			t.Fatal(err)
		}
		return len(f.Data.Columns[0].Number)
	}
	if rows(s.points) != rows(whole.points)-1 {
		t.Errorf("limb darkening has %d channels, expected one fewer than %d", rows(s.points), rows(whole.points))
	}
	depths, err := spectrum.Assemble(s.points, nil)
	if err != nil {
		t.Fatal(err)
	}
	f, err = Spectrum(depths)
	draw("spectrum", f, err)
	if !strings.Contains(f.Caption, "no depth") {
		t.Errorf("the caption of the spectrum is %q", f.Caption)
	}
}
