package diagnose

import (
	"fmt"
	"math"

	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
)

// Intervals is the number of equal intervals of time that a summary resolves.
const Intervals = 320

// A Summary is what figures and checks of many channels need of one fitted light
// curve. Its size has a bound, some 20 kB, whatever the number of integrations, so
// that a step can take those of thousands of channels at once.
type Summary struct {
	Channel   lightcurve.Channel
	Mid       float64             // as in [fit.CurveFit]
	Level     float64             // as in [fit.CurveFit]
	Flux      lightcurve.Averages // flux over trend, averaged over at most 320 intervals; usable is a sample that was fitted
	ModelTime []float64           // BJD_TDB, days
	Model     []float64           // transit model at these times; in between, a straight line is as good
	Scatter   Scatter             // of the residuals
	Binning   lightcurve.Binning  // of the residuals in bins of growing size, in units of the star's flux; empty with too few
	Cadence   float64             // minutes
	Beta      Beta                // in bins of 10 to 30 minutes; its Value is NaN when these are too few
}

// Fitted reports whether any sample was fitted.
func (s Summary) Fitted() bool { return s.Scatter.Used > 0 }

// Samples is the number of integrations, fitted or not.
func (s Summary) Samples() int { return s.Scatter.Used + s.Scatter.Masked }

// Summarise sums a fitted light curve up. The line through Model keeps within
// 0.05 % of the transit's depth of the model (unless that takes more than 500
// points, as no transit does). A fit without a usable sample has a summary too:
// numbers that cannot be had are NaN. It is an error when the slices of f differ
// in length.
func Summarise(f fit.CurveFit) (Summary, error) {
	residual, err := Residuals(f)
	if err != nil {
		return Summary{}, err
	}
	out := Summary{Channel: f.Channel, Mid: f.Mid, Level: f.Level, Cadence: lightcurve.Cadence(f.Time)}
	out.Scatter = scatterOf(f, residual)
	if binning, err := lightcurve.Binned(residual); err == nil {
		out.Binning = binning
	}
	if out.Beta, err = betaOf(out.Binning, out.Cadence, shortestBin, longestBin); err != nil {
		out.Beta = Beta{Value: math.NaN(), Err: math.NaN(), From: math.NaN(), To: math.NaN()}
	}
	flux := residual // which is not needed any more
	for i := range flux {
		if finite(flux[i]) {
			flux[i] = f.Flux[i] / f.Trend[i]
		}
	}
	if out.Flux, err = lightcurve.Average(f.Time, flux, Intervals); err != nil {
		return Summary{}, err
	}
	for _, i := range polyline(f.Time, f.Transit, max(bend*depth(f), leastBend), mostPoints) {
		out.ModelTime = append(out.ModelTime, f.Time[i])
		out.Model = append(out.Model, f.Transit[i])
	}
	return out, nil
}

// depth returns how far the model falls below 1.
func depth(f fit.CurveFit) float64 {
	out := 0.0
	for i, m := range f.Transit {
		if finite(m) && finite(f.Time[i]) {
			out = max(out, 1-m)
		}
	}
	return out
}

// Check reports what keeps a summary from being shown: slices that differ in
// length, or more intervals than a summary has. That of a channel of which
// nothing is known, with empty slices, is as good as any other.
func (s Summary) Check() error {
	n := len(s.Flux.Value)
	if n > Intervals {
		return fmt.Errorf("summary of channel %d has %d intervals; expected at most %d", s.Channel.Index, n, Intervals)
	}
	for _, part := range []struct {
		name       string
		have, want int
	}{
		{"mean times", len(s.Flux.Time), n}, {"counts of usable samples", len(s.Flux.Used), n}, {"counts of samples", len(s.Flux.Samples), n},
		{"values of the model", len(s.Model), len(s.ModelTime)}, {"counts of bins", len(s.Binning.Bins), len(s.Binning.Size)},
		{"scatters", len(s.Binning.RMS), len(s.Binning.Size)}, {"scatters of white noise", len(s.Binning.White), len(s.Binning.Size)},
	} {
		if part.have != part.want {
			return fmt.Errorf("summary of channel %d has %d %s; expected %d, as Summarise gives them", s.Channel.Index, part.have, part.name, part.want)
		}
	}
	return nil
}
