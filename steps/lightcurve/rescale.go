package lightcurve

import (
	"math"
	"slices"
)

// minPairs is the least number of neighbouring usable samples from which a
// scatter is taken; with fewer, the given errors are kept.
const minPairs = 20

// RescaleErrors returns a copy of cube whose errors match the scatter from one
// integration to the next, channel by channel, and the factor each channel's
// errors were multiplied by.
//
// The factor is the robust standard deviation (from the median absolute
// deviation) of the differences of neighbouring usable samples, each divided by
// the error expected of it, the root of the sum of the two squared errors. It
// does not see the transit or slow trends, which shift few differences by
// little; noise that is correlated from one integration to the next makes it too
// small. Errors that differ from sample to sample keep their ratios.
//
// A channel that has no error above zero at all gets the scatter itself as the
// error of every sample; its factor is NaN, and [Missing] and [Negative] are
// taken off those of its samples whose flux is finite and above zero. A channel
// with fewer than 20 pairs of neighbouring usable samples keeps its errors, with
// factor 1. So does one whose scatter is exactly zero.
func RescaleErrors(cube Cube) (scaled Cube, factors []float64, err error) {
	if err := cube.checkShape("rescale errors"); err != nil {
		return Cube{}, nil, err
	}
	out := cube.ownMasks()
	out.Err = slices.Clone(cube.Err)
	factors = make([]float64, len(out.Flux))
	for j := range out.Flux {
		out.Err[j] = slices.Clone(out.Err[j])
		factors[j] = rescale(out.Flux[j], out.Err[j], out.Mask[j])
	}
	return out, factors, nil
}

// RescaleCurveErrors is [RescaleErrors] for one light curve.
func RescaleCurveErrors(curve Curve) (scaled Curve, factor float64, err error) {
	if err := curve.checkShape("rescale errors"); err != nil {
		return Curve{}, 0, err
	}
	out := curve
	out.Err = slices.Clone(curve.Err)
	out.Mask = slices.Clone(curve.Mask)
	return out, rescale(out.Flux, out.Err, out.Mask), nil
}

// rescale changes the errors of one channel, and its mask where it had no
// errors, and returns the factor.
func rescale(flux, sigma []float64, mask []Flag) float64 {
	if !haveErrors(sigma) {
		return setErrors(flux, sigma, mask)
	}
	normal := make([]float64, 0, len(flux))
	for i := 1; i < len(flux); i++ {
		if mask[i-1] == 0 && mask[i] == 0 {
			normal = append(normal, (flux[i]-flux[i-1])/math.Hypot(sigma[i-1], sigma[i]))
		}
	}
	if len(normal) < minPairs {
		return 1
	}
	_, factor := robustScatter(normal)
	if !(factor > 0) || !finite(factor) {
		return 1
	}
	for i := range sigma {
		sigma[i] *= factor
	}
	return factor
}

// setErrors gives a channel without errors its point-to-point scatter.
func setErrors(flux, sigma []float64, mask []Flag) float64 {
	use := func(i int) bool {
		return mask[i]&^(Missing|Negative) == 0 && finite(flux[i]) && flux[i] > 0
	}
	scatter := pointToPoint(flux, use)
	if !(scatter > 0) {
		return 1
	}
	for i := range sigma {
		sigma[i] = scatter
		if use(i) {
			mask[i] = 0
		}
	}
	return math.NaN()
}
