package figure

import (
	"fmt"
	"math"

	"rimlight/steps/diagnose"
	"rimlight/steps/fit"
)

// A series is what a figure shows of a curve fit: usable samples after division
// by the trend.
type series struct {
	hours    []float64 // from mid-transit
	flux     []float64 // flux over trend; NaN where masked
	model    []float64 // transit model
	residual []float64 // flux less model; NaN where masked
	used     int
	masked   int
	middle   float64 // BJD_TDB that hours count from
	known    bool    // middle is mid-transit, not merely the first time
}

// newSeries prepares a curve fit. It is an error when slices differ in length;
// a series may have no usable sample.
func newSeries(f fit.CurveFit) (series, error) {
	residual, err := diagnose.Residuals(f)
	if err != nil {
		return series{}, err
	}
	out := series{residual: residual, model: f.Transit, middle: f.Mid, known: true}
	if lo, _ := extent(f.Time); !finite(f.Mid) {
		out.middle, out.known = lo, false
	}
	out.hours, out.flux = make([]float64, len(f.Time)), make([]float64, len(f.Time))
	for i, t := range f.Time {
		out.hours[i] = (t - out.middle) * hours
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

// timeTitle is the title of a time axis that counts from the middle.
func (s series) timeTitle() string {
	if s.known {
		return "Time from mid-transit (h)"
	}
	return "Time from the first integration (h)"
}

// since says what the hours count from.
func (s series) since() string {
	if s.known {
		return fmt.Sprintf("Hours count from mid-transit at BJD_TDB %.5f.", s.middle)
	}
	return fmt.Sprintf("Hours count from the first integration at BJD_TDB %.5f.", s.middle)
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

// bend is how far a drawn model may lie from the model, in units of its depth.
const bend = 5e-4

// modelLine returns the points of the model that a line through it needs.
func (s series) modelLine() (x, y []float64) {
	depth, _ := s.depth()
	index := simplified(s.hours, s.model, max(bend*depth, 1e-9))
	return pick(s.hours, index), pick(s.model, index)
}
