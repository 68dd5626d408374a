package chain

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mathext"
)

// MeanError is the Monte-Carlo standard error of the mean of a column: the
// standard deviation over the root of the effective sample size. It is what more
// draws would lessen, not the uncertainty of the parameter. Errors as for [RHat].
func MeanError(x []float64, chains int) (float64, error) {
	size, err := MeanESS(x, chains)
	if err != nil {
		return 0, fmt.Errorf("Monte-Carlo error of the mean: %w", err)
	}
	_, variance := meanVariance(x)
	return math.Sqrt(variance / size), nil
}

// SDError is the Monte-Carlo standard error of the standard deviation of a
// column, by the error of the mean square (Kenney & Keeping 1951, propagated to
// its root), with the effective sample size of the distance from the mean.
// Errors as for [RHat].
func SDError(x []float64, chains int) (float64, error) {
	if err := checkColumn(x, chains); err != nil {
		return 0, fmt.Errorf("Monte-Carlo error of the standard deviation: %w", err)
	}
	mean, _ := meanVariance(x)
	distance := make([]float64, len(x))
	var second, fourth float64
	for i, v := range x {
		square := (v - mean) * (v - mean)
		distance[i] = math.Abs(v - mean)
		second += square / float64(len(x))
		fourth += square * square / float64(len(x))
	}
	size := effectiveSize(split(distance, chains))
	return math.Sqrt(math.Max(0, fourth-second*second) / size / second / 4), nil
}

// QuantileError is the Monte-Carlo standard error of the quantile of a column at
// p, which lies between 0 and 1: half the distance between the quantiles at the
// ends of the central 68% of the distribution that the effective sample size
// leaves for the share below the true quantile, a beta distribution (Vehtari et
// al. 2021, section 4.4). Errors as for [RHat], and for p.
func QuantileError(x []float64, chains int, p float64) (float64, error) {
	size, err := QuantileESS(x, chains, p)
	if err != nil {
		return 0, fmt.Errorf("Monte-Carlo error of a quantile: %w", err)
	}
	sorted := slices.Clone(x)
	slices.Sort(sorted)
	return quantileError(sorted, size, p), nil
}

func quantileError(sorted []float64, size, p float64) float64 {
	const below, above = 0.15865525393145707, 0.8413447460685429 // one standard deviation of a normal distribution
	at := func(share float64) float64 {
		share = mathext.InvRegIncBeta(size*p+1, size*(1-p)+1, share)
		return quantile(sorted, min(max(share, 0), 1))
	}
	return (at(above) - at(below)) / 2
}
