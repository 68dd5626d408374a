package fit

import (
	"math"
	"testing"

	"rimlight/steps/spectrum"
)

// TestSharedCovarianceWithGap holds that a point of which nothing is known has no
// part in what the channels share, and changes nothing for the others.
func TestSharedCovarianceWithGap(t *testing.T) {
	white := Posterior{Names: []string{"axisRatio"}, Value: []float64{9}, Err: []float64{0.1}, Cov: [][]float64{{0.01}}}
	good := func(shift float64) spectrum.Point {
		return spectrum.Point{Depth: 0.01, DepthErr: 1e-5, ShiftGeometry: []float64{shift}}
	}
	gap := spectrum.Point{Depth: math.NaN(), DepthErr: math.NaN(), Flag: "no result"}
	with := SharedCovariance([]spectrum.Point{good(1e-4), gap, good(2e-4)}, white)
	without := SharedCovariance([]spectrum.Point{good(1e-4), good(2e-4)}, white)
	for i, k := range []int{0, 2} {
		for j, l := range []int{0, 2} {
			if with[k][l] != without[i][j] || !(with[k][l] > 0) {
				t.Errorf("element (%d, %d) is %g, without the gap %g", k, l, with[k][l], without[i][j])
			}
		}
	}
	if _, err := spectrum.Assemble([]spectrum.Point{gap}, SharedCovariance([]spectrum.Point{gap}, white)); err == nil {
		t.Error("a point without a channel is accepted")
	}
}
