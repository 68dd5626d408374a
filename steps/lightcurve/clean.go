package lightcurve

import (
	"fmt"
	"math"
	"slices"
)

// maxClipPasses bounds the rounds of clipping. Each round only adds flags, and
// real data settle in two to four.
const maxClipPasses = 10

// edgeHalf is the least number of neighbours on the longer side of a window at
// either end of the series, so that the first and last samples are compared
// with something.
const edgeHalf = 2

// A RunningMedian is a rule for finding outliers in time: a sample is one when
// it lies further than Sigma robust standard deviations from the median of the
// Window usable samples centred on it.
type RunningMedian struct {
	Window int     // samples, odd, at least 5; at the ends of the series the window shrinks symmetrically
	Sigma  float64 // threshold in robust standard deviations, above 0
}

func (r RunningMedian) check(what string) error {
	if r.Window < 5 || r.Window%2 == 0 {
		return fmt.Errorf("%s: window is %d samples; expected an odd number of at least 5, for example 21", what, r.Window)
	}
	if !(r.Sigma > 0) || math.IsInf(r.Sigma, 1) {
		return fmt.Errorf("%s: sigma is %g; expected a finite number above 0, for example 5", what, r.Sigma)
	}
	return nil
}

// MaskOutliers returns raw with masks of its own, in which dead channels carry
// [Excluded] (see [MaskDead]) and samples far from their neighbours in time
// carry [Outlier]. Fluxes are left as they are: outliers are masked, not replaced.
//
// The standard deviation is that of the whole channel about its running median,
// from the median absolute deviation. Masked samples take no part, and the
// clipping is repeated until it finds nothing new. So that the corners of a
// deep transit are not taken for outliers, a sample must besides lie as far
// outside the span of two medians, that of the half window before it and that
// of the half window after it: on any slope or corner a good sample lies between
// the two. A channel whose scatter is exactly zero is not clipped.
//
// Clipping at a running median is common practice, no source.
func MaskOutliers(raw Cube, rule RunningMedian) (Cube, error) {
	const what = "mask outliers"
	if err := rule.check(what); err != nil {
		return Cube{}, err
	}
	out, err := MaskDead(raw)
	if err != nil {
		return Cube{}, err
	}
	for j := range out.Flux {
		rule.clip(out.Flux[j], out.Err[j], out.Mask[j])
	}
	return out, nil
}

// MaskCurveOutliers is [MaskOutliers] for one light curve, without the search
// for dead channels.
func MaskCurveOutliers(curve Curve, rule RunningMedian) (Curve, error) {
	const what = "mask outliers"
	if err := rule.check(what); err != nil {
		return Curve{}, err
	}
	if err := curve.checkShape(what); err != nil {
		return Curve{}, err
	}
	out := curve
	out.Mask = slices.Clone(curve.Mask)
	rule.clip(out.Flux, out.Err, out.Mask)
	return out, nil
}

// clip flags outliers of one channel in mask.
func (r RunningMedian) clip(flux, sigma []float64, mask []Flag) {
	ignore := errorFlags(sigma)
	index := make([]int, 0, len(flux))
	value := make([]float64, 0, len(flux))
	scratch := make([]float64, 0, len(flux))
	for range maxClipPasses {
		index, value = index[:0], value[:0]
		for i, f := range flux {
			if mask[i]&^ignore == 0 && finite(f) {
				index = append(index, i)
				value = append(value, f)
			}
		}
		center := runningMedian(value, r.Window)
		scratch = scratch[:0]
		for k, v := range value {
			scratch = append(scratch, v-center[k])
		}
		_, scatter := robustScatter(scratch)
		if !(scatter > 0) {
			return
		}
		limit := r.Sigma * scatter
		found := false
		for k, v := range value {
			if math.Abs(v-center[k]) > limit && outsideHalves(value, k, r.Window/2, limit) {
				mask[index[k]] |= Outlier
				found = true
			}
		}
		if !found {
			return
		}
	}
}

// errorFlags returns the reasons for masking that say nothing of the flux: when
// no sample of a channel has a usable error, Missing and Negative may stand for
// the error alone, and [RescaleErrors] will supply one.
func errorFlags(sigma []float64) Flag {
	if haveErrors(sigma) {
		return 0
	}
	return Missing | Negative
}

func haveErrors(sigma []float64) bool {
	return slices.ContainsFunc(sigma, func(e float64) bool { return e > 0 && finite(e) })
}

// outsideHalves reports whether value[k] is further than limit outside the span
// of the medians of up to half samples before and after it. Where an end of the
// series cuts one side short, a straight line through the other side, drawn on to
// the sample, widens the span.
func outsideHalves(value []float64, k, half int, limit float64) bool {
	before := slices.Clone(value[max(0, k-half):k])
	after := slices.Clone(value[k+1 : min(len(value), k+1+half)])
	slices.Reverse(before) // nearest first, as after is
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, sides := range [][2][]float64{{before, after}, {after, before}} {
		side, other := sides[0], sides[1]
		if n := len(side); len(other) < n && n >= 2 {
			near, far := medianInPlace(slices.Clone(side[:n/2])), medianInPlace(slices.Clone(side[n/2:]))
			// near lies (n/2+1)/2 samples from k on average, far n/2 further (for even n).
			onward := near + (near-far)*float64(n/2+1)/float64(n)
			lo, hi = math.Min(lo, onward), math.Max(hi, onward)
		}
		if len(side) > 0 {
			m := medianInPlace(slices.Clone(side))
			lo, hi = math.Min(lo, m), math.Max(hi, m)
		}
	}
	return value[k] < lo-limit || value[k] > hi+limit
}

// runningMedian returns the median of the window samples centred on each
// sample. Near the ends the window shrinks symmetrically, down to edgeHalf
// neighbours on the inner side.
func runningMedian(value []float64, window int) []float64 {
	n := len(value)
	center := make([]float64, n)
	sorted := make([]float64, 0, min(window, n))
	lo, hi := 0, 0 // sorted holds value[lo:hi]
	for i := range value {
		half := min(window/2, max(min(i, n-1-i), edgeHalf))
		newLo, newHi := max(0, i-half), min(n, i+half+1)
		for ; hi < newHi; hi++ {
			at, _ := slices.BinarySearch(sorted, value[hi])
			sorted = slices.Insert(sorted, at, value[hi])
		}
		for ; lo < newLo; lo++ {
			at, _ := slices.BinarySearch(sorted, value[lo])
			sorted = slices.Delete(sorted, at, at+1)
		}
		k := len(sorted)
		center[i] = sorted[k/2]
		if k%2 == 0 {
			center[i] = (sorted[k/2-1] + sorted[k/2]) / 2
		}
	}
	return center
}
