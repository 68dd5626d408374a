package lightcurve

import (
	"fmt"
	"math"
)

// leastBins is the least number of bins a scatter is taken over; its relative
// standard error is then 1/√20, 22%.
const leastBins = 10

// sizesPerOctave sets the spacing of the bin sizes of [Binned].
const sizesPerOctave = 3

// A Binning says how the scatter of a series falls when its samples are averaged
// in bins. All slices have one element per bin size.
type Binning struct {
	Size  []int     // samples per bin, increasing from 1
	Bins  []int     // full bins of that size
	RMS   []float64 // root mean square of the bin means about zero, in the unit of the series
	White []float64 // the same for uncorrelated noise: RMS[0]/√Size
	Err   []float64 // standard error of White for uncorrelated normal noise: White/√(2 Bins)
}

// Binned averages the finite values of residual, in their order, in bins of
// growing size (about three sizes per octave, as long as there are ten full
// bins; an incomplete last bin is left out) and returns the scatter of the bin
// means: the time-averaging test of Pont, Zucker & Queloz (2006) and Winn et al.
// (2008), with the scatter taken about zero, so that uncorrelated noise falls as
// 1/√size without a correction for the mean. Gaps in time are closed up. Fewer
// than 10 finite values are an error.
func Binned(residual []float64) (Binning, error) {
	kept := make([]float64, 0, len(residual))
	for _, r := range residual {
		if finite(r) {
			kept = append(kept, r)
		}
	}
	if len(kept) < leastBins {
		return Binning{}, fmt.Errorf("binned scatter: %d finite residuals; expected at least %d", len(kept), leastBins)
	}
	var out Binning
	last := 0
	for step := 0; ; step++ {
		size := int(math.Round(math.Exp2(float64(step) / sizesPerOctave)))
		bins := len(kept) / size
		if bins < leastBins {
			return out, nil
		}
		if size == last {
			continue
		}
		last = size
		out.RMS = append(out.RMS, rmsOfMeans(kept, size, bins))
		white := out.RMS[0] / math.Sqrt(float64(size))
		out.Size = append(out.Size, size)
		out.Bins = append(out.Bins, bins)
		out.White = append(out.White, white)
		out.Err = append(out.Err, white/math.Sqrt(2*float64(bins)))
	}
}

// rmsOfMeans returns the root mean square of the means of the first bins runs of
// size values.
func rmsOfMeans(x []float64, size, bins int) float64 {
	sum := 0.0
	for b := range bins {
		mean := 0.0
		for _, v := range x[b*size : (b+1)*size] {
			mean += v
		}
		mean /= float64(size)
		sum += mean * mean
	}
	return math.Sqrt(sum / float64(bins))
}
