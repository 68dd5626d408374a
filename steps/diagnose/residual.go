package diagnose

import (
	"fmt"
	"math"
	"slices"

	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
)

// slack lets a bin of exactly the shortest or longest length count although times
// in days are rounded.
const slack = 1e-6

// checkShape reports the first slice of a curve fit whose length does not fit its
// times. Every function here starts with it.
func checkShape(f fit.CurveFit) error {
	n := len(f.Time)
	for _, part := range []struct {
		name string
		have int
	}{{"fluxes", len(f.Flux)}, {"errors", len(f.Err)}, {"flags", len(f.Mask)}, {"transit values", len(f.Transit)}, {"trend values", len(f.Trend)}} {
		if part.have != n {
			return fmt.Errorf("curve fit of channel %d has %d %s; expected one for each of %d times", f.Channel.Index, part.have, part.name, n)
		}
	}
	return nil
}

// Residuals returns flux over trend, less the transit model, one number per
// integration, in units of the star's flux. Masked samples and those that are not
// finite are NaN. It is an error when the slices of f differ in length.
func Residuals(f fit.CurveFit) ([]float64, error) {
	if err := checkShape(f); err != nil {
		return nil, fmt.Errorf("residuals: %w", err)
	}
	out := make([]float64, len(f.Time))
	for i := range out {
		out[i] = math.NaN()
		if r := f.Flux[i]/f.Trend[i] - f.Transit[i]; f.Mask[i] == 0 && finite(r) {
			out[i] = r
		}
	}
	return out, nil
}

// A Scatter says how much residuals vary.
type Scatter struct {
	Used   int     // residuals that are finite
	Masked int     // all others
	RMS    float64 // root mean square about zero, in units of the star's flux; NaN without residuals
	Ratio  float64 // root mean square of residual over error; NaN without residuals that have an error above zero
}

// ResidualScatter measures the residuals of f. It is an error when the slices of
// f differ in length.
func ResidualScatter(f fit.CurveFit) (Scatter, error) {
	residual, err := Residuals(f)
	if err != nil {
		return Scatter{}, err
	}
	return scatterOf(f, residual), nil
}

// scatterOf measures the residuals of f.
func scatterOf(f fit.CurveFit, residual []float64) Scatter {
	var out Scatter
	var sum, ratio float64
	weighed := 0
	for i, r := range residual {
		if !finite(r) {
			out.Masked++
			continue
		}
		out.Used++
		sum += r * r
		if z := r * f.Trend[i] / f.Err[i]; f.Err[i] > 0 && finite(z) {
			weighed++
			ratio += z * z
		}
	}
	out.RMS, out.Ratio = math.Sqrt(sum/float64(out.Used)), math.Sqrt(ratio/float64(weighed))
	return out
}

// A Beta is the outcome of the time-averaging test.
type Beta struct {
	Value float64 // mean ratio of measured to expected scatter over the bin sizes
	Err   float64 // standard error of one ratio at the largest bin size, for uncorrelated noise
	From  float64 // shortest bin used, minutes
	To    float64 // longest bin used, minutes
	Sizes int     // bin sizes used
}

// TimeAveraging measures correlated noise as Pont, Zucker & Queloz (2006) and
// Winn et al. (2008) do: the scatter of residuals averaged in bins of lo to hi
// minutes, in units of what uncorrelated noise would give, σ₁ / √N · √(M/(M-1))
// for M bins of N residuals; the mean over the bin sizes of [lightcurve.Binned].
// Bins hold consecutive usable residuals, so gaps are closed up. It is an error
// when no bin size within the range fits at least ten times into the series.
func TimeAveraging(f fit.CurveFit, lo, hi float64) (Beta, error) {
	if !(lo > 0 && lo < hi) {
		return Beta{}, fmt.Errorf("time averaging: bins of %g to %g minutes; expected 0 < shortest < longest", lo, hi)
	}
	residual, err := Residuals(f)
	if err != nil {
		return Beta{}, fmt.Errorf("time averaging: %w", err)
	}
	binned, err := lightcurve.Binned(residual)
	if err != nil {
		return Beta{}, fmt.Errorf("time averaging: %w", err)
	}
	return betaOf(binned, lightcurve.Cadence(f.Time), lo, hi)
}

// betaOf is the time-averaging test of residuals that have been binned, one
// integration taking so many minutes.
func betaOf(binned lightcurve.Binning, minutes, lo, hi float64) (Beta, error) {
	out := Beta{From: math.NaN(), To: math.NaN()}
	sum := 0.0
	for k, size := range binned.Size {
		length := float64(size) * minutes
		if !(length >= lo*(1-slack) && length <= hi*(1+slack)) || size == 1 || !(binned.White[k] > 0) {
			continue
		}
		if out.Sizes == 0 {
			out.From = length
		}
		out.To = length
		out.Sizes++
		out.Err = binned.Err[k] / binned.White[k]
		sum += binned.RMS[k] / Expected(binned.White[k], binned.Bins[k])
	}
	if out.Sizes == 0 {
		residuals := 0
		if len(binned.Bins) > 0 {
			residuals = binned.Bins[0]
		}
		return Beta{}, fmt.Errorf("time averaging: no bin of %g to %g minutes fits ten times into %d residuals spaced by %.3g minutes", lo, hi, residuals, minutes)
	}
	out.Value = sum / float64(out.Sizes)
	return out, nil
}

// Expected returns the scatter expected of M bins of uncorrelated noise, of which
// white is the scatter for infinitely many bins: white · √(M/(M-1)), the
// correction that Winn et al. (2008) apply. It needs bins ≥ 2.
func Expected(white float64, bins int) float64 {
	return white * math.Sqrt(float64(bins)/float64(bins-1))
}

// median returns the median of x, which it sorts; NaN when x is empty.
func median(x []float64) float64 {
	n := len(x)
	if n == 0 {
		return math.NaN()
	}
	slices.Sort(x)
	return x[(n-1)/2] + (x[n/2]-x[(n-1)/2])/2
}

// finite reports whether x is neither NaN nor infinite.
func finite(x float64) bool { return x-x == 0 }
