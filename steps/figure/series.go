package figure

import (
	"fmt"
	"math"

	"rimlight/steps/diagnose"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
)

// A series is what a figure shows of a curve fit: usable samples after division
// by the trend.
type series struct {
	zero
	time     []float64 // BJD_TDB, days
	hours    []float64 // from zero
	flux     []float64 // flux over trend; NaN where masked
	model    []float64 // transit model
	residual []float64 // flux less model; NaN where masked
	used     int
	masked   int
}

// newSeries prepares a curve fit. It is an error when slices differ in length;
// a series may have no usable sample.
func newSeries(f fit.CurveFit) (series, error) {
	residual, err := diagnose.Residuals(f)
	if err != nil {
		return series{}, err
	}
	first, _ := extent(f.Time)
	out := series{zero: newZero(f.Mid, first), time: f.Time, residual: residual, model: f.Transit}
	out.hours, out.flux = out.since(f.Time), make([]float64, len(f.Time))
	for i := range f.Time {
		if !finite(out.hours[i]) {
			out.residual[i] = math.NaN()
		}
		out.flux[i] = math.NaN()
		if finite(out.residual[i]) {
			out.flux[i] = f.Flux[i] / f.Trend[i]
			out.used++
		}
	}
	out.masked = len(f.Time) - out.used
	return out, nil
}

// binned averages values of the series, a few of them at least in each interval.
func (s series) binned(value []float64) (bins, error) {
	averages, err := lightcurve.Average(s.time, value, min(whiteBins, max(s.used/4, leastBins)))
	if err != nil {
		return bins{}, err
	}
	return newBins(averages, 1, s.at), nil
}

// depth returns how far the model falls below its maximum of 1, and for how many
// hours it is below 1; zeros for a model without a transit.
func (s series) depth() (depth, duration float64) {
	first, last := math.NaN(), math.NaN()
	for i, m := range s.model {
		if m < 1 && finite(s.hours[i]) {
			depth = max(depth, 1-m)
			if !(first <= s.hours[i]) {
				first = s.hours[i]
			}
			last = s.hours[i]
		}
	}
	if depth == 0 {
		return 0, 0
	}
	return depth, last - first
}

// A zero is the time that the hours of a figure count from.
type zero struct {
	at    float64 // BJD_TDB, days
	known bool    // it is mid-transit, not merely the first time
}

// newZero takes mid-transit, or else the first time.
func newZero(mid, first float64) zero {
	if finite(mid) {
		return zero{mid, true}
	}
	return zero{first, false}
}

// since gives times in hours from zero.
func (z zero) since(time []float64) []float64 {
	out := make([]float64, len(time))
	for i, t := range time {
		out[i] = (t - z.at) * hours
	}
	return out
}

// title is the title of a time axis.
func (z zero) title() string {
	if z.known {
		return "Time from mid-transit (h)"
	}
	return "Time from the first integration (h)"
}

// sentence says what the hours count from.
func (z zero) sentence() string {
	if z.known {
		return fmt.Sprintf("Hours count from mid-transit at BJD_TDB %.5f.", z.at)
	}
	return fmt.Sprintf("Hours count from the first integration at BJD_TDB %.5f.", z.at)
}
