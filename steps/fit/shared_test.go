package fit

import (
	"math"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// TestShiftGeometry compares the linear response of a channel's depth to the
// orbit with fits at changed orbits.
func TestShiftGeometry(t *testing.T) {
	s := newScene(t, 31, 600, 6)
	white := whiteOf(t, s)
	curve := lightcurve.Curves(s.cube)[2]
	model, priors := s.model(), channelPriors("u1", "u2", -1, 2)
	base, _, err := Channel(curve, white, withChannel(model, priors))
	if err != nil {
		t.Fatal(err)
	}
	if len(base.ShiftGeometry) != len(white.Names) {
		t.Fatalf("%d shifts for %d parameters", len(base.ShiftGeometry), len(white.Names))
	}
	refit := func(k int, change float64) float64 {
		moved := white
		moved.Value = append([]float64(nil), white.Value...)
		moved.Value[k] += change
		p, _, err := Channel(curve, moved, withChannel(model, priors))
		if err != nil {
			t.Fatal(err)
		}
		return p.Depth
	}
	for k, name := range white.Names {
		switch name {
		case "midTransitOffset", "axisRatio", "inclination", "settlingTime":
		default:
			if base.ShiftGeometry[k] != 0 {
				t.Errorf("%s is not held, but has shift %g", name, base.ShiftGeometry[k])
			}
			continue
		}
		h := 0.5 * white.Err[k]
		want := (refit(k, h) - refit(k, -h)) / (2 * h)
		got := base.ShiftGeometry[k]
		// The residuals of the data enter the refits, so they agree only so far.
		if math.Abs(got-want)*white.Err[k] > 0.05*base.DepthErr {
			t.Errorf("%s: %g, refits give %g; times its error: %g of %g", name, got, want, got*white.Err[k], base.DepthErr)
		}
	}
}

func TestSharedCovariance(t *testing.T) {
	white := Posterior{Names: []string{"a", "b", "c"}, Cov: [][]float64{{4, 1, 0}, {1, 9, 0}, {0, 0, math.Inf(1)}}}
	points := []spectrum.Point{
		{Depth: 1, DepthErr: 1, ShiftGeometry: []float64{1, 0, 0}},
		{Depth: math.NaN(), DepthErr: math.NaN()},
		{Depth: 1, DepthErr: 1, ShiftGeometry: []float64{2, -1, 0}},
		{Depth: 1, DepthErr: 1},
	}
	nan := math.NaN()
	want := [][]float64{{4, nan, 7, nan}, {nan, nan, nan, nan}, {7, nan, 21, nan}, {nan, nan, nan, nan}}
	got := SharedCovariance(points, white)
	for i := range want {
		for j := range want {
			if w, g := want[i][j], got[i][j]; g != w && !(math.IsNaN(w) && math.IsNaN(g)) {
				t.Errorf("element %d %d: %g, want %g", i, j, g, w)
			}
		}
	}
	if len(SharedCovariance(nil, white)) != 0 {
		t.Error("a covariance of no points")
	}
}

// TestSpectrumIsHonest holds the errors of a whole small spectrum, the shared
// part included, against the truth.
func TestSpectrumIsHonest(t *testing.T) {
	var meanSq, rmsSq float64
	const scenes = 4
	for seed := range uint64(scenes) {
		s := newScene(t, 40+seed, 500, 12)
		white, points := s.reduce(t, s.model(), whitePriors(), channelPriors("u1", "u2", -1, 2))
		shared := SharedCovariance(points, white)
		mean, rms := s.pulls(points, shared)
		meanSq += mean * mean / scenes
		rmsSq += rms * rms / scenes
		for i, p := range points {
			if !p.Good() || p.Flag != "" || !(shared[i][i] > 0 && shared[i][i] < 30*p.DepthErr*p.DepthErr) {
				t.Errorf("seed %d, channel %d: %+v, shared variance %g", seed, i, p, shared[i][i])
			}
		}
	}
	// 48 depths: the relative standard error of the rms is 10% plus what the shared part adds.
	if rms := math.Sqrt(rmsSq); rms < 0.7 || rms > 1.3 {
		t.Errorf("rms pull %.2f, want about 1", rms)
	}
	if mean := math.Sqrt(meanSq); mean > 1 {
		t.Errorf("mean pulls have rms %.2f", mean)
	}
}
