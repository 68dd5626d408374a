package noise

import (
	"fmt"
	"math"
)

// A Detector turns counts into electrons, for the noise that a measurement could
// reach at best.
type Detector struct {
	Gain       float64 // electrons per unit of flux, as summed over the aperture and the exposure
	ReadNoise  float64 // standard deviation of one read of one pixel, electrons
	Pixels     float64 // pixels summed
	Reads      float64 // reads of each pixel per integration that add their noise; 0 stands for 1, and 2 for a difference of two
	Background float64 // electrons of background per pixel and integration, subtracted from the flux
}

// Expected returns the relative standard deviation of one integration of a flux,
// the root of its electrons, those of the background and the squared noise of the
// reads, over its electrons. The noise of the background's own estimate, of flat
// fields and of scintillation is not in it.
func (d Detector) Expected(flux float64) (float64, error) {
	for _, x := range []float64{d.ReadNoise, d.Pixels, d.Reads, d.Background} {
		if !(x >= 0) || math.IsInf(x, 0) {
			return math.NaN(), fmt.Errorf("photon noise: read noise %g, pixels %g, reads %g, background %g; expected numbers of at least 0", d.ReadNoise, d.Pixels, d.Reads, d.Background)
		}
	}
	electrons := flux * d.Gain
	if !(flux > 0) || !(d.Gain > 0) || !(electrons > 0) || math.IsInf(electrons, 0) {
		return math.NaN(), fmt.Errorf("photon noise: flux %g and gain %g; expected positive numbers", flux, d.Gain)
	}
	reads := d.Reads
	if reads == 0 {
		reads = 1
	}
	sigma := math.Sqrt(electrons + d.Pixels*(d.Background+reads*d.ReadNoise*d.ReadNoise))
	if out := sigma / electrons; finite(out) {
		return out, nil
	}
	return math.NaN(), errRange
}

// An Excess compares the scatter of a channel with what its photons allow.
type Excess struct {
	Expected float64 // relative standard deviation of photons and reads
	Measured float64 // root mean square of the residuals about zero
	Ratio    float64 // Measured over Expected
	Err      float64 // standard error of the ratio, for normal noise: Ratio/√(2n)
	Extra    float64 // the noise that adds to what is expected, in quadrature; 0 when Ratio is below 1
	Samples  int     // n, finite residuals
}

// Above says how far above the photon noise residuals lie, which are relative to
// flux, the mean flux of an integration in the unit of d.Gain. Residuals that are
// not finite are left out; fewer than two are an error.
func (d Detector) Above(flux float64, residual []float64) (Excess, error) {
	expected, err := d.Expected(flux)
	if err != nil {
		return Excess{}, err
	}
	out := Excess{Expected: expected}
	sum := 0.0
	for _, r := range residual {
		if finite(r) {
			z := r / expected
			sum += z * z
			out.Samples++
		}
	}
	if out.Samples < 2 {
		return Excess{}, fmt.Errorf("photon noise: %d finite residuals; expected at least 2", out.Samples)
	}
	out.Ratio = math.Sqrt(sum / float64(out.Samples))
	out.Measured = out.Ratio * expected
	out.Err = out.Ratio / math.Sqrt(2*float64(out.Samples))
	if out.Ratio > 1 {
		out.Extra = expected * math.Sqrt(out.Ratio*out.Ratio-1)
	}
	if !finite(out.Ratio) || !finite(out.Measured) {
		return Excess{}, errRange
	}
	return out, nil
}
