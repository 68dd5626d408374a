package fit

import (
	"math"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// TestGeometry holds the covariance that draws of the geometry give against the one of
// first order.
func TestGeometry(t *testing.T) {
	s := newScene(t, 5, 700, 4)
	model := s.model()
	model.White = whitePriors()
	curve, err := lightcurve.White(s.cube)
	if err != nil {
		t.Fatal(err)
	}
	white, _, err := White(curve, model)
	if err != nil {
		t.Fatal(err)
	}
	model.Channel = Priors{uniform("radiusRatio", 0.001, 0.5), uniform("u1", -2, 3), uniform("u2", -2, 3)}
	curves := lightcurve.Curves(s.cube)
	const n = 50
	points, shared, posteriors, err := ChannelsOverGeometry(curves, white, model, Sampling{Effective: 500, Compared: -1}, n)
	if err != nil {
		t.Fatal(err)
	}
	if len(posteriors) != len(curves) {
		t.Fatalf("%d posteriors", len(posteriors))
	}
	plain, _, err := Channels(curves, white, model, Sampling{Compared: -1})
	if err != nil {
		t.Fatal(err)
	}
	linear := SharedCovariance(plain, white)
	for i := range curves {
		for j := range curves {
			scale := math.Sqrt(linear[i][i] * linear[j][j])
			if d := (shared[i][j] - linear[i][j]) / scale; math.Abs(d) > 4*math.Sqrt(2./n)+0.1 {
				t.Errorf("covariance (%d, %d) is %.3g, to first order %.3g", i, j, shared[i][j], linear[i][j])
			}
		}
		if math.Abs(points[i].Depth-plain[i].Depth) > math.Sqrt(linear[i][i])/2 || math.Abs(points[i].DepthErr/plain[i].DepthErr-1) > 0.1 {
			t.Errorf("depth %d: %.6g ± %.2g, with the geometry held %.6g ± %.2g", i, points[i].Depth, points[i].DepthErr, plain[i].Depth, plain[i].DepthErr)
		}
	}
	if _, err := spectrum.Assemble(points, shared); err != nil {
		t.Error(err)
	}
	if _, err := GeometryDraws(white, model, 3, 1); err == nil || !strings.Contains(err.Error(), "expected 8 to 100") {
		t.Errorf("three draws: %v", err)
	}
	white.Cov = nil
	if _, err := GeometryDraws(white, model, 10, 1); err == nil {
		t.Error("a posterior without a covariance was accepted")
	}
}
