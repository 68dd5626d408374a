package chain

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/dsp/fourier"
)

// tailProbability is where [TailESS] looks, at both ends.
const tailProbability = 0.05

// BulkESS is the number of independent draws that a column is worth for the
// location of the distribution: the effective sample size of the normal scores
// of its ranks in split chains (Vehtari et al. 2021). It is defined, and means
// the same, where the distribution has no mean. Errors as for [RHat].
func BulkESS(x []float64, chains int) (float64, error) {
	if err := checkColumn(x, chains); err != nil {
		return 0, fmt.Errorf("bulk effective sample size: %w", err)
	}
	halves, count := split(x, chains)
	return effectiveSize(rankNormalise(halves), count), nil
}

// TailESS is the number of independent draws that a column is worth for the ends
// of intervals: the lesser of the effective sample sizes at the quantiles 0.05
// and 0.95 (Vehtari et al. 2021). Errors as for [RHat].
func TailESS(x []float64, chains int) (float64, error) {
	if err := checkColumn(x, chains); err != nil {
		return 0, fmt.Errorf("tail effective sample size: %w", err)
	}
	sorted := slices.Clone(x)
	slices.Sort(sorted)
	return math.Min(quantileSize(x, sorted, chains, tailProbability), quantileSize(x, sorted, chains, 1-tailProbability)), nil
}

// MeanESS is the number of independent draws that a column is worth for its
// mean: the number of draws over the autocorrelation time, from split chains.
// Errors as for [RHat].
func MeanESS(x []float64, chains int) (float64, error) {
	if err := checkColumn(x, chains); err != nil {
		return 0, fmt.Errorf("effective sample size of the mean: %w", err)
	}
	return effectiveSize(split(x, chains)), nil
}

// QuantileESS is the number of independent draws that a column is worth for the
// quantile at p, which lies between 0 and 1: that of the mean of the indicator
// of lying below it. Errors as for [RHat], and for p.
func QuantileESS(x []float64, chains int, p float64) (float64, error) {
	const what = "effective sample size of a quantile"
	if err := checkColumn(x, chains); err != nil {
		return 0, fmt.Errorf("%s: %w", what, err)
	}
	if !(p > 0 && p < 1) {
		return 0, fmt.Errorf("%s: a quantile at %g; expected a number between 0 and 1", what, p)
	}
	sorted := slices.Clone(x)
	slices.Sort(sorted)
	return quantileSize(x, sorted, chains, p), nil
}

// AutocorrelationTime is the number of draws after which a chain has forgotten
// where it was: 1 + 2 Σ ρ(t) over the lags t of the autocorrelation ρ, which is 1
// for independent draws. Chains that disagree lengthen it. Errors as for [RHat].
func AutocorrelationTime(x []float64, chains int) (float64, error) {
	size, err := MeanESS(x, chains)
	if err != nil {
		return 0, fmt.Errorf("autocorrelation time: %w", err)
	}
	return float64(len(x)) / size, nil
}

// quantileSize is the effective size for the quantile at p.
func quantileSize(x, sorted []float64, chains int, p float64) float64 {
	at := quantile(sorted, p)
	below := make([]float64, len(x))
	for i, v := range x {
		if v <= at {
			below[i] = 1
		}
	}
	return effectiveSize(split(below, chains))
}

// effectiveSize is the effective sample size of chains: their autocorrelations
// are combined (Vehtari et al. 2021, eq. 10) and summed as far as pairs of
// neighbouring lags are positive, made monotone (the initial sequence of Geyer
// 1992). It is at most S log10 S for S draws. Draws that are all equal are worth
// their number.
func effectiveSize(x []float64, chains int) float64 {
	n := len(x) / chains
	covariance, means := autocovariance(x, chains)
	total := float64(len(x))
	variance := covariance[0] // of the posterior, as all chains see it
	within := variance * float64(n) / float64(n-1)
	if chains > 1 {
		_, between := meanVariance(means)
		variance += between
	}
	if !(variance > 0) {
		return total
	}
	rho := func(t int) float64 { return 1 - (within-covariance[t])/variance }
	last := 1 + rho(1) // the pair of lags 0 and 1
	time := -1 + 2*last
	for lag := 2; lag+1 < n && last > 0; lag += 2 {
		even, pair := rho(lag), rho(lag)+rho(lag+1)
		if pair < 0 {
			time += math.Max(0, even) // better than nothing for alternating chains
			break
		}
		last = math.Min(last, pair)
		time += 2 * last
	}
	return total / math.Max(time, 1/math.Log10(total))
}

// autocovariance gives the autocovariances of chains at the lags 0 to n-1, with
// the divisor n and averaged over chains, by fast Fourier transform; and the means
// of the chains.
func autocovariance(x []float64, chains int) (covariance, means []float64) {
	n := len(x) / chains
	size := 1
	for size < 2*n { // so that the end does not meet the beginning
		size *= 2
	}
	fft := fourier.NewFFT(size)
	padded := make([]float64, size)
	spectrum, power := make([]complex128, size/2+1), make([]complex128, size/2+1)
	means = make([]float64, chains)
	for c := range chains {
		own := x[c*n : (c+1)*n]
		for _, v := range own {
			means[c] += v
		}
		means[c] /= float64(n)
		for i, v := range own {
			padded[i] = v - means[c]
		}
		fft.Coefficients(spectrum, padded)
		for k, z := range spectrum {
			power[k] += complex(real(z)*real(z)+imag(z)*imag(z), 0)
		}
	}
	covariance = fft.Sequence(padded, power)[:n]
	norm := 1 / (float64(size) * float64(n) * float64(chains))
	for t := range covariance {
		covariance[t] *= norm
	}
	return covariance, means
}
